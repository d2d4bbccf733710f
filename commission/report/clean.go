package report

import (
	"fmt"
	"regexp"
	"slices"
	"strings"
	"unicode"
	"unicode/utf8"

	"golang.org/x/text/unicode/bidi"
)

// clean makes a text from the log harmless and visible: a control, a direction mark, a joiner or an unassigned character is
// written by its number, as ⟨U+202E⟩; line breaks and tabs become blanks. What drawn says may be drawn stays as it is.
func clean(text string, drawn func(rune) bool) string {
	if isPlain(text) {
		return text
	}
	var b strings.Builder
	for len(text) > 0 {
		r, size := utf8.DecodeRuneInString(text)
		switch {
		case r == utf8.RuneError && size == 1:
			fmt.Fprintf(&b, "⟨%02X⟩", text[0])
		case r == '\n' || r == '\r' || r == '\t' || unicode.Is(unicode.Zs, r):
			b.WriteByte(' ')
		case !unicode.IsPrint(r) || r == '⟨' || r == '⟩' || !drawn(r): // a bracket of its own could pass for an escape
			fmt.Fprintf(&b, "⟨U+%04X⟩", r)
		default:
			b.WriteRune(r)
		}
		text = text[size:]
	}
	return b.String()
}

func isPlain(text string) bool {
	for i := range len(text) {
		if text[i] < ' ' || text[i] > '~' {
			return false
		}
	}
	return true
}

// anyRune lets every printable character pass.
func anyRune(rune) bool { return true }

// visual puts one line into the order in which it is drawn from left to right (Unicode Annex 9, by the x/text tables). Text
// without letters that run from right to left comes back as it is.
func visual(line string) string {
	if !strings.ContainsFunc(line, runsLeft) {
		return line
	}
	var p bidi.Paragraph
	if _, err := p.SetString(leftToRight + line); err != nil { // the page runs from left to right, whatever a line begins with
		return line
	}
	order, err := p.Order()
	if err != nil {
		return line
	}
	var b strings.Builder
	var group []string // runs that are drawn in reverse order: right to left, and the numbers among them
	flush := func() {
		for _, run := range slices.Backward(group) {
			b.WriteString(run)
		}
		group = nil
	}
	for i := range order.NumRuns() {
		run := order.Run(i)
		text := run.String()
		switch {
		case run.Direction() == bidi.RightToLeft:
			group = append(group, bidi.ReverseString(text))
		default:
			if number := leadingNumber.FindString(text); len(group) > 0 && number != "" { // it keeps to the side of the word before it
				group, text = append(group, number), text[len(number):]
			}
			if text != "" {
				flush()
				b.WriteString(text)
			}
		}
	}
	flush()
	return strings.TrimPrefix(b.String(), leftToRight)
}

// leftToRight is the mark that gives a paragraph its direction (Unicode Annex 9, rule P2).
const leftToRight = "\u200e"

var leadingNumber = regexp.MustCompile(`^[ ]*[0-9]+([.,:][0-9]+)*`)

// runsLeft tells whether a character belongs to a script that runs from right to left.
func runsLeft(r rune) bool {
	if r < 0x0590 {
		return false
	}
	properties, _ := bidi.LookupRune(r)
	class := properties.Class()
	return class == bidi.R || class == bidi.AL
}
