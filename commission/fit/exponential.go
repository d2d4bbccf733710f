package fit

import (
	"fmt"
	"math"
)

// Status tells whether a fit may be believed.
type Status string

// The states of a fit.
const (
	OK           Status = "ok"
	TooFewPoints Status = "too few points"
	NotFinite    Status = "not finite"            // a NaN or an infinity among the samples
	NotOrdered   Status = "time does not advance" // a sample before its predecessor
	NoRise       Status = "no rise"               // the values span less than five resolutions
	TooEarly     Status = "too early"             // the record ends before two time constants
	NoTau        Status = "time constant not identifiable"
	NotConverged Status = "not converged"
)

// Options of [Exponential]. The zero value fits Final, Start and Tau with T0 = 0.
type Options struct {
	T0         float64  // seconds, the instant at which the curve leaves Start
	Resolution float64  // of the values, as the register steps; 0 where it is not known
	FixedStart *float64 // where the start is known
	FixedFinal *float64 // where the end is known: 0 for a discharge into a resistor
	TauStart   float64  // where to begin; 0 searches over all scales of the record
}

// Curve is a fitted exponential. With status [TooEarly] the numbers stand but deserve no verdict; with another status than
// [OK] they are meaningless.
type Curve struct {
	Status Status
	Why    string // in words, where the status is not OK

	Final, Start, Tau       float64
	FinalSE, StartSE, TauSE float64 // standard errors, 0 for a fixed parameter
	Correlation             float64 // of Final with Tau; 0 where one is fixed
	SSR                     float64 // sum of the squared residuals
	S                       float64 // standard deviation used for the standard errors, never below Resolution ⁄ √12
	N, Freedom              int
	Runs                    float64 // z of the runs test on the residuals' signs; |z| > 2.6: the model is wrong
	Covered                 float64 // length of the record after T0 in time constants
	T0                      float64
}

// At is the fitted value at t.
func (c Curve) At(t float64) float64 {
	return c.Final - (c.Final-c.Start)*math.Exp(-(t-c.T0)/c.Tau)
}

// IsUsable tells whether the curve may carry a verdict.
func (c Curve) IsUsable() bool { return c.Status == OK }

// leastPoints of a curve, and the length in time constants below which Final and Tau are nearly the same unknown (their
// correlation passes 0.95: formulas H, trap 1).
const (
	leastPoints  = 5
	leastCovered = 2
)

// Exponential fits v(t) = Final − (Final − Start)·e^(−(t−T0)⁄Tau) to samples in order of time. Distances between the
// samples may vary. Repeats of an old value belong out of the record first: see [OncePerRefresh].
func Exponential(t, v []float64, o Options) Curve {
	e := exponential{t: t, v: v, o: o}
	c := Curve{N: len(t), T0: o.T0}
	if status, why := e.unfit(); status != OK {
		c.Status, c.Why = status, why
		return c
	}
	logTau, ok := e.search()
	if !ok {
		c.Status, c.Why = NoTau, "no time constant between the samples' spacing and a thousand records fits better than its neighbours"
		return c
	}
	return e.polish(c, math.Exp(logTau))
}

type exponential struct {
	t, v []float64
	o    Options
}

func (e exponential) unfit() (Status, string) {
	if len(e.t) != len(e.v) || len(e.t) < leastPoints {
		return TooFewPoints, fmt.Sprintf("%d samples, wanted at least %d", min(len(e.t), len(e.v)), leastPoints)
	}
	low, high := e.v[0], e.v[0]
	for i := range e.t {
		if !isFinite(e.t[i]) || !isFinite(e.v[i]) {
			return NotFinite, fmt.Sprintf("sample %d is not a number", i+1)
		}
		if i > 0 && e.t[i] < e.t[i-1] {
			return NotOrdered, fmt.Sprintf("sample %d is %.6g s before its predecessor", i+1, e.t[i-1]-e.t[i])
		}
		low, high = math.Min(low, e.v[i]), math.Max(high, e.v[i])
	}
	if span := high - low; !(span > 0) || span < 5*e.o.Resolution {
		return NoRise, fmt.Sprintf("the values span %.6g, wanted at least five resolutions of %.6g", span, e.o.Resolution)
	}
	if !(e.t[len(e.t)-1] > e.t[0]) {
		return NotOrdered, "all samples are of one instant"
	}
	return OK, ""
}

func isFinite(x float64) bool { return !math.IsNaN(x) && !math.IsInf(x, 0) }

// ssr is the least sum of squares for one time constant, the levels being a linear fit.
func (e exponential) ssr(logTau float64) float64 {
	final, start, ok := e.levels(math.Exp(logTau))
	if !ok {
		return math.Inf(1)
	}
	sum := 0.0
	for i, t := range e.t {
		d := math.Exp(-(t - e.o.T0) / math.Exp(logTau))
		r := e.v[i] - final*(1-d) - start*d
		sum += r * r
	}
	return sum
}

// levels gives the best Final and Start for one time constant.
func (e exponential) levels(tau float64) (final, start float64, ok bool) {
	rising, falling, rest := make([]float64, len(e.t)), make([]float64, len(e.t)), append([]float64(nil), e.v...)
	for i, t := range e.t {
		falling[i] = math.Exp(-(t - e.o.T0) / tau)
		rising[i] = -math.Expm1(-(t - e.o.T0) / tau)
	}
	var columns [][]float64
	if e.o.FixedFinal != nil {
		final = *e.o.FixedFinal
		addScaled(rest, -final, rising)
	} else {
		columns = append(columns, rising)
	}
	if e.o.FixedStart != nil {
		start = *e.o.FixedStart
		addScaled(rest, -start, falling)
	} else {
		columns = append(columns, falling)
	}
	if len(columns) == 0 {
		return final, start, true
	}
	f, ok := decompose(columns)
	if !ok {
		return 0, 0, false
	}
	x := f.solve(rest)
	if e.o.FixedFinal == nil {
		final, x = x[0], x[1:]
	}
	if e.o.FixedStart == nil {
		start = x[0]
	}
	return final, start, true
}

// search brackets the least sum of squares in ln Tau, from the start given or from a scan over all scales of the record,
// and narrows it by golden section. ok is false where the least lies at an end of the range.
func (e exponential) search() (logTau float64, ok bool) {
	span := e.t[len(e.t)-1] - e.t[0]
	lowest, highest := math.Log(span/float64(len(e.t))/10), math.Log(span*1000)
	var a, m, b float64
	if e.o.TauStart > 0 {
		a, m, b, ok = e.downhill(math.Log(e.o.TauStart), lowest, highest)
	} else {
		a, m, b, ok = e.scan(lowest, highest)
	}
	if !ok {
		return 0, false
	}
	return e.golden(a, m, b), true
}

const scanSteps = 48

func (e exponential) scan(lowest, highest float64) (a, m, b float64, ok bool) {
	step := (highest - lowest) / scanSteps
	best, bestAt := math.Inf(1), -1
	for i := range scanSteps + 1 {
		if s := e.ssr(lowest + float64(i)*step); s < best {
			best, bestAt = s, i
		}
	}
	m = lowest + float64(bestAt)*step
	return m - step, m, m + step, bestAt > 0 && bestAt < scanSteps
}

// downhill walks from a start in steps of half an e-fold until the sum of squares rises again.
func (e exponential) downhill(from, lowest, highest float64) (a, m, b float64, ok bool) {
	const step = 0.5
	m = from
	here := e.ssr(m)
	direction := step
	if e.ssr(m+step) > here {
		direction = -step
	}
	for m > lowest-10 && m < highest+10 {
		next := e.ssr(m + direction)
		if next > here {
			a, b = m-step, m+step
			return a, m, b, true
		}
		m, here = m+direction, next
	}
	return 0, 0, 0, false
}

func (e exponential) golden(a, m, b float64) float64 {
	const ratio = 0.3819660112501051 // 2 − golden section
	fm := e.ssr(m)
	for b-a > 1e-7 {
		var x float64
		if m-a > b-m {
			x = m - ratio*(m-a)
		} else {
			x = m + ratio*(b-m)
		}
		fx := e.ssr(x)
		switch {
		case fx < fm && x < m:
			b, m, fm = m, x, fx
		case fx < fm:
			a, m, fm = m, x, fx
		case x < m:
			a = x
		default:
			b = x
		}
	}
	return m
}

// polish ends with Gauss–Newton steps over all free parameters, which near the least converge to rounding, and takes the
// covariance from the last Jacobian.
func (e exponential) polish(c Curve, tau float64) Curve {
	final, start, ok := e.levels(tau)
	if !ok {
		c.Status, c.Why = NoTau, "the two levels cannot be told apart"
		return c
	}
	c.Final, c.Start, c.Tau = final, start, tau
	var f factors
	converged := false
	for range 60 {
		residuals, columns := e.linearised(c)
		if f, ok = decompose(columns); !ok {
			c.Status, c.Why = NoTau, "the levels and the time constant cannot be told apart"
			return c
		}
		step := f.solve(residuals)
		next := e.moved(c, step)
		if !(next.Tau > 0) || e.sumOf(next) > e.sumOf(c)*(1+1e-12)+1e-300 {
			converged = relative(c, next) < 1e-6
			break
		}
		change := relative(c, next)
		c = next
		if change < 1e-13 {
			converged = true
			break
		}
		converged = change < 1e-8
	}
	return e.judged(c, f, converged)
}

func relative(a, b Curve) float64 {
	scale := math.Max(math.Abs(a.Final), math.Abs(a.Start))
	return math.Max(math.Abs(a.Tau-b.Tau)/a.Tau, math.Max(math.Abs(a.Final-b.Final), math.Abs(a.Start-b.Start))/scale)
}

// linearised gives residuals and Jacobian columns in the order Final, Start, Tau, the fixed ones left out.
func (e exponential) linearised(c Curve) (residuals []float64, columns [][]float64) {
	n := len(e.t)
	residuals = make([]float64, n)
	rising, falling, slope := make([]float64, n), make([]float64, n), make([]float64, n)
	for i, t := range e.t {
		x := (t - c.T0) / c.Tau
		falling[i], rising[i] = math.Exp(-x), -math.Expm1(-x)
		slope[i] = -(c.Final - c.Start) * falling[i] * x / c.Tau
		residuals[i] = e.v[i] - c.Final*rising[i] - c.Start*falling[i]
	}
	if e.o.FixedFinal == nil {
		columns = append(columns, rising)
	}
	if e.o.FixedStart == nil {
		columns = append(columns, falling)
	}
	return residuals, append(columns, slope)
}

func (e exponential) moved(c Curve, step []float64) Curve {
	if e.o.FixedFinal == nil {
		c.Final, step = c.Final+step[0], step[1:]
	}
	if e.o.FixedStart == nil {
		c.Start, step = c.Start+step[0], step[1:]
	}
	c.Tau += step[0]
	return c
}

func (e exponential) sumOf(c Curve) float64 {
	sum := 0.0
	for i, t := range e.t {
		r := e.v[i] - c.At(t)
		sum += r * r
	}
	return sum
}

// judged fills in the uncertainties and the status.
func (e exponential) judged(c Curve, f factors, converged bool) Curve {
	residuals, _ := e.linearised(c)
	c.SSR = dot(residuals, residuals)
	c.Freedom = len(e.t) - len(f.q)
	c.S = deviation(c.SSR, c.Freedom, e.o.Resolution)
	c.Runs = Runs(residuals)
	c.Covered = (e.t[len(e.t)-1] - math.Max(e.t[0], c.T0)) / c.Tau
	gram := f.inverseGram()
	last := len(gram) - 1
	c.TauSE = c.S * math.Sqrt(gram[last][last])
	k := 0
	if e.o.FixedFinal == nil {
		c.FinalSE = c.S * math.Sqrt(gram[0][0])
		c.Correlation = gram[0][last] / math.Sqrt(gram[0][0]*gram[last][last])
		k = 1
	}
	if e.o.FixedStart == nil {
		c.StartSE = c.S * math.Sqrt(gram[k][k])
	}
	switch {
	case !converged:
		c.Status, c.Why = NotConverged, "the last step still moved the parameters"
	case c.TauSE > 0.3*c.Tau:
		c.Status, c.Why = NoTau, fmt.Sprintf("the time constant is known to ±%.0f %% only", 100*c.TauSE/c.Tau)
	case e.o.FixedFinal == nil && c.Covered < leastCovered:
		c.Status = TooEarly
		c.Why = fmt.Sprintf("the record ends after %.2f time constants, wanted at least %d; final value and time constant are correlated by %.3f", c.Covered, leastCovered, c.Correlation)
	default:
		c.Status = OK
	}
	return c
}

// deviation is the standard deviation of one residual, never finer than a rectangle of the resolution's width.
func deviation(ssr float64, freedom int, resolution float64) float64 {
	variance := resolution * resolution / 12
	if freedom > 0 {
		variance = math.Max(variance, ssr/float64(freedom))
	}
	return math.Sqrt(variance)
}
