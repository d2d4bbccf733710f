package precharge

import (
	"math"
	"testing"

	"chargehand/commission/quantity"
)

// charged is a circuit taken through time step by step, with all energy accounted for. It knows no closed form.
type charged struct {
	t, e, v                           float64
	resistors, bleeder, load, charge  float64 // J, J, J, C
	pre                               float64 // in the pre-charge resistor alone
	fromSource, storedLink, unbalance float64
	hiccup                            bool
}

// state is a charge at one instant: source and link voltage, energy in resistors, bleeder and supply, and charge.
type state struct{ e, v, r, b, l, q float64 }

func (s state) plus(k state, h float64) state {
	return state{s.e + h*k.e, s.v + h*k.v, s.r + h*k.r, s.b + h*k.b, s.l + h*k.l, s.q + h*k.q}
}

// stateRate is how fast everything changes, the supply on or off.
func (c Circuit) stateRate(s state, on bool) state {
	r := float64(c.Resistor + c.Series)
	i := math.Max(0, (s.e-float64(c.DiodeDrop)-s.v)/r)
	d := state{r: i*i*r + i*float64(c.DiodeDrop), q: i}
	drain := 0.0
	if rb := float64(c.Bleeder); rb > 0 {
		drain, d.b = s.v/rb, s.v*s.v/rb
	}
	if on {
		drain, d.l = drain+float64(c.Auxiliary)/s.v, float64(c.Auxiliary)
	}
	d.v = (i - drain) / float64(c.Capacitance)
	if c.Source > 0 {
		d.e = -i / float64(c.Source)
	}
	return d
}

// stateAfter is one step of Runge-Kutta of fourth order.
func (c Circuit) stateAfter(s state, on bool, h float64) state {
	k1 := c.stateRate(s, on)
	k2 := c.stateRate(s.plus(k1, h/2), on)
	k3 := c.stateRate(s.plus(k2, h/2), on)
	k4 := c.stateRate(s.plus(k3, h), on)
	for _, k := range []state{k2, k2, k3, k3, k4} {
		k1 = k1.plus(k, 1)
	}
	return s.plus(k1, h/6)
}

// cut is the part of a step after which it is done, by halving.
func (c Circuit) cut(s state, on bool, h float64, done func(state) bool) float64 {
	low, high := 0.0, h
	for range 60 {
		if m := (low + high) / 2; done(c.stateAfter(s, on, m)) {
			high = m
		} else {
			low = m
		}
	}
	return high
}

// simulate goes in steps of a two-thousandth of R·C until stop, at most to the end. The supply starts at V_on and stops at
// V_off; the steps on which it does are cut by halving.
func simulate(c Circuit, end float64, stop func(e, v float64) bool) charged {
	s := state{e: float64(c.EMF), v: float64(c.Start)}
	on, out := c.Auxiliary > 0 && c.Start >= c.StartsAt, charged{}
	flips := func(x state) bool {
		return c.Auxiliary > 0 && (!on && x.v >= float64(c.StartsAt) || on && x.v <= float64(c.StopsAt))
	}
	stops := func(x state) bool { return stop != nil && stop(x.e, x.v) }
	h := float64(c.Resistor+c.Series) * float64(c.Capacitance) / 2000
	for out.t < end && !stops(s) {
		take := math.Min(h, end-out.t)
		next := c.stateAfter(s, on, take)
		flipped := flips(next)
		if flipped {
			take = c.cut(s, on, take, flips)
			next = c.stateAfter(s, on, take)
		}
		if stops(next) {
			take = c.cut(s, on, take, stops)
			next, flipped = c.stateAfter(s, on, take), false
		}
		s, out.t = next, out.t+take
		if flipped {
			out.hiccup = out.hiccup || on
			on = !on
		}
	}
	out.account(c, s)
	return out
}

// account adds up where the energy went.
func (out *charged) account(c Circuit, s state) {
	stored := func(cap quantity.Capacitance, from, to float64) float64 {
		return float64(cap) * (to - from) * (to + from) / 2
	}
	out.fromSource = float64(c.EMF) * s.q
	if c.Source > 0 {
		out.fromSource = stored(c.Source, s.e, float64(c.EMF))
	}
	out.e, out.v, out.resistors, out.bleeder, out.load, out.charge = s.e, s.v, s.r, s.b, s.l, s.q
	out.pre = (s.r - s.q*float64(c.DiodeDrop)) * float64(c.Resistor) / float64(c.Resistor+c.Series)
	out.storedLink = stored(c.Capacitance, float64(c.Start), s.v)
	out.unbalance = (out.fromSource - out.storedLink - s.r - s.b - s.l) / out.fromSource
}

var ferry = Circuit{EMF: 821.7, Resistor: 100, Series: 0.063, Capacitance: 12.5e-3, Bleeder: 22000, Auxiliary: 40, StartsAt: 350, StopsAt: 300}

func with(c Circuit, change func(*Circuit)) Circuit {
	change(&c)
	return c
}

// Closed forms against integration; and the integration keeps every joule: source = link + resistances + bleeder + load.
func TestChargeAgreesWithIntegrationAndKeepsItsEnergy(t *testing.T) {
	for _, c := range []struct {
		name string
		Circuit
		difference quantity.Voltage
	}{
		{"the ferry", ferry, 25},
		{"without auxiliary supply", with(ferry, func(c *Circuit) { c.Auxiliary = 0 }), 25},
		{"without bleeder", with(ferry, func(c *Circuit) { c.Bleeder = 0 }), 25},
		{"bare", with(ferry, func(c *Circuit) { c.Bleeder, c.Auxiliary = 0, 0 }), 8},
		{"from a charged bus below the start of the supply", with(ferry, func(c *Circuit) { c.Start = 210 }), 25},
		{"from a charged bus above it", with(ferry, func(c *Circuit) { c.Start = 500 }), 25},
		{"with diode drop", with(ferry, func(c *Circuit) { c.DiodeDrop = 1.6 }), 25},
		{"heavy supply, still reached", with(ferry, func(c *Circuit) { c.Auxiliary, c.Bleeder = 150, 9000 }), 40},
		{"supercapacitor", with(ferry, func(c *Circuit) { c.Bleeder, c.Auxiliary, c.Source = 0, 0, 0.8 }), 20},
		{"supercapacitor with bleeder", with(ferry, func(c *Circuit) { c.Auxiliary, c.Source = 0, 0.8 }), 20},
		{"supercapacitor with bleeder and supply", with(ferry, func(c *Circuit) { c.Source = 14 }), 25},
	} {
		want := simulate(c.Circuit, 60, func(e, v float64) bool { return e-v <= float64(c.difference) })
		if math.Abs(want.unbalance) > 1e-9 {
			t.Errorf("%s: energy not accounted for = %v of what the source gave, want 0", c.name, want.unbalance)
		}
		if got := float64(c.TimeToClose(c.difference)); math.Abs(got-want.t) > 1e-6*want.t {
			t.Errorf("%s: TimeToClose(%v) = %v s, want %v s by integration", c.name, c.difference, got, want.t)
		}
		if got := float64(c.EnergyToClose(c.difference)); math.Abs(got-want.pre) > 1e-6*want.pre {
			t.Errorf("%s: EnergyToClose(%v) = %v J, want %v J by integration", c.name, c.difference, got, want.pre)
		}
		for _, until := range []float64{0.2, 1, 3.3, 8} {
			want := simulate(c.Circuit, until, nil)
			low, high := c.VoltageAt(quantity.Seconds(until))
			if low != high || math.Abs(float64(low)-want.v) > 1e-6*want.v {
				t.Errorf("%s: VoltageAt(%v s) = %v … %v, want %v V by integration", c.name, until, low, high, want.v)
			}
			if got := float64(c.EnergyUntil(quantity.Seconds(until))); math.Abs(got-want.pre) > 1e-6*want.pre {
				t.Errorf("%s: EnergyUntil(%v s) = %v J, want %v J by integration", c.name, until, got, want.pre)
			}
		}
	}
}

// Each way in which a charge stays below its target, against where the integration ends.
func TestSettledAgreesWithIntegration(t *testing.T) {
	for _, c := range []struct {
		name string
		Circuit
		how Settling
	}{
		{"at the source", with(ferry, func(c *Circuit) { c.Bleeder, c.Auxiliary = 0, 0 }), AtFinal},
		{"at the divider", with(ferry, func(c *Circuit) { c.Auxiliary = 0 }), AtFinal},
		{"at the equilibrium", ferry, AtEquilibrium},
		{"supply starts too high to start", with(ferry, func(c *Circuit) { c.StartsAt, c.StopsAt = 820, 800 }), AtFinal},
		{"supply pulls down to the equilibrium", with(ferry, func(c *Circuit) { c.Auxiliary, c.StartsAt, c.StopsAt = 300, 800, 300 }), AtEquilibrium},
		{"no equilibrium", with(ferry, func(c *Circuit) { c.Auxiliary = 2000 }), Hiccups},
		{"supply starts below the lower equilibrium", with(ferry, func(c *Circuit) { c.Auxiliary, c.StartsAt, c.StopsAt = 1500, 200, 150 }), Hiccups},
		{"supply starts and stops above the higher equilibrium", with(ferry, func(c *Circuit) { c.Auxiliary, c.StartsAt, c.StopsAt = 600, 780, 760 }), Hiccups},
	} {
		got, how := c.Settled()
		if how != c.how {
			t.Errorf("%s: Settled() how = %v, want %v", c.name, how, c.how)
		}
		end := simulate(c.Circuit, 30, nil)
		if end.hiccup != (c.how == Hiccups) {
			t.Errorf("%s: integration hiccups = %v, want %v", c.name, end.hiccup, c.how == Hiccups)
		}
		if c.how != Hiccups && math.Abs(float64(got)-end.v) > 1e-6*end.v {
			t.Errorf("%s: Settled() = %v, want %v V by integration", c.name, got, end.v)
		}
		if c.how == Hiccups {
			if got != c.StartsAt {
				t.Errorf("%s: Settled() = %v, want the upper level %v", c.name, got, c.StartsAt)
			}
			if bound := float64(c.EnergyUntil(30)); bound < end.pre {
				t.Errorf("%s: EnergyUntil(30 s) = %v J, want at least the %v J by integration", c.name, bound, end.pre)
			}
		}
	}
}

// A supercapacitor that sags under its load: the link never comes up where it hiccups, and the highest voltage is found.
func TestSupercapacitorUnderLoad(t *testing.T) {
	slow := Circuit{EMF: 540, Resistor: 47, Series: 0.025, Capacitance: 12e-3, Bleeder: 8000, Source: 1.5}
	highest := 0.0
	simulate(slow, 10, func(_, v float64) bool { highest = math.Max(highest, v); return false })
	if got, how := slow.Settled(); how != AtFinal || math.Abs(float64(got)-highest) > 1e-4*highest {
		t.Errorf("Settled() = %v, %v, want the highest voltage %v V by integration", got, how, highest)
	}
	if got := float64(slow.TimeToClose(0.5)); !math.IsInf(got, 1) {
		t.Errorf("TimeToClose(0.5 V) = %v s, want never: the bleeder holds more than that off", got)
	}
	pulled := with(slow, func(c *Circuit) { c.Auxiliary, c.StartsAt, c.StopsAt = 2500, 300, 250 })
	if _, how := pulled.Settled(); how != Hiccups {
		t.Errorf("Settled() with 2.5 kW on the bus = %v, want hiccups", how)
	}
	// So large a supercapacitor is a source of constant EMF.
	large := with(ferry, func(c *Circuit) { c.Source = 1e7 })
	if got, want := float64(large.TimeToClose(25)), float64(ferry.TimeToClose(25)); math.Abs(got-want) > 1e-5*want {
		t.Errorf("TimeToClose behind a million farads = %v s, want %v s", got, want)
	}
}

// Share of the final voltage after n time constants, as printed in handbooks (Kuphaldt, Lessons in Electric Circuits, vol. I,
// ch. 16): 63.2, 86.5, 95.0, 98.2, 99.3 %.
func TestChargeAgainstTheHandbookTable(t *testing.T) {
	c := Circuit{EMF: 1000, Resistor: 100, Capacitance: 1e-2}
	for n, want := range map[float64]float64{1: 632, 2: 865, 3: 950, 4: 982, 5: 993} {
		if got, _ := c.VoltageAt(quantity.Seconds(n)); math.Abs(float64(got)-want) > 1 {
			t.Errorf("VoltageAt(%v time constants) = %v, want %v V", n, got, want)
		}
	}
	for share, want := range map[float64]float64{0.5: 0.6931, 0.8: 1.6094, 0.9: 2.3026, 0.95: 2.9957, 0.98: 3.9120, 0.99: 4.6052} {
		if got := float64(c.TimeTo(quantity.Voltage(1000 * share))); math.Abs(got-want) > 5e-5 {
			t.Errorf("TimeTo(%v of the final voltage) = %v time constants, want %v", share, got, want)
		}
	}
}

// A public worked charge: 400 V, 50 Ω, 3.0 mF: τ 150 ms, 8 A, 3200 W, 240 J in all, 95 % after 449.36 ms; with 1 kΩ across the
// capacitor it ends at 380.95 V with τ 142.86 ms and the resistor keeps 7.256 W (by hand from the same inputs).
func TestChargeOfAWorkedExample(t *testing.T) {
	c := Circuit{EMF: 400, Resistor: 50, Capacitance: 3e-3}
	loaded := with(c, func(c *Circuit) { c.Bleeder = 1000 })
	final, _ := loaded.Settled()
	for _, row := range []struct {
		name           string
		got, want, tol float64
	}{
		{"time constant", float64(c.TimeConstant()), 0.150, 1e-12},
		{"peak current", float64(c.PeakCurrent()), 8, 1e-12},
		{"peak power", float64(c.PeakPower()), 3200, 1e-9},
		{"energy", float64(c.EnergyUntil(quantity.Seconds(math.Inf(1)))), 240, 1e-9},
		{"time to 95 %", float64(c.TimeTo(380)), 0.44936, 5e-6},
		{"time to 99 %", float64(c.TimeTo(396)), 0.69078, 5e-6},
		{"equivalent pulse", float64(pulseTime(c.TimeConstant(), 240, 3200)), 0.075, 1e-12},
		{"final voltage with 1 kΩ", float64(final), 380.95, 5e-3},
		{"time constant with 1 kΩ", float64(loaded.TimeConstant()), 0.14286, 5e-6},
		{"kept power with 1 kΩ", float64(loaded.SettledPower()), 7.256, 5e-4},
	} {
		if math.Abs(row.got-row.want) > row.tol {
			t.Errorf("%s = %v, want %v", row.name, row.got, row.want)
		}
	}
}

// n time constants turn 1 − e^(−2n) of the energy into heat: 63.2121, 86.4665, 98.1684, 99.7521 % (by hand).
func TestEnergyAgainstTheTable(t *testing.T) {
	c := Circuit{EMF: 1000, Resistor: 100, Capacitance: 1e-2}
	for n, want := range map[float64]float64{0.5: 0.632121, 1: 0.864665, 2: 0.981684, 3: 0.997521} {
		if got := float64(c.EnergyUntil(quantity.Seconds(n))) / 5000; math.Abs(got-want) > 1e-6 {
			t.Errorf("share of the energy after %v time constants = %v, want %v", n, got, want)
		}
	}
}

// Scaling: voltage tenfold with the load a hundredfold leaves every time, resistance k and capacitance 1⁄k leave times and
// divide the power, capacitance k takes k times as long and k times the energy.
func TestChargeScales(t *testing.T) {
	base, energy := float64(ferry.TimeToClose(25)), float64(ferry.EnergyToClose(25))
	for _, row := range []struct {
		name string
		Circuit
		difference   quantity.Voltage
		time, energy float64
	}{
		{"voltage × 10, load × 100", with(ferry, func(c *Circuit) { c.EMF, c.StartsAt, c.StopsAt, c.Auxiliary = 8217, 3500, 3000, 4000 }), 250, 1, 100},
		{"resistance × 3, capacitance ⁄ 3, load ⁄ 3", with(ferry, func(c *Circuit) {
			c.Resistor, c.Series, c.Bleeder, c.Capacitance, c.Auxiliary = 300, 0.189, 66000, 12.5e-3/3, 40.0/3
		}), 25, 1, 1.0 / 3},
		{"capacitance × 5", with(ferry, func(c *Circuit) { c.Capacitance = 62.5e-3 }), 25, 5, 5},
	} {
		if got := float64(row.TimeToClose(row.difference)) / base; math.Abs(got-row.time) > 1e-9*row.time {
			t.Errorf("%s: time = %v of before, want %v", row.name, got, row.time)
		}
		if got := float64(row.EnergyToClose(row.difference)) / energy; math.Abs(got-row.energy) > 1e-9*row.energy {
			t.Errorf("%s: energy = %v of before, want %v", row.name, got, row.energy)
		}
	}
}

// The one-node model against integration of dθ⁄dt = (P·R_th − θ)⁄τ_th over a series of charges.
func TestBodyAgreesWithIntegration(t *testing.T) {
	heat := with(ferry, func(c *Circuit) { c.Auxiliary = 0 }).Heat(4.9).ScaledTo(4300)
	body := Body{0.22, 300}
	rise, hottest := 0.0, 0.0
	const h = 1e-3
	for k := range 3 * 90_000 {
		in := math.Mod(float64(k)*h, 90)
		p := 0.0
		if in < 4.9 {
			p = heat.power(in + h/2)
		}
		rise += (p*0.22 - rise) / 300 * h
		hottest = math.Max(hottest, rise)
	}
	if got := float64(body.Peak(heat, body.Before(heat, 3, 90))); math.Abs(got-hottest) > 1e-4*hottest {
		t.Errorf("Peak of the third charge = %v K, want %v K by integration", got, hottest)
	}
	if got := float64(body.Before(heat, 4, 90)); math.Abs(got-rise) > 1e-4*rise {
		t.Errorf("Before the fourth charge = %v K, want %v K by integration", got, rise)
	}
	period := body.LeastPeriod(heat, 20)
	if got := float64(body.Peak(heat, body.SteadyStart(heat, period))); math.Abs(got-20) > 1e-9 {
		t.Errorf("steady peak at LeastPeriod(20 K) = %v K, want 20 K", got)
	}
	if got := float64(body.LeastPeriod(heat, 2)); !math.IsInf(got, 1) {
		t.Errorf("LeastPeriod(2 K) = %v s, want never: one charge alone is hotter", got)
	}
}
