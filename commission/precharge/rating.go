package precharge

import (
	"math"

	"chargehand/commission/quantity"
)

// Rating is what the resistor's maker permits: continuous power with its derating, a short-time overload, and single
// pulses. The factor of the derating is applied to every one of them: the permitted rise scales with the headroom (linear
// derating as in IEC 60115-1, from memory; its use for pulses is a convention).
type Rating struct {
	Power        quantity.Power
	FullTo       quantity.Temperature // full rating up to here
	ZeroAt       quantity.Temperature // none from here
	Multiple     float64              // short-time overload as a multiple of Power; 0 where not known
	OverloadTime quantity.Seconds
	Pulses       []Pulse // ascending in duration
}

// Pulse is one permissible single pulse.
type Pulse struct {
	Duration quantity.Seconds
	Energy   quantity.Energy
}

func (p Pulse) power() float64 { return float64(p.Energy) / float64(p.Duration) }

// Factor is the derating at the resistor's own temperature, 0…1.
func (r Rating) Factor(at quantity.Temperature) quantity.Ratio {
	f := float64(r.ZeroAt-at) / float64(r.ZeroAt-r.FullTo)
	return quantity.Ratio(math.Min(1, math.Max(0, f)))
}

// Permissible is the power of one rectangular pulse of the given duration that is permitted from the given temperature.
//
// Inside the pulse curve it is interpolated with both axes logarithmic. Outside, a known safe point proves its power for
// shorter pulses and its energy for longer ones; nothing else is claimed.
func (r Rating) Permissible(duration quantity.Seconds, from quantity.Temperature) quantity.Power {
	return quantity.Power(float64(r.Factor(from)) * r.cold(float64(duration)))
}

// Withstand is the longest time for which the given power is permitted from the given temperature: infinite where it is
// within the continuous rating, 0 where it exceeds every figure of the rating.
func (r Rating) Withstand(power quantity.Power, from quantity.Temperature) quantity.Seconds {
	f := float64(r.Factor(from))
	if f == 0 {
		return 0
	}
	p := float64(power) / f
	if p <= float64(r.Power) {
		return quantity.Seconds(math.Inf(1))
	}
	overload := 0.0
	if p <= r.Multiple*float64(r.Power) {
		overload = r.Multiple * float64(r.Power) * float64(r.OverloadTime) / p
	}
	n := len(r.Pulses)
	if n == 0 {
		return quantity.Seconds(overload)
	}
	first, last := r.Pulses[0], r.Pulses[n-1]
	if t := math.Max(overload, float64(last.Energy)/p); t >= float64(last.Duration) {
		return quantity.Seconds(t)
	}
	for i := n - 1; i > 0; i-- {
		if t, ok := within(r.Pulses[i-1], r.Pulses[i], p); ok {
			return quantity.Seconds(t)
		}
	}
	if p <= first.power() {
		return first.Duration
	}
	return quantity.Seconds(math.Min(overload, float64(first.Duration)))
}

// within is the longest time on the straight line between two points, both axes logarithmic, at which p is permitted.
func within(a, b Pulse, p float64) (float64, bool) {
	pa, pb := a.power(), b.power()
	switch {
	case p <= pb:
		return float64(b.Duration), true
	case p > pa:
		return 0, false
	}
	share := math.Log(p/pa) / math.Log(pb/pa)
	return float64(a.Duration) * math.Pow(float64(b.Duration/a.Duration), share), true
}

// cold is the permissible power at full rating.
func (r Rating) cold(t float64) float64 {
	power := float64(r.Power)
	n := len(r.Pulses)
	if n > 0 && t >= float64(r.Pulses[0].Duration) && t <= float64(r.Pulses[n-1].Duration) {
		return math.Max(power, r.onCurve(t))
	}
	if r.Multiple > 0 {
		power = math.Max(power, r.Multiple*float64(r.Power)*math.Min(1, float64(r.OverloadTime)/t))
	}
	switch {
	case n == 0:
	case t < float64(r.Pulses[0].Duration):
		power = math.Max(power, r.Pulses[0].power())
	default:
		power = math.Max(power, float64(r.Pulses[n-1].Energy)/t)
	}
	return power
}

func (r Rating) onCurve(t float64) float64 {
	for i := 1; i < len(r.Pulses); i++ {
		a, b := r.Pulses[i-1], r.Pulses[i]
		if t <= float64(b.Duration) {
			share := math.Log(t/float64(a.Duration)) / math.Log(float64(b.Duration/a.Duration))
			return a.power() * math.Pow(b.power()/a.power(), share)
		}
	}
	return r.Pulses[0].power()
}
