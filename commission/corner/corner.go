package corner

import "chargehand/commission/quantity"

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

// Ends are the least, nominal and greatest result.
func (s Spread) Ends() (low, nominal, high float64) { return s.Low, s.Nominal, s.High }

// As gives the spread its quantity again.
func As[Q quantity.Scalar](s Spread) quantity.Spread[Q] {
	return quantity.Spread[Q]{Low: Q(s.Low), Nominal: Q(s.Nominal), High: Q(s.High)}
}

// Over evaluates f with every axis nominal and at each combination of low and high. That is exact where f is monotone in
// each axis; where it is not, give the axis more points by searching inside f. A NaN corner makes both ends NaN.
func Over(axes []Axis, f func(x []float64) float64) Spread {
	return OverAll(axes, 1, func(x, out []float64) { out[0] = f(x) })[0]
}

func clone(x []float64) []float64 { return append([]float64(nil), x...) }
