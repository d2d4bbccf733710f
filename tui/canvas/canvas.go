package canvas

import (
	"unicode/utf8"

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
	clusters      []string // characters made of several code points
}

// cell is one column of one row, without pointers so that a sheet costs the collector nothing. A wide character fills its
// own cell and marks the next as covered.
type cell struct {
	char    rune // 0: nothing; below 0: clusters[-1-char]
	role    theme.Role
	covered bool
	wires   Side // conductors that leave this cell, where char is 0
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
	c.cells[y*c.width+x] = cell{char: c.char(text), role: role}
	if width == 2 {
		c.uncover(x+1, y)
		c.cells[y*c.width+x+1] = cell{covered: true, role: role}
	}
}

// char is how a cell names a character.
func (c *Canvas) char(text string) rune {
	if r, size := utf8.DecodeRuneInString(text); size == len(text) {
		return r
	}
	c.clusters = append(c.clusters, text)
	return -rune(len(c.clusters))
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

// Text writes clean text from column x on and gives the first column behind it. What does not fit is dropped. It counts
// columns as [theme.Width] does: an ASCII letter by itself, anything else by the character with its marks.
func (c *Canvas) Text(x, y int, text string, role theme.Role) int {
	last := -1 // column of the character before
	for len(text) > 0 {
		cluster, width := text[:1], 1
		if text[0] < ' ' || text[0] > '~' {
			cluster, width = ansi.FirstGraphemeCluster(text, ansi.GraphemeWidth)
		}
		text = text[len(cluster):]
		switch {
		case cluster[0] < ' ' || cluster[0] == 0x7F:
		case width < 1:
			c.addMark(last, y, cluster)
		default:
			c.set(x, y, width, cluster, role)
			last = x
			x += width
		}
	}
	return x
}

// addMark joins a combining mark to the character in a cell.
func (c *Canvas) addMark(x, y int, mark string) {
	if k := c.at(x, y); k != nil && k.char != 0 {
		k.char = c.char(string(c.append(nil, k)) + mark)
	}
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
		if k := c.at(x+i, y); k == nil || k.char != 0 || k.wires != 0 || k.covered {
			return false
		}
	}
	return true
}

// String is the sheet: Height lines of exactly Width columns, without a line break at the end.
func (c *Canvas) String() string {
	b := make([]byte, 0, len(c.cells)*3+c.height*64)
	for y := range c.height {
		if y > 0 {
			b = append(b, '\n')
		}
		b = c.appendRow(b, c.cells[y*c.width:(y+1)*c.width])
	}
	return string(b)
}

// appendRow writes runs of one role between one pair of escape sequences.
func (c *Canvas) appendRow(b []byte, row []cell) []byte {
	role, after := theme.Text, ""
	for i := range row {
		k := &row[i]
		if k.covered {
			continue
		}
		next := k.role
		if k.char == 0 && k.wires == 0 {
			next = theme.Text
		}
		if next != role {
			b = append(b, after...)
			var before string
			before, after = c.theme.Codes(next)
			b = append(b, before...)
			role = next
		}
		b = c.append(b, k)
	}
	return append(b, after...)
}

func (c *Canvas) append(b []byte, k *cell) []byte {
	switch {
	case k.char > 0:
		return utf8.AppendRune(b, k.char)
	case k.char < 0:
		return append(b, c.clusters[-1-k.char]...)
	}
	return append(b, c.glyph(k)...)
}

// Theme is the theme that the sheet was made with.
func (c *Canvas) Theme() theme.Theme { return c.theme }
