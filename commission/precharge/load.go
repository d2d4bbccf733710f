package precharge

import (
	"math"

	"chargehand/commission/quantity"
)

// Constant power P on the link, from V_on upwards. With i_n = (V_f − v)⁄R_e − P⁄v the net charging current,
//
//	dt = τ·v dv ⁄ [(v₊ − v)(v − v₋)],   v± = ½·[V_f ± √(V_f² − 4·R_e·P)]
//
// so time and resistor energy between two voltages are integrals of rational functions: closed forms.

// Equilibria are the two link voltages at which the charging current just covers bleeder and auxiliary supply: the higher
// is stable, the lower is not. ok is false where there are none, or no constant power.
func (c Circuit) Equilibria() (stable, unstable quantity.Voltage, ok bool) {
	s := c.solve()
	return quantity.Voltage(s.vPlus), quantity.Voltage(s.vMinus), s.balances
}

// GreatestLoad is the largest constant power with any equilibrium, V_f²⁄(4·R_e).
func (c Circuit) GreatestLoad() quantity.Power {
	s := c.solve()
	return quantity.Power(s.vf * s.vf / (4 * s.re))
}

// LeastNetCurrent is the least net charging current on the way to v, the load counted from its start; negative where the
// charge stalls. It is false where the link is at v already. The net current is concave, so its least is at an end.
func (c Circuit) LeastNetCurrent(v quantity.Voltage) (quantity.Current, bool) {
	s := c.solve()
	target := float64(v)
	if target <= s.v0 {
		return 0, false
	}
	net := func(v, load float64) float64 { return (s.vf-v)/s.re - load/v }
	if !s.isLoadedBelow(target) {
		return quantity.Current(net(target, 0)), true
	}
	return quantity.Current(math.Min(net(math.Max(s.v0, s.vOn), s.load), net(target, s.load))), true
}

// SettledPower is what the resistor burns continuously once the charge has settled below its target; while the auxiliary
// supply hiccups it is the upper bound, with the link at its lower level.
func (c Circuit) SettledPower() quantity.Power {
	s := c.solve()
	v, how := s.settle()
	if how == Hiccups {
		v = s.vOff
	}
	return quantity.Power(s.rp * (s.es - v) / s.r * (s.es - v) / s.r)
}

// balance finds the equilibria; the small root without cancellation.
func (s *solution) balance() {
	square := s.vf*s.vf - 4*s.re*s.load
	if s.load == 0 || square < 0 {
		return
	}
	root := math.Sqrt(square)
	s.vPlus, s.vMinus, s.balances = (s.vf+root)/2, 2*s.re*s.load/(s.vf+root), true
}

// loadStarts is when the link reaches V_on; infinite where it never does or there is no load.
func (s solution) loadStarts() float64 {
	if s.load == 0 {
		return math.Inf(1)
	}
	return s.unloadedTime(s.v0, s.vOn)
}

// approach is y = ln[(v₊ − from)⁄(v₊ − to)], by which the link has come closer to the stable equilibrium.
func (s solution) approach(from, to float64) float64 {
	return math.Log((s.vPlus - from) / (s.vPlus - to))
}

func (s solution) loadedTime(from, to float64) float64 {
	return s.loadedTimeBy(s.approach(from, to), from, to)
}

// loadedTimeBy is τ⁄(v₊ − v₋)·{v₊·y + v₋·ln[(to − v₋)⁄(from − v₋)]}.
func (s solution) loadedTimeBy(y, from, to float64) float64 {
	return s.tau / (s.vPlus - s.vMinus) * (s.vPlus*y + s.vMinus*math.Log((to-s.vMinus)/(from-s.vMinus)))
}

// loadedVoltage is the link voltage t after it stood at from under load, and its approach to the stable equilibrium.
// Newton's rule in y, where time is nearly linear: dt⁄dy = τ·v⁄(v − v₋).
func (s solution) loadedVoltage(from, t float64) (v, y float64) {
	y = t / s.tau
	for range 50 {
		v = s.vPlus - (s.vPlus-from)*math.Exp(-y)
		step := (s.loadedTimeBy(y, from, v) - t) * (v - s.vMinus) / (s.tau * v)
		y = math.Max(0, y-step)
		if math.Abs(step) <= 1e-14*(1+y) {
			break
		}
	}
	return s.vPlus - (s.vPlus-from)*math.Exp(-y), y
}

// loadedEnergy is ∫ R_p·((E_s − v)⁄R)² dt from one voltage to another under load:
//
//	−R_p·τ⁄R²·∫ v(E_s − v)²⁄(v² − V_f·v + R_e·P) dv
//
// by dividing the polynomials (quotient v + a, remainder b·v + d) and partial fractions. y is the approach from → to, which
// keeps its digits where the link is as good as at the equilibrium.
func (s solution) loadedEnergy(from, to, y float64) float64 {
	product := s.re * s.load
	a := s.vf - 2*s.es
	b, d := s.es*s.es-product+a*s.vf, -a*product
	width := s.vPlus - s.vMinus
	atPlus, atMinus := (b*s.vPlus+d)/width, -(b*s.vMinus+d)/width
	quotient := (to*to-from*from)/2 + a*(to-from)
	logs := -atPlus*y + atMinus*math.Log((to-s.vMinus)/(from-s.vMinus))
	return -s.rp * s.tau / (s.r * s.r) * (quotient + logs)
}
