package fit

import "math"

// Solution is the end of a [Marquardt] search.
type Solution struct {
	X         []float64
	SE        []float64 // standard errors with s² = SSR ⁄ (n−p), NaN where they cannot be told
	SSR       float64
	N         int
	Converged bool
}

// Marquardt finds the least sum of squares of a model with several unknowns from a start (D. W. Marquardt, J. SIAM 11 (1963)
// 431; each unknown damped in its own scale). residuals fills r for x and reports false where x is outside the model's
// range. For a single exponential use [Exponential], which needs no start.
func Marquardt(x0 []float64, n int, residuals func(x, r []float64) bool) Solution {
	m := marquardt{n: n, residuals: residuals}
	s := Solution{X: append([]float64(nil), x0...), N: n, SE: make([]float64, len(x0))}
	r := make([]float64, n)
	if n <= len(x0) || !residuals(s.X, r) {
		s.SSR = math.Inf(1)
		return s
	}
	s.SSR = dot(r, r)
	damping := 1e-3
	for range 80 {
		columns := m.jacobian(s.X, r)
		moved := false
		for damping < 1e12 && !moved {
			next, nextR, ok := m.step(s.X, r, columns, damping)
			if ssr := dot(nextR, nextR); ok && ssr <= s.SSR {
				moved = true
				s.Converged = s.SSR-ssr <= 1e-10*s.SSR
				s.X, r, s.SSR = next, nextR, ssr
				damping = math.Max(damping/8, 1e-12)
			} else {
				damping *= 5
			}
		}
		if !moved {
			s.Converged = true // no direction leads down: the least to rounding
		}
		if s.Converged {
			break
		}
	}
	m.uncertain(&s, r)
	return s
}

type marquardt struct {
	n         int
	residuals func(x, r []float64) bool
}

// jacobian gives the derivatives of the residuals by one-sided differences, one column for each unknown.
func (m marquardt) jacobian(x, r []float64) [][]float64 {
	columns := make([][]float64, len(x))
	for j := range x {
		moved := append([]float64(nil), x...)
		h := 1e-6 * math.Max(math.Abs(x[j]), 1e-6)
		moved[j] += h
		column := make([]float64, m.n)
		if !m.residuals(moved, column) {
			h = -h
			moved[j] = x[j] + h
			m.residuals(moved, column)
		}
		for i := range column {
			column[i] = (column[i] - r[i]) / h
		}
		columns[j] = column
	}
	return columns
}

func (m marquardt) step(x, r []float64, columns [][]float64, damping float64) (next, nextR []float64, ok bool) {
	p := len(x)
	extended := make([][]float64, p)
	for j, c := range columns {
		extended[j] = make([]float64, m.n+p)
		copy(extended[j], c)
		extended[j][m.n+j] = math.Sqrt(damping) * math.Max(norm(c), 1e-30)
	}
	right := make([]float64, m.n+p)
	for i := range r {
		right[i] = -r[i]
	}
	f, ok := decompose(extended)
	nextR = make([]float64, m.n)
	if !ok {
		return x, nextR, false
	}
	next = append([]float64(nil), x...)
	addScaled(next, 1, f.solve(right))
	return next, nextR, m.residuals(next, nextR)
}

func (m marquardt) uncertain(s *Solution, r []float64) {
	for j := range s.SE {
		s.SE[j] = math.NaN()
	}
	if f, ok := decompose(m.jacobian(s.X, r)); ok {
		gram := f.inverseGram()
		variance := s.SSR / float64(m.n-len(s.X))
		for j := range s.SE {
			s.SE[j] = math.Sqrt(variance * gram[j][j])
		}
	}
}
