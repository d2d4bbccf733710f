package fit

import "math"

// Straight is a fitted line y = Intercept + Slope·x with its standard errors. Errors common to all points, such as a wrong
// gain, do not show in the scatter: [Straight.WithGains] adds them.
type Straight struct {
	Status               Status
	Intercept, Slope     float64
	InterceptSE, SlopeSE float64
	Covariance           float64 // of Intercept and Slope
	S                    float64 // residual standard deviation
	SSR                  float64
	RSquared             float64
	N, Freedom           int
	MeanX, SumSquaresX   float64 // about the mean
	Runs                 float64
}

// Line fits a straight line by ordinary least squares, the errors being in y (formulas H). resolution is the register step
// of y, 0 where unknown.
func Line(x, y []float64, resolution float64) Straight {
	l := Straight{N: len(x)}
	if len(x) != len(y) || len(x) < 3 {
		l.Status = TooFewPoints
		return l
	}
	for i := range x {
		if !isFinite(x[i]) || !isFinite(y[i]) {
			l.Status = NotFinite
			return l
		}
	}
	meanX, meanY := Average(x).Mean, Average(y).Mean
	var sxx, sxy, syy float64
	for i := range x {
		dx, dy := x[i]-meanX, y[i]-meanY
		sxx, sxy, syy = sxx+dx*dx, sxy+dx*dy, syy+dy*dy
	}
	if !(sxx > 0) {
		l.Status = NoRise
		return l
	}
	l.Slope = sxy / sxx
	l.Intercept = meanY - l.Slope*meanX
	residuals := make([]float64, len(x))
	for i := range x {
		residuals[i] = (y[i] - meanY) - l.Slope*(x[i]-meanX)
	}
	l.SSR = dot(residuals, residuals)
	l.Freedom = len(x) - 2
	l.S = deviation(l.SSR, l.Freedom, resolution)
	l.MeanX, l.SumSquaresX = meanX, sxx
	l.SlopeSE = l.S / math.Sqrt(sxx)
	l.InterceptSE = l.S * math.Sqrt(1/float64(len(x))+meanX*meanX/sxx)
	l.Covariance = -l.S * l.S * meanX / sxx
	if syy > 0 {
		l.RSquared = 1 - l.SSR/syy
	}
	l.Runs = Runs(residuals)
	l.Status = OK
	return l
}

// At is the line's value at x.
func (l Straight) At(x float64) float64 { return l.Intercept + l.Slope*x }

// SEAt is the standard error of the line at x, the correlation of intercept and slope included.
func (l Straight) SEAt(x float64) float64 {
	return math.Sqrt(math.Max(0, l.InterceptSE*l.InterceptSE+x*x*l.SlopeSE*l.SlopeSE+2*x*l.Covariance))
}

// NewReadingSE is the standard deviation of one further reading at x.
func (l Straight) NewReadingSE(x float64) float64 { return math.Hypot(l.S, l.SEAt(x)) }

// Gains are errors common to all points of a line, as standard uncertainties.
type Gains struct {
	Y, X    float64 // relative, of the two instruments
	OffsetY float64 // in the unit of y
	NoiseX  float64 // standard deviation of x itself, which flattens the slope by 1 − n·NoiseX²⁄Sxx
}

// WithGains gives the combined standard uncertainties of slope and intercept: scatter and gain errors, which do not average
// out (formulas H, trap 8).
func (l Straight) WithGains(g Gains) (slope, intercept float64) {
	flattened := math.Abs(l.Slope) * float64(l.N) * g.NoiseX * g.NoiseX / l.SumSquaresX
	slope = math.Sqrt(l.SlopeSE*l.SlopeSE + l.Slope*l.Slope*(g.Y*g.Y+g.X*g.X) + flattened*flattened)
	intercept = math.Sqrt(l.InterceptSE*l.InterceptSE + math.Pow(l.Intercept*g.Y, 2) + g.OffsetY*g.OffsetY)
	return slope, intercept
}
