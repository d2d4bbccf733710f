package precharge

import (
	"math"

	"chargehand/commission/quantity"
)

// Heat is the power in the resistor during one charge:
//
//	P(t) = Scale·R_p·(I_∞ + ΔI·e^(−t⁄τ))²  until On, then nothing
type Heat struct {
	Resistor     quantity.Resistance
	Steady       quantity.Current // I_∞
	Decaying     quantity.Current // ΔI
	TimeConstant quantity.Seconds
	On           quantity.Seconds
	Scale        float64
}

// Heat is the current shape of the charge without the auxiliary supply, until on.
func (c Circuit) Heat(on quantity.Seconds) Heat {
	s := c.solve()
	return Heat{c.Resistor, quantity.Current(s.steady), quantity.Current(s.current0 - s.steady),
		quantity.Seconds(s.tau), on, 1}
}

// Energy is ∫P dt until On.
func (h Heat) Energy() quantity.Energy {
	sum, tau, t := 0.0, float64(h.TimeConstant), float64(h.On)
	steady, decaying := float64(h.Steady), float64(h.Decaying)
	sum = steady*steady*t - 2*steady*decaying*tau*math.Expm1(-t/tau) - decaying*decaying*tau/2*math.Expm1(-2*t/tau)
	return quantity.Energy(h.Scale * float64(h.Resistor) * sum)
}

// ScaledTo is the same shape with another energy.
func (h Heat) ScaledTo(e quantity.Energy) Heat {
	if has := h.Energy(); has > 0 {
		h.Scale *= float64(e / has)
	}
	return h
}

func (h Heat) power(t float64) float64 {
	i := float64(h.Steady) + float64(h.Decaying)*math.Exp(-t/float64(h.TimeConstant))
	return h.Scale * float64(h.Resistor) * i * i
}

// slope is dP⁄dt.
func (h Heat) slope(t float64) float64 {
	fading := float64(h.Decaying) * math.Exp(-t/float64(h.TimeConstant))
	return -2 * h.Scale * float64(h.Resistor) * (float64(h.Steady) + fading) * fading / float64(h.TimeConstant)
}

// Body is the resistor as one thermal node: dθ⁄dt = (P·R_th − θ)⁄τ_th, θ the rise over ambient. It has no hot spot: for
// times far below τ_th it permits more than the wire does, so [Rating] applies beside it.
type Body struct {
	Thermal      quantity.Thermal // R_th
	TimeConstant quantity.Seconds // τ_th
}

func (b Body) rate() float64 { return 1 / float64(b.TimeConstant) }

// Rise is θ at t ≤ On after a start at θ = start.
func (b Body) Rise(h Heat, start quantity.Difference, t quantity.Seconds) quantity.Difference {
	k, x := b.rate(), float64(t)
	r := 1 / float64(h.TimeConstant)
	steady, decaying := float64(h.Steady), float64(h.Decaying)
	sum := decaying * decaying * response(2*r, k, x)
	if steady > 0 {
		sum += steady*steady*response(0, k, x) + 2*steady*decaying*response(r, k, x)
	}
	gain := h.Scale * float64(h.Resistor) * float64(b.Thermal) * k
	return quantity.Difference(float64(start)*math.Exp(-k*x) + gain*sum)
}

// response is (e^(−r·t) − e^(−k·t))⁄(k − r), also where the two rates meet.
func response(r, k, t float64) float64 {
	z := (k - r) * t
	switch {
	case math.Abs(z) < 1e-9:
		return t * math.Exp(-k*t)
	case z > 0:
		return -math.Exp(-r*t) * t * math.Expm1(-z) / z
	}
	return math.Exp(-k*t) * t * math.Expm1(z) / z
}

// Peak is the hottest of one charge that starts at θ = start: where P·R_th = θ, or an end.
func (b Body) Peak(h Heat, start quantity.Difference) quantity.Difference {
	return b.Rise(h, start, b.peakTime(h, start))
}

// peakTime finds where P·R_th − θ changes its sign: it falls, ever less steeply, as long as the resistor warms, so Newton's
// rule gets there from either side. It begins where the power has fallen to what the whole energy at once would keep warm.
func (b Body) peakTime(h Heat, start quantity.Difference) quantity.Seconds {
	thermal, k := float64(b.Thermal), b.rate()
	if h.power(0)*thermal <= float64(start) {
		return 0
	}
	end := float64(h.On)
	if h.power(end)*thermal >= float64(b.Rise(h, start, h.On)) {
		return h.On
	}
	t := float64(h.timeOf(float64(start)/thermal + float64(h.Energy())*k))
	for range 40 {
		excess := h.power(t)*thermal - float64(b.Rise(h, start, quantity.Seconds(t)))
		step := excess / (h.slope(t)*thermal - k*excess)
		t = math.Min(math.Max(0, t-step), end)
		if math.Abs(step) < 1e-10*end {
			break
		}
	}
	return quantity.Seconds(t)
}

// After is θ at the end of one period that starts at θ = start.
func (b Body) After(h Heat, start quantity.Difference, period quantity.Seconds) quantity.Difference {
	if period <= h.On {
		return b.Rise(h, start, period)
	}
	return b.Rise(h, start, h.On) * quantity.Difference(math.Exp(-b.rate()*float64(period-h.On)))
}

// SteadyStart is θ before each charge of an unlimited series: g(T)⁄(1 − e^(−T⁄τ_th)).
func (b Body) SteadyStart(h Heat, period quantity.Seconds) quantity.Difference {
	return b.After(h, 0, period) / quantity.Difference(-math.Expm1(-b.rate()*float64(period)))
}

// Before is θ before the n-th of a series from ambient, n from 1: the geometric sum of what the earlier ones left.
func (b Body) Before(h Heat, n int, period quantity.Seconds) quantity.Difference {
	if n <= 1 {
		return 0
	}
	return b.SteadyStart(h, period) * quantity.Difference(-math.Expm1(-b.rate()*float64(n-1)*float64(period)))
}

// LeastPeriod is the shortest period of an unlimited series whose peak stays at allowed: infinite where a single charge is
// too hot already. At the peak P·R_th = θ, so its time follows from allowed alone, then the start, then the period.
func (b Body) LeastPeriod(h Heat, allowed quantity.Difference) quantity.Seconds {
	at := h.timeOf(float64(allowed) / float64(b.Thermal))
	start := float64(allowed-b.Rise(h, 0, at)) * math.Exp(b.rate()*float64(at))
	if start <= 0 {
		return quantity.Seconds(math.Inf(1))
	}
	left := float64(b.Rise(h, 0, h.On)) * math.Exp(b.rate()*float64(h.On))
	return max(h.On, quantity.Seconds(math.Log1p(left/start)/b.rate()))
}

// timeOf is when the power has fallen to p, between 0 and On.
func (h Heat) timeOf(p float64) quantity.Seconds {
	i := math.Sqrt(p/(h.Scale*float64(h.Resistor))) - float64(h.Steady)
	if i <= 0 {
		return h.On
	}
	t := -float64(h.TimeConstant) * math.Log(i/float64(h.Decaying))
	return quantity.Seconds(math.Min(math.Max(t, 0), float64(h.On)))
}

// Withstand is how long a constant power may last from θ = start until θ = allowed: infinite where it settles below.
func (b Body) Withstand(p quantity.Power, start, allowed quantity.Difference) quantity.Seconds {
	final := float64(p) * float64(b.Thermal)
	switch {
	case start >= allowed:
		return 0
	case final <= float64(allowed):
		return quantity.Seconds(math.Inf(1))
	}
	return b.TimeConstant * quantity.Seconds(math.Log((final-float64(start))/(final-float64(allowed))))
}
