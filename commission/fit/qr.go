package fit

import "math"

// factors is the thin QR decomposition of a tall matrix, column by column (modified Gram–Schmidt, each column
// orthogonalised twice so that nearly parallel columns stay orthogonal to rounding).
type factors struct {
	q [][]float64 // orthonormal columns
	r [][]float64 // upper triangle, r[i][j] for i ≤ j
}

// decompose factors the matrix given by its columns; ok is false where the columns are linearly dependent.
func decompose(columns [][]float64) (f factors, ok bool) {
	p := len(columns)
	f.r = make([][]float64, p)
	for i := range f.r {
		f.r[i] = make([]float64, p)
	}
	for j, column := range columns {
		q := append([]float64(nil), column...)
		before := norm(q)
		for range 2 {
			for i := range j {
				c := dot(f.q[i], q)
				f.r[i][j] += c
				addScaled(q, -c, f.q[i])
			}
		}
		length := norm(q)
		if !(length > 1e-13*before) || math.IsInf(length, 0) {
			return f, false
		}
		for k := range q {
			q[k] /= length
		}
		f.r[j][j] = length
		f.q = append(f.q, q)
	}
	return f, true
}

// solve gives the least squares solution for the right side y.
func (f factors) solve(y []float64) []float64 {
	p := len(f.q)
	x := make([]float64, p)
	rest := append([]float64(nil), y...)
	for j := range p {
		x[j] = dot(f.q[j], rest)
		addScaled(rest, -x[j], f.q[j])
	}
	for i := p - 1; i >= 0; i-- {
		for j := i + 1; j < p; j++ {
			x[i] -= f.r[i][j] * x[j]
		}
		x[i] /= f.r[i][i]
	}
	return x
}

// inverseGram gives (JᵀJ)⁻¹ = R⁻¹·R⁻ᵀ.
func (f factors) inverseGram() [][]float64 {
	p := len(f.q)
	inverse := make([][]float64, p) // R⁻¹, upper triangle
	for i := range inverse {
		inverse[i] = make([]float64, p)
	}
	for j := range p {
		inverse[j][j] = 1 / f.r[j][j]
		for i := j - 1; i >= 0; i-- {
			sum := 0.0
			for k := i + 1; k <= j; k++ {
				sum += f.r[i][k] * inverse[k][j]
			}
			inverse[i][j] = -sum / f.r[i][i]
		}
	}
	gram := make([][]float64, p)
	for i := range gram {
		gram[i] = make([]float64, p)
		for j := range p {
			for k := max(i, j); k < p; k++ {
				gram[i][j] += inverse[i][k] * inverse[j][k]
			}
		}
	}
	return gram
}

func dot(a, b []float64) float64 {
	sum := 0.0
	for i := range a {
		sum += a[i] * b[i]
	}
	return sum
}

func norm(a []float64) float64 { return math.Sqrt(dot(a, a)) }

func addScaled(a []float64, c float64, b []float64) {
	for i := range a {
		a[i] += c * b[i]
	}
}
