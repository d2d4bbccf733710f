// Package corner takes a calculation over all corners of its toleranced inputs.
//
// Start at [Over]. An input is an [Axis]; the calculation gets one number per axis, so a quantity that enters twice (the
// resistance in a time constant and in an energy) has the same value in both places of one corner.
package corner

import "math"

// Axis is one input with its tolerance, in SI. An axis without width is not varied.
type Axis struct {
	Name               string
	Low, Nominal, High float64
}

// Exact is an axis without width.
func Exact(name string, v float64) Axis { return Axis{name, v, v, v} }

// Spread is the outcome over all corners: the least, nominal and greatest result, the inputs that gave the least and the
// greatest, and what each axis moves by itself with the others nominal.
type Spread struct {
	Low, Nominal, High float64
	AtLow, AtHigh      []float64
	Moves              []float64
}

// Over evaluates f with every axis nominal and at each combination of low and high. That is exact where f is monotone in
// each axis; where it is not, give the axis more points by searching inside f. A NaN corner makes both ends NaN.
func Over(axes []Axis, f func(x []float64) float64) Spread {
	x := make([]float64, len(axes))
	var wide []int
	for i, a := range axes {
		x[i] = a.Nominal
		if a.Low != a.High {
			wide = append(wide, i)
		}
	}
	nominal := f(x)
	s := Spread{Low: nominal, Nominal: nominal, High: nominal, AtLow: clone(x), AtHigh: clone(x), Moves: make([]float64, len(axes))}
	for _, i := range wide {
		x[i] = axes[i].Low
		low := f(x)
		x[i] = axes[i].High
		s.Moves[i] = math.Abs(f(x) - low)
		x[i] = axes[i].Nominal
	}
	for corner := 0; corner < 1<<len(wide); corner++ {
		for bit, i := range wide {
			x[i] = axes[i].Low
			if corner>>bit&1 == 1 {
				x[i] = axes[i].High
			}
		}
		s.take(x, f(x))
	}
	return s
}

func (s *Spread) take(x []float64, result float64) {
	switch {
	case math.IsNaN(result) || math.IsNaN(s.Low):
		s.Low, s.High = math.NaN(), math.NaN()
	case result < s.Low:
		s.Low, s.AtLow = result, clone(x)
	case result > s.High:
		s.High, s.AtHigh = result, clone(x)
	}
}

func clone(x []float64) []float64 { return append([]float64(nil), x...) }
