package far

import (
	"slices"

	"chargehand/tui/canvas"
	"chargehand/tui/theme"
)

// plan says how the blocks share the screen.
type plan struct {
	columns, rows int // of blocks
	scale
}

// scale is the size of one dot: columns, and half rows (whole rows in ASCII, where a dot is never half a row).
type scale struct{ x, y int }

// better prefers higher digits, then wider ones.
func (s scale) better(o scale) bool {
	if s.y != o.y {
		return s.y > o.y
	}
	return s.x > o.x
}

// arrange tries the blocks below each other, beside each other and in two columns, and takes what gives the largest
// digits, the same for all blocks.
func arrange(blocks []block, t theme.Theme, width, height int) plan {
	best := plan{columns: 1, rows: len(blocks)}
	for columns := 1; columns <= len(blocks); columns++ {
		rows := (len(blocks) + columns - 1) / columns
		w, h := width/columns, height/rows
		s := scale{1 << 20, 1 << 20}
		for _, b := range blocks {
			if own := b.largest(t, w-2, h-b.lines()); s.better(own) {
				s = own
			}
		}
		if s.better(best.scale) {
			best = plan{columns, rows, s}
		}
	}
	return best
}

// lines is how many rows of plain text stand above and below the digits.
func (b block) lines() int {
	n := 1
	if b.limit != "" || b.note != "" {
		n++
	}
	return n
}

// text is what is drawn in glyphs.
func (b block) text() string {
	if b.unit == "" {
		return b.number
	}
	return b.number + " " + b.unit
}

// largest is the greatest size at which the block's text fits into so many columns and rows. A dot is about square, and
// at most as high as twice its width, so that digits keep their shape.
func (b block) largest(t theme.Theme, columns, rows int) scale {
	halves := 2
	if t.ASCII() {
		halves = 1
	}
	dots := dotsWide(b.text())
	if dots == 0 || columns < dots || rows*halves < glyphHeight {
		return scale{}
	}
	s := scale{x: columns / dots, y: rows * halves / glyphHeight}
	if t.ASCII() { // a row is about as high as two columns are wide
		return scale{min(s.x, 3*s.y), min(s.y, s.x)}
	}
	return scale{min(s.x, 2*s.y), min(s.y, 2*s.x)}
}

// drawAll draws the blocks as large as there is room for: all in large digits, or where that cannot be only the first
// ones, from the last on giving up for a line of plain text at the bottom.
func drawAll(c *canvas.Canvas, blocks []block, top, bottom int) {
	for large := len(blocks); large > 0; large-- {
		plain := len(blocks) - large
		for tightness := range 3 {
			some := slices.Clone(blocks[:large])
			for i := range some {
				some[i] = some[i].tightened(tightness)
			}
			p := arrange(some, c.Theme(), c.Width(), bottom-plain-top)
			if p.x == 0 || p.y == 0 {
				continue
			}
			p.draw(c, some, top, bottom-plain)
			for i, b := range blocks[large:] {
				b.drawPlain(c, bottom-plain+i)
			}
			return
		}
	}
	for i, b := range blocks {
		b.drawPlain(c, top+i)
	}
}

// tightened is the block with less around its digits: at 1 all its words stand in one row, at 2 the unit too is among them.
func (b block) tightened(tightness int) block {
	if tightness < 1 {
		return b
	}
	if tightness > 1 && b.unit != "" {
		b.label += " in " + b.unit
		b.unit = ""
	}
	for _, more := range []string{b.note, b.limit} {
		if more != "" {
			b.label += ", " + more
			break
		}
	}
	b.note, b.limit = "", ""
	return b
}

func (p plan) draw(c *canvas.Canvas, blocks []block, top, bottom int) {
	w, h := c.Width()/p.columns, (bottom-top)/p.rows
	for i, b := range blocks {
		b.draw(c, p.scale, i%p.columns*w, top+i/p.columns*h, w, h)
	}
}

// draw puts the block into the middle of its field.
func (b block) draw(c *canvas.Canvas, s scale, x, y, width, height int) {
	middle := x + width/2
	tall := s.rows(c)
	y += max(0, (height-tall-b.lines())/2)
	c.Centred(middle, y, width, b.label, theme.Text)
	b.glyphs(c, s, middle-dotsWide(b.text())*s.x/2, y+1)
	switch {
	case b.note != "":
		c.Centred(middle, y+1+tall, width, b.note, b.role)
	case b.limit != "":
		c.Centred(middle, y+1+tall, width, b.limit, theme.Text)
	}
}

// drawPlain writes the block on one row: the value first, since half a number is another number.
func (b block) drawPlain(c *canvas.Canvas, y int) {
	text := b.text()
	if b.note != "" {
		text = b.note
	}
	if theme.Width(text) > c.Width() {
		text = "?"
	}
	b.note = ""
	end := c.Text(0, y, text, b.role) + 1
	c.Within(end, y, c.Width()-end, b.tightened(1).label, theme.Text)
}

// rows is how many rows a glyph takes.
func (s scale) rows(c *canvas.Canvas) int {
	if c.Theme().ASCII() {
		return glyphHeight * s.y
	}
	return (glyphHeight*s.y + 1) / 2
}

// glyphs draws the text with its upper left dot at x, y.
func (b block) glyphs(c *canvas.Canvas, s scale, x, y int) {
	ascii := c.Theme().ASCII()
	for _, r := range b.text() {
		g := glyph(r)
		width := len(g[0]) * s.x
		for row := range s.rows(c) {
			for column := range width {
				if ascii {
					if g[row/s.y][column/s.x] == '#' {
						c.Text(x+column, y+row, "#", b.role)
					}
					continue
				}
				upper := g[2*row/s.y][column/s.x] == '#'
				lower := (2*row+1)/s.y < glyphHeight && g[(2*row+1)/s.y][column/s.x] == '#'
				if half := halfBlock(upper, lower); half != "" {
					c.Text(x+column, y+row, half, b.role)
				}
			}
		}
		x += width + s.x
	}
}

func halfBlock(upper, lower bool) string {
	switch {
	case upper && lower:
		return "█"
	case upper:
		return "▀"
	case lower:
		return "▄"
	}
	return ""
}
