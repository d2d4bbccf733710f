package corner

import "math"

// OverAll is [Over] for several results of one calculation: f fills out with one number per result. Every corner is
// worked through once, so all results of one corner rest on the same inputs and the costly part is not repeated.
func OverAll(axes []Axis, results int, f func(x, out []float64)) []Spread {
	x := make([]float64, len(axes))
	var wide []int
	for i, a := range axes {
		x[i] = a.Nominal
		if a.Low != a.High {
			wide = append(wide, i)
		}
	}
	out, other := make([]float64, results), make([]float64, results)
	f(x, out)
	spreads := make([]Spread, results)
	for k, v := range out {
		spreads[k] = Spread{Low: v, Nominal: v, High: v, AtLow: clone(x), AtHigh: clone(x), Moves: make([]float64, len(axes))}
	}
	for _, i := range wide {
		x[i] = axes[i].Low
		f(x, out)
		x[i] = axes[i].High
		f(x, other)
		x[i] = axes[i].Nominal
		for k := range spreads {
			spreads[k].Moves[i] = math.Abs(other[k] - out[k])
		}
	}
	for corner := 0; corner < 1<<len(wide); corner++ {
		for bit, i := range wide {
			x[i] = axes[i].Low
			if corner>>bit&1 == 1 {
				x[i] = axes[i].High
			}
		}
		f(x, out)
		for k := range spreads {
			spreads[k].keep(x, out[k])
		}
	}
	return spreads
}

// keep takes one more corner into the spread.
func (s *Spread) keep(x []float64, result float64) {
	switch {
	case math.IsNaN(result) || math.IsNaN(s.Low):
		s.Low, s.High = math.NaN(), math.NaN()
	case result < s.Low:
		s.Low = result
		copy(s.AtLow, x)
	case result > s.High:
		s.High = result
		copy(s.AtHigh, x)
	}
}
