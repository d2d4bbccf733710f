package theme

import (
	"fmt"
	"strings"
	"unicode"
	"unicode/utf8"

	"github.com/charmbracelet/x/ansi"
)

// mostMarks is how many combining marks one letter keeps. No script in use needs more; a longer pile climbs over its
// neighbours' lines.
const mostMarks = 2

// Clean makes a text from a file or a device harmless to show on one line: control characters become visible (ESC reads
// ^[), line breaks and tabs become blanks, invisible and direction-turning characters become visible or vanish, and what
// terminals disagree about the width of (joiners, variation selectors, flags) is taken apart. A clean text comes back
// unchanged.
func Clean(text string) string {
	if isPlain(text) {
		return text
	}
	var b strings.Builder
	marks := mostMarks // full: a mark at the very beginning has nothing to stand on
	for len(text) > 0 {
		r, size := utf8.DecodeRuneInString(text)
		switch {
		case r == utf8.RuneError && size == 1:
			b.WriteRune('\uFFFD')
			marks = 0
		case unicode.Is(unicode.Mn, r) || unicode.Is(unicode.Mc, r):
			if marks++; marks <= mostMarks && !isInvisible(r) {
				b.WriteRune(r)
			}
		default:
			before := b.Len()
			if writeHarmless(&b, r); b.Len() > before { // what vanishes carries no marks
				marks = 0
			}
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

func writeHarmless(b *strings.Builder, r rune) {
	switch {
	case r == '\n' || r == '\r' || r == '\t' || unicode.Is(unicode.Zs, r) || r == 0x2028 || r == 0x2029:
		b.WriteByte(' ')
	case r < ' ':
		b.WriteByte('^')
		b.WriteRune(r + '@')
	case r == 0x7F:
		b.WriteString("^?")
	case r >= 0x80 && r < 0xA0, isDirection(r):
		fmt.Fprintf(b, "<%04X>", r)
	case isInvisible(r):
	case r >= 0x1F1E6 && r <= 0x1F1FF: // the letters of which flags are made
		b.WriteRune('A' + r - 0x1F1E6)
	default:
		b.WriteRune(r)
	}
}

// isDirection tells whether r turns the direction of writing: such a character can make one number look like another.
func isDirection(r rune) bool {
	return r == 0x061C || r == 0x200E || r == 0x200F || r >= 0x202A && r <= 0x202E || r >= 0x2066 && r <= 0x2069
}

func isInvisible(r rune) bool {
	return unicode.Is(unicode.Cf, r) || unicode.Is(unicode.Me, r) || unicode.Is(unicode.Variation_Selector, r) ||
		r >= 0x1F3FB && r <= 0x1F3FF || // skin tones
		r == 0x115F || r == 0x1160 || r == 0x3164 || r == 0xFFA0 // fillers
}

// Width is how many columns a clean text takes.
func Width(text string) int { return ansi.StringWidth(text) }

// Clip shortens a text, which may hold colours, to a width and marks the cut.
func (t Theme) Clip(text string, width int) string {
	if width <= 0 {
		return ""
	}
	return ansi.Truncate(text, width, t.Pick("…", "~"))
}

// Fit clips a text and fills it up with blanks to exactly the width.
func (t Theme) Fit(text string, width int) string {
	text = t.Clip(text, width)
	if room := width - Width(text); room > 0 {
		text += strings.Repeat(" ", room)
	}
	return text
}
