package circuit

import "math"

// matrix is a small dense square matrix that is factorised in place.
type matrix struct {
	n     int
	a     []float64
	pivot []int
	inv   []float64 // inverses of the diagonal after the decomposition
}

func newMatrix(n int) *matrix {
	return &matrix{n: n, a: make([]float64, n*n), pivot: make([]int, n), inv: make([]float64, n)}
}

func (m *matrix) clear() { clear(m.a) }

func (m *matrix) add(row, column int, v float64) { m.a[row*m.n+column] += v }

// factorise makes the LU decomposition with row exchange; false for a
// singular matrix.
func (m *matrix) factorise() bool {
	n := m.n
	for k := 0; k < n; k++ {
		best, at := 0.0, -1
		for i := k; i < n; i++ {
			if v := math.Abs(m.a[i*n+k]); v > best {
				best, at = v, i
			}
		}
		if at < 0 || math.IsNaN(best) || math.IsInf(best, 0) {
			return false
		}
		m.pivot[k] = at
		if at != k {
			for j := 0; j < n; j++ {
				m.a[k*n+j], m.a[at*n+j] = m.a[at*n+j], m.a[k*n+j]
			}
		}
		inverse := 1 / m.a[k*n+k]
		m.inv[k] = inverse
		rowK := m.a[k*n : k*n+n]
		for i := k + 1; i < n; i++ {
			rowI := m.a[i*n : i*n+n]
			if rowI[k] == 0 {
				continue
			}
			f := rowI[k] * inverse
			rowI[k] = f
			for j := k + 1; j < n; j++ {
				rowI[j] -= f * rowK[j]
			}
		}
	}
	return true
}

// solve replaces b by the solution.
func (m *matrix) solve(b []float64) {
	n := m.n
	for k := 0; k < n; k++ {
		b[k], b[m.pivot[k]] = b[m.pivot[k]], b[k]
	}
	for i := 1; i < n; i++ {
		s := b[i]
		for j, v := range m.a[i*n : i*n+i] {
			s -= v * b[j]
		}
		b[i] = s
	}
	for i := n - 1; i >= 0; i-- {
		s := b[i]
		row := m.a[i*n : i*n+n]
		for j := i + 1; j < n; j++ {
			s -= row[j] * b[j]
		}
		b[i] = s * m.inv[i]
	}
}
