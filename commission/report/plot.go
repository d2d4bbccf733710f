package report

import "math"

// Plot is a drawing in its own numbers, in coherent SI units: what is to be seen, and not how. Layers are drawn in order.
type Plot struct {
	ID      string // of the capture, or of what is drawn
	Title   string
	X, Y    Axis
	Layers  []Layer
	Caption []string // what the numbers say, a sentence each
}

// Axis is one axis with the range that it shows.
type Axis struct {
	Label, Unit string
	Low, High   float64
}

// Role is what a layer shows; it fixes the look everywhere.
type Role int

// The roles of a layer.
const (
	Predicted Role = iota // a range, or its nominal line
	Measured              // a trace or points
	Beside                // another measured quantity on the same axis
	Fitted                // a line through what was measured
	Border                // a limit, a setting, or the instant of an event
)

// Layer is one thing drawn. Which fields count says its shape: a Band has Low and High over X, a Line has Y over X (a NaN
// in Y breaks it), Points are marks at X and Y, a Level is a horizontal line and a Moment a vertical one.
type Layer struct {
	Name   string
	Role   Role
	Shape  Shape
	X, Y   []float64
	Low    []float64
	High   []float64
	Level  float64
	Hidden bool // not named in the legend
}

// Shape is the form of a layer.
type Shape int

// The shapes of a layer.
const (
	Line Shape = iota
	Band
	Points
	Level
	Moment
)

// IsEmpty tells whether there is nothing to draw.
func (p Plot) IsEmpty() bool {
	return len(p.Layers) == 0 || !(p.X.High > p.X.Low) || !(p.Y.High > p.Y.Low)
}

// fitY sets the y range to what the layers show within the x range, with a little room.
func (p *Plot) fitY() {
	low, high := math.Inf(1), math.Inf(-1)
	take := func(x []float64, ys ...[]float64) {
		for i := range x {
			for _, y := range ys {
				if x[i] >= p.X.Low && x[i] <= p.X.High && i < len(y) && !math.IsNaN(y[i]) && !math.IsInf(y[i], 0) {
					low, high = math.Min(low, y[i]), math.Max(high, y[i])
				}
			}
		}
	}
	for _, l := range p.Layers {
		switch l.Shape {
		case Band:
			take(l.X, l.Low, l.High)
		case Line, Points:
			take(l.X, l.Y)
		case Level:
			low, high = math.Min(low, l.Level), math.Max(high, l.Level)
		}
	}
	room := 0.06 * (high - low)
	if room == 0 {
		room = math.Max(1e-3*math.Abs(high), 1e-3)
	}
	p.Y.Low, p.Y.High = low-room, high+room
	if low >= 0 && p.Y.Low < 0 {
		p.Y.Low = 0
	}
}

// ticks are round numbers within an axis, about so many, with the decimals that tell them apart.
func (a Axis) ticks(about int) (at []float64, decimals int) {
	span := a.High - a.Low
	if !(span > 0) || math.IsInf(span, 0) || about < 1 {
		return nil, 0
	}
	rough := span / float64(about)
	power := math.Pow(10, math.Floor(math.Log10(rough)))
	step := 10 * power
	for _, m := range []float64{1, 2, 5} {
		if rough <= m*power*1.0000001 {
			step = m * power
			break
		}
	}
	first := math.Ceil(a.Low/step - 1e-9)
	for k := first; k*step <= a.High+1e-9*span && len(at) < 4*about+4; k++ {
		at = append(at, k*step)
	}
	return at, int(math.Max(0, -math.Floor(math.Log10(step)+1e-9)))
}
