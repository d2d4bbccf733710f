package chart

import (
	"math"

	"chargehand/tui/canvas"
	"chargehand/tui/theme"
)

// raster is the plot's area in dots. Each layer has its own dots; of the layers in one cell the last drawn is shown, so
// that a trace is never thickened by the line behind it.
type raster struct {
	columns, rows int
	perX, perY    int // dots to a cell
	bits          []uint8
	roles         []theme.Role
	marks         []mark // a character that stands for itself, instead of dots
}

// mark is a character among the dots.
type mark uint8

const (
	noMark mark = iota
	above
	below
	leftOf
	rightOf
	point
	upright
	cursorLine
)

var markSigns = [...][2]string{noMark: {" ", " "}, above: {"▲", "^"}, below: {"▼", "v"}, leftOf: {"◀", "<"}, rightOf: {"▶", ">"},
	point: {"●", "o"}, upright: {"┊", "|"}, cursorLine: {"│", "|"}}

func newRaster(columns, rows int, form Form) *raster {
	r := &raster{columns: columns, rows: rows, perX: 1, perY: 1}
	switch form {
	case Braille:
		r.perX, r.perY = 2, 4
	case Block:
		r.perY = 2
	}
	r.bits = make([]uint8, columns*rows)
	r.roles = make([]theme.Role, columns*rows)
	r.marks = make([]mark, columns*rows)
	return r
}

// middle is the dot of a cell on which the cell's own value lies, counted from the bottom dot of the cell.
func (r *raster) middle() int { return r.perY / 2 }

// dot gives the dot of a place in cells. Rows count upwards here, as values do.
func (r *raster) dot(column, row float64) (x, y int) {
	return int(math.Round(column * float64(r.perX))), int(math.Round(row*float64(r.perY))) + r.middle()
}

// plot sets a dot in a role's layer; of two roles in a cell the later one stays.
func (r *raster) plot(x, y int, role theme.Role) {
	if x < 0 || y < 0 {
		return
	}
	column, row := x/r.perX, y/r.perY
	if column >= r.columns || row >= r.rows {
		return
	}
	i := (r.rows-1-row)*r.columns + column
	if r.roles[i] != role || r.marks[i] != noMark {
		r.bits[i], r.marks[i], r.roles[i] = 0, noMark, role
	}
	r.bits[i] |= 1 << ((y%r.perY)*r.perX + x%r.perX)
}

// mark puts a character into the cell of a place.
func (r *raster) mark(column, row int, sign mark, role theme.Role) {
	if column < 0 || row < 0 || column >= r.columns || row >= r.rows {
		return
	}
	i := (r.rows-1-row)*r.columns + column
	r.bits[i], r.marks[i], r.roles[i] = 0, sign, role
}

// line joins two dots; only every dash-th dot is set.
func (r *raster) line(x0, y0, x1, y1, dash int, role theme.Role) {
	steps := max(abs(x1-x0), abs(y1-y0))
	for i := 0; i <= steps; i++ {
		x, y := x0, y0
		if steps > 0 {
			x += int(math.Round(float64(i*(x1-x0)) / float64(steps)))
			y += int(math.Round(float64(i*(y1-y0)) / float64(steps)))
		}
		if dash <= 1 || (x+y)%dash == 0 {
			r.plot(x, y, role)
		}
	}
}

func abs(v int) int {
	if v < 0 {
		return -v
	}
	return v
}

// brailleDot is the bit of each dot of a Braille cell, from the bottom row up, left before right (Unicode 16.0, block
// Braille Patterns: dots 7 8, 3 6, 2 5, 1 4).
var brailleDot = [8]uint8{0x40, 0x80, 0x04, 0x20, 0x02, 0x10, 0x01, 0x08}

var braille = func() (glyphs [256]string) {
	for i := range glyphs {
		glyphs[i] = string(rune(0x2800 + i))
	}
	return glyphs
}()

var halves = [4]string{" ", "▄", "▀", "█"}

// onto writes the raster on a sheet, its upper left corner at x, y.
func (r *raster) onto(c *canvas.Canvas, x, y int, ascii func(theme.Role) string) {
	for i, bits := range r.bits {
		at, to := x+i%r.columns, y+i/r.columns
		switch {
		case r.marks[i] != noMark:
			c.Put(at, to, markSigns[r.marks[i]][0], markSigns[r.marks[i]][1], r.roles[i])
		case bits == 0:
		case r.perY == 4:
			var glyph uint8
			for k, b := range brailleDot {
				if bits&(1<<k) != 0 {
					glyph |= b
				}
			}
			c.Put(at, to, braille[glyph], braille[glyph], r.roles[i])
		case r.perY == 2 && r.roles[i] != theme.Band:
			c.Put(at, to, halves[bits&3], halves[bits&3], r.roles[i])
		case r.perY == 2:
			c.Text(at, to, "░", theme.Band)
		default:
			c.Text(at, to, ascii(r.roles[i]), r.roles[i])
		}
	}
}
