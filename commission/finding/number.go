package finding

import (
	"math"
	"strconv"
	"strings"

	"chargehand/commission/quantity"
)

// leastDigits and mostDigits bound the significant digits of a printed figure: three, and more where the verdict turns on
// them.
const (
	leastDigits = 3
	mostDigits  = 9
)

// Digits are the significant digits that show why the verdict fell as it did: the fewest with which no corner prints like
// an edge of the limit that it does not equal.
func (f Finding) Digits() int {
	for digits := leastDigits; digits < mostDigits; digits++ {
		if f.tellsApart(digits) {
			return digits
		}
	}
	return mostDigits
}

func (f Finding) tellsApart(digits int) bool {
	for _, edge := range []*float64{f.Limit.Low, f.Limit.High} {
		if edge == nil {
			continue
		}
		for _, v := range []float64{f.Value.Low, f.Value.Nominal, f.Value.High} {
			if v != *edge && !math.IsNaN(v) && Print(v, f.Unit, digits) == Print(*edge, f.Unit, digits) {
				return false
			}
		}
	}
	return true
}

// Print writes a number of a coherent unit for people, "148 V"; a count stands without decimals, a size beyond all prefixes
// as a power of ten, and a number that is not finite is "–".
func Print(v float64, unit string, digits int) string {
	if unit == "1" && v == math.Trunc(v) && math.Abs(v) < 1e12 {
		return strconv.FormatFloat(v, 'f', 0, 64)
	}
	size := math.Abs(v)
	switch {
	case math.IsNaN(v) || math.IsInf(v, 0):
		return "–"
	case size >= 1e12 || size > 0 && size < 1e-12:
		return strings.TrimSuffix(strconv.FormatFloat(v, 'e', digits-1, 64)+" "+unit, " 1")
	}
	return quantity.Engineering(v, unit, digits)
}

// printRange writes low … high, the unit once where both have the same, and nothing where they print alike.
func (f Finding) printRange(digits int) string {
	low, high := f.printEnd(f.Value.Low, digits), f.printEnd(f.Value.High, digits)
	if low == high {
		return ""
	}
	return joinRange(low, high)
}

// printEnd writes an end of the value; one that is not finite is what the state says.
func (f Finding) printEnd(v float64, digits int) string {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		switch f.State {
		case Never, Unlimited:
			return string(f.State)
		}
	}
	return Print(v, f.Unit, digits)
}

func joinRange(low, high string) string {
	number, unit, hasUnit := strings.Cut(low, " ")
	_, other, _ := strings.Cut(high, " ")
	if hasUnit && unit == other {
		low = number
	}
	return low + " … " + high
}

// printLimit writes the limit, "≤ 400 A", "≥ 49.1 V", "860 … 1090 V", "= 1".
func (f Finding) printLimit(digits int) string {
	low, high := f.Limit.Low, f.Limit.High
	switch {
	case low != nil && high != nil && *low == *high:
		return "= " + Print(*low, f.Unit, digits)
	case low != nil && high != nil:
		return joinRange(Print(*low, f.Unit, digits), Print(*high, f.Unit, digits))
	case low != nil:
		return "≥ " + Print(*low, f.Unit, digits)
	case high != nil:
		return "≤ " + Print(*high, f.Unit, digits)
	}
	return ""
}
