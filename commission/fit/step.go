package fit

import "math"

// Response is a step response: one level, then an exponential towards another.
type Response struct {
	Status        Status
	Before, After float64
	BeforeSE      float64
	AfterSE       float64
	At            float64 // seconds, when it left the first level
	Tau           float64
	TauSE         float64
	Overshoot     float64 // beyond After as a fraction of the step, 0 where there is none
	Settled       float64 // seconds after At from which on it stays within 2 % of the step
}

// Step finds one step in a record: the instant is searched among the samples, the levels and the time constant are fitted.
// An undershoot or ringing shows as Overshoot; the exponential is then a smooth stand-in.
func Step(t, v []float64, resolution float64) Response {
	best := Response{Status: TooFewPoints}
	least := math.Inf(1)
	for k := 3; k+leastPoints <= len(t); k++ {
		before := Average(v[:k])
		t0 := (t[k-1] + t[k]) / 2
		start := before.Mean
		c := Exponential(t[k:], v[k:], Options{T0: t0, Resolution: resolution, FixedStart: &start})
		if c.Status != OK {
			continue
		}
		ssr := c.SSR + before.SD*before.SD*float64(k-1)
		if ssr < least {
			least = ssr
			best = Response{Status: OK, Before: before.Mean, BeforeSE: before.MeanSE, After: c.Final, AfterSE: c.FinalSE, At: t0, Tau: c.Tau, TauSE: c.TauSE}
		}
	}
	if best.Status != OK {
		if len(t) >= leastPoints+3 {
			best.Status = NoRise
		}
		return best
	}
	best.measure(t, v)
	return best
}

func (r *Response) measure(t, v []float64) {
	step := r.After - r.Before
	for i := range t {
		if t[i] < r.At {
			continue
		}
		r.Overshoot = math.Max(r.Overshoot, (v[i]-r.After)/step)
		if math.Abs(v[i]-r.After) > 0.02*math.Abs(step) {
			r.Settled = t[i] - r.At
		}
	}
}
