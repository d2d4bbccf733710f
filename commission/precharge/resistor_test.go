package precharge

import (
	"math"
	"testing"

	"chargehand/commission/finding/findingtest"
	"chargehand/commission/quantity"
)

func ratingIn(c findingtest.Case) Rating {
	r := Rating{Power: quantity.Power(c.In("p_rated_W")), FullTo: quantity.Temperature(c.In("t1_C")),
		ZeroAt: quantity.Temperature(c.In("t2_C")), Multiple: c.In("sto_k"), OverloadTime: quantity.Seconds(c.In("sto_t_s"))}
	if single := c.In("e_single_J"); single > 0 {
		// An energy that is permitted however short the pulse is the limit of a curve with one very short point.
		r.Pulses = []Pulse{{Duration: 1e-9, Energy: quantity.Energy(single)}}
	}
	curve, _ := c.Inputs["curve"].([]any)
	for _, point := range curve {
		p := point.([]any)
		r.Pulses = append(r.Pulses, Pulse{quantity.Seconds(p[0].(float64)), quantity.Energy(p[1].(float64))})
	}
	return r
}

func heatIn(c findingtest.Case) Heat {
	on := quantity.Seconds(c.In("t_on_s"))
	if on == 0 {
		on = quantity.Seconds(40 * c.In("tau_s"))
	}
	steady := quantity.Current(c.In("i_inf_A"))
	return Heat{quantity.Resistance(c.In("r_pre_ohm")), steady, quantity.Current(c.In("i0_A")) - steady,
		quantity.Seconds(c.In("tau_s")), on, 1}
}

func TestRatingOnPublicPulseCases(t *testing.T) {
	for _, c := range findingtest.Cases(t, "resistor_pulse") {
		rating, heat := ratingIn(c), heatIn(c)
		peak := quantity.Power(c.In("r_pre_ohm") * math.Pow(c.In("i0_A"), 2))
		from := quantity.Temperature(c.In("t_amb_C"))
		duration := pulseTime(heat.TimeConstant, heat.Energy(), peak)
		permitted := rating.Permissible(duration, from)
		c.Check(t, map[string]any{
			"temp_factor": float64(rating.Factor(from)), "p_peak_W": float64(peak), "e_pulse_J": float64(heat.Energy()),
			"pulse_t_s": float64(duration), "p_perm_W": float64(permitted),
			"e_perm_J": float64(permitted) * float64(duration), "utilisation": float64(peak / permitted),
		}, "ok")
	}
}

func TestBodyOnPublicSeries(t *testing.T) {
	for _, c := range findingtest.Cases(t, "resistor_attempts") {
		heat, period := heatIn(c), quantity.Seconds(c.In("period_s"))
		body := Body{quantity.Thermal(c.In("r_th_K_W")), quantity.Seconds(c.In("tau_th_s"))}
		ambient := c.In("t_amb_C")
		steady := body.SteadyStart(heat, period)
		factor := ratingIn(c).Factor(quantity.Temperature(ambient))
		thermal := float64(body.LeastPeriod(heat, quantity.Difference(c.In("t_max_C")-ambient)))
		mean := float64(heat.Energy()) / float64(factor) / c.In("p_rated_W")
		var peaks, ends []any
		for attempt := range len(c.Expected["t_peak_C"].([]any)) {
			start := body.Before(heat, attempt+1, period)
			peaks = append(peaks, ambient+float64(body.Peak(heat, start)))
			ends = append(ends, ambient+float64(body.After(heat, start, period)))
		}
		c.Check(t, map[string]any{
			"t_peak_C": peaks, "t_end_C": ends,
			"e_pulse_J": float64(heat.Energy()), "t_ss_start_C": ambient + float64(steady),
			"t_ss_peak_C": ambient + float64(body.Peak(heat, steady)), "p_avg_W": float64(heat.Energy()) / float64(period),
			"period_min_thermal_s": thermal, "period_min_avg_s": mean, "period_min_s": math.Max(thermal, mean),
		}, "avg_ok", "n_attempts_ok")
	}
}

func TestWithstandOnPublicFaults(t *testing.T) {
	for _, c := range findingtest.Cases(t, "resistor_fault") {
		rating := ratingIn(c)
		current := c.In("emf_V") / (c.In("r_pre_ohm") + c.In("r_series_ohm"))
		power := quantity.Power(c.In("r_pre_ohm") * current * current)
		start := quantity.Temperature(c.In("t_start_C"))
		pulse := float64(rating.Withstand(power, start))
		got := map[string]float64{"i_fault_A": current, "p_fault_W": float64(power), "t_withstand_pulse_s": pulse, "t_withstand_s": pulse}
		if thermal := c.In("r_th_K_W"); thermal > 0 {
			body := Body{quantity.Thermal(thermal), quantity.Seconds(c.In("tau_th_s"))}
			ambient := c.In("t_amb_C")
			rise := quantity.Difference(float64(start) - ambient)
			byHeat := float64(body.Withstand(power, rise, quantity.Difference(c.In("t_max_C")-ambient)))
			got["t_withstand_thermal_s"] = byHeat
			got["t_withstand_s"] = math.Min(pulse, byHeat)
			steady := Heat{Resistor: quantity.Resistance(c.In("r_pre_ohm")), Steady: quantity.Current(current), TimeConstant: 1, On: 1e9, Scale: 1}
			got["t_at_timeout_C"] = ambient + float64(body.Rise(steady, rise, quantity.Seconds(c.In("t_timeout_s"))))
		}
		got["window_lo_s"] = aboveSlowestCharge * c.In("t_charge_max_s")
		got["window_hi_s"] = got["t_withstand_s"] / belowLeastWithstand
		exists := got["window_lo_s"] < got["window_hi_s"]
		if want := c.Expected["window_exists"]; exists != want {
			t.Errorf("%s: window exists = %v, want %v", c.ID, exists, want)
		}
		if exists {
			got["timeout_rec_s"] = math.Sqrt(got["window_lo_s"] * got["window_hi_s"])
		}
		if out := c.In("t_timeout_s"); out > 0 {
			got["fault_utilisation"] = out / got["t_withstand_s"]
		}
		c.Check(t, findingtest.Numbers(got), "window_exists", "timeout_ok", "timeout_rec_s")
	}
}

// A curve and an overload together: what is proved where. Figures by hand from 12 kJ in 0.1 s … 200 kJ in 100 s, 10 kW for 5 s.
func TestPermissiblePulseInEachRange(t *testing.T) {
	r := Rating{Power: 1000, FullTo: 40, ZeroAt: 275, Multiple: 10, OverloadTime: 5,
		Pulses: []Pulse{{0.1, 12e3}, {1, 30e3}, {10, 90e3}, {100, 200e3}}}
	for _, c := range []struct {
		name     string
		duration quantity.Seconds
		from     quantity.Temperature
		want     quantity.Power
		source   string
	}{
		{"shorter than the curve", 0.01, 25, 120e3, "P of the first point, 12 kJ ⁄ 0.1 s"},
		{"on a point", 1, 40, 30e3, "30 kJ ⁄ 1 s"},
		{"between points", quantity.Seconds(math.Sqrt(10)), 40, quantity.Power(math.Sqrt(30e3 * 9e3)), "middle of both logarithms"},
		{"longer than the curve", 200, 40, 1000, "200 kJ ⁄ 200 s is the continuous rating"},
		{"half the headroom gone", 1, 157.5, 15e3, "factor (275 − 157.5) ⁄ 235 = ½"},
		{"no headroom", 1, 275, 0, "factor 0"},
	} {
		if got := r.Permissible(c.duration, c.from); math.Abs(float64(got-c.want)) > 1e-9*float64(c.want) {
			t.Errorf("%s: Permissible(%v s, %v °C) = %v W, want %v W (%s)", c.name, c.duration, c.from, got, c.want, c.source)
		}
	}
}

// Withstand is the inverse of Permissible: the power is permitted up to it and no longer.
func TestWithstandInvertsPermissible(t *testing.T) {
	for _, r := range []Rating{
		{Power: 1000, FullTo: 40, ZeroAt: 275, Pulses: []Pulse{{0.1, 12e3}, {1, 30e3}, {10, 90e3}, {100, 200e3}}},
		{Power: 1000, FullTo: 40, ZeroAt: 275, Multiple: 10, OverloadTime: 5},
		{Power: 200, FullTo: 40, ZeroAt: 275, Multiple: 5, OverloadTime: 5, Pulses: []Pulse{{0.01, 100}, {0.5, 900}}},
	} {
		for p := quantity.Power(1100); p < 110e3; p *= 1.37 {
			at := r.Withstand(p, 60)
			if at == 0 {
				if r.Permissible(1e-12, 60) >= p {
					t.Errorf("Withstand(%v W) = 0, but a short pulse of it is permitted", p)
				}
				continue
			}
			if got := r.Permissible(at*(1-1e-9), 60); got < p*(1-1e-6) {
				t.Errorf("Permissible(%v s) = %v W just before Withstand, want at least %v", at, got, p)
			}
			for longer := at * (1 + 1e-9); longer < 1e5; longer *= 1.5 {
				if got := r.Permissible(longer, 60); got >= p {
					t.Errorf("Permissible(%v s) = %v W beyond Withstand(%v W) = %v s", longer, got, p, at)
				}
			}
		}
	}
}

// Two rates that meet must not divide nothing by nothing: limits by hand, t·e^(−k·t).
func TestResponseWhereTheRatesMeet(t *testing.T) {
	for _, k := range []float64{1e-3, 1, 50} {
		want := 0.7 * math.Exp(-0.7*k)
		for _, r := range []float64{k, k * (1 + 1e-12), k * (1 - 1e-9)} {
			if got := response(r, k, 0.7); math.Abs(got-want) > 1e-6*want {
				t.Errorf("response(%v, %v, 0.7) = %v, want %v", r, k, got, want)
			}
		}
	}
}
