package fit

import (
	"math"

	"gonum.org/v1/gonum/stat/distuv"
)

// Coverage is the factor k of an expanded uncertainty U = k·u with the two-sided coverage of two standard deviations of a
// normal distribution (95.45 %) for few degrees of freedom: Student's t. It falls to 2 for many. With no freedom at all it
// is infinite: one point proves nothing about its scatter.
func Coverage(freedom int) float64 {
	if freedom < 1 {
		return math.Inf(1)
	}
	return StudentT(0.5+0.5*math.Erf(2/math.Sqrt2), float64(freedom))
}

// StudentT is the quantile of Student's t distribution.
func StudentT(probability, freedom float64) float64 {
	return distuv.StudentsT{Mu: 0, Sigma: 1, Nu: freedom}.Quantile(probability)
}

// WithinProbability is the probability that a value known as y with standard uncertainty u lies in [low, high]; a side
// without a limit is infinite (JCGM 106:2012, 7, from memory).
func WithinProbability(y, u, low, high float64) float64 {
	return normal((high-y)/u) - normal((low-y)/u)
}

func normal(z float64) float64 { return 0.5 * math.Erfc(-z/math.Sqrt2) }
