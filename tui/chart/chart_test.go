package chart

import (
	"fmt"
	"math"
	"os"
	"os/exec"
	"strings"
	"testing"

	"pgregory.net/rapid"

	"chargehand/tui/golden"
	"chargehand/tui/theme"
)

// charge is a pre-charge as predicted and as measured, with a gap: u = U·(1 − e^(−t⁄τ)).
func charge() Chart {
	band, nominal := Band{Name: "predicted"}, Series{Name: "nominal"}
	trace := Series{Name: "measured", MaxStep: 0.2}
	for i := range 101 {
		x := float64(i) * 0.05
		band.X = append(band.X, x)
		band.Low = append(band.Low, 812*(1-math.Exp(-x/1.56)))
		band.High = append(band.High, 822*(1-math.Exp(-x/0.95)))
		nominal.X = append(nominal.X, x)
		nominal.Y = append(nominal.Y, 820*(1-math.Exp(-x/1.2)))
		if x < 1.2 || x > 1.6 && x < 3 {
			trace.X = append(trace.X, x)
			trace.Y = append(trace.Y, 815*(1-math.Exp(-x/1.3)))
		}
	}
	cursor := 1.0
	return Chart{
		X: Scale{Label: "time", Unit: "s", High: 5}, Y: Scale{Label: "bus voltage", Unit: "V"},
		Bands: []Band{band}, Nominal: []Series{nominal}, Traces: []Series{trace},
		Markers: []Marker{{Label: "closing difference 25 V", At: 797}, {Label: "rise ≥ 105 V", At: 0.37, Upright: true},
			{Label: "time-out 10.5 s", At: 10.5, Upright: true}},
		Cursor: &cursor,
	}
}

// droop is a row of settled points, one of them outside, with a fitted line and its confidence.
func droop() Chart {
	points := Series{Name: "settled", X: []float64{0, 40, 80, 120, 160, 200}, Y: []float64{1030.2, 1024.1, 1019.2, 1013.1, 1008.4, 1120}}
	fit := Series{Name: "fit", X: []float64{0, 200}, Y: []float64{1030, 1002.8}}
	band := Band{Name: "confidence 95 %"}
	for i := range 21 {
		x := float64(i) * 10
		half := 1 + math.Abs(x-100)/50
		band.X = append(band.X, x)
		band.Low = append(band.Low, 1030-0.136*x-half)
		band.High = append(band.High, 1030-0.136*x+half)
	}
	return Chart{X: Scale{Label: "bus current", Unit: "A"}, Y: Scale{Label: "bus voltage", Unit: "V", Low: 1000, High: 1035},
		Bands: []Band{band}, Fitted: []Series{fit}, Points: []Series{points}}
}

func TestGolden(t *testing.T) {
	for _, size := range [][2]int{{80, 24}, {100, 30}, {140, 40}} {
		for name, c := range map[string]Chart{"charge": charge(), "droop": droop()} {
			at := fmt.Sprintf("%s-%dx%d", name, size[0], size[1])
			golden.Compare(t, at, c.View(theme.Theme{}, size[0], size[1]))
			golden.Compare(t, at+"-colour", c.View(theme.New(theme.Options{Colour: true, Dark: true}), size[0], size[1]))
			golden.Compare(t, at+"-ascii", c.View(theme.New(theme.Options{ASCII: true}), size[0], size[1]))
			c.Form = Block
			golden.Compare(t, at+"-block", c.View(theme.Theme{}, size[0], size[1]))
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

func TestASCIIFormIsASCII(t *testing.T) {
	for _, c := range []Chart{charge(), droop()} {
		for _, r := range c.View(theme.New(theme.Options{ASCII: true}), 100, 30) {
			if r > '~' {
				t.Errorf("View under ASCII holds %q", r)
			}
		}
	}
}

func TestOutsideIsMarked(t *testing.T) {
	c := Chart{X: Scale{High: 10}, Y: Scale{High: 10}, Points: []Series{{X: []float64{5, 5, -3, 14}, Y: []float64{30, -30, 5, 5}}}}
	view := c.View(theme.Theme{}, 60, 14)
	for _, sign := range []string{"▲", "▼", "◀", "▶", "4 outside"} {
		if strings.Count(view, sign) != 1 {
			t.Errorf("View has %q %d times, want once\n%s", sign, strings.Count(view, sign), view)
		}
	}
	inside := Chart{X: Scale{High: 10}, Y: Scale{High: 10}, Points: []Series{{X: []float64{0, 10}, Y: []float64{0, 10}}}}
	if view := inside.View(theme.Theme{}, 60, 14); strings.Contains(view, "outside") || strings.Count(view, "●") != 2 {
		t.Errorf("View of points on the very edge =\n%s\nwant two points and nothing outside", view)
	}
}

func TestGapIsLeftBlankAndMarked(t *testing.T) {
	whole := Series{X: []float64{0, 2, 4, 6, 8, 10}, Y: []float64{5, 5, 5, 5, 5, 5}}
	missing := Series{X: []float64{0, 2, 4, 6, 8, 10}, Y: []float64{5, 5, math.NaN(), 5, 5, 5}}
	wide := Series{X: []float64{0, 2, 6, 8, 10}, Y: []float64{5, 5, 5, 5, 5}, MaxStep: 3}
	draw := func(s Series) string {
		return Chart{X: Scale{High: 10}, Y: Scale{High: 10}, Traces: []Series{s}, Form: ASCII}.View(theme.Theme{}, 60, 14)
	}
	if strings.Contains(draw(whole), "╳") {
		t.Errorf("View of a whole trace marks a gap\n%s", draw(whole))
	}
	for _, s := range []Series{missing, wide} {
		view := draw(s)
		if !strings.Contains(view, "╳╳") || strings.Count(view, "*") >= strings.Count(draw(whole), "*") {
			t.Errorf("View of %v =\n%s\nwant a gap", s, view)
		}
	}
}

func TestCursorReadsSamplesAndNeverBetween(t *testing.T) {
	at := 4.0
	c := Chart{X: Scale{Label: "time", Unit: "s", High: 10}, Y: Scale{Unit: "V", High: 10}, Cursor: &at,
		Traces:  []Series{{Name: "measured", X: []float64{0, 4, 10}, Y: []float64{0, 7, 9}}},
		Nominal: []Series{{Name: "nominal", X: []float64{0, 10}, Y: []float64{0, 10}}},
		Bands:   []Band{{Name: "predicted", X: []float64{0, 10}, Low: []float64{0, 8}, High: []float64{2, 12}}}}
	last := func() string {
		lines := strings.Split(c.View(theme.Theme{}, 100, 14), "\n")
		return strings.TrimSpace(lines[len(lines)-1])
	}
	if got, want := last(), "time 4.00 s   measured 7.00 V   predicted 3.20 … 6.00 V   nominal 4.00 V"; got != want {
		t.Errorf("read-off = %q, want %q", got, want)
	}
	at = 7
	if got := last(); !strings.Contains(got, "measured no value") {
		t.Errorf("read-off between two samples = %q, want no value", got)
	}
	if got := c.Step(+1, theme.Theme{}, 100, 14); !(got > 7 && got < 7.3) {
		t.Errorf("Step(+1) from 7 = %v, want the next column", got)
	}
	at = 10
	x, _ := c.Axes(theme.Theme{}, 100, 14)
	if got := c.Step(+1000, theme.Theme{}, 100, 14); got != x.High() {
		t.Errorf("Step(+1000) = %v, want the end of the axis, %v", got, x.High())
	}
}

func TestHarmlessText(t *testing.T) {
	c := charge()
	c.Title, c.Traces[0].Name, c.Markers[0].Label = "\x1b[2J電池", "\x1b]0;x\a", "limit \u202e\n25 V"
	view := c.View(theme.Theme{}, 100, 20)
	if strings.ContainsAny(view, "\x1b\a\u202e") || strings.Count(view, "\n") != 19 {
		t.Errorf("View with escape sequences in its texts =\n%q", view)
	}
}

// Any data at any size gives exactly that size.
func TestAnySizeAndData(t *testing.T) {
	odd := rapid.OneOf(rapid.Float64(), rapid.Float64Range(-1e3, 1e3), rapid.SampledFrom([]float64{0, math.NaN(), math.Inf(1), math.Inf(-1), 1e300}))
	rapid.Check(t, func(t *rapid.T) {
		width, height := rapid.IntRange(0, 150).Draw(t, "width"), rapid.IntRange(0, 45).Draw(t, "height")
		xs, ys := rapid.SliceOfN(odd, 0, 12).Draw(t, "x"), rapid.SliceOfN(odd, 0, 12).Draw(t, "y")
		s := Series{Name: "s", X: xs, Y: ys, MaxStep: 1}
		cursor := odd.Draw(t, "cursor")
		c := Chart{Form: Form(rapid.IntRange(0, 2).Draw(t, "form")), Traces: []Series{s}, Points: []Series{s}, Nominal: []Series{s}, Fitted: []Series{s},
			Bands: []Band{{X: xs, Low: ys, High: xs}}, Cursor: &cursor, X: Scale{Low: odd.Draw(t, "low"), High: odd.Draw(t, "high")},
			Markers: []Marker{{Label: "limit", At: odd.Draw(t, "at")}, {Label: "moment", At: odd.Draw(t, "when"), Upright: true}}}
		c.Step(1, theme.Theme{}, width, height)
		checkSize(t, c.View(theme.Theme{}, width, height), width, height)
	})
}

func checkSize(t interface{ Fatalf(string, ...any) }, view string, width, height int) {
	if height == 0 {
		if view != "" {
			t.Fatalf("View at %dx%d = %q, want nothing", width, height, view)
		}
		return
	}
	rows := strings.Split(view, "\n")
	if len(rows) != height {
		t.Fatalf("View at %dx%d has %d rows", width, height, len(rows))
	}
	for _, row := range rows {
		if theme.Width(row) != width {
			t.Fatalf("View at %dx%d has a row of %d columns: %q", width, height, theme.Width(row), row)
		}
	}
}

func BenchmarkView140x40(b *testing.B) {
	c, th := charge(), theme.New(theme.Options{Colour: true, Dark: true})
	for b.Loop() {
		c.View(th, 140, 40)
	}
}
