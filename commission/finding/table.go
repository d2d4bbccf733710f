package finding

import (
	"fmt"
	"io"
	"slices"
	"strings"

	"github.com/mattn/go-runewidth"
)

// TableOptions say how a sheet is shown as a table.
type TableOptions struct {
	Width int  // columns of the terminal; below 80 it is taken as 80
	ASCII bool // no symbol beyond ASCII
	// Style colours the words of a verdict; nil leaves them plain. It must not change their width.
	Style func(v Verdict, text string) string
}

// narrow is the least width the table is laid out for; wide is where titles and margins find room.
const (
	narrow = 80
	wide   = 118
)

// WriteTable writes the sheet for people: a heading with the verdict of the whole, the families worst first and in each the
// findings worst first, aligned; below a finding that does not pass, why and what would help. It holds no escape codes but
// those that Style adds.
func (s Sheet) WriteTable(to io.Writer, o TableOptions) error {
	o.Width = max(o.Width, narrow)
	t := table{options: o}
	t.heading(s)
	families := s.families()
	t.measure(families)
	for _, family := range families {
		t.family(family)
	}
	_, err := io.WriteString(to, t.text.String())
	return err
}

// families are the findings grouped by the first word of their id, worst group first and worst finding first, otherwise in
// the order they came.
func (s Sheet) families() [][]Finding {
	var groups [][]Finding
	place := map[string]int{}
	for _, f := range s.Findings {
		name, _, _ := strings.Cut(f.ID, ".")
		k, known := place[name]
		if !known {
			k = len(groups)
			place[name] = k
			groups = append(groups, nil)
		}
		groups[k] = append(groups[k], f)
	}
	for _, g := range groups {
		slices.SortStableFunc(g, func(a, b Finding) int { return b.Verdict.rank() - a.Verdict.rank() })
	}
	slices.SortStableFunc(groups, func(a, b []Finding) int { return b[0].Verdict.rank() - a[0].Verdict.rank() })
	return groups
}

type table struct {
	options                                            TableOptions
	text                                               strings.Builder
	name, nominal, between, limit, marginWidth, titles int // column widths
}

func (t *table) heading(s Sheet) {
	title := s.Site
	if s.Reference != "" {
		title += " · " + s.Reference
	}
	word := strings.ToUpper(string(s.Verdict))
	title = t.plain(title)
	gap := t.options.Width - width(title) - width(word)
	if gap < 1 {
		title = clip(title, t.options.Width-width(word)-1, t.ellipsis())
		gap = t.options.Width - width(title) - width(word)
	}
	t.text.WriteString(title + strings.Repeat(" ", gap) + t.styled(s.Verdict, word) + "\n")
	counts := map[Verdict]int{}
	for _, f := range s.Findings {
		counts[f.Verdict]++
	}
	var words []string
	for _, v := range []Verdict{Fail, Undecided, Marginal, Pass, Info} {
		if counts[v] > 0 {
			words = append(words, fmt.Sprintf("%d %s", counts[v], v))
		}
	}
	t.text.WriteString(strings.Join(words, ", ") + "\n")
}

func (t *table) styled(v Verdict, text string) string {
	if t.options.Style == nil {
		return text
	}
	return t.options.Style(v, text)
}

// cells are the texts of one finding's row.
type cells struct{ name, nominal, between, limit, margin, title string }

func (t *table) cells(f Finding) cells {
	_, name, _ := strings.Cut(f.ID, ".")
	if f.Subject != "" {
		name += " " + f.Subject
	}
	digits := f.Digits()
	c := cells{name: name, nominal: f.printEnd(f.Value.Nominal, digits), between: f.printRange(digits), limit: f.printLimit(digits), title: f.Title}
	if f.Limit.IsGiven() {
		c.margin = Print(f.Margin, f.Unit, leastDigits)
	}
	return cells{t.plain(c.name), t.plain(c.nominal), t.plain(c.between), t.plain(c.limit), t.plain(c.margin), t.plain(c.title)}
}

// verdictWidth is the sign, a blank, and the longest word.
const verdictWidth = 2 + len("undecided")

// leastName is the least width of the name's column: the longest family-less id but its end.
const leastName = 12

// measure lays out the columns for all families alike; what is too wide loses its end, first the names, then the figures.
func (t *table) measure(families [][]Finding) {
	for _, family := range families {
		for _, f := range family {
			c := t.cells(f)
			t.name, t.nominal, t.between = max(t.name, width(c.name)), max(t.nominal, width(c.nominal)), max(t.between, width(c.between))
			t.limit, t.marginWidth = max(t.limit, width(c.limit)), max(t.marginWidth, width(c.margin))
		}
	}
	rest := t.options.Width - (2 + verdictWidth + 2 + 2 + t.nominal + 2 + t.between + 2 + t.limit)
	if t.options.Width >= wide {
		rest -= 2 + t.marginWidth
	} else {
		t.marginWidth = 0
	}
	for _, column := range []*int{&t.between, &t.limit, &t.nominal} {
		less := max(0, min(leastName-rest, *column-1))
		*column, rest = *column-less, rest+less
	}
	t.name = max(leastName, min(t.name, rest))
	if rest -= t.name + 2; t.options.Width >= wide && rest >= 16 {
		t.titles = rest
	}
}

func (t *table) family(findings []Finding) {
	name, _, _ := strings.Cut(findings[0].ID, ".")
	t.text.WriteString("\n" + name + "\n")
	for _, f := range findings {
		t.row(f)
		t.reasons(f)
	}
}

func (t *table) row(f Finding) {
	c := t.cells(f)
	verdict := pad(t.sign(f.Verdict)+" "+string(f.Verdict), verdictWidth)
	line := t.column(c.name, t.name, pad) + "  " + t.column(c.nominal, t.nominal, padLeft) + "  " + t.column(c.between, t.between, pad) + "  " + t.column(c.limit, t.limit, pad)
	if t.marginWidth > 0 {
		line += "  " + padLeft(c.margin, t.marginWidth)
	}
	if t.titles > 0 {
		line += "  " + clip(c.title, t.titles, t.ellipsis())
	}
	t.text.WriteString("  " + t.styled(f.Verdict, verdict) + "  " + strings.TrimRight(line, " ") + "\n")
}

// column fits a cell into its column.
func (t *table) column(text string, columns int, fill func(string, int) string) string {
	return fill(clip(text, columns, t.ellipsis()), columns)
}

// reasons stand below a finding that needs attention, and below a name that lost its end.
func (t *table) reasons(f Finding) {
	if c := t.cells(f); width(c.name) > t.name {
		t.wrapped(f.ID + ", " + f.Subject)
	}
	switch f.Verdict {
	case Undecided:
		t.wrapped("needs: " + strings.Join(f.Because, ", "))
		return
	case Fail, Marginal:
	default:
		return
	}
	if t.titles == 0 {
		t.wrapped(f.Title)
	}
	for _, b := range f.Because {
		t.wrapped(b)
	}
	if f.Remedy != "" {
		t.wrapped("remedy: " + f.Remedy)
	}
}

const reasonIndent = 6

func (t *table) wrapped(text string) {
	indent := strings.Repeat(" ", reasonIndent)
	for _, line := range wrap(t.plain(text), t.options.Width-reasonIndent) {
		t.text.WriteString(indent + line + "\n")
	}
}

func (t *table) sign(v Verdict) string {
	signs := map[Verdict]string{Fail: "✗", Undecided: "?", Marginal: "!", Pass: "✓", Info: "·"}
	if t.options.ASCII {
		signs = map[Verdict]string{Fail: "x", Undecided: "?", Marginal: "!", Pass: "+", Info: "."}
	}
	return signs[v]
}

func (t *table) ellipsis() string {
	if t.options.ASCII {
		return "~"
	}
	return "…"
}

// ascii spells the symbols that findings use; what remains beyond ASCII becomes a question mark.
var ascii = strings.NewReplacer("…", "..", "≤", "<=", "≥", ">=", "Ω", "ohm", "µ", "u", "°C", "degC", "²", "2", "·", "-", "–", "-", "−", "-",
	"×", "x", "⁄", "/", "√", "sqrt", "∥", "||", "Σ", "sum ", "Δ", "d", "η", "eta", "σ", "sigma", "π", "pi", "τ", "tau", "ω", "omega", "θ", "theta",
	"±", "+/-", "≠", "!=", "∫", "integral ", "½", "1/2", "′", "'", "→", "->", "’", "'", "“", "\"", "”", "\"")

func (t *table) plain(text string) string {
	if !t.options.ASCII {
		return text
	}
	return strings.Map(func(r rune) rune {
		if r > 126 {
			return '?'
		}
		return r
	}, ascii.Replace(text))
}

// terminal measures display columns; ambiguous characters are narrow.
var terminal = &runewidth.Condition{}

func width(s string) int { return terminal.StringWidth(s) }

func clip(s string, columns int, ellipsis string) string {
	if width(s) <= columns {
		return s
	}
	return terminal.Truncate(s, columns, ellipsis)
}

func pad(s string, columns int) string { return s + strings.Repeat(" ", max(0, columns-width(s))) }

func padLeft(s string, columns int) string {
	return strings.Repeat(" ", max(0, columns-width(s))) + s
}

// wrap breaks a text at blanks; a word that is longer than the line is cut.
func wrap(text string, columns int) []string {
	var lines []string
	line := ""
	for _, word := range strings.Fields(text) {
		if line != "" && width(line)+1+width(word) > columns {
			lines = append(lines, line)
			line = ""
		}
		for width(word) > columns {
			head := terminal.Truncate(word, columns, "")
			if head == "" {
				break
			}
			lines = append(lines, head)
			word = word[len(head):]
		}
		if line != "" {
			line += " "
		}
		line += word
	}
	if line != "" {
		lines = append(lines, line)
	}
	return lines
}
