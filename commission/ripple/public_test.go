package ripple

import (
	"math"
	"testing"

	"chargehand/commission/finding/findingtest"
	"chargehand/commission/quantity"
)

func stageOf(c findingtest.Case) Stage {
	bus := c.In("v_bus_V")
	return Stage{Bus: quantity.Voltage(bus), Duty: quantity.Ratio(1 - c.In("v_src_V")/bus), Choke: quantity.Inductance(c.In("l_choke_H")),
		Switching: quantity.Frequency(c.In("f_sw_Hz")), Phases: int(c.Input("n_phases", 3))}
}

// Source of the figures: public-cases.json, exact summing of the waves and ngspice.
func TestPublicRipple(t *testing.T) {
	for _, c := range findingtest.Cases(t, "ripple") {
		s := stageOf(c)
		sum := quantity.Current(c.In("i_dc_A"))
		peak := s.Peak(sum, quantity.Ratio(c.In("share_err_frac")))
		c.Check(t, map[string]any{
			"duty": float64(s.Duty), "di_phase_pp_A": float64(s.PhaseSwing()), "di_sum_pp_A": float64(s.SumSwing()), "di_sum_rms_A": float64(s.SumRMS()),
			"i_phase_peak_A": float64(peak), "i_phase_rms_A": float64(s.PhaseRMS(sum)), "f_sum_Hz": float64(s.Switching) * float64(s.Phases),
			"cancel_ratio": float64(s.SumSwing() / s.PhaseSwing()), "i_ccm_boundary_A": float64(s.ContinuousFrom()),
			"saturates": float64(peak) > c.Input("i_sat_A", math.Inf(1)),
		})
	}
}

func TestPublicRippleFilter(t *testing.T) {
	for _, c := range findingtest.Cases(t, "ripple_filter") {
		s := stageOf(c)
		b := Branches{Capacitance: quantity.Capacitance(c.In("c_f_F")), ESR: quantity.Resistance(c.In("esr_ohm")), ESL: quantity.Inductance(c.In("esl_H")),
			Source: quantity.Resistance(c.In("r_s_ohm")), SourceInductance: quantity.Inductance(c.In("l_s_H"))}
		got := map[string][]any{}
		var filterSquare, sourceSquare float64
		const all400 = 400 // harmonics behind the root mean squares of the case
		for h := 1; h <= all400; h++ {
			f := quantity.Frequency(float64(h*s.Phases) * float64(s.Switching))
			sum, real := float64(s.SumHarmonic(h)), b.StarPoint(f, s.Choke, s.Phases)
			filter, source := sum*b.FilterShare(f), sum*b.SourceShare(f)
			filterSquare, sourceSquare = filterSquare+filter*filter/2, sourceSquare+source*source/2
			if h > int(c.Input("n_harm", 5)) {
				continue
			}
			for key, v := range map[string]float64{"f_Hz": float64(f), "i_sum_A": sum, "i_cap_A": filter, "i_src_A": source, "i_cap_exact_A": filter * real, "i_src_exact_A": source * real} {
				got[key] = append(got[key], v)
			}
		}
		all := map[string]any{"i_cap_rms_A": math.Sqrt(filterSquare), "i_src_rms_A": math.Sqrt(sourceSquare),
			"f_res_current_controlled_Hz": float64(b.Resonance()), "f_res_fixed_duty_Hz": float64(b.ResonanceAtFixedDuty(s.Choke, s.Phases))}
		for key, list := range got {
			all[key] = list
		}
		c.Check(t, all)
	}
}

// Ripple of the sum over that of one phase. Source: interleaved converters, any textbook of power electronics; the table
// follows from N·(D − m⁄N)·((m + 1)⁄N − D)⁄(D·(1 − D)), m the whole number of N·D.
func TestCancellationTable(t *testing.T) {
	duties := []float64{1. / 6, 0.2, 0.25, 1. / 3, 0.4, 0.5, 0.6, 2. / 3, 0.75, 5. / 6}
	for _, row := range []struct {
		phases int
		want   []float64
	}{
		{2, []float64{0.8, 0.75, 0.6667, 0.5, 0.3333, 0, 0.3333, 0.5, 0.6667, 0.8}},
		{3, []float64{0.6, 0.5, 0.3333, 0, 0.2222, 0.3333, 0.2222, 0, 0.3333, 0.6}},
		{6, []float64{0, 0.1667, 0.2222, 0, 0.1667, 0, 0.1667, 0, 0.2222, 0}},
	} {
		for k, d := range duties {
			s := Stage{Bus: 1000, Duty: quantity.Ratio(d), Choke: 0.4e-3, Switching: 4000, Phases: row.phases}
			if got := float64(s.SumSwing() / s.PhaseSwing()); math.Abs(got-row.want[k]) > 5e-5 {
				t.Errorf("SumSwing/PhaseSwing(N = %d, D = %.4f) = %.4f, want %.4f", row.phases, d, got, row.want[k])
			}
		}
	}
}

// wave adds up the triangles of all phases point by point, straight from volts over inductance.
func wave(bus, duty, switching float64, chokes []float64, points int) []float64 {
	sum := make([]float64, points)
	for k, l := range chokes {
		// While the lower switch conducts the choke sees V_source = V_bus·(1 − D), then V_source − V_bus = −V_bus·D.
		onSlope, offSlope := bus*(1-duty)/l, -bus*duty/l
		swing := onSlope * duty / switching
		for p := range sum {
			phase := math.Mod(float64(p)/float64(points)-float64(k)/float64(len(chokes))+1, 1)
			if phase < duty {
				sum[p] += -swing/2 + onSlope*phase/switching
			} else {
				sum[p] += swing/2 + offSlope*(phase-duty)/switching
			}
		}
	}
	return sum
}

func TestSumSwingAgainstWaves(t *testing.T) {
	const points = 120000
	for _, phases := range []int{1, 2, 3, 4, 6} {
		for _, duty := range []float64{0.05, 0.17, 0.3, 1. / 3, 0.5, 0.62, 0.75, 0.9} {
			chokes := make([]float64, phases)
			for k := range chokes {
				chokes[k] = 0.42e-3
			}
			low, high := math.Inf(1), math.Inf(-1)
			for _, v := range wave(1000, duty, 5000, chokes, points) {
				low, high = math.Min(low, v), math.Max(high, v)
			}
			s := Stage{Bus: 1000, Duty: quantity.Ratio(duty), Choke: 0.42e-3, Switching: 5000, Phases: phases}
			if got := float64(s.SumSwing()); math.Abs(got-(high-low)) > 2e-3*float64(s.PhaseSwing()) {
				t.Errorf("SumSwing(N = %d, D = %.3f) = %v, want %v from the waves", phases, duty, got, high-low)
			}
		}
	}
}

// Harmonics of unequal chokes against a Fourier sum over the waves added up point by point.
func TestHarmonicAgainstWaves(t *testing.T) {
	const points = 6000
	for _, chokes := range [][]float64{{0.42e-3, 0.38e-3, 0.46e-3}, {0.45e-3, 0.55e-3}, {0.4e-3, 0.4e-3, 0.4e-3, 0.44e-3}} {
		for _, duty := range []float64{0.21, 0.43, 0.7} {
			sum := wave(1000, duty, 5000, chokes, points)
			typed := make([]quantity.Inductance, len(chokes))
			for k, l := range chokes {
				typed[k] = quantity.Inductance(l)
			}
			for h := 1; h <= harmonics; h++ {
				var re, im float64
				for p, v := range sum {
					sin, cos := math.Sincos(2 * math.Pi * float64(h*p) / points)
					re, im = re+v*cos, im+v*sin
				}
				want := 2 / float64(points) * math.Hypot(re, im)
				got := float64(Harmonic(1000, quantity.Ratio(duty), 5000, typed, h))
				if math.Abs(got-want) > 1e-3*want+2e-3 {
					t.Errorf("Harmonic(%v, D = %.2f, h = %d) = %v, want %v from the waves", chokes, duty, h, got, want)
				}
			}
		}
	}
}
