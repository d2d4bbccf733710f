package corner

import (
	"math"
	"strings"

	"chargehand/commission/quantity"
)

// Of is the axis of an entered quantity, named after its key in the site file.
func Of[Q quantity.Scalar](key string, e quantity.Entered[Q]) Axis {
	return Axis{key, float64(e.Low), float64(e.Nominal), float64(e.High)}
}

// Names are the names of the axes.
func Names(axes []Axis) []string {
	names := make([]string, len(axes))
	for i, a := range axes {
		names[i] = a.Name
	}
	return names
}

// Describe says in words which ends of their tolerances the inputs at x stand at, "choke at its least"; inputs without
// tolerance are left out.
func Describe(axes []Axis, x []float64) string {
	var words []string
	for i, a := range axes {
		if a.Low == a.High || i >= len(x) {
			continue
		}
		switch x[i] {
		case a.Low:
			words = append(words, a.Name+" at its least")
		case a.High:
			words = append(words, a.Name+" at its greatest")
		}
	}
	if len(words) == 0 {
		return "no tolerance enters"
	}
	return strings.Join(words, ", ")
}

// DescribeEnds says which corners give the least and the greatest result.
func DescribeEnds(axes []Axis, s Spread) string {
	if s.Low == s.High {
		return "no tolerance enters"
	}
	return "least with " + Describe(axes, s.AtLow) + "; greatest with " + Describe(axes, s.AtHigh)
}

// DescribeMoving says where the inputs that move the result stand in one of its corners, "choke lowest"; the others are left
// out, for a result on which many inputs have no bearing.
func DescribeMoving(axes []Axis, s Spread, at []float64) string {
	var words []string
	for i, a := range axes {
		if a.Low == a.High || s.Moves[i] == 0 {
			continue
		}
		end := "highest"
		if at[i] == a.Low {
			end = "lowest"
		}
		words = append(words, a.Name+" "+end)
	}
	if len(words) == 0 {
		return "every corner alike"
	}
	return strings.Join(words, ", ")
}

// Greatest is the greatest value of f over low…high and where it stands. The ends are always among the points tried; an
// interior extremum is found by points evenly spaced and then narrowed by golden section to 1e-8 of the range. That finds
// the greatest of a function whose peaks are wider than the spacing.
func Greatest(low, high float64, points int, f func(x float64) float64) (value, at float64) {
	value, at = f(low), low
	if high <= low {
		return value, at
	}
	step := (high - low) / float64(points)
	best := 0
	for i := 1; i <= points; i++ {
		x := low + float64(i)*step
		if i == points {
			x = high
		}
		if v := f(x); v > value {
			value, at, best = v, x, i
		}
	}
	left, right := math.Max(low, low+float64(best-1)*step), math.Min(high, low+float64(best+1)*step)
	return narrow(left, right, value, at, (high-low)*1e-8, f)
}

func narrow(left, right, value, at, close float64, f func(x float64) float64) (float64, float64) {
	const golden = 0.6180339887498949
	a, b := right-golden*(right-left), left+golden*(right-left)
	fa, fb := f(a), f(b)
	for right-left > close {
		if fa > fb {
			right, b, fb = b, a, fa
			a = right - golden*(right-left)
			fa = f(a)
		} else {
			left, a, fa = a, b, fb
			b = left + golden*(right-left)
			fb = f(b)
		}
	}
	if fa > value {
		value, at = fa, a
	}
	if fb > value {
		value, at = fb, b
	}
	return value, at
}
