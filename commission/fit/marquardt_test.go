package fit

import (
	"math"
	"testing"
)

// The full starts of NIST StRD, both parameters searched. A damped search that stops early near b1 = 1459.5 is found by its
// residual sum of squares, which is checked.
func TestMarquardtMeetsCertifiedValuesFromBothStarts(t *testing.T) {
	tests := []struct {
		name        string
		x, y        []float64
		starts      [][]float64
		b1, b2, ssr float64
		b1SE        float64
	}{
		{"Misra1a", misra1aX, misra1aY, [][]float64{{500, 0.0001}, {250, 0.0005}}, 2.3894212918e+02, 5.5015643181e-04, 1.2455138894e-01, 2.7070075241e+00},
		{"BoxBOD", boxBODX, boxBODY, [][]float64{{1, 1}, {100, 0.75}}, 2.1380940889e+02, 5.4723748542e-01, 1.1680088766e+03, 1.2354515176e+01},
	}
	for _, test := range tests {
		for _, start := range test.starts {
			s := Marquardt(start, len(test.x), func(b, r []float64) bool {
				for i := range r {
					r[i] = test.y[i] + b[0]*math.Expm1(-b[1]*test.x[i])
				}
				return true
			})
			if !s.Converged || !agree(s.X[0], test.b1, 6) || !agree(s.X[1], test.b2, 6) || !agree(s.SSR, test.ssr, 6) || !agree(s.SE[0], test.b1SE, 4) {
				t.Errorf("Marquardt(%s from %v) = %.9g, %.9g, SSR %.9g, SE b1 %.6g, want %.9g, %.9g, %.9g, %.6g (NIST StRD)",
					test.name, start, s.X[0], s.X[1], s.SSR, s.SE[0], test.b1, test.b2, test.ssr, test.b1SE)
			}
		}
	}
}
