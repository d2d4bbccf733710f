package oneline

import (
	"chargehand/tui/canvas"
	"chargehand/tui/theme"
)

// drawing is one diagram in the making.
type drawing struct {
	*canvas.Canvas
	instant
	plan Plan
}

// contactor draws a contact of the given width on a rail: terminals at both ends and a blade that lies closed, stands
// open, or is not known. Raised blades reach into the row above.
func (d *drawing) contactor(x, y, width int, p position, raised bool) {
	d.blade(x, y, width, p, raised)
	d.Put(x+width-1, y, "◦", "o", p.role())
}

// isolator draws a contact with the bar of a disconnector at its fixed terminal.
func (d *drawing) isolator(x, y, width int, p position, raised bool) {
	d.blade(x, y, width, p, raised)
	if p == closed {
		d.Put(x+width-1, y, "┽", "+", p.role())
		return
	}
	d.Put(x+width-1, y, "├", "|", p.role())
}

func (d *drawing) blade(x, y, width int, p position, raised bool) {
	for i := range width {
		d.Text(x+i, y, " ", theme.Wire)
	}
	d.Put(x, y, "◦", "o", p.role())
	switch p {
	case open:
		d.Put(x+1, y, "╱", "/", p.role())
		if raised {
			d.Put(x+2, y-1, "╱", "/", p.role())
		}
	case closed:
		for i := 1; i < width-1; i++ {
			d.Put(x+i, y, "━", "=", p.role())
		}
	default:
		d.Text(x+width/2, y, "?", p.role())
	}
}

// arcs draws a choke.
func (d *drawing) arcs(x, y, width int) {
	for i := range width {
		d.Put(x+i, y, "∩", "m", theme.Symbol)
	}
}

// diode draws a triangle that points to the right, before its bar.
func (d *drawing) diode(x, y int) {
	d.Put(x, y, "▷", ">", theme.Symbol)
	d.Put(x+1, y, "├", "|", theme.Symbol)
}

// source draws the source upright between the rails: its two plates on rows y and y+1, the wire at column x.
func (d *drawing) source(x, y, top, bottom, half int) {
	d.Wire(x, top, x, y, theme.Wire)
	d.Wire(x, y+1, x, bottom, theme.Wire)
	switch d.plan.plates {
	case cell: // the long plate is the plus
		d.plate(x, y, half, true)
		d.plate(x, y+1, half-1, false)
	case capacitor:
		d.plate(x, y, half, true)
		d.plate(x, y+1, half, false)
	case box:
		for i := -half; i <= half; i++ {
			d.Put(x+i, y, "─", "-", theme.Symbol)
			d.Put(x+i, y+1, "─", "-", theme.Symbol)
		}
		d.Put(x-half, y, "┌", "+", theme.Symbol)
		d.Put(x+half, y, "┐", "+", theme.Symbol)
		d.Put(x-half, y+1, "└", "+", theme.Symbol)
		d.Put(x+half, y+1, "┘", "+", theme.Symbol)
		d.Put(x, y, "┴", "+", theme.Symbol)
		d.Put(x, y+1, "┬", "+", theme.Symbol)
	}
}

// plate draws a level plate around column x with its lead on the upper or lower side.
func (d *drawing) plate(x, y, half int, upper bool) {
	for i := -half; i <= half; i++ {
		if upper || d.plan.plates != cell {
			d.Put(x+i, y, "─", "-", theme.Symbol)
		} else {
			d.Put(x+i, y, "━", "=", theme.Symbol)
		}
	}
	switch {
	case upper:
		d.Put(x, y, "┴", "+", theme.Symbol)
	case d.plan.plates == cell:
		d.Put(x, y, "┯", "=", theme.Symbol)
	default:
		d.Put(x, y, "┬", "-", theme.Symbol)
	}
}

// shunt draws a capacitor between the rails at column x: in one row as two lines, in two as two plates.
func (d *drawing) shunt(x, top, bottom, y int, tall bool) {
	d.Wire(x, top, x, bottom, theme.Wire)
	if !tall {
		d.Put(x, y, "═", "=", theme.Symbol)
		return
	}
	for i := -2; i <= 2; i++ {
		d.Put(x+i, y, "─", "-", theme.Symbol)
		d.Put(x+i, y+1, "─", "-", theme.Symbol)
	}
	d.Put(x, y, "┴", "+", theme.Symbol)
	d.Put(x, y+1, "┬", "+", theme.Symbol)
}

// reading writes a reading in at most width columns.
func (d *drawing) reading(x, y, width int, s theme.Shown) int {
	return d.Text(x, y, s.Within(width), s.Role)
}

// labelled writes a faint word and a reading behind it, or the reading alone where both do not fit.
func (d *drawing) labelled(x, y, width int, label string, s theme.Shown) {
	if room := width - theme.Width(label) - 1; theme.Width(s.String()) <= room {
		x = d.Text(x, y, label+" ", theme.Faint)
	}
	d.reading(x, y, width, s)
}

// stateOf writes the name of a contact and its state.
func (d *drawing) stateOf(x, y, width int, label, word string, p position) {
	end := d.Within(x, y, width, label+" ", theme.Faint)
	d.Within(end, y, width-(end-x), word, p.role())
}
