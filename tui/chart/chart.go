package chart

import (
	"math"

	"chargehand/tui/theme"
)

// Form is how finely a chart is drawn.
type Form uint8

// The forms. A theme for ASCII draws every chart in ASCII.
const (
	Braille Form = iota
	Block
	ASCII
)

// Scale says what an axis shows. Where Low and High are equal the axis takes in all that is drawn; otherwise it takes in
// Low to High and what lies outside is marked at the edge.
type Scale struct {
	Label, Unit string // unit without prefix: the axis chooses one
	Low, High   float64
}

// Series is a row of values. A Y that is not a number is a gap, and so is a step in X wider than MaxStep where that is
// above 0. X ascends.
type Series struct {
	Name    string
	X, Y    []float64
	MaxStep float64
}

// Band is a range over X. X ascends; between two X the edges are straight.
type Band struct {
	Name         string
	X, Low, High []float64
}

// Marker is a limit or a moment: a level line at Y = At, or an upright one at X = At.
type Marker struct {
	Label   string
	At      float64
	Upright bool
	Role    theme.Role // theme.Limit where zero
}

// Chart is one picture. Empty parts are not drawn.
type Chart struct {
	Title   string
	X, Y    Scale
	Bands   []Band   // predicted, or the confidence of a fit
	Nominal []Series // predicted lines
	Fitted  []Series // lines fitted to what is measured
	Traces  []Series // what is measured, joined
	Points  []Series // what is measured, each for itself
	Markers []Marker
	Cursor  *float64 // the X to read off at
	Form    Form
}

// The least size of a drawn chart, in columns and rows; a smaller one is replaced by a sentence.
const LeastWidth, LeastHeight = 24, 6

// extent is the range of all finite values that are drawn.
func (c Chart) extent() (x, y extentOf) {
	x, y = empty(), empty()
	for _, list := range [][]Series{c.Nominal, c.Fitted, c.Traces, c.Points} {
		for _, s := range list {
			for i := range s.len() {
				x.include(s.X[i])
				y.include(s.Y[i])
			}
		}
	}
	for _, b := range c.Bands {
		for i := range b.len() {
			x.include(b.X[i])
			y.include(b.Low[i])
			y.include(b.High[i])
		}
	}
	for _, m := range c.Markers {
		if m.Upright {
			x.include(m.At)
		} else {
			y.include(m.At)
		}
	}
	return x, y
}

// extentOf is the range of the values seen so far.
type extentOf struct{ low, high float64 }

func empty() extentOf { return extentOf{math.Inf(1), math.Inf(-1)} }

func (r *extentOf) include(v float64) {
	if math.IsNaN(v) || math.Abs(v) > 1e12 {
		return
	}
	r.low, r.high = min(r.low, v), max(r.high, v)
}

func (s Series) len() int { return min(len(s.X), len(s.Y)) }
func (b Band) len() int   { return min(len(b.X), len(b.Low), len(b.High)) }

// at is the value of a line at x, straight between its points; false outside it or in a gap.
func (s Series) at(x float64) (float64, bool) { return between(s.X[:s.len()], s.Y, x) }

func (b Band) at(x float64) (low, high float64, ok bool) {
	low, ok = between(b.X[:b.len()], b.Low, x)
	if !ok {
		return 0, 0, false
	}
	high, ok = between(b.X[:b.len()], b.High, x)
	return low, high, ok
}

func between(xs, ys []float64, x float64) (float64, bool) {
	n := len(xs)
	if n == 0 || !(x >= xs[0] && x <= xs[n-1]) {
		return 0, false
	}
	lo, hi := 0, n-1
	for hi-lo > 1 {
		if mid := (lo + hi) / 2; xs[mid] <= x {
			lo = mid
		} else {
			hi = mid
		}
	}
	y := ys[lo]
	switch {
	case xs[hi] == x:
		y = ys[hi]
	case xs[hi] > xs[lo]:
		y += (ys[hi] - ys[lo]) * (x - xs[lo]) / (xs[hi] - xs[lo])
	}
	return y, !math.IsNaN(y) && !math.IsInf(y, 0)
}

// nearest is the sample of the series closest to x, no further away than reach.
func (s Series) nearest(x, reach float64) (sampleX, sampleY float64, ok bool) {
	best := reach
	for i := range s.len() {
		if d := math.Abs(s.X[i] - x); d <= best && !math.IsNaN(s.Y[i]) && !math.IsInf(s.Y[i], 0) {
			best, sampleX, sampleY, ok = d, s.X[i], s.Y[i], true
		}
	}
	return sampleX, sampleY, ok
}
