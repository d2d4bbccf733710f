package report

import (
	"fmt"
	"io"
	"strings"
	"time"

	"codeberg.org/go-pdf/fpdf"
)

// Paper is a size of page.
type Paper string

// The sizes of paper.
const (
	A4     Paper = "a4"
	Letter Paper = "letter"
)

// IsKnown tells whether the paper is one of the two.
func (p Paper) IsKnown() bool { return p == A4 || p == Letter }

// The page in millimetres.
const (
	sideMargin   = 17.0
	topMargin    = 24.0 // the running head stands above it
	bottomMargin = 20.0 // the foot stands below it
)

// colour is red, green and blue.
type colour struct{ r, g, b int }

var (
	ink       = colour{26, 32, 44}
	quiet     = colour{96, 106, 122}
	rule      = colour{198, 205, 214}
	heading   = colour{22, 60, 102}
	shade     = colour{241, 244, 248}
	bandFill  = colour{205, 223, 241}
	bandLine  = colour{58, 110, 165}
	traceLine = colour{186, 62, 0}
	besideInk = colour{36, 120, 86}
	fitLine   = colour{110, 64, 150}
	white     = colour{255, 255, 255}
)

// sheet is a document in the making: a cursor that goes down the page, and a new page where it ends.
type sheet struct {
	pdf    *fpdf.Fpdf
	w, h   float64 // mm
	y      float64 // mm, where the next thing stands
	widths map[face]map[rune]float64
}

// properties are what a reader of the file is told about it.
type properties struct {
	title, subject, author string
	at                     time.Time
}

func newSheet(paper Paper, p properties) (*sheet, error) {
	if !paper.IsKnown() {
		return nil, fmt.Errorf("there is no paper %q; write a4 or letter", paper)
	}
	size := map[Paper]string{A4: "A4", Letter: "Letter"}[paper]
	pdf := fpdf.New("P", "mm", size, "")
	pdf.SetCatalogSort(true)
	pdf.SetProducer("chargehand", true)
	pdf.SetCreator("chargehand", true)
	pdf.SetTitle(clean(p.title, anyRune), true)
	pdf.SetSubject(clean(p.subject, anyRune), true)
	pdf.SetAuthor(clean(p.author, anyRune), true)
	pdf.SetCreationDate(p.at.UTC())
	pdf.SetModificationDate(p.at.UTC())
	pdf.SetLang("en")
	pdf.SetAutoPageBreak(false, 0)
	pdf.SetMargins(0, 0, 0)
	addFonts(pdf)
	s := &sheet{pdf: pdf, widths: map[face]map[rune]float64{}}
	s.w, s.h = pdf.GetPageSize()
	s.page()
	return s, pdf.Error()
}

func (s *sheet) page() {
	s.pdf.AddPage()
	s.pdf.SetLineCapStyle("butt")
	s.pdf.SetLineJoinStyle("round")
	s.y = topMargin
}

func (s *sheet) left() float64   { return sideMargin }
func (s *sheet) right() float64  { return s.w - sideMargin }
func (s *sheet) inner() float64  { return s.w - 2*sideMargin }
func (s *sheet) bottom() float64 { return s.h - bottomMargin }
func (s *sheet) room() float64   { return s.bottom() - s.y }

// need begins a new page unless so many millimetres are left.
func (s *sheet) need(height float64) {
	if s.room() < height && s.y > topMargin {
		s.page()
	}
}

func (s *sheet) gap(height float64) { s.y += height }

// lineHeight is the distance of two lines of a size in points, in millimetres.
func lineHeight(size float64) float64 { return size * 0.352778 * 1.32 }

// width of a text in millimetres.
func (s *sheet) width(f face, size float64, text string) float64 {
	known := s.widths[f]
	if known == nil {
		known = map[rune]float64{}
		s.widths[f] = known
	}
	sum := 0.0
	for _, r := range text {
		w, ok := known[r]
		if !ok {
			s.pdf.SetFont(f.family, f.style, 10)
			w = float64(s.pdf.GetStringSymbolWidth(string(r))) / 1000
			known[r] = w
		}
		sum += w
	}
	return sum * size * 0.352778
}

// text draws one line with its baseline at y.
func (s *sheet) text(x, y float64, f face, size float64, c colour, text string) {
	s.pdf.SetFont(f.family, f.style, size)
	s.pdf.SetTextColor(c.r, c.g, c.b)
	s.pdf.Text(x, y, visual(text))
}

func (s *sheet) textRight(x, y float64, f face, size float64, c colour, text string) {
	s.text(x-s.width(f, size, text), y, f, size, c, text)
}

func (s *sheet) textMiddle(x, y float64, f face, size float64, c colour, text string) {
	s.text(x-s.width(f, size, text)/2, y, f, size, c, text)
}

// wrap breaks a text into lines no wider than width; a word that is wider by itself is broken where it must be.
func (s *sheet) wrap(f face, size, width float64, text string) []string {
	text = clean(text, draws(f))
	var lines []string
	line, used := "", 0.0
	space := s.width(f, size, " ")
	flush := func() {
		lines = append(lines, line)
		line, used = "", 0
	}
	for _, word := range strings.Split(text, " ") {
		w := s.width(f, size, word)
		if line != "" && used+space+w > width {
			flush()
		}
		for w > width {
			cut := s.fits(f, size, width, word)
			line = word[:cut]
			flush()
			word = word[cut:]
			w = s.width(f, size, word)
		}
		if line == "" {
			line, used = word, w
			continue
		}
		line, used = line+" "+word, used+space+w
	}
	return append(lines, line)
}

// fits is how many bytes of a word fit into a width, at least one letter.
func (s *sheet) fits(f face, size, width float64, word string) int {
	used := 0.0
	for i, r := range word {
		used += s.width(f, size, string(r))
		if used > width && i > 0 {
			return i
		}
	}
	return len(word)
}

// short cuts a text to one line, with an ellipsis where it was longer.
func (s *sheet) short(f face, size, width float64, text string) string {
	text = clean(text, draws(f))
	if s.width(f, size, text) <= width {
		return text
	}
	return text[:s.fits(f, size, width-s.width(f, size, "…"), text)] + "…"
}

// paragraph writes a text over the whole width, or within a part of it from x on.
func (s *sheet) paragraph(f face, size float64, c colour, text string) {
	s.paragraphAt(s.left(), s.inner(), f, size, c, text)
}

func (s *sheet) paragraphAt(x, width float64, f face, size float64, c colour, text string) {
	for _, line := range s.wrap(f, size, width, text) {
		s.need(lineHeight(size))
		s.text(x, s.y+size*0.352778, f, size, c, line)
		s.y += lineHeight(size)
	}
}

// title begins a section.
func (s *sheet) title(text string) {
	s.need(30)
	if s.y > topMargin {
		s.gap(6)
	}
	s.bookmark(text, 0)
	s.text(s.left(), s.y+4.6, bold, 13, heading, text)
	s.y += 7
	s.line(s.left(), s.y, s.right(), s.y, 0.5, heading)
	s.y += 3.5
}

// subtitle begins a part of a section.
func (s *sheet) subtitle(text string) {
	s.need(18)
	s.gap(2)
	s.text(s.left(), s.y+3.6, bold, 10, heading, s.short(bold, 10, s.inner(), text))
	s.y += 6
}

func (s *sheet) bookmark(text string, level int) {
	s.pdf.SetFont(regular.family, regular.style, 9)
	s.pdf.Bookmark(text, level, s.y)
}

func (s *sheet) line(x1, y1, x2, y2, width float64, c colour) {
	s.pdf.SetDrawColor(c.r, c.g, c.b)
	s.pdf.SetLineWidth(width)
	s.pdf.Line(x1, y1, x2, y2)
}

// box draws a filled rectangle with a border; either may be left out by giving white, or a width of 0.
func (s *sheet) box(x, y, w, h float64, fill colour, width float64, border colour) {
	s.pdf.SetFillColor(fill.r, fill.g, fill.b)
	style := "F"
	if width > 0 {
		s.pdf.SetDrawColor(border.r, border.g, border.b)
		s.pdf.SetLineWidth(width)
		style = "FD"
	}
	s.pdf.Rect(x, y, w, h, style)
}

// furniture stands on every page; it is drawn last, when the number of pages is known.
type furniture struct {
	head, headRight string
	foot            []string
	marks           []Mark
}

func (s *sheet) furnish(f furniture) {
	pages := s.pdf.PageCount()
	for page := 1; page <= pages; page++ {
		s.pdf.SetPage(page)
		s.pdf.SetFont(regular.family, regular.style, 9) // the page has its own state: say the font anew
		s.furnishPage(f, page, pages)
	}
}

func (s *sheet) furnishPage(f furniture, page, pages int) {
	y := 13.0
	x := s.left()
	for _, m := range f.marks {
		w := s.width(bold, 9, string(m)) + 4
		s.box(x, y-4.2, w, 5.8, traceLine, 0, ink)
		s.text(x+2, y, bold, 9, white, string(m))
		x += w + 2
	}
	if len(f.marks) > 0 {
		x += 1
	}
	s.textRight(s.right(), y, regular, 8, quiet, f.headRight)
	s.text(x, y, bold, 8, ink, s.short(bold, 8, s.right()-x-s.width(regular, 8, f.headRight)-4, f.head))
	s.line(s.left(), y+3, s.right(), y+3, 0.25, rule)

	y = s.h - bottomMargin + 5
	s.line(s.left(), y-2, s.right(), y-2, 0.25, rule)
	s.textRight(s.right(), y+2, regular, 8, ink, fmt.Sprintf("page %d of %d", page, pages))
	for i, line := range f.foot {
		s.text(s.left(), y+1.6+3.2*float64(i), mono, 6.2, quiet, s.short(mono, 6.2, s.inner()-26, line))
	}
	s.watermark(f.marks)
}

// watermark writes the marks across the page, light enough to read through.
func (s *sheet) watermark(marks []Mark) {
	if len(marks) == 0 {
		return
	}
	words := make([]string, len(marks))
	for i, m := range marks {
		words[i] = string(m)
	}
	text := strings.Join(words, " · ")
	diagonal := 0.8 * s.h
	size := min(92, 92*diagonal/s.width(bold, 92, text))
	s.pdf.SetAlpha(0.10, "Normal")
	s.pdf.TransformBegin()
	s.pdf.TransformRotate(54, s.w/2, s.h/2)
	s.textMiddle(s.w/2, s.h/2+size*0.352778*0.36, bold, size, traceLine, text)
	s.pdf.TransformEnd()
	s.pdf.SetAlpha(1, "Normal")
}

func (s *sheet) write(w io.Writer) error {
	if err := s.pdf.Error(); err != nil {
		return fmt.Errorf("make the PDF: %w", err)
	}
	return s.pdf.Output(w)
}
