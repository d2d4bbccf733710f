package theme

import (
	"strings"
	"testing"
	"unicode"
	"unicode/utf8"

	"github.com/mattn/go-runewidth"
)

func TestClean(t *testing.T) {
	for _, c := range []struct{ name, in, want string }{
		{"plain", "Ferry Wagtail, aft battery string", "Ferry Wagtail, aft battery string"},
		{"units", "100 Ω ±5 % at 35 °C, 2 µF", "100 Ω ±5 % at 35 °C, 2 µF"},
		{"colour", "\x1b[31mred\x1b[0m", "^[[31mred^[[0m"},
		{"title", "\x1b]0;owned\x07", "^[]0;owned^G"},
		{"eight-bit CSI", "\u009b2J", "<009B>2J"},
		{"bell, delete, nul", "\a\x7f\x00", "^G^?^@"},
		{"lines", "one\r\ntwo\tthree", "one  two three"},
		{"narrow blank", "5\u202fV\u00a05", "5 V 5"},
		{"right to left override", "412\u202e6.21", "412<202E>6.21"},
		{"zero width", "a\u200bb\ufeffc\u00add", "abcd"},
		{"emoji variation and joiner", "⚠\ufe0f \U0001F468\u200d\U0001F469", "⚠ \U0001F468\U0001F469"},
		{"skin tone", "\U0001F44D\U0001F3FD", "\U0001F44D"},
		{"flag", "\U0001F1F3\U0001F1F1", "NL"},
		{"keycap", "1\ufe0f\u20e3", "1"},
		{"accent", "Zoe\u0308", "Zoe\u0308"},
		{"pile of marks", "a" + strings.Repeat("\u0301", 40) + "b", "a\u0301\u0301b"},
		{"mark with nothing below", "\u0301x", "x"},
		{"not UTF-8", "a\xff\xfeb", "a\uFFFD\uFFFDb"},
		{"wide", "電池 한글", "電池 한글"},
	} {
		if got := Clean(c.in); got != c.want {
			t.Errorf("%s: Clean(%q) = %q, want %q", c.name, c.in, got, c.want)
		}
	}
}

func FuzzClean(f *testing.F) {
	for _, s := range []string{"\x1b[31m", "Zoe\u0308 電池", "⚠\ufe0f", "\u202e", "\U0001F468\u200d\U0001F469\u200d\U0001F466", "│Ω±→", "\xff"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		got := Clean(s)
		if !utf8.ValidString(got) {
			t.Fatalf("Clean(%q) = %q, want UTF-8", s, got)
		}
		for _, r := range got {
			if unicode.IsControl(r) || isDirection(r) || unicode.Is(unicode.Cf, r) {
				t.Fatalf("Clean(%q) = %q, want nothing that steers: %U", s, got, r)
			}
		}
		if again := Clean(got); again != got {
			t.Fatalf("Clean(%q) = %q, want it unchanged", got, again)
		}
	})
}

// The two rules for width that stand in this program's libraries must agree on what the drawings are made of, also in a
// country where one of them would count drawing characters double.
func TestWidthRulesAgree(t *testing.T) {
	narrow := runewidth.NewCondition()
	narrow.EastAsianWidth = false
	for _, s := range []string{"│┤▷├◦╱┽∩═‖▸◂●▲▼░█▀▄⠿╳", "Ω ± µ ° ≤ → …", "電池", "Zoe\u0308", "⚠", "✓ ≈ ✗", "𝛺"} {
		if got, want := Width(s), narrow.StringWidth(s); got != want {
			t.Errorf("Width(%q) = %d, want %d as the other rule counts", s, got, want)
		}
	}
}

func TestClipNeverExceeds(t *testing.T) {
	for _, th := range []Theme{{}, New(Options{ASCII: true}), New(Options{Colour: true, Dark: true})} {
		for _, s := range []string{"", "abc", "電池電池", "Zoe\u0308 and friends", th.Paint(Danger, "! FAULT 17")} {
			for width := -1; width < 12; width++ {
				if got := Width(th.Clip(s, width)); got > max(width, 0) {
					t.Errorf("Width(Clip(%q, %d)) = %d, want at most that", s, width, got)
				}
				if got := Width(th.Fit(s, width)); got != max(width, 0) {
					t.Errorf("Width(Fit(%q, %d)) = %d, want exactly that", s, width, got)
				}
			}
		}
	}
}
