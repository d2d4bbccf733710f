package report

import "strings"

// column is one column of a table.
type column struct {
	title string
	share float64 // of the width, in parts of the sum of all shares
	face  face    // regular where it is not given
	right bool
}

// cell is one field; its paragraphs stand below one another.
type cell struct {
	lines []styled
}

// styled is a paragraph with its look.
type styled struct {
	text   string
	face   face
	size   float64
	colour colour
}

const tableSize = 7.6

func plain(text string) cell { return cell{[]styled{{text, regular, tableSize, ink}}} }

func strong(text string) cell { return cell{[]styled{{text, bold, tableSize, ink}}} }

func coloured(text string, c colour) cell { return cell{[]styled{{text, bold, tableSize, c}}} }

// under adds a small quiet paragraph below; nothing for an empty text.
func (c cell) under(text string) cell {
	if text != "" {
		c.lines = append(c.lines, styled{text, regular, 6.6, quiet})
	}
	return c
}

// table draws rows under a head that stands again on every page. A row that does not fit on what is left of a page begins
// on the next; one that is longer than a page is carried on.
type table struct {
	sheet   *sheet
	columns []column
	x, w    []float64
	headed  bool
	dense   bool // rows of names and values, close together
}

const cellPad = 1.3

// pad is the room above and below a row.
func (t *table) pad() float64 {
	if t.dense {
		return 0.55
	}
	return cellPad
}

func (s *sheet) table(columns ...column) *table {
	t := &table{sheet: s, columns: columns}
	sum := 0.0
	for _, c := range columns {
		sum += c.share
	}
	x := s.left()
	for _, c := range columns {
		w := s.inner() * c.share / sum
		t.x, t.w = append(t.x, x), append(t.w, w)
		x += w
	}
	return t
}

func (t *table) head() {
	s := t.sheet
	s.need(16)
	s.box(s.left(), s.y, s.inner(), 5.2, shade, 0, ink)
	for i, c := range t.columns {
		if c.right {
			s.textRight(t.x[i]+t.w[i]-cellPad, s.y+3.6, bold, 7, quiet, c.title)
			continue
		}
		s.text(t.x[i]+cellPad, s.y+3.6, bold, 7, quiet, c.title)
	}
	s.y += 5.2
	t.headed = true
}

// wrapped is one line of a cell ready to draw.
type wrapped struct {
	text   string
	look   styled
	height float64
}

// row draws one row; wide, where given, stands below it over the whole width.
func (t *table) row(cells []cell, wide ...styled) {
	s := t.sheet
	lines := make([][]wrapped, len(cells))
	height := 0.0
	for i, c := range cells {
		lines[i] = t.wrap(c, t.w[i]-2*cellPad)
		height = max(height, heightOf(lines[i]))
	}
	below := t.wrap(cell{wide}, s.inner()-2*cellPad)
	whole := height + heightOf(below) + 2*t.pad()
	if !t.headed {
		if whole+8 > s.room() && s.y > topMargin+8 { // the head does not stand alone
			s.page()
		}
		t.head()
	}
	if whole > s.room() && s.y > topMargin+8 {
		s.page()
		t.head()
	}
	t.draw(lines)
	t.drawWide(below)
	s.y += t.pad()
	s.line(s.left(), s.y, s.right(), s.y, 0.15, rule)
}

func (t *table) wrap(c cell, width float64) []wrapped {
	var lines []wrapped
	for _, p := range c.lines {
		for _, text := range t.sheet.wrap(p.face, p.size, width, p.text) {
			lines = append(lines, wrapped{text, p, lineHeight(p.size)})
		}
	}
	return lines
}

func heightOf(lines []wrapped) float64 {
	sum := 0.0
	for _, l := range lines {
		sum += l.height
	}
	return sum
}

// draw draws the cells of one row side by side, over as many pages as they need.
func (t *table) draw(cells [][]wrapped) {
	s := t.sheet
	s.y += t.pad()
	for {
		left, deepest := false, s.y
		for i, lines := range cells {
			y := s.y
			for len(lines) > 0 && y+lines[0].height <= s.bottom()+0.01 {
				t.put(i, y, lines[0])
				y += lines[0].height
				lines = lines[1:]
			}
			cells[i] = lines
			left = left || len(lines) > 0
			deepest = max(deepest, y)
		}
		if !left {
			s.y = deepest
			return
		}
		s.page()
		t.head()
		s.y += cellPad
	}
}

func (t *table) put(i int, y float64, l wrapped) {
	s := t.sheet
	base := y + l.look.size*0.352778
	if t.columns[i].right {
		s.textRight(t.x[i]+t.w[i]-cellPad, base, l.look.face, l.look.size, l.look.colour, l.text)
		return
	}
	s.text(t.x[i]+cellPad, base, l.look.face, l.look.size, l.look.colour, l.text)
}

func (t *table) drawWide(lines []wrapped) {
	s := t.sheet
	for _, l := range lines {
		if l.height > s.room() {
			s.page()
			t.head()
			s.y += cellPad
		}
		s.text(s.left()+cellPad, s.y+l.look.size*0.352778, l.look.face, l.look.size, l.look.colour, l.text)
		s.y += l.height
	}
}

// note is a small paragraph below a row.
func note(label, text string) []styled {
	if strings.TrimSpace(text) == "" {
		return nil
	}
	return []styled{{label + text, regular, 6.6, quiet}}
}
