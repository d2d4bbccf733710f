package chart

import (
	"fmt"
	"math"

	"chargehand/tui/canvas"
	"chargehand/tui/theme"
)

// frame is where everything of a chart stands on its sheet.
type frame struct {
	chart    Chart
	theme    theme.Theme
	sheet    *canvas.Canvas
	left     int // column of the upright axis
	top      int // row of the plot's first line
	x, y     Axis
	xExp     int
	yExp     int
	xUnit    string
	yUnit    string
	plot     *raster
	clipped  int
	gapAt    []bool
	readOffs int // rows below for the cursor
}

// View draws the chart in exactly width columns and height rows.
func (c Chart) View(t theme.Theme, width, height int) string {
	f := c.frame(t, width, height)
	if f.plot == nil {
		f.sheet.Within(0, 0, f.sheet.Width(), fmt.Sprintf("the chart needs %d×%d", LeastWidth, LeastHeight), theme.Faint)
		return f.sheet.String()
	}
	f.bands()
	f.markerLines()
	f.lines()
	f.points()
	f.cursor()
	f.plot.onto(f.sheet, f.left+1, f.top, asciiMark)
	f.axes()
	f.markerLabels()
	f.heading()
	f.readOff()
	return f.sheet.String()
}

// Axes gives the axes that [Chart.View] uses for a size: the one of X with a cell for each column of the plot, the one of
// Y with a cell for each row, counted from the bottom.
func (c Chart) Axes(t theme.Theme, width, height int) (x, y Axis) {
	f := c.frame(t, width, height)
	return f.x, f.y
}

// Step gives the X of the cursor moved by so many columns, kept on the axis; a chart without a cursor begins at the end of
// its first trace.
func (c Chart) Step(columns int, t theme.Theme, width, height int) float64 {
	x, _ := c.Axes(t, width, height)
	at := x.High()
	switch {
	case c.Cursor != nil:
		at = *c.Cursor
	case len(c.Traces) > 0 && c.Traces[0].len() > 0:
		at = c.Traces[0].X[c.Traces[0].len()-1]
	}
	cell := math.Round(x.Cell(at)) + float64(columns)
	return x.Value(int(min(max(cell, 0), float64(x.Cells-1))))
}

func (c Chart) frame(t theme.Theme, width, height int) *frame {
	f := &frame{chart: c, theme: t, sheet: canvas.New(t, width, height)}
	width, height = f.sheet.Width(), f.sheet.Height()
	if width < LeastWidth || height < LeastHeight {
		return f
	}
	if t.ASCII() {
		f.chart.Form = ASCII
	}
	if c.Cursor != nil {
		f.readOffs = 1
	}
	f.top = 1
	rows := height - f.top - 2 - f.readOffs
	ex, ey := c.extent()
	f.y = axisFor(c.Y, ey, rows, max(2, rows/9), max(6, rows/3))
	var letter string
	f.yExp, letter = f.y.prefix(c.Y.Unit)
	f.yUnit = t.Plain(letter + c.Y.Unit)
	labels := 0
	for _, tick := range f.y.Ticks(f.yExp) {
		labels = max(labels, len(tick.Label))
	}
	f.left = min(labels+1, width/2)
	columns := width - f.left - 1
	f.x = axisFor(c.X, ex, columns, max(8, columns/10), max(20, columns/4))
	f.xExp, letter = f.x.prefix(c.X.Unit)
	f.xUnit = t.Plain(letter + c.X.Unit)
	f.plot = newRaster(columns, rows, f.chart.Form)
	f.gapAt = make([]bool, columns)
	return f
}

func axisFor(s Scale, seen extentOf, cells, least, most int) Axis {
	low, high := s.Low, s.High
	if low == high {
		low, high = seen.low, seen.high
	}
	return NewAxis(low, high, cells, least, most)
}

func asciiMark(role theme.Role) string {
	switch role {
	case theme.Band:
		return ":"
	case theme.Nominal:
		return "."
	case theme.Fitted:
		return "+"
	case theme.Trace:
		return "*"
	case theme.Cursor:
		return "|"
	}
	return "-"
}

// place is where a point lies, in dots.
func (f *frame) place(x, y float64) (int, int) {
	const far = 1e6 // dots: enough to leave the sheet, little enough for whole numbers
	return f.plot.dot(min(max(f.x.Cell(x), -far), far), min(max(f.y.Cell(y), -far), far))
}

// inside tells whether a value lies on the axis, to within the dot that is drawn for it.
func inside(a Axis, v float64, per int) bool {
	cell := a.Cell(v)
	half := 0.5/float64(per) + 1e-9
	return cell >= -half && cell <= float64(a.Cells-1)+half
}

// nearest is the cell whose own value is closest to v, which must lie on the axis.
func nearest(a Axis, v float64) int { return int(math.Round(a.Cell(v))) }

// bands fills the bands with staggered dots and draws their edges in dots further apart than a line's, so that without
// colour too a band is told from a trace.
func (f *frame) bands() {
	p := f.plot
	for _, b := range f.chart.Bands {
		for x := 0; x < p.columns*p.perX; x++ {
			low, high, ok := b.at(f.x.At(float64(x) / float64(p.perX)))
			if !ok {
				continue
			}
			_, bottom := f.place(0, low)
			_, top := f.place(0, high)
			for y := max(bottom, 0); y <= min(top, p.rows*p.perY-1); y++ {
				if p.perY < 4 || x%2 == 0 && (y == bottom || y == top || (y+x/2)%2 == 0) {
					p.plot(x, y, theme.Band)
				}
			}
		}
	}
}

func (f *frame) lines() {
	for _, s := range f.chart.Nominal {
		f.line(s, theme.Nominal, 3)
	}
	for _, s := range f.chart.Fitted {
		f.line(s, theme.Fitted, 1)
	}
	for _, s := range f.chart.Traces {
		f.line(s, theme.Trace, 1)
	}
}

// line draws a series; a lone sample between two gaps is a dot. In ASCII and blocks a dashed line is drawn whole, for its
// character already differs.
func (f *frame) line(s Series, role theme.Role, dash int) {
	if f.chart.Form != Braille {
		dash = 1
	}
	joined, lastX, lastY := false, 0, 0
	for i := range s.len() {
		x, y := s.X[i], s.Y[i]
		if math.IsNaN(x) || math.IsNaN(y) || math.IsInf(x, 0) {
			joined = false
			continue
		}
		if i > 0 && s.MaxStep > 0 && x-s.X[i-1] > s.MaxStep {
			joined = false
		}
		px, py := f.place(x, y)
		if joined {
			f.segment(lastX, lastY, px, py, dash, role)
		} else {
			f.plot.plot(px, py, role)
		}
		f.edge(x, y, role)
		joined, lastX, lastY = true, px, py
	}
	if role == theme.Trace {
		f.gaps(s)
	}
}

// segment draws the part of a line that lies on the plot; a line far outside would take as many steps as it is long.
func (f *frame) segment(x0, y0, x1, y1, dash int, role theme.Role) {
	w, h := float64(f.plot.columns*f.plot.perX-1), float64(f.plot.rows*f.plot.perY-1)
	ax, ay, bx, by := float64(x0), float64(y0), float64(x1), float64(y1)
	from, to := 0.0, 1.0
	for _, e := range [4][2]float64{{ax - bx, ax}, {bx - ax, w - ax}, {ay - by, ay}, {by - ay, h - ay}} {
		switch p, q := e[0], e[1]; {
		case p == 0 && q < 0:
			return
		case p < 0:
			from = max(from, q/p)
		case p > 0:
			to = min(to, q/p)
		}
	}
	if from > to {
		return
	}
	at := func(k float64) (int, int) {
		return int(math.Round(ax + k*(bx-ax))), int(math.Round(ay + k*(by-ay)))
	}
	fx, fy := at(from)
	tx, ty := at(to)
	f.plot.line(fx, fy, tx, ty, dash, role)
}

// edge marks a point that lies outside the plot at the nearest place of its edge.
func (f *frame) edge(x, y float64, role theme.Role) {
	if role != theme.Trace {
		return
	}
	column := int(math.Floor((f.x.Cell(x)*float64(f.plot.perX) + 0.5) / float64(f.plot.perX)))
	row := int(min(max(math.Round(f.y.Cell(y)), 0), float64(f.plot.rows-1)))
	okX, okY := inside(f.x, x, f.plot.perX), inside(f.y, y, f.plot.perY)
	switch {
	case okX && okY:
		return
	case okX && f.y.Cell(y) > 0:
		f.plot.mark(column, f.plot.rows-1, above, theme.Trace)
	case okX:
		f.plot.mark(column, 0, below, theme.Trace)
	case f.x.Cell(x) > 0:
		f.plot.mark(f.plot.columns-1, row, rightOf, theme.Trace)
	default:
		f.plot.mark(0, row, leftOf, theme.Trace)
	}
	f.clipped++
}

// gaps finds the columns in which a trace has no value though it has one before and after.
func (f *frame) gaps(s Series) {
	last := math.NaN()
	open := false
	for i := range s.len() {
		if math.IsNaN(s.Y[i]) || math.IsNaN(s.X[i]) {
			open = true
			continue
		}
		if x := s.X[i]; !math.IsNaN(last) && (open || s.MaxStep > 0 && x-last > s.MaxStep) {
			columns := float64(len(f.gapAt))
			from, to := min(max(math.Floor(f.x.Cell(last))+1, 0), columns), min(f.x.Cell(x), columns)
			for column := int(from); float64(column) < to; column++ {
				f.gapAt[column] = true
			}
		}
		last, open = s.X[i], false
	}
}

// points draws each value as a cross that fills its cell, so that it is seen on a line and in a band.
func (f *frame) points() {
	for _, s := range f.chart.Points {
		for i := range s.len() {
			x, y := s.X[i], s.Y[i]
			if math.IsNaN(x) || math.IsNaN(y) {
				continue
			}
			if !inside(f.x, x, f.plot.perX) || !inside(f.y, y, f.plot.perY) {
				f.edge(x, y, theme.Trace)
				continue
			}
			f.plot.mark(nearest(f.x, x), nearest(f.y, y), point, theme.Trace)
		}
	}
}
