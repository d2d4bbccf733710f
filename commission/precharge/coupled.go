package precharge

import (
	"math"

	"chargehand/commission/quantity"
)

// A supercapacitor under bleeder or auxiliary load: link v and source e both move, nothing is at rest, and there is no
// closed form with constant power. Fourth-order Runge-Kutta in steps of a twentieth of the time constant, the steps cut
// where the auxiliary supply starts or stops and where the difference is reached.

// longest is how many time constants are followed step by step.
const longest = 200

// drawn is what such a charge came to.
type drawn struct {
	closedAt     float64 // infinite when the difference never came
	energy       float64 // in the resistor until closing, or until the given time
	link, source float64 // at the end
	settled      float64 // highest link voltage, or where the auxiliary supply leaves it
	how          Settling
}

type pair struct{ e, v, w float64 } // source, link, resistor energy

// draw runs until the difference has fallen to gap, or until the time given; with neither (gap ≤ 0, until < 0) until the
// link rises no more. A charge that has stopped rising before the gap is reached never closes.
func (c Circuit) draw(gap, until float64) drawn {
	s := c.solve()
	x := pair{e: s.e, v: s.v0}
	on := s.load > 0 && s.v0 >= s.vOn
	for t := 0.0; ; {
		if until < 0 && (c.rate(s, x, on).v <= 0 || t > longest*s.tau) {
			return c.ended(s, x, on)
		}
		step := s.tau / 20
		if until >= 0 {
			step = math.Min(step, until-t)
		}
		next, stayed, took := c.step(s, x, on, step)
		if gap > 0 && next.e-next.v <= gap {
			part := c.fraction(s, x, on, took, gap, false) * took
			next = c.advance(s, x, on, part)
			return drawn{closedAt: t + part, energy: next.w, link: next.v, source: next.e, settled: next.v}
		}
		x, on, t = next, stayed, t+took
		if until > t && t > longest*s.tau { // nothing moves any more but the slow sag: the power of now is the bound of later
			x.w += c.rate(s, x, on).w * (until - t)
			t = until
		}
		if until >= 0 && t >= until {
			return drawn{closedAt: math.Inf(1), energy: x.w, link: x.v, source: x.e}
		}
	}
}

// march gives the link voltage at the start and after each of n equal intervals.
func (c Circuit) march(interval float64, n int) []quantity.Voltage {
	s := c.solve()
	x := pair{e: s.e, v: s.v0}
	on := s.load > 0 && s.v0 >= s.vOn
	voltages := make([]quantity.Voltage, 1, n+1)
	voltages[0] = c.Start
	for range n {
		for left := interval; left > 1e-12*interval; {
			next, stayed, took := c.step(s, x, on, math.Min(s.tau/20, left))
			x, on, left = next, stayed, left-took
		}
		voltages = append(voltages, quantity.Voltage(x.v))
	}
	return voltages
}

// step advances by h, or to where the auxiliary supply starts or stops on the way, and says what the supply does then and
// how long it took.
func (c Circuit) step(s solution, x pair, on bool, h float64) (next pair, then bool, took float64) {
	next = c.advance(s, x, on, h)
	if s.load == 0 || !(!on && next.v >= s.vOn || on && next.v <= s.vOff) {
		return next, on, h
	}
	if on && x.v <= s.vOff { // below its stopping voltage from the start
		return x, false, 0
	}
	took = c.fraction(s, x, on, h, c.threshold(on), true) * h
	return c.advance(s, x, on, took), !on, took
}

func (c Circuit) threshold(on bool) float64 {
	if on {
		return float64(c.StopsAt)
	}
	return float64(c.StartsAt)
}

// ended says where the link is left once it rises no more: with the auxiliary supply on, at the equilibrium for the
// source voltage of that moment.
func (c Circuit) ended(s solution, x pair, on bool) drawn {
	d := drawn{closedAt: math.Inf(1), energy: math.Inf(1), link: x.v, source: x.e, settled: x.v, how: AtFinal}
	if on {
		still := c
		still.Source, still.EMF, still.Start = 0, quantity.Voltage(x.e), quantity.Voltage(x.v)
		settled, how := still.solve().settle()
		d.settled, d.how = settled, how
	}
	return d
}

// rate is the derivative of source, link and resistor energy.
func (c Circuit) rate(s solution, x pair, on bool) pair {
	i := math.Max(0, (x.e-float64(c.DiodeDrop)-x.v)/s.r)
	drain := 0.0
	if c.Bleeder > 0 {
		drain = x.v / float64(c.Bleeder)
	}
	if on {
		drain += s.load / x.v
	}
	return pair{e: -i / float64(c.Source), v: (i - drain) / s.c, w: s.rp * i * i}
}

func (c Circuit) advance(s solution, x pair, on bool, h float64) pair {
	along := func(k pair, part float64) pair { return pair{x.e + part*k.e, x.v + part*k.v, x.w + part*k.w} }
	k1 := c.rate(s, x, on)
	k2 := c.rate(s, along(k1, h/2), on)
	k3 := c.rate(s, along(k2, h/2), on)
	k4 := c.rate(s, along(k3, h), on)
	return pair{
		x.e + h/6*(k1.e+2*k2.e+2*k3.e+k4.e),
		x.v + h/6*(k1.v+2*k2.v+2*k3.v+k4.v),
		x.w + h/6*(k1.w+2*k2.w+2*k3.w+k4.w),
	}
}

// fraction is the part of the step after which the link stands at level, or source and link differ by level.
func (c Circuit) fraction(s solution, x pair, on bool, step, level float64, isLink bool) float64 {
	distance := func(p pair) float64 {
		if isLink {
			return p.v - level
		}
		return p.e - p.v - level
	}
	before := distance(x)
	low, high := 0.0, 1.0
	for range 50 {
		middle := (low + high) / 2
		if distance(c.advance(s, x, on, middle*step))*before > 0 {
			low = middle
		} else {
			high = middle
		}
	}
	return high
}
