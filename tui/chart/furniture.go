package chart

import (
	"fmt"
	"math"

	"chargehand/tui/theme"
)

// axes draws both rulers with their ticks and labels. A tick's mark and its label stand in the row, or the column, on
// which its value is drawn.
func (f *frame) axes() {
	rows, columns := f.plot.rows, f.plot.columns
	base := f.top + rows
	f.sheet.Wire(f.left, f.top, f.left, base, theme.Axis)
	f.sheet.Wire(f.left, base, f.left+columns, base, theme.Axis)
	for _, tick := range f.y.Ticks(f.yExp) {
		y := f.top + rows - 1 - tick.Cell
		f.sheet.Right(f.left, y, f.left, f.theme.Minus(tick.Label), theme.Axis)
		f.sheet.Put(f.left, y, "┤", "+", theme.Axis)
	}
	for column, gap := range f.gapAt {
		if gap {
			f.sheet.Put(f.left+1+column, base, "╳", "x", theme.Withdrawn)
		}
	}
	f.xLabels(base)
}

// xLabels writes the numbers below the level axis, and its unit behind the last of them, or where there is no room
// before it.
func (f *frame) xLabels(base int) {
	next, gap := 0, 0
	for _, tick := range f.x.Ticks(f.xExp) {
		x := f.left + 1 + tick.Cell
		if !f.gapAt[tick.Cell] {
			f.sheet.Put(x, base, "┬", "+", theme.Axis)
		}
		label := f.theme.Minus(tick.Label)
		width := theme.Width(label)
		from := min(max(x-width/2, 0), f.sheet.Width()-width)
		if from >= next {
			gap = next
			next = f.sheet.Text(from, base+1, label, theme.Axis) + 1
		}
	}
	switch unit := f.xUnit; {
	case unit == "":
	case next+theme.Width(unit) <= f.sheet.Width():
		f.sheet.Text(f.sheet.Width()-theme.Width(unit), base+1, unit, theme.Faint)
	case f.sheet.IsBlank(gap, base+1, theme.Width(unit)+1):
		f.sheet.Text(gap, base+1, unit, theme.Faint)
	}
}

// heading is the first row: the unit above its axis, the title, and what each kind of drawing is.
func (f *frame) heading() {
	x := f.sheet.Within(0, 0, f.left+8, f.yUnit, theme.Faint) + 1
	label := theme.Clean(f.chart.Y.Label)
	if over := theme.Clean(f.chart.X.Label); label != "" && over != "" {
		label += " over " + over
	}
	if label != "" {
		x = f.sheet.Within(x, 0, f.sheet.Width()-x, label, theme.Faint) + 1
	}
	if f.chart.Title != "" {
		x = f.sheet.Within(x+1, 0, f.sheet.Width()-x-1, theme.Clean(f.chart.Title), theme.Title) + 1
	}
	end := f.sheet.Width()
	if f.clipped > 0 {
		note := fmt.Sprintf("%d outside", f.clipped)
		if end-theme.Width(note) > x {
			end -= theme.Width(note)
			f.sheet.Text(end, 0, note, theme.Abnormal)
			end -= 2
		}
	}
	entries := f.legend()
	for i := len(entries) - 1; i >= 0; i-- { // from the right, the most important last
		e := entries[i]
		width := theme.Width(e.sign) + 1 + theme.Width(e.name)
		if end-width <= x {
			return
		}
		end -= width
		f.sheet.Text(f.sheet.Text(end, 0, e.sign, e.role)+1, 0, e.name, theme.Text)
		end -= 2
	}
}

type entry struct {
	sign, name string
	role       theme.Role
}

func (f *frame) legend() (list []entry) {
	add := func(name, braille, block, ascii string, role theme.Role) {
		if name = theme.Clean(name); name == "" {
			return
		}
		sign := map[Form]string{Braille: braille, Block: block, ASCII: ascii}[f.chart.Form]
		list = append(list, entry{sign, name, role})
	}
	for _, b := range f.chart.Bands {
		add(b.Name, "⠡⠊", "░░", "::", theme.Band)
	}
	for _, s := range f.chart.Nominal {
		add(s.Name, "⠂⠄", "▄▄", "..", theme.Nominal)
	}
	for _, s := range f.chart.Fitted {
		add(s.Name, "⠤⠤", "▄▄", "++", theme.Fitted)
	}
	for _, s := range f.chart.Points {
		add(s.Name, "●", "●", "o", theme.Trace)
	}
	for _, s := range f.chart.Traces {
		add(s.Name, "⠒⠒", "▀▀", "**", theme.Trace)
	}
	return list
}

func (m Marker) role() theme.Role {
	if m.Role == theme.Text {
		return theme.Limit
	}
	return m.Role
}

// markerLines draws the markers that lie on the axes, dashed.
func (f *frame) markerLines() {
	p := f.plot
	for _, m := range f.chart.Markers {
		switch {
		case math.IsNaN(m.At):
		case m.Upright && inside(f.x, m.At, p.perX):
			for row := range p.rows {
				p.mark(nearest(f.x, m.At), row, upright, m.role())
			}
		case !m.Upright && inside(f.y, m.At, p.perY):
			_, y := f.place(0, m.At)
			for x := range p.columns * p.perX {
				if p.perX == 1 && (p.perY > 1 || x%2 == 0) || x%4 < 2 {
					p.plot(x, y, m.role())
				}
			}
		}
	}
}

// markerLabels names the markers: a level one at the right above its line, an upright one beside its top, each where no
// other label stands. One outside the axes is named at the edge with an arrow to where it lies.
func (f *frame) markerLabels() {
	taken := f.levelLines()
	free := func(row, from, to int) bool {
		for _, t := range taken[row] {
			if from <= t[1] && to >= t[0] {
				return false
			}
		}
		return row >= f.top && row < f.top+f.plot.rows
	}
	put := func(row, from int, label string, role theme.Role) bool {
		to := from + theme.Width(label) - 1
		if !free(row, from-1, to+1) {
			return false
		}
		taken[row] = append(taken[row], [2]int{from, to})
		f.sheet.Text(from, row, label, role)
		return true
	}
	for _, m := range f.chart.Markers {
		label := theme.Clean(m.Label)
		if label == "" || math.IsNaN(m.At) {
			continue
		}
		label = f.theme.Clip(f.theme.Plain(label), f.plot.columns-4)
		if m.Upright {
			f.labelUpright(m, label, put)
		} else {
			f.labelLevel(m, label, put)
		}
	}
}

// levelLines are the rows of level markers, which a label of another marker should leave free.
func (f *frame) levelLines() map[int][][2]int {
	taken := map[int][][2]int{}
	for _, m := range f.chart.Markers {
		if !m.Upright && inside(f.y, m.At, f.plot.perY) {
			_, dot := f.place(0, m.At)
			row := f.top + f.plot.rows - 1 - dot/f.plot.perY
			taken[row] = append(taken[row], [2]int{0, f.sheet.Width()})
		}
	}
	return taken
}

func (f *frame) labelUpright(m Marker, label string, put func(row, from int, label string, role theme.Role) bool) {
	column := int(min(max(f.x.Cell(m.At), -1), float64(f.plot.columns)))
	from := f.left + 1 + column + 1
	switch {
	case !inside(f.x, m.At, f.plot.perX) && column < 0:
		label, from = f.theme.Pick("◀ ", "< ")+label, f.left+1
	case !inside(f.x, m.At, f.plot.perX):
		label += f.theme.Pick(" ▶", " >")
		from = f.sheet.Width() - theme.Width(label)
	case from+theme.Width(label) > f.sheet.Width():
		from = f.left + 1 + column - theme.Width(label)
	}
	for row := f.top; row < f.top+f.plot.rows; row++ {
		if put(row, from, label, m.role()) {
			return
		}
	}
}

func (f *frame) labelLevel(m Marker, label string, put func(row, from int, label string, role theme.Role) bool) {
	bottom := f.top + f.plot.rows - 1
	var rows []int
	switch cell := f.y.Cell(m.At); {
	case inside(f.y, m.At, f.plot.perY):
		_, dot := f.place(0, m.At)
		row := bottom - dot/f.plot.perY
		rows = []int{row - 1, row + 1, row - 2, row + 2}
	case cell > 0:
		label = f.theme.Pick("▲ ", "^ ") + label
		rows = []int{f.top, f.top + 1, f.top + 2}
	default:
		label = f.theme.Pick("▼ ", "v ") + label
		rows = []int{bottom, bottom - 1, bottom - 2}
	}
	width := theme.Width(label)
	for _, from := range []int{f.sheet.Width() - width, f.left + 2, f.left + (f.plot.columns-width)/2} {
		for _, row := range rows {
			if put(row, from, label, m.role()) {
				return
			}
		}
	}
}

// cursor draws the read-off line.
func (f *frame) cursor() {
	c := f.chart.Cursor
	if c == nil || !inside(f.x, *c, f.plot.perX) {
		return
	}
	for row := range f.plot.rows {
		f.plot.mark(nearest(f.x, *c), row, cursorLine, theme.Cursor)
	}
}

// readOff is the last row: what stands at the cursor. Of what is measured it gives the sample itself, never a value
// between two.
func (f *frame) readOff() {
	if f.chart.Cursor == nil {
		return
	}
	at := *f.chart.Cursor
	var parts []entry
	name := theme.Clean(f.chart.X.Label)
	if name == "" {
		name = "at"
	}
	parts = append(parts, entry{name, f.value(at, f.x, 1, f.xExp, f.xUnit), theme.Cursor})
	for _, list := range [][]Series{f.chart.Traces, f.chart.Points} {
		for _, s := range list {
			text := "no value"
			if _, y, ok := s.nearest(at, f.x.Pitch()); ok {
				text = f.value(y, f.y, 2, f.yExp, f.yUnit)
			}
			parts = append(parts, entry{theme.Clean(s.Name), text, theme.Trace})
		}
	}
	for _, b := range f.chart.Bands {
		if low, high, ok := b.at(at); ok {
			text := f.number(low, f.y, 2, f.yExp) + f.theme.Pick(" … ", " .. ") + f.value(high, f.y, 2, f.yExp, f.yUnit)
			parts = append(parts, entry{theme.Clean(b.Name), text, theme.Text})
		}
	}
	for _, list := range [][]Series{f.chart.Nominal, f.chart.Fitted} {
		for _, s := range list {
			if y, ok := s.at(at); ok {
				parts = append(parts, entry{theme.Clean(s.Name), f.value(y, f.y, 2, f.yExp, f.yUnit), theme.Text})
			}
		}
	}
	x, row := 0, f.sheet.Height()-1
	for _, p := range parts {
		width := theme.Width(p.sign) + 1 + theme.Width(p.name)
		if x+width > f.sheet.Width() {
			break
		}
		x = f.sheet.Text(x, row, p.sign, theme.Faint) + 1
		x = f.sheet.Text(x, row, p.name, p.role) + 3
	}
}

// number writes a value in the axis's own prefix, so many digits finer than what a cell stands for: the cursor's own place
// needs one, and what is read off there was measured more finely than it can be drawn.
func (f *frame) number(v float64, a Axis, finer, exponent int) string {
	places := int(math.Ceil(float64(finer)-math.Log10(a.Pitch()))) + exponent
	return f.theme.Minus(fmt.Sprintf("%.*f", max(places, 0), v/math.Pow10(exponent)))
}

func (f *frame) value(v float64, a Axis, finer, exponent int, unit string) string {
	if unit == "" {
		return f.number(v, a, finer, exponent)
	}
	return f.number(v, a, finer, exponent) + " " + unit
}
