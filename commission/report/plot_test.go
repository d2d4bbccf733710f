package report

import (
	"math"
	"slices"
	"testing"

	"chargehand/commission/capture"
	"chargehand/commission/finding"
	"chargehand/commission/signal"
)

func TestTicks(t *testing.T) {
	for _, c := range []struct {
		low, high float64
		about     int
		want      []float64
		decimals  int
	}{
		{0, 10, 5, []float64{0, 2, 4, 6, 8, 10}, 0},
		{0, 1, 5, []float64{0, 0.2, 0.4, 0.6, 0.8, 1}, 1},
		{-0.5, 9.5, 10, []float64{0, 1, 2, 3, 4, 5, 6, 7, 8, 9}, 0},
		{990, 1070, 4, []float64{1000, 1020, 1040, 1060}, 0},
		{0.013, 0.0145, 3, []float64{0.013, 0.0135, 0.014, 0.0145}, 4},
	} {
		got, decimals := Axis{Low: c.low, High: c.high}.ticks(c.about)
		close := slices.EqualFunc(got, c.want, func(a, b float64) bool { return math.Abs(a-b) < 1e-9 })
		if !close || decimals != c.decimals {
			t.Errorf("ticks(%g … %g, %d) = %v, %d decimals, want %v, %d", c.low, c.high, c.about, got, decimals, c.want, c.decimals)
		}
	}
	for _, a := range []Axis{{Low: 1, High: 1}, {Low: 0, High: math.Inf(1)}, {Low: math.NaN(), High: 1}, {Low: 2, High: 1}} {
		if got, _ := a.ticks(5); got != nil {
			t.Errorf("ticks(%v) = %v, want none", a, got)
		}
	}
}

// TestPlotsOfTheRehearsal checks that each plot holds what it is for, and that measurement and prediction are on one scale:
// the charge runs inside its band, the fitted line through its points.
func TestPlotsOfTheRehearsal(t *testing.T) {
	s := story(t)
	charge := s.plotsOf(s.Captures[0])
	if len(charge) != 2 {
		t.Fatalf("a pre-charge has %d plots, want charge and closing", len(charge))
	}
	band, trace := layer(t, charge[0], "predicted, all corners"), layer(t, charge[0], "bus voltage, measured")
	outside := 0
	for i, x := range trace.X {
		if x > 0.3 && x < 8 && (trace.Y[i] < interpolated(band.X, band.Low, x)-5 || trace.Y[i] > interpolated(band.X, band.High, x)+5) {
			outside++
		}
	}
	if outside > 0 || len(trace.X) < 100 {
		t.Errorf("%d of %d samples of the charge lie outside its band, want none: its finding passes", outside, len(trace.X))
	}
	stairs := s.plotsOf(s.Captures[1])[0]
	line, steps := layer(t, stairs, "line through the steps"), layer(t, stairs, "settled steps, measured")
	for i, x := range steps.X {
		if at := interpolated(line.X, line.Y, x); math.Abs(at-steps.Y[i]) > 1 {
			t.Errorf("step %d at %.1f A stands at %.2f V, the line at %.2f V, want within 1 V", i+1, x, steps.Y[i], at)
		}
	}
	if len(steps.X) != 8 {
		t.Errorf("the stairs have %d steps, want the 8 that the finding counts", len(steps.X))
	}
	fall := s.plotsOf(s.Captures[2])[0]
	layer(t, fall, "touch-safe voltage")
	if p := s.windowPlot(); p.IsEmpty() || p.Y.High < 1070 {
		t.Errorf("the window reaches up to %g V, want the highest bus of 1070 V on it", p.Y.High)
	}
	if !s.sharePlot().IsEmpty() {
		t.Error("a share that nobody measured is drawn")
	}
}

func layer(t *testing.T, p Plot, name string) Layer {
	t.Helper()
	for _, l := range p.Layers {
		if l.Name == name {
			return l
		}
	}
	t.Fatalf("plot %q has no layer %q", p.Title, name)
	return Layer{}
}

func interpolated(x, y []float64, at float64) float64 {
	for i := 1; i < len(x); i++ {
		if at <= x[i] {
			return y[i-1] + (y[i]-y[i-1])*(at-x[i-1])/(x[i]-x[i-1])
		}
	}
	return y[len(y)-1]
}

func TestGapsStayGaps(t *testing.T) {
	c := capture.Capture{Gaps: []capture.Gap{{From: 2e9, To: 5e9}}}
	x, y := broken(c, []float64{0, 1, 2, 5, 6}, []float64{10, 11, 12, 15, 16})
	if len(x) != 6 || !math.IsNaN(y[3]) {
		t.Errorf("broken = %v, %v, want a break between 2 s and 5 s", x, y)
	}
	if v := before(capture.Capture{}, signal.BusVoltage, 0); !math.IsNaN(v) {
		t.Errorf("before of an empty capture = %g, want NaN", v)
	}
}

func TestEveryFaceDrawsTheSymbols(t *testing.T) {
	for _, r := range "Ωµτ∆Δ°±≤²√∞…–·⟨⟩" {
		for _, f := range []face{regular, bold, mono} {
			if !draws(f)(r) {
				t.Errorf("%v has no glyph for %c (%U)", f, r, r)
			}
		}
	}
	if draws(regular)('渡') || draws(regular)(0x1F6A2) {
		t.Error("the regular face claims glyphs that it has not")
	}
}

// The order of a mixed line is that of Unicode Annex 9: the Hebrew word is drawn from right to left, the rest stays.
func TestVisual(t *testing.T) {
	for _, c := range []struct{ in, want string }{
		{"plain ±5 %", "plain ±5 %"},
		{"שלום", "םולש"},
		{"name שלום 12", "name 12 םולש"},
		{"שלום 12 ⟨U+6E21⟩", "12 םולש ⟨U+6E21⟩"},
	} {
		if got := visual(c.in); got != c.want {
			t.Errorf("visual(%q) = %q, want %q", c.in, got, c.want)
		}
	}
}

func TestClean(t *testing.T) {
	for _, c := range []struct{ in, want string }{
		{"A\x1b[31mB", "A⟨U+001B⟩[31mB"}, {"A\u009b31mB", "A⟨U+009B⟩31mB"}, {"a\nb\tc", "a b c"}, {"\xff", "⟨FF⟩"}, {"Ω ±5 %", "Ω ±5 %"}, {"a\u00a0b", "a b"},
		{"\ue000", "⟨U+E000⟩"},
	} {
		if got := clean(c.in, anyRune); got != c.want {
			t.Errorf("clean(%q) = %q, want %q", c.in, got, c.want)
		}
	}
	if got := clean("渡Ω", draws(regular)); got != "⟨U+6E21⟩Ω" {
		t.Errorf("clean for the regular face = %q, want the glyph it lacks by its number", got)
	}
}

// TestSharePlot draws one measured share inside its limits, in per cent.
func TestSharePlot(t *testing.T) {
	low, high := -0.1, 0.1
	s := Story{Measured: []Finding{{Finding: finding.Finding{ID: "measured.share", Subject: "aft string", Unit: "1", State: finding.Finite,
		Value: finding.Value{Low: 0.01, Nominal: 0.02, High: 0.03}, Limit: finding.Limit{Low: &low, High: &high}, Verdict: finding.Pass}}}}
	p := s.sharePlot()
	if p.IsEmpty() || p.Y.Low > -10 || p.Y.High < 10 || len(p.Caption) != 1 {
		t.Errorf("sharePlot = %g … %g %%, caption %q, want both limits of 10 %% on it and one sentence", p.Y.Low, p.Y.High, p.Caption)
	}
	if at := layer(t, p, "measured with its uncertainty").Y; at[0] != 1 || at[1] != 3 {
		t.Errorf("the share is drawn from %g to %g %%, want 1 to 3", at[0], at[1])
	}
}
