package main

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
	"time"

	"chargehand/commission/quantity"
	"chargehand/commission/signal"
	"chargehand/protocol/registermap"
	"chargehand/tui/theme"
)

// linkWidth is the width that everything `link` prints keeps to.
const linkWidth = 80

// inASCII spells the signs of units and texts with ASCII.
var inASCII = strings.NewReplacer("°C", "degC", "Ω", "ohm", "µ", "u", "±", "+-", "×", "x", "²", "2", "−", "-", "…", "...", "→", "->")

// printLine prints a line of a result, harmless to the terminal and no wider than it need be: what does not fit goes on below,
// further in.
func (a *app) printLine(line string) { fmt.Fprintln(a.out, a.narrow(line)) }

func (a *app) narrow(line string) string {
	line = theme.Clean(line)
	if a.ascii {
		line = inASCII.Replace(line)
	}
	return strings.Join(wrapped(line, linkWidth), "\n")
}

// wrapped breaks a line at blanks; what follows stands two columns further in than it did.
func wrapped(line string, width int) []string {
	indent := strings.Repeat(" ", len(line)-len(strings.TrimLeft(line, " "))+2)
	var out []string
	for theme.Width(line) > width {
		cut := breakAt(line, width, len(indent))
		if cut < 0 {
			break
		}
		out = append(out, strings.TrimRight(line[:cut], " "))
		line = indent + strings.TrimLeft(line[cut:], " ")
	}
	return append(out, line)
}

// breakAt gives the last blank at which a line fits the width; -1 where there is none behind its indent.
func breakAt(line string, width, indent int) int {
	best := -1
	for i, r := range line {
		if i > 0 && theme.Width(line[:i]) > width {
			break
		}
		if r == ' ' && i > indent && strings.TrimSpace(line[:i]) != "" {
			best = i
		}
	}
	return best
}

// place is a signal's address both ways: "holding 100 (40101)", "holding 120.3 (40121)" for a bit of a register.
func place(p registermap.Point) string {
	bit := ""
	if p.Type == registermap.Bit && !p.Table.HasBits() {
		bit = fmt.Sprintf(".%d", p.BitNumber)
	}
	return fmt.Sprintf("%s %d%s (%s)", p.Table, p.Address, bit, p.Reference())
}

// shown is a value with its unit, to the step of its register, so that it can be compared with the device's own display.
func shown(p registermap.Point, value float64) string {
	unit := p.Name.Unit()
	step := math.Abs(p.Scale * p.UnitFactor)
	switch {
	case math.IsNaN(value):
		return "no value"
	case p.Values != nil || unit == "":
		return strconv.FormatFloat(value, 'g', 6, 64)
	case math.Abs(value) >= 1e10 || value != 0 && math.Abs(value) < 1e-4 && isFloat(p): // no plant's, but what the words say
		return strconv.FormatFloat(value, 'g', 3, 64) + " " + unit
	case math.Abs(value) >= 1e5:
		return quantity.Engineering(value, unit, 5)
	case isFloat(p) || step == 0:
		return strconv.FormatFloat(value, 'g', 6, 64) + " " + unit
	}
	decimals := max(0, int(math.Ceil(-math.Log10(step)-1e-9)))
	return strconv.FormatFloat(value, 'f', decimals, 64) + " " + unit
}

func isFloat(p registermap.Point) bool { return p.Type == registermap.F32 || p.Type == registermap.F64 }

func tableHead() string {
	return fmt.Sprintf("%-21s %-22s %-9s %10s %6s %s", "signal", "place", "raw", "value", "age", "state")
}

// tableRows are a signal's line of the table, and beneath it the raw words where they are too many for their column.
func tableRows(p registermap.Point, r signal.Reading, at time.Time) []string {
	value, age := "", ""
	if r.Quality.HasValue() {
		value = shown(p, r.Value)
	}
	if !r.At.IsZero() {
		age = theme.Age(max(r.Age(at), 0))
	}
	raw := registermap.Hex(r.Raw)
	var below []string
	if theme.Width(raw) > 9 {
		below = append(below, "  raw "+raw)
		raw = ""
	}
	row := fmt.Sprintf("%-21s %-22s %-9s %s %6s %s", p.Name, place(p), raw, right(value, 10), age, r.Quality)
	return append([]string{row}, below...)
}

// right sets a text to the right by its width on the screen.
func right(text string, width int) string {
	return strings.Repeat(" ", max(0, width-theme.Width(text))) + text
}

// detail is what stands around a signal's registers, and every reading of it that a plant could have; a star marks those that
// agree with what is expected.
func detail(p registermap.Point, own uint8, w registermap.Words, e expectation, expected bool) []string {
	lines := []string{fmt.Sprintf("%s, %s, %s", p.Name, place(p), p.Type), "  registers " + neighbours(p, own, w)}
	if p.Type == registermap.Bit {
		return append(lines, bits(p, own, w)...)
	}
	if expected {
		lines = append(lines, "  expected  "+e.text(p))
	}
	if items := readings(p, own, w, e, expected); len(items) > 0 {
		lines = append(lines, "  readings  "+strings.Join(items, "; "))
	}
	if words, ok := w.Of(p, own); ok {
		if odd := registermap.Hint(p, words); odd != "" {
			lines = append(lines, "  odd       "+odd)
		}
	}
	return lines
}

// bits tells which bits of a register are set.
func bits(p registermap.Point, own uint8, w registermap.Words) []string {
	words, ok := w.Of(p, own)
	if !ok || p.Table.HasBits() {
		return nil
	}
	set := "none"
	for i := range 16 {
		if words[0]>>i&1 == 1 {
			set = strings.TrimPrefix(set, "none") + fmt.Sprintf(" %d", i)
		}
	}
	return []string{"  bits set  " + strings.TrimSpace(set)}
}

// readings are what a signal reads as mapped and with each single line of the map changed; ways that read the same stand
// together.
func readings(p registermap.Point, own uint8, w registermap.Words, e expectation, expected bool) []string {
	type reading struct {
		ways  []string
		value string
	}
	var all []reading
	for i, h := range registermap.Decodings(p, own, w) {
		words, read := w.Of(h.Point, own)
		if !read || i > 0 && (!isPossible(p.Name, h.Value) || h.Value == 0) {
			continue
		}
		value := shown(h.Point, h.Value)
		if r := h.Point.Decode(words); !r.Quality.HasValue() {
			value = "no value"
		} else if expected && e.agrees(h.Point, h.Value) {
			value += "*"
		}
		if at := slices.IndexFunc(all, func(r reading) bool { return r.value == value }); at >= 0 {
			all[at].ways = append(all[at].ways, way(h))
		} else {
			all = append(all, reading{[]string{way(h)}, value})
		}
	}
	var items []string
	for _, r := range all {
		items = append(items, strings.Join(r.ways, ", ")+": "+r.value)
	}
	return items
}

// neighbours are the raw words from three before a signal to three behind it; the signal's own stand in brackets.
func neighbours(p registermap.Point, own uint8, w registermap.Words) string {
	unit := own
	if p.HasUnitID {
		unit = p.UnitID
	}
	from, to := max(0, int(p.Address)-3), min(65535, int(p.Address)+p.Words()+2)
	var words []string
	for at := from; at <= to; at++ {
		text := "----"
		if v, ok := w[registermap.Register{UnitID: unit, Table: p.Table, Address: registermap.Address(at)}]; ok {
			text = registermap.Hex([]uint16{v})
		}
		if at >= int(p.Address) && at < int(p.Address)+p.Words() {
			text = "[" + text + "]"
		}
		words = append(words, text)
	}
	return fmt.Sprintf("%d to %d: %s", from, to, strings.Join(words, " "))
}

// way is how a reading differs from the map's, in few words.
func way(h registermap.Hypothesis) string {
	if len(h.Changes) == 0 {
		return "as mapped"
	}
	var words []string
	for _, c := range h.Changes {
		to := strings.Trim(c.To, `"`)
		switch c.Key {
		case "word_order":
			to += " words"
		case "byte_order":
			to += " bytes"
		case "type":
		case "table":
			to += fmt.Sprintf(" %d", h.Point.Address)
		case "sign_reversed":
			to = "sign reversed"
			if !h.Point.SignReversed {
				to = "sign not reversed"
			}
		case "address":
			to = fmt.Sprintf("%s %s", h.Point.Table, to)
		default:
			to = c.Key + " " + to
		}
		words = append(words, to)
	}
	return strings.Join(words, ", ")
}

// mostPossible are values beyond any plant, by unit. Common practice.
var mostPossible = map[string]float64{"V": 1e4, "A": 2e4, "W": 1e8, "°C": 1e3, "Ω": 1e10, "V/A": 100, "": 1e10}

// leastPossible is the least size of a number that is none by accident of its bits, as a float of other words is.
const leastPossible = 1e-6

// isPossible tells whether some plant could have this value.
func isPossible(n signal.Name, value float64) bool {
	most := mostPossible[n.Unit()]
	least := -most
	switch n.Unit() {
	case "Ω", "V/A":
		least = 0
	case "°C":
		least = -60
	}
	return value >= least && value <= most && (value == 0 || math.Abs(value) >= leastPossible)
}

// text is an expectation in words.
func (e expectation) text(p registermap.Point) string {
	if e.isNarrow() {
		s := shown(p, e.Value)
		if e.Tolerance > 0 {
			s += " ± " + quantity.Engineering(e.Tolerance, p.Name.Unit(), 2)
		}
		return s + ", " + e.why
	}
	return fmt.Sprintf("%s to %s: %s", quantity.Engineering(e.Value-e.Tolerance, p.Name.Unit(), 3),
		quantity.Engineering(e.Value+e.Tolerance, p.Name.Unit(), 3), e.why)
}
