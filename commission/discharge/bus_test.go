package discharge

import (
	"math"
	"testing"

	"chargehand/commission/finding/findingtest"
	"chargehand/commission/quantity"
)

func TestBusOnPublicCases(t *testing.T) {
	for _, c := range findingtest.Cases(t, "discharge") {
		end := quantity.Voltage(c.Input("v_end_V", 60)) // by default the touch limit
		from := quantity.Voltage(c.In("v_start_V"))
		bus := func(scaleC, scaleR, load float64) Bus {
			return Bus{Link: quantity.Capacitance(c.In("c_F") * scaleC), Bleeder: quantity.Resistance(c.In("r_bleed_ohm") * scaleR),
				Auxiliary: quantity.Power(load), StopsAt: quantity.Voltage(c.In("v_uv_V"))}
		}
		p, tc, tr := c.In("p_load_W"), c.In("c_tol"), c.In("r_tol")
		c.Check(t, map[string]any{
			"t_s": float64(bus(1, 1, p).Time(from, end)), "t_no_load_s": float64(bus(1, 1, 0).Time(from, end)),
			"t_worst_s":  float64(bus(1+tc, 1+tr, 0).Time(from, end)),
			"t_best_s":   float64(bus(1-tc, 1-tr, p).Time(from, end)),
			"e_stored_J": float64(bus(1, 1, 0).Stored(from)), "e_stored_max_J": float64(bus(1+tc, 1, 0).Stored(from)),
			"q_C": c.In("c_F") * float64(from), "p_bleed_W": float64(from*from) / c.In("r_bleed_ohm"),
		}, "ok")
	}
}

// IEC 60204-1, 6.2.4 asks for 60 V within 5 s: from 750 V that needs R·C ≤ 1.97963 s, from 800 V ≤ 1.93030 s
// (5 s ⁄ ln(750⁄60), ln(800⁄60); worked by hand to six digits).
func TestResidualVoltageOfIEC60204(t *testing.T) {
	for _, c := range []struct {
		from     quantity.Voltage
		constant float64
	}{{750, 1.97963}, {800, 1.93030}} {
		b := Bus{Link: 1e-3, Bleeder: quantity.Resistance(c.constant / 1e-3)}
		if got := float64(b.Time(c.from, 60)); math.Abs(got-5) > 2e-5 {
			t.Errorf("Time(%v to 60 V) with RC = %v s = %v s, want 5 s", c.from, c.constant, got)
		}
	}
}

// A published worked case of a residual charge: 4.4 µF still at 80 V after 5 s holds 352 µC (IEC 61010-1, worked in a public
// product-safety thread of May 2013); from 325 V that is a path of 5 s ⁄ ln(325⁄80) ⁄ 4.4 µF.
func TestResidualChargeOfAPublishedCase(t *testing.T) {
	b := Bus{Link: 4.4e-6, Bleeder: quantity.Resistance(5 / math.Log(325.0/80) / 4.4e-6)}
	if got := float64(b.VoltageAt(325, 5)) * 4.4e-6; math.Abs(got-352e-6) > 1e-12 {
		t.Errorf("charge left after 5 s = %v C, want 352 µC", got)
	}
}

// drained integrates the bus in small steps, with everything that was stored accounted for.
func drained(b Bus, from, to float64) (t, balance float64) {
	v, left, burnt := from, 0.0, 0.0
	rate := func(v float64) (dv, dw float64) {
		c, i := float64(b.Link), 0.0
		if v <= float64(b.Held) || b.Filter == 0 {
			c += float64(b.Filter)
		}
		if b.Bleeder > 0 {
			i += v / float64(b.Bleeder)
		}
		if b.Auxiliary > 0 && v > float64(b.StopsAt) {
			i += float64(b.Auxiliary) / v
		}
		return -i / c, i * v
	}
	// The steps are in voltage, so that none runs over an edge: dt = dv ⁄ rate, Simpson's rule.
	edges := []float64{from, to}
	for _, e := range []float64{float64(b.Held), float64(b.StopsAt)} {
		if e < from && e > to {
			edges = append(edges, e)
		}
	}
	for len(edges) > 1 {
		next := to
		for _, e := range edges {
			if e < v && e > next {
				next = e
			}
		}
		const n = 4000
		h := (next - v) / n
		at := func(x float64) (float64, float64) {
			x = math.Min(math.Max(x, next*(1+1e-13)), v*(1-1e-13)) // the inner side of an edge
			dv, dw := rate(x)
			return 1 / dv, dw / dv
		}
		for k := range n {
			a, m, z := v+float64(k)*h, v+(float64(k)+0.5)*h, v+float64(k+1)*h
			ta, wa := at(a)
			tm, wm := at(m)
			tz, wz := at(z)
			left += h / 6 * (ta + 4*tm + tz)
			burnt += h / 6 * (wa + 4*wm + wz)
		}
		v = next
		if v <= to {
			break
		}
	}
	stored := float64(b.Link) * (from*from - to*to) / 2
	if b.Filter > 0 {
		joint := math.Min(from, math.Max(float64(b.Held), to))
		stored += float64(b.Filter) * (joint*joint - to*to) / 2
	}
	return left, (stored - burnt) / stored
}

func TestBusAgreesWithIntegrationAndKeepsItsEnergy(t *testing.T) {
	for _, b := range []Bus{
		{Link: 11.7e-3, Filter: 0.8e-3, Held: 821.7, Bleeder: 22e3},
		{Link: 11.7e-3, Bleeder: 22e3, Auxiliary: 40, StopsAt: 300},
		{Link: 11.7e-3, Filter: 0.8e-3, Held: 633.6, Bleeder: 22e3, Auxiliary: 40, StopsAt: 300},
		{Link: 11.7e-3, Filter: 2e-3, Held: 633.6, Auxiliary: 40},
		{Link: 5e-3, Filter: 2e-3, Held: 200, Bleeder: 1e3, Auxiliary: 150, StopsAt: 400},
	} {
		want, balance := drained(b, 1070, 60)
		if math.Abs(balance) > 1e-9 {
			t.Errorf("%+v: energy not accounted for = %v of what was stored, want 0", b, balance)
		}
		if got := float64(b.Time(1070, 60)); math.Abs(got-want) > 1e-8*want {
			t.Errorf("%+v: Time(1070 V, 60 V) = %v s, want %v s by integration", b, got, want)
		}
		for _, v := range []quantity.Voltage{1000, 700, 500, 350, 250, 100} {
			if got := b.VoltageAt(1070, b.Time(1070, v)); math.Abs(float64(got-v)) > 1e-9*float64(v) {
				t.Errorf("%+v: VoltageAt(Time(%v)) = %v, want it back", b, v, got)
			}
		}
	}
}

func TestBusWithoutAPathNeverEmpties(t *testing.T) {
	bare := Bus{Link: 10e-3}
	if got := float64(bare.Time(1000, 60)); !math.IsInf(got, 1) {
		t.Errorf("Time without any path = %v, want never", got)
	}
	if got := bare.VoltageAt(1000, 1e6); got != 1000 {
		t.Errorf("VoltageAt(1e6 s) without any path = %v, want 1000 V", got)
	}
	dropsOut := Bus{Link: 10e-3, Auxiliary: 40, StopsAt: 300}
	if got := float64(dropsOut.Time(1000, 60)); !math.IsInf(got, 1) {
		t.Errorf("Time with a supply that lets go at 300 V = %v, want never", got)
	}
	// C·(V₁² − V₂²)⁄2P by hand: 10 mF·(1000² − 300²)⁄80 W
	if got, want := float64(dropsOut.Time(1000, 300)), 10e-3*(1e6-9e4)/80; math.Abs(got-want) > 1e-9*want {
		t.Errorf("Time down to where the supply lets go = %v s, want %v s", got, want)
	}
	if got := bare.Time(50, 60); got != 0 {
		t.Errorf("Time from below = %v, want 0", got)
	}
}

// Twice the capacitance or twice the resistance takes twice as long; n bleeders alike in parallel take an n-th.
func TestDischargeScales(t *testing.T) {
	b := Bus{Link: 11.7e-3, Filter: 0.8e-3, Held: 821.7, Bleeder: 22e3}
	base := float64(b.Time(1070, 60))
	doubled := b
	doubled.Link, doubled.Filter = 2*b.Link, 2*b.Filter
	slow := b
	slow.Bleeder = 2 * b.Bleeder
	for name, got := range map[string]float64{"capacitance": float64(doubled.Time(1070, 60)), "resistance": float64(slow.Time(1070, 60))} {
		if math.Abs(got-2*base) > 1e-12*got {
			t.Errorf("time at twice the %s = %v, want twice %v", name, got, base)
		}
	}
}
