package measured

import (
	"math"
	"strings"
	"testing"
	"time"

	"chargehand/commission/capture"
	"chargehand/commission/finding"
	"chargehand/commission/signal"
)

// only is a capture of one signal.
func only(kind capture.Kind, n signal.Name, t, v []float64) capture.Capture {
	c := capture.Capture{ID: "c1", Kind: kind, Channels: []capture.Channel{{Name: n, Unit: "V", Type: "u16", Scale: 0.1}}}
	for i := range t {
		c.Samples = append(c.Samples, capture.Sample{At: since(t[i]), Values: []capture.Value{{V: v[i], OK: true}}})
	}
	return c
}

func times(n int, step float64) []float64 {
	t := make([]float64, n)
	for i := range t {
		t[i] = float64(i) * step
	}
	return t
}

func values(t []float64, f func(t float64) float64) []float64 {
	v := make([]float64, len(t))
	for i := range t {
		v[i] = f(t[i])
	}
	return v
}

// Captures that cannot be judged: 'cannot be judged because …', never a number, never a pass.
func TestBadCapturesAreNotJudged(t *testing.T) {
	s := readSite(t, "wagtail")
	ramp := times(60, 0.1)
	reversed := make([]float64, 60)
	for i := range reversed {
		reversed[i] = 6 - float64(i)*0.1
	}
	rise := func(t float64) float64 { return 780 * (1 - math.Exp(-t/1.25)) }
	gappy := only(capture.Precharge, signal.BusVoltage, ramp, values(ramp, rise))
	gappy.Samples = append(gappy.Samples[:8:8], gappy.Samples[40:]...)
	withNaN := only(capture.Precharge, signal.BusVoltage, ramp, values(ramp, rise))
	withNaN.Samples[7].Values[0].V = math.NaN()
	silent := only(capture.Precharge, signal.BusVoltage, ramp, values(ramp, rise))
	for i := range silent.Samples {
		silent.Samples[i].Values = []capture.Value{{}}
	}
	tests := []struct {
		name string
		c    capture.Capture
	}{
		{"empty", capture.Capture{Channels: gappy.Channels}},
		{"without the signal", capture.Capture{}},
		{"two points", only(capture.Precharge, signal.BusVoltage, []float64{0, 1}, []float64{0, 500})},
		{"constant", only(capture.Precharge, signal.BusVoltage, ramp, values(ramp, func(float64) float64 { return 400 }))},
		{"random", only(capture.Precharge, signal.BusVoltage, ramp, values(ramp, func(t float64) float64 { return 400 + 390*math.Sin(1000*t*t) }))},
		{"gap-ridden", gappy},
		{"time-reversed", only(capture.Precharge, signal.BusVoltage, reversed, values(ramp, rise))},
		{"NaN", withNaN},
		{"no value in any sample", silent},
		{"too early", only(capture.Precharge, signal.BusVoltage, times(20, 0.05), values(times(20, 0.05), rise))},
	}
	for _, test := range tests {
		for _, f := range append(Precharge(s, test.c), Discharge(s, test.c)...) {
			if f.Verdict == finding.Pass || f.Verdict == finding.Marginal || f.State == finding.Finite || !math.IsNaN(f.Value.Nominal) {
				t.Errorf("%s(%s) = %s, value %v, state %s, want no number and no pass", f.ID, test.name, f.Verdict, f.Value, f.State)
			}
			if f.Verdict == finding.Undecided && !strings.Contains(strings.Join(f.Because, "\n"), "cannot be judged because") {
				t.Errorf("%s(%s) because %q, want 'cannot be judged because …'", f.ID, test.name, f.Because)
			}
		}
	}
}

func TestTooEarlySaysSo(t *testing.T) {
	at := times(20, 0.05)
	c := only(capture.Precharge, signal.BusVoltage, at, values(at, func(t float64) float64 { return 780 * (1 - math.Exp(-t/1.25)) }))
	f := Precharge(readSite(t, "wagtail"), c)[0]
	if f.Verdict != finding.Undecided || !strings.Contains(strings.Join(f.Because, " "), "too early") {
		t.Errorf("Precharge(0.8 time constants) = %s, %q, want undecided with 'too early'", f.Verdict, f.Because)
	}
	if p := SoFar(c); p.Judged || !strings.Contains(p.Words, "too early") || math.Abs(float64(p.TimeConstant)-1.25) > 0.3 {
		t.Errorf("SoFar = %+v, want about 1.25 s and 'too early'", p)
	}
}

// The figures of a good charge come back from the record: R and C were put into the plant.
func TestPrechargeFindsWhatWasPutIn(t *testing.T) {
	s := readSite(t, "wagtail")
	for seed := range uint64(8) {
		p := healthy(s, 300+seed)
		f := Precharge(s, p.charge())[0]
		if f.Verdict != finding.Pass && f.Verdict != finding.Marginal {
			t.Fatalf("seed %d: %s %q", seed, f.Verdict, f.Because)
		}
		want := (p.rp + p.ri + p.rx) * (p.c + p.cFilter)
		for what, pair := range map[string][2]float64{
			"time constant":         {f.Value.Nominal, want},
			"pre-charge resistance": {part(t, f, "pre-charge resistance"), p.rp},
			"capacitance":           {part(t, f, "capacitance"), p.c + p.cFilter},
		} {
			if math.Abs(pair[0]/pair[1]-1) > 0.03 {
				t.Errorf("seed %d: %s = %.5g, want %.5g within 3 %%", seed, what, pair[0], pair[1])
			}
		}
	}
}

func part(t *testing.T, f finding.Finding, name string) float64 {
	t.Helper()
	for _, p := range f.Parts {
		if p.Name == name {
			return p.Value.Nominal
		}
	}
	t.Fatalf("%s has no part %q", f.ID, name)
	return 0
}

func TestRiseIsDecidedByTheFirstSampleAtItsTime(t *testing.T) {
	check := Check{At: 370 * time.Millisecond, AtLeast: 105}
	good := func(t float64) float64 { return 780 * (1 - math.Exp(-t/1.25)) }
	at := times(8, 0.05)
	tests := []struct {
		name             string
		c                capture.Capture
		decided, missing bool
	}{
		{"before its time", only(capture.Precharge, signal.BusVoltage, at[:7], values(at[:7], good)), false, false},
		{"good", only(capture.Precharge, signal.BusVoltage, times(9, 0.05), values(times(9, 0.05), good)), true, false},
		{"shorted", only(capture.Precharge, signal.BusVoltage, times(9, 0.05), values(times(9, 0.05), func(float64) float64 { return 1.2 })), true, true},
		{"without samples", capture.Capture{}, false, false},
	}
	for _, test := range tests {
		r := Rise(test.c, check)
		if r.Decided != test.decided || r.Missing != test.missing || r.Words == "" {
			t.Errorf("Rise(%s) = %+v, want decided %v, missing %v, with words", test.name, r, test.decided, test.missing)
		}
	}
	if words := Rise(tests[2].c, check).Words; !strings.Contains(words, "open now") {
		t.Errorf("Rise(shorted) says %q, want 'open now'", words)
	}
}

// Nothing but the capture counts: the same samples under another name, stage and attempt give the same answer.
func TestCausesDoNotDependOnTheCapturesName(t *testing.T) {
	s := readSite(t, "wagtail")
	p := healthy(s, 9)
	p.rp *= 1.6
	c := p.charge()
	first := Precharge(s, c)
	c.ID, c.Stage, c.Attempt = "", "", 0
	second := Precharge(s, c)
	if a, b := causesOf(first), causesOf(second); len(a) == 0 || len(a) != len(b) || a[0].ID != b[0].ID || a[0].Score != b[0].Score {
		t.Errorf("causes with name %v, without %v, want the same", a, b)
	}
}
