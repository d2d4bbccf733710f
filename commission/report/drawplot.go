package report

import (
	"math"
	"strconv"

	"codeberg.org/go-pdf/fpdf"
)

// frame is where a plot's numbers lie on the page.
type frame struct {
	x, y, w, h float64 // mm, y downwards
	plot       Plot
}

func (f frame) at(x, y float64) (px, py float64) {
	return f.x + (x-f.plot.X.Low)/(f.plot.X.High-f.plot.X.Low)*f.w, f.y + f.h - (y-f.plot.Y.Low)/(f.plot.Y.High-f.plot.Y.Low)*f.h
}

const (
	plotLabelSize = 6.8
	plotLeft      = 17.0 // mm for the labels of the y axis
)

// drawPlot draws a plot of a height over the whole width, with its title above and legend and caption below.
func (s *sheet) drawPlot(p Plot, height float64) {
	if p.IsEmpty() {
		return
	}
	entries := legendOf(p)
	s.need(height + 22 + 4*float64((len(entries)+1)/2) + 3.2*float64(len(p.Caption)))
	s.bookmark(p.Title, 1)
	s.text(s.left(), s.y+3.6, bold, 9, ink, s.short(bold, 9, s.inner(), p.Title))
	s.y += 6
	f := frame{x: s.left() + plotLeft, y: s.y, w: s.inner() - plotLeft - 3, h: height, plot: p}
	s.axes(f)
	s.pdf.ClipRect(f.x, f.y, f.w, f.h, false)
	for _, l := range p.Layers {
		s.layer(f, l)
	}
	s.pdf.ClipEnd()
	s.pdf.SetDashPattern(nil, 0)
	s.box2(f.x, f.y, f.w, f.h)
	s.y += height + 9.5
	s.legend(entries, f.x, f.w)
	for _, line := range p.Caption {
		s.paragraphAt(f.x, f.w, regular, 7.2, ink, line)
	}
	s.gap(5)
}

// box2 is the frame of a plot, drawn over what lies inside.
func (s *sheet) box2(x, y, w, h float64) {
	s.pdf.SetDrawColor(quiet.r, quiet.g, quiet.b)
	s.pdf.SetLineWidth(0.25)
	s.pdf.Rect(x, y, w, h, "D")
}

func (s *sheet) axes(f frame) {
	p := f.plot
	at, decimals := p.Y.ticks(6)
	for _, v := range at {
		_, y := f.at(p.X.Low, v)
		s.line(f.x, y, f.x+f.w, y, 0.1, rule)
		s.line(f.x-1.2, y, f.x, y, 0.2, quiet)
		s.textRight(f.x-1.8, y+0.9, regular, plotLabelSize, ink, number(v, decimals))
	}
	at, decimals = p.X.ticks(10)
	for _, v := range at {
		x, _ := f.at(v, p.Y.Low)
		s.line(x, f.y, x, f.y+f.h, 0.1, rule)
		s.line(x, f.y+f.h, x, f.y+f.h+1.2, 0.2, quiet)
		s.textMiddle(x, f.y+f.h+3.9, regular, plotLabelSize, ink, number(v, decimals))
	}
	s.textMiddle(f.x+f.w/2, f.y+f.h+7.6, regular, plotLabelSize, quiet, axisWords(p.X))
	x, y := s.left()+2.6, f.y+f.h/2
	s.pdf.TransformBegin()
	s.pdf.TransformRotate(90, x, y)
	s.textMiddle(x, y, regular, plotLabelSize, quiet, axisWords(p.Y))
	s.pdf.TransformEnd()
}

func axisWords(a Axis) string {
	if a.Unit == "" {
		return a.Label
	}
	return a.Label + " in " + a.Unit
}

func number(v float64, decimals int) string {
	text := strconv.FormatFloat(v, 'f', decimals, 64)
	if text == "-0" {
		return "0"
	}
	return text
}

// look is how a role is drawn.
type look struct {
	colour colour
	width  float64
	dash   []float64
}

func lookOf(r Role) look {
	switch r {
	case Predicted:
		return look{bandLine, 0.25, []float64{1.6, 1}}
	case Measured:
		return look{traceLine, 0.4, nil}
	case Beside:
		return look{besideInk, 0.3, nil}
	case Fitted:
		return look{fitLine, 0.35, nil}
	}
	return look{ink, 0.25, []float64{0.9, 0.9}}
}

func (s *sheet) layer(f frame, l Layer) {
	k := lookOf(l.Role)
	s.pdf.SetDrawColor(k.colour.r, k.colour.g, k.colour.b)
	s.pdf.SetLineWidth(k.width)
	s.pdf.SetDashPattern(k.dash, 0)
	switch l.Shape {
	case Band:
		s.bandOf(f, l)
	case Line:
		s.trace(f, l)
	case Points:
		s.pdf.SetDashPattern(nil, 0)
		s.pdf.SetFillColor(k.colour.r, k.colour.g, k.colour.b)
		for i := range l.X {
			x, y := f.at(l.X[i], l.Y[i])
			s.pdf.Circle(x, y, 0.75, "F")
		}
	case Level:
		x, y := f.at(f.plot.X.Low, l.Level)
		s.pdf.Line(x, y, x+f.w, y)
		s.textRight(x+f.w-1, y-0.7, regular, 6.2, ink, l.Name)
	case Moment:
		x, _ := f.at(l.Level, f.plot.Y.Low)
		s.pdf.Line(x, f.y, x, f.y+f.h)
	}
}

func (s *sheet) bandOf(f frame, l Layer) {
	s.pdf.SetFillColor(bandFill.r, bandFill.g, bandFill.b)
	var outline []fpdf.PointType
	for i := range l.X {
		outline = appendPoint(outline, f, l.X[i], l.High[i])
	}
	for i := len(l.X) - 1; i >= 0; i-- {
		outline = appendPoint(outline, f, l.X[i], l.Low[i])
	}
	if len(outline) > 2 {
		s.pdf.Polygon(outline, "F")
	}
}

func appendPoint(to []fpdf.PointType, f frame, x, y float64) []fpdf.PointType {
	if math.IsNaN(y) || math.IsInf(y, 0) {
		return to
	}
	px, py := f.at(x, y)
	return append(to, fpdf.PointType{X: bounded(px), Y: bounded(py)})
}

// bounded keeps a point far outside the frame within what a PDF's numbers may be; the clip hides it all the same.
func bounded(mm float64) float64 { return math.Max(-5000, math.Min(5000, mm)) }

// trace draws a line, broken where it has no value.
func (s *sheet) trace(f frame, l Layer) {
	drawing := false
	for i := range l.X {
		if math.IsNaN(l.Y[i]) || math.IsInf(l.Y[i], 0) {
			if drawing {
				s.pdf.DrawPath("D")
			}
			drawing = false
			continue
		}
		x, y := f.at(l.X[i], l.Y[i])
		if !drawing {
			s.pdf.MoveTo(bounded(x), bounded(y))
			drawing = true
			continue
		}
		s.pdf.LineTo(bounded(x), bounded(y))
	}
	if drawing {
		s.pdf.DrawPath("D")
	}
}

func legendOf(p Plot) []Layer {
	var entries []Layer
	for _, l := range p.Layers {
		if l.Name != "" && !l.Hidden && l.Shape != Level { // a level is named where it is drawn
			entries = append(entries, l)
		}
	}
	return entries
}

// legend names the layers in two columns.
func (s *sheet) legend(entries []Layer, x, w float64) {
	for i, l := range entries {
		ex, ey := x+float64(i%2)*w/2, s.y+4*float64(i/2)
		k := lookOf(l.Role)
		switch l.Shape {
		case Band:
			s.box(ex, ey, 7, 2.4, bandFill, 0, ink)
		case Points:
			s.pdf.SetFillColor(k.colour.r, k.colour.g, k.colour.b)
			s.pdf.Circle(ex+3.5, ey+1.2, 0.75, "F")
		default:
			s.pdf.SetDashPattern(k.dash, 0)
			s.line(ex, ey+1.2, ex+7, ey+1.2, k.width, k.colour)
			s.pdf.SetDashPattern(nil, 0)
		}
		s.text(ex+9, ey+2.1, regular, 7, ink, s.short(regular, 7, w/2-11, l.Name))
	}
	s.y += 4*float64((len(entries)+1)/2) + 1
}
