package canvas

import (
	"strings"

	"github.com/charmbracelet/x/ansi"

	"chargehand/tui/theme"
)

// No terminal is wider or higher than this; a greater size is taken for a mistake and cut down.
const (
	mostColumns = 2000
	mostRows    = 1000
)

// Canvas is a sheet of cells. Columns count from 0 at the left, rows from 0 at the top.
type Canvas struct {
	theme         theme.Theme
	width, height int
	cells         []cell
}

// cell is one column of one row. Text "" is a blank; a wide character fills its own cell and marks the next as covered.
type cell struct {
	text    string
	role    theme.Role
	covered bool
	wires   Side // conductors that leave this cell, where text is ""
	heavy   bool
}

// New makes an empty sheet. A size below 1×1 gives a sheet on which nothing is drawn.
func New(t theme.Theme, width, height int) *Canvas {
	width, height = min(max(width, 0), mostColumns), min(max(height, 0), mostRows)
	return &Canvas{theme: t, width: width, height: height, cells: make([]cell, width*height)}
}

// Width is the number of columns, Height the number of rows.
func (c *Canvas) Width() int  { return c.width }
func (c *Canvas) Height() int { return c.height }

func (c *Canvas) at(x, y int) *cell {
	if x < 0 || y < 0 || x >= c.width || y >= c.height {
		return nil
	}
	return &c.cells[y*c.width+x]
}

// set writes one grapheme of the given width, and mends wide characters that it cuts in two.
func (c *Canvas) set(x, y, width int, text string, role theme.Role) {
	if x < 0 || y < 0 || x+width > c.width || y >= c.height {
		return
	}
	c.uncover(x, y)
	c.cells[y*c.width+x] = cell{text: text, role: role}
	if width == 2 {
		c.uncover(x+1, y)
		c.cells[y*c.width+x+1] = cell{covered: true, role: role}
	}
}

func (c *Canvas) uncover(x, y int) {
	i := y*c.width + x
	if c.cells[i].covered {
		c.cells[i-1] = cell{}
	}
	if x+1 < c.width && c.cells[i+1].covered {
		c.cells[i+1] = cell{}
	}
}

// Text writes clean text from column x on and gives the first column behind it. What does not fit is dropped.
func (c *Canvas) Text(x, y int, text string, role theme.Role) int {
	for len(text) > 0 {
		if b := text[0]; b >= ' ' && b <= '~' && (len(text) == 1 || text[1] < 0x80) {
			c.set(x, y, 1, text[:1], role)
			x, text = x+1, text[1:]
			continue
		}
		cluster, width := ansi.FirstGraphemeCluster(text, ansi.GraphemeWidth)
		text = text[len(cluster):]
		if width < 1 || cluster[0] < ' ' || cluster[0] == 0x7F {
			continue
		}
		if width > 2 {
			cluster, width = "?", 1
		}
		c.set(x, y, width, cluster, role)
		x += width
	}
	return x
}

// Within writes clean text into at most width columns and marks a cut; it gives the first column behind the text.
func (c *Canvas) Within(x, y, width int, text string, role theme.Role) int {
	return c.Text(x, y, c.theme.Clip(text, width), role)
}

// Right writes clean text so that it ends before column x.
func (c *Canvas) Right(x, y, width int, text string, role theme.Role) {
	text = c.theme.Clip(text, width)
	c.Text(x-theme.Width(text), y, text, role)
}

// Centred writes clean text around column x, in at most width columns.
func (c *Canvas) Centred(x, y, width int, text string, role theme.Role) {
	text = c.theme.Clip(text, width)
	c.Text(x-theme.Width(text)/2, y, text, role)
}

// Put writes one character one column wide; the second stands in for it under --ascii.
func (c *Canvas) Put(x, y int, unicode, ascii string, role theme.Role) {
	c.set(x, y, 1, c.theme.Pick(unicode, ascii), role)
}

// IsBlank tells whether nothing is drawn in the columns from x on.
func (c *Canvas) IsBlank(x, y, width int) bool {
	for i := range width {
		if k := c.at(x+i, y); k == nil || k.text != "" || k.wires != 0 || k.covered {
			return false
		}
	}
	return true
}

// String is the sheet: Height lines of exactly Width columns, without a line break at the end.
func (c *Canvas) String() string {
	var b strings.Builder
	b.Grow(len(c.cells)*3 + c.height*16)
	for y := range c.height {
		if y > 0 {
			b.WriteByte('\n')
		}
		c.writeRow(&b, c.cells[y*c.width:(y+1)*c.width])
	}
	return b.String()
}

// writeRow writes runs of one role between one pair of escape sequences. Blanks belong to whatever stands before them,
// unless the role has a ground of its own.
func (c *Canvas) writeRow(b *strings.Builder, row []cell) {
	role, after := theme.Text, ""
	for i := range row {
		k := &row[i]
		if k.covered {
			continue
		}
		text := k.text
		if text == "" {
			text = c.glyph(k)
		}
		next := k.role
		if text == " " && k.text == "" {
			next = theme.Text
		}
		if next != role {
			b.WriteString(after)
			var before string
			before, after = c.theme.Codes(next)
			b.WriteString(before)
			role = next
		}
		b.WriteString(text)
	}
	b.WriteString(after)
}

// Theme is the theme that the sheet was made with.
func (c *Canvas) Theme() theme.Theme { return c.theme }
