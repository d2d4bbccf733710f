package precharge

import (
	"fmt"
	"math"

	"chargehand/commission/quantity"
)

// The preferred numbers of IEC 60063 (from memory, series E6 to E24) and the tolerance that each series is made in.
var (
	e6  = []float64{1.0, 1.5, 2.2, 3.3, 4.7, 6.8}
	e12 = []float64{1.0, 1.2, 1.5, 1.8, 2.2, 2.7, 3.3, 3.9, 4.7, 5.6, 6.8, 8.2}
	e24 = []float64{1.0, 1.1, 1.2, 1.3, 1.5, 1.6, 1.8, 2.0, 2.2, 2.4, 2.7, 3.0, 3.3, 3.6, 3.9, 4.3, 4.7, 5.1, 5.6, 6.2, 6.8, 7.5, 8.2, 9.1}
)

// seriesOf is the preferred series that a tolerance is usual in: E24 up to 5 %, E12 up to 10 %, E6 beyond.
func seriesOf(tolerance quantity.Ratio) int {
	switch {
	case tolerance <= 0.05+1e-9:
		return 24
	case tolerance <= 0.10+1e-9:
		return 12
	}
	return 6
}

// preferred is the least value of a preferred series, 6, 12 or 24, from least to greatest; false where there is none.
func preferred(least, greatest quantity.Resistance, series int) (quantity.Resistance, bool) {
	numbers := map[int][]float64{6: e6, 12: e12, 24: e24}[series]
	if !(least > 0) || math.IsInf(float64(least), 1) {
		return 0, false
	}
	for decade := math.Floor(math.Log10(float64(least))); ; decade++ {
		for _, n := range numbers {
			v := quantity.Resistance(math.Round(n*10) * math.Pow(10, decade-1))
			if v > greatest {
				return 0, false
			}
			if v >= least*(1-1e-12) {
				return v, true
			}
		}
	}
}

func seriesName(series int) string { return fmt.Sprintf("IEC 60063 E%d", series) }
