package precharge

import (
	"math"

	"chargehand/commission/quantity"
)

// Circuit is a pre-charge path with one value for each of its quantities: one corner of a site. Source plus, resistor,
// the parallel chokes and the upper diodes charge the link; bleeder and auxiliary supply take from it.
type Circuit struct {
	EMF         quantity.Voltage     // E, rest voltage of the source at the start
	DiodeDrop   quantity.Voltage     // V_d, constant; 0 where neglected
	Start       quantity.Voltage     // V_0, link voltage at the start
	Resistor    quantity.Resistance  // R_p
	Series      quantity.Resistance  // R_i + R_x: internal, cables, chokes in parallel
	Capacitance quantity.Capacitance // C, all that is charged
	Bleeder     quantity.Resistance  // R_b; 0 where there is none
	Auxiliary   quantity.Power       // P, constant power; 0 where there is none
	StartsAt    quantity.Voltage     // V_on
	StopsAt     quantity.Voltage     // V_off ≤ V_on
	Source      quantity.Capacitance // C_s of a supercapacitor; 0 for a source of constant EMF
}

// Settling is how a charge ends when the bypass never closes.
type Settling int

// The ways of settling.
const (
	AtFinal       Settling = iota // at the divider of resistor and bleeder, or at the source
	AtEquilibrium                 // where resistor current, bleeder and auxiliary supply balance
	Hiccups                       // the auxiliary supply starts, pulls the link down, stops, and again
)

// solution holds what follows from a Circuit alone, worked out once. Symbols as in the package text.
type solution struct {
	e, es, v0, rp, r, re, c, tau, vf float64
	current0, steady                 float64 // î and I_∞
	load, vOn, vOff                  float64
	vPlus, vMinus                    float64
	balances                         bool // vPlus and vMinus exist
}

func (c Circuit) solve() solution {
	s := solution{
		e: float64(c.EMF), es: float64(c.EMF - c.DiodeDrop), v0: float64(c.Start), rp: float64(c.Resistor),
		r: float64(c.Resistor + c.Series), c: float64(c.Capacitance),
		load: float64(c.Auxiliary), vOn: float64(c.StartsAt), vOff: float64(c.StopsAt),
	}
	s.re, s.vf = s.r, s.es
	if rb := float64(c.Bleeder); rb > 0 {
		s.re = s.r * rb / (s.r + rb)
		s.vf = s.es * rb / (s.r + rb)
		s.steady = s.es / (s.r + rb)
	}
	series := s.c
	if cs := float64(c.Source); cs > 0 {
		series = s.c * cs / (s.c + cs)
		if c.Bleeder == 0 {
			s.vf = s.v0 + (s.es-s.v0)*series/s.c
		}
	}
	s.tau = s.re * series
	s.current0 = math.Max(0, (s.es-s.v0)/s.r)
	s.balance()
	return s
}

// isCoupled tells that source and link both move under a load: no static equilibrium, no closed form.
func (c Circuit) isCoupled() bool {
	return c.Source > 0 && c.Capacitance > 0 && (c.Bleeder > 0 || c.Auxiliary > 0)
}

// TimeConstant is τ = (R ∥ R_b)·C, with a supercapacitor's own capacitance in series.
func (c Circuit) TimeConstant() quantity.Seconds { return quantity.Seconds(c.solve().tau) }

// PeakCurrent is the current at the first instant, (E − V_d − V_0)⁄R; 0 where the diodes block.
func (c Circuit) PeakCurrent() quantity.Current { return quantity.Current(c.solve().current0) }

// PeakPower is the power in the resistor at the first instant.
func (c Circuit) PeakPower() quantity.Power {
	s := c.solve()
	return quantity.Power(s.rp * s.current0 * s.current0)
}

// Settled is the link voltage at which the charge stays when the bypass never closes, and how. Where the auxiliary supply
// hiccups it is the upper level. With a supercapacitor under load nothing stays: it is the highest voltage reached.
func (c Circuit) Settled() (quantity.Voltage, Settling) {
	settled, _, how := c.rest()
	return settled, how
}

// Remaining is the difference between source and link when the charge has settled; a supercapacitor has sagged by then.
func (c Circuit) Remaining() quantity.Voltage {
	_, remaining, _ := c.rest()
	return remaining
}

func (c Circuit) rest() (settled, remaining quantity.Voltage, how Settling) {
	if c.isCoupled() {
		o := c.draw(0, -1)
		return quantity.Voltage(o.settled), quantity.Voltage(o.source - o.settled), o.how
	}
	s := c.solve()
	v, how := s.settle()
	if c.Source > 0 {
		return quantity.Voltage(v), c.DiodeDrop, how
	}
	return quantity.Voltage(v), quantity.Voltage(s.e - v), how
}

// TimeTo is the time until the link has reached v: 0 when it is there already, infinite when it never comes.
func (c Circuit) TimeTo(v quantity.Voltage) quantity.Seconds {
	return quantity.Seconds(c.solve().timeTo(float64(v)))
}

// TimeToClose is the time until source and link differ by no more than difference; infinite when that never comes.
func (c Circuit) TimeToClose(difference quantity.Voltage) quantity.Seconds {
	t, _ := c.close(difference, false)
	return t
}

// EnergyToClose is the energy in the resistor until source and link differ by no more than difference; infinite when that
// never comes.
func (c Circuit) EnergyToClose(difference quantity.Voltage) quantity.Energy {
	_, w := c.close(difference, true)
	return w
}

// close is the time until the bypass may close and, where asked for, the energy until then.
func (c Circuit) close(difference quantity.Voltage, energy bool) (quantity.Seconds, quantity.Energy) {
	s := c.solve()
	gap, drop := float64(difference), float64(c.DiodeDrop)
	target := s.e - gap
	var t float64
	switch {
	case s.e-s.v0 <= gap:
		return 0, 0
	case c.isCoupled():
		o := c.draw(gap, -1)
		return quantity.Seconds(o.closedAt), quantity.Energy(o.energy)
	case c.Source > 0 && gap <= drop:
		t = math.Inf(1)
	case c.Source > 0:
		t = s.tau * math.Log((s.es-s.v0)/(gap-drop))
	default:
		t = s.timeTo(target)
	}
	switch {
	case !energy:
		return quantity.Seconds(t), 0
	case math.IsInf(t, 1):
		return quantity.Seconds(t), quantity.Energy(t)
	case c.Source > 0 || !s.isLoadedBelow(target):
		return quantity.Seconds(t), quantity.Energy(s.unloadedEnergy(t))
	}
	return quantity.Seconds(t), quantity.Energy(s.energyTo(target))
}

// EnergyUntil is the energy in the resistor until t with the bypass open. While the auxiliary supply hiccups it is an
// upper bound, with the link at its lower level.
func (c Circuit) EnergyUntil(t quantity.Seconds) quantity.Energy {
	if c.isCoupled() {
		return quantity.Energy(c.draw(-1, float64(t)).energy)
	}
	return quantity.Energy(c.solve().energyUntil(float64(t)))
}

// VoltageAt is the link voltage at t with the bypass open. Low and high differ only while the auxiliary supply hiccups,
// when the link is somewhere between its stopping and its starting voltage.
func (c Circuit) VoltageAt(t quantity.Seconds) (low, high quantity.Voltage) {
	if c.isCoupled() {
		v := quantity.Voltage(c.draw(-1, float64(t)).link)
		return v, v
	}
	l, h := c.solve().voltageAt(float64(t))
	return quantity.Voltage(l), quantity.Voltage(h)
}

// settle says where a source of constant EMF leaves the link.
func (s solution) settle() (float64, Settling) {
	switch on := math.Max(s.v0, s.vOn); {
	case s.load == 0 || s.vOn >= s.vf:
		return s.vf, AtFinal
	case !s.balances, on <= s.vMinus, s.vOn > s.vPlus && s.vOff >= s.vPlus:
		return s.vOn, Hiccups
	}
	return s.vPlus, AtEquilibrium
}

func (s solution) timeTo(v float64) float64 {
	switch {
	case v <= s.v0:
		return 0
	case s.v0 >= s.es:
		return math.Inf(1)
	case !s.isLoadedBelow(v):
		return s.unloadedTime(s.v0, v)
	}
	on := math.Max(s.v0, s.vOn)
	if !s.balances || on <= s.vMinus || v >= s.vPlus {
		return math.Inf(1)
	}
	return s.unloadedTime(s.v0, on) + s.loadedTime(on, v)
}

func (s solution) isLoadedBelow(v float64) bool { return s.load > 0 && s.vOn < v }

// unloadedTime is τ·ln[(V_f − from)⁄(V_f − to)].
func (s solution) unloadedTime(from, to float64) float64 {
	switch {
	case to <= from:
		return 0
	case to >= s.vf:
		return math.Inf(1)
	}
	return s.tau * math.Log((s.vf-from)/(s.vf-to))
}

// unloadedEnergy is R_p·[I_∞²·t + 2·I_∞·ΔI·τ·(1 − e^(−t⁄τ)) + ½·ΔI²·τ·(1 − e^(−2t⁄τ))] from the start.
func (s solution) unloadedEnergy(t float64) float64 {
	if s.current0 == 0 {
		return 0
	}
	decaying := s.current0 - s.steady
	sum := -2*s.steady*decaying*s.tau*math.Expm1(-t/s.tau) - decaying*decaying*s.tau/2*math.Expm1(-2*t/s.tau)
	if s.steady > 0 {
		sum += s.steady * s.steady * t
	}
	return s.rp * sum
}

func (s solution) energyUntil(t float64) float64 {
	on := s.loadStarts()
	if t <= on {
		return s.unloadedEnergy(t)
	}
	before := s.unloadedEnergy(on)
	from := math.Max(s.v0, s.vOn)
	if _, how := s.settle(); how == Hiccups {
		return before + s.rp*math.Pow((s.es-s.vOff)/s.r, 2)*(t-on)
	}
	v, y := s.loadedVoltage(from, t-on)
	return before + s.loadedEnergy(from, v, y)
}

func (s solution) energyTo(v float64) float64 {
	from := math.Max(s.v0, s.vOn)
	return s.unloadedEnergy(s.unloadedTime(s.v0, from)) + s.loadedEnergy(from, v, s.approach(from, v))
}

func (s solution) voltageAt(t float64) (low, high float64) {
	if s.v0 >= s.es {
		return s.v0, s.v0
	}
	on := s.loadStarts()
	if t <= on {
		v := s.vf - (s.vf-s.v0)*math.Exp(-t/s.tau)
		return v, v
	}
	if _, how := s.settle(); how == Hiccups {
		return s.vOff, s.vOn
	}
	v, _ := s.loadedVoltage(math.Max(s.v0, s.vOn), t-on)
	return v, v
}
