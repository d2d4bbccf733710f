package far

import (
	"fmt"
	"math"
	"os"
	"os/exec"
	"strings"
	"testing"
	"time"

	"pgregory.net/rapid"

	"chargehand/commission/signal"
	"chargehand/tui/golden"
	"chargehand/tui/theme"
)

var now = time.Date(2026, 12, 1, 14, 2, 11, 0, time.UTC)

func reading(name signal.Name, value float64, age time.Duration) signal.Reading {
	return signal.Reading{Name: name, Value: value, At: now.Add(-age), Quality: signal.Good}
}

func face(t theme.Theme, figures int) Face {
	return Face{
		Banner: "REHEARSAL", Title: "Pre-charge, first charge", Hint: "f back",
		Link: Link{"link good 48/s, age 12 ms", theme.Normal},
		Figures: []Figure{
			Reading(t, "difference across the bypass", reading(signal.SourceVoltage, 314.2, 0), false, now, time.Second, "close at ≤ 25 V"),
			Reading(t, "bus voltage", reading(signal.BusVoltage, 497.6, 0), true, now, time.Second, "≤ 1090 V"),
			Reading(t, "source current", reading(signal.SourceCurrent, -3.1, 12*time.Second), false, now, time.Second, "≤ 8.2 A"),
		}[:figures],
		Countdown: Countdown{"time-out in", 7300 * time.Millisecond, theme.Abnormal},
	}
}

func TestGolden(t *testing.T) {
	for _, size := range [][2]int{{40, 10}, {80, 24}, {100, 30}, {140, 40}} {
		for figures := 1; figures <= 3; figures++ {
			name := fmt.Sprintf("%d-%dx%d", figures, size[0], size[1])
			draw := func(o theme.Options) string { return face(theme.New(o), figures).View(theme.New(o), size[0], size[1]) }
			golden.Compare(t, name, draw(theme.Options{}))
			golden.Compare(t, name+"-colour", draw(theme.Options{Colour: true, Dark: true}))
			golden.Compare(t, name+"-ascii", draw(theme.Options{ASCII: true}))
		}
	}
}

// In a country where some libraries count drawing characters double the picture must be the same.
func TestGoldenUnderAnotherLocale(t *testing.T) {
	test := exec.Command(os.Args[0], "-test.run=^TestGolden$")
	test.Env = append(os.Environ(), "LC_ALL=ja_JP.UTF-8", "LANG=ja_JP.UTF-8")
	if out, err := test.CombinedOutput(); err != nil {
		t.Errorf("golden test under LC_ALL=ja_JP.UTF-8: %v\n%s", err, out)
	}
}

func TestGlyphsAreWhole(t *testing.T) {
	seen := map[[glyphHeight]string]rune{}
	for r, g := range glyphs {
		for _, row := range g {
			if len(row) != len(g[0]) || strings.Trim(row, " #") != "" {
				t.Errorf("glyph %q has the row %q, want %d dots", r, row, len(g[0]))
			}
		}
		if other, ok := seen[g]; ok {
			t.Errorf("glyph %q looks like %q", r, other)
		}
		seen[g] = r
	}
	// Every unit and sign that a reading is written with has a glyph of its own.
	for _, name := range signal.Names {
		for _, value := range []float64{-0.0123, 45.6, 7.89e4, 1.2e7, 3.4e10} {
			number, unit := theme.Theme{}.Parts(value, name.Unit())
			for _, r := range strings.ReplaceAll(number+unit, "−", "-") {
				if _, ok := glyphs[r]; !ok {
					t.Errorf("no glyph for %q in %s %s", r, number, unit)
				}
			}
		}
	}
}

// What is drawn in ASCII, one sign for a dot, reads back as the number that was put in.
func TestDigitsReadBack(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		value := math.Round(rapid.Float64Range(-999, 999).Draw(t, "value")*10) / 10
		th := theme.New(theme.Options{ASCII: true})
		f := Face{Figures: []Figure{Reading(th, "", reading(signal.BusVoltage, value, 0), false, now, time.Second, "")}}
		want := f.blocks(th)[0].text()
		rows := strings.Split(f.View(th, dotsWide(want)+2, 10), "\n")[2:9]
		if got := readBack(rows); got != strings.ReplaceAll(want, " ", "") {
			t.Fatalf("the digits of %q read back as %q:\n%s", want, got, strings.Join(rows, "\n"))
		}
	})
}

// readBack reads glyphs from left to right, the widest that fits first.
func readBack(rows []string) string {
	text := ""
	for x := 0; x < len(rows[0]); {
		best, width := rune(0), 0
		for r, g := range glyphs {
			w := len(g[0])
			if w <= width || x+w > len(rows[0]) || r == ' ' {
				continue
			}
			same := true
			for y, row := range rows {
				same = same && row[x:x+w] == g[y]
			}
			if same {
				best, width = r, w
			}
		}
		if width == 0 {
			x++
			continue
		}
		text += string(best)
		x += width
	}
	return text
}

// On the least size one reading is still in large digits, four rows high at least, and the countdown is not lost.
func TestLeastSizeIsLarge(t *testing.T) {
	for _, value := range []float64{0, 1033.7, -212.4, 9999.9} {
		f := face(theme.Theme{}, 1)
		f.Figures[0] = Reading(theme.Theme{}, "bus voltage", reading(signal.BusVoltage, value, 0), false, now, time.Second, "≤ 1090 V")
		view := f.View(theme.Theme{}, LeastWidth, LeastHeight)
		large := 0
		for _, row := range strings.Split(view, "\n") {
			if strings.ContainsAny(row, "█▀▄") {
				large++
			}
		}
		if large < 4 || !strings.Contains(view, "0:08") {
			t.Errorf("View of %v at %d×%d has %d rows of digits, want 4 and the countdown:\n%s", value, LeastWidth, LeastHeight, large, view)
		}
	}
}

// At any size a number stands whole or not at all, and an old one never.
func TestAnySize(t *testing.T) {
	for _, th := range []theme.Theme{{}, theme.New(theme.Options{ASCII: true}), theme.New(theme.Options{Colour: true})} {
		for figures := 0; figures <= 3; figures++ {
			for width := 0; width <= 160; width += 7 {
				for height := 0; height <= 45; height += 3 {
					view := face(th, figures).View(th, width, height)
					rows := strings.Split(view, "\n")
					if height > 0 && len(rows) != height || height == 0 && view != "" {
						t.Fatalf("View at %dx%d has %d rows", width, height, len(rows))
					}
					for _, row := range rows {
						if height > 0 && theme.Width(row) != width {
							t.Fatalf("View at %dx%d has a row of %d columns: %q", width, height, theme.Width(row), row)
						}
					}
					if strings.Contains(view, "3.1") {
						t.Fatalf("View at %dx%d shows the withdrawn current:\n%s", width, height, view)
					}
				}
			}
		}
	}
}

func TestHarmlessText(t *testing.T) {
	f := face(theme.Theme{}, 2)
	f.Title, f.Link.Text, f.Figures[0].Label, f.Figures[1].Limit, f.Banner, f.Hint = "\x1b[2J電池", "\x1b]0;x\a", "\u202ex", "a\nb", "\x9b", "\x1b"
	for _, size := range [][2]int{{40, 10}, {100, 30}} {
		view := f.View(theme.Theme{}, size[0], size[1])
		if strings.ContainsAny(view, "\x1b\a\u202e\u009b") || strings.Count(view, "\n") != size[1]-1 {
			t.Errorf("View at %v with escape sequences in its texts =\n%q", size, view)
		}
	}
}

func TestClock(t *testing.T) {
	for left, want := range map[time.Duration]string{
		-time.Second: "0:00", 0: "0:00", 1: "0:01", time.Second: "0:01", 61 * time.Second: "1:01", 10 * time.Minute: "10:00",
		time.Hour + 2*time.Minute + 3*time.Second: "1:02:03", 1000 * time.Hour: "99:59:59",
	} {
		if got := Clock(left); got != want {
			t.Errorf("Clock(%v) = %q, want %q", left, got, want)
		}
	}
}

func BenchmarkView140x40(b *testing.B) {
	th := theme.New(theme.Options{Colour: true, Dark: true})
	f := face(th, 3)
	for b.Loop() {
		f.View(th, 140, 40)
	}
}
