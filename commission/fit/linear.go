package fit

import "math"

// Linear fits y = Σ x_j·columns[j] by least squares through QR. It gives the coefficients and their standard errors; ok is
// false where the columns cannot be told apart or there are too few rows.
func Linear(columns [][]float64, y []float64) (x, se []float64, ok bool) {
	if len(columns) == 0 || len(y) <= len(columns) {
		return nil, nil, false
	}
	f, ok := decompose(columns)
	if !ok {
		return nil, nil, false
	}
	x = f.solve(y)
	rest := append([]float64(nil), y...)
	for j, c := range columns {
		addScaled(rest, -x[j], c)
	}
	variance := dot(rest, rest) / float64(len(y)-len(columns))
	gram := f.inverseGram()
	se = make([]float64, len(x))
	for j := range se {
		se[j] = math.Sqrt(variance * gram[j][j])
		if math.IsNaN(x[j]) || math.IsNaN(se[j]) {
			return nil, nil, false
		}
	}
	return x, se, true
}
