package discharge

import (
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"chargehand/commission/finding"
	"chargehand/commission/finding/findingtest"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

func touchSafe(t *testing.T, s site.Site) finding.Finding {
	t.Helper()
	return findingtest.Find(t, Findings(s), "discharge.touch-safe", "")
}

// The bleeder that the remedy names passes, one per cent more does not; without any it starts from none.
func TestBleederOfTheRemedyPassesAndMoreDoesNot(t *testing.T) {
	for _, name := range []string{"wagtail", "ouzel", "nightjar"} {
		s := findingtest.Load(t, name)
		f := touchSafe(t, s)
		if len(f.Changes) != 1 || f.Changes[0].Key != "bus.bleeder" {
			t.Fatalf("%s: remedy = %q, want a bleeder", name, f.Remedy)
		}
		bleeding := func(r float64) site.Site {
			was := quantity.Spread[quantity.Resistance]{Low: 1, Nominal: 1, High: 1}
			if len(s.Bus.Bleeders) > 0 {
				was = s.Bus.Bleeders[0].Value.Spread
			}
			b := site.Bleeder{Name: "new"}
			scale := quantity.Resistance(r) / was.Nominal
			b.Value = quantity.Entered[quantity.Resistance]{Spread: quantity.Spread[quantity.Resistance]{Low: was.Low * scale, Nominal: quantity.Resistance(r), High: was.High * scale}, Text: "typed"}
			changed := s
			changed.Bus.Bleeders = []site.Bleeder{b}
			return changed
		}
		if g := touchSafe(t, bleeding(f.Changes[0].Value)); g.Verdict != finding.Pass {
			t.Errorf("%s: with %q = %s, want pass", name, f.Remedy, g.Verdict)
		}
		if g := touchSafe(t, bleeding(f.Changes[0].Value*1.01)); g.Verdict == finding.Pass {
			t.Errorf("%s: one per cent more than %q passes too", name, f.Remedy)
		}
	}
}

func TestLabelRoundsUp(t *testing.T) {
	for slowest, want := range map[quantity.Seconds]quantity.Seconds{4.2: 5, 60: 60, 60.1: 120, 987.6: 17 * 60} {
		if got := label(slowest); got != want {
			t.Errorf("label(%v) = %v, want %v", slowest, got, want)
		}
	}
	if f := touchSafe(t, findingtest.Load(t, "wagtail")); !strings.Contains(f.Remedy, "waiting time of 17 min") {
		t.Errorf("remedy = %q, want the label's 17 min for 987.6 s", f.Remedy)
	}
}

func TestFindingsNameTheKeysThatAreMissing(t *testing.T) {
	findingtest.NameWhatIsMissing(t, Findings, []findingtest.Absence{
		findingtest.Without("bus.touch_safe", func(s *site.Site) { s.Bus.TouchSafe = nil }, []string{"touch-safe"}),
		findingtest.Without("bus.touch_safe.within", func(s *site.Site) {
			v := *s.Bus.TouchSafe
			v.Within = quantity.Entered[quantity.Seconds]{}
			s.Bus.TouchSafe = &v
		}, []string{"touch-safe"}),
		findingtest.Without("setpoints, where the nominal voltage stands in", func(s *site.Site) { s.Infeeds = nil }, nil),
		findingtest.Without("a bleeder, which may be absent", func(s *site.Site) { s.Bus.Bleeders = nil }, nil),
		findingtest.Without("the converter, whose filter may be absent", func(s *site.Site) { s.Converter = nil }, nil),
	})
}

// An isolated bank hangs on the bus again when it is discharged; a filter before the bypass stays with the source.
func TestWhatDischarges(t *testing.T) {
	s := findingtest.Load(t, "wagtail")
	whole := touchSafe(t, s).Value
	isolated := s
	isolated.Bus.Capacitances = slices.Clone(s.Bus.Capacitances)
	isolated.Bus.Capacitances[2].Isolated = true
	if got := touchSafe(t, isolated).Value; got != whole {
		t.Errorf("time with an isolated bank = %v, want as without, %v", got, whole)
	}
	bare, before := s, s
	c, d := *s.Converter, *s.Converter
	f := *s.Converter.Filter
	f.Position = site.AtSource
	c.Filter, d.Filter = nil, &f
	bare.Converter, before.Converter = &c, &d
	if got, want := touchSafe(t, before).Value, touchSafe(t, bare).Value; got != want {
		t.Errorf("time with the filter before the bypass = %v, want as without, %v", got, want)
	}
	if got, with := touchSafe(t, bare).Value, whole; got.High >= with.High {
		t.Errorf("time without the filter = %v, want less than with, %v", got.High, with.High)
	}
}

// Any site inside the tolerances discharges inside the band, from any of the voltages, supply on or off.
func TestBandHoldsEveryDischarge(t *testing.T) {
	for _, name := range []string{"wagtail", "ouzel"} {
		s := findingtest.Load(t, name)
		v0 := quantity.Spread[quantity.Voltage]{Low: 860, Nominal: 870, High: 880}
		p := Predict(s, v0)
		if len(p.Missing) > 0 || len(p.Band) == 0 {
			t.Fatalf("%s: Predict lacks %v, want a band", name, p.Missing)
		}
		if last := p.Band[len(p.Band)-1].Bus; math.Abs(float64(last.High-60)) > 1e-6 {
			t.Errorf("%s: band ends at %v, want the touch-safe 60 V in the slowest corner", name, last.High)
		}
		random := rand.New(rand.NewPCG(3, 3))
		for range 300 {
			drawn := findingtest.Draw(s, random, 0.5)
			axes := predictionAxes(drawn, v0)
			x := make([]float64, len(axes))
			for i, a := range axes {
				x[i] = a.Low + random.Float64()*(a.High-a.Low)
			}
			bus, from := cornerBus(x)
			for _, point := range p.Band {
				v := bus.VoltageAt(from, quantity.Seconds(point.At.Seconds()))
				if v < point.Bus.Low-1e-6 || v > point.Bus.High+1e-6 {
					t.Fatalf("%s: bus at %v = %v, want inside %v … %v", name, point.At, v, point.Bus.Low, point.Bus.High)
				}
			}
		}
	}
}

func TestPredictionWithoutAPathStaysFlat(t *testing.T) {
	p := Predict(findingtest.Load(t, "nightjar"), quantity.Exactly(quantity.Voltage(700)))
	if !math.IsInf(float64(p.TimeToTouchSafe.Nominal), 1) || !math.IsInf(float64(p.TimeConstant.Low), 1) {
		t.Errorf("times without a path = %v, %v, want never", p.TimeToTouchSafe, p.TimeConstant)
	}
	if last := p.Band[len(p.Band)-1].Bus; last.Low != 700 || last.High != 700 {
		t.Errorf("band without a path ends at %v, want 700 V still", last)
	}
}

func TestPredictionNamesWhatItLacks(t *testing.T) {
	s := findingtest.Load(t, "wagtail")
	s.Bus.TouchSafe = nil
	if p := Predict(s, quantity.Exactly(quantity.Voltage(900))); !slices.Contains(p.Missing, "bus.touch_safe.voltage") || p.Band != nil {
		t.Errorf("Predict without a touch-safe voltage lacks %v, want bus.touch_safe.voltage and no band", p.Missing)
	}
}

// Where the touch-safe voltage stands at or above the bus there is nothing to wait for, with a bleeder or without, and the
// printed calculation says so: no time below 0.
func TestTouchSafeBusTakesNoTime(t *testing.T) {
	for _, name := range []string{"wagtail", "nightjar"} {
		s := findingtest.Load(t, name)
		at := float64(highest(s))
		for _, touch := range []float64{at, 1.5 * at} {
			safe := *s.Bus.TouchSafe
			findingtest.Set(&safe.Voltage, touch)
			s.Bus.TouchSafe = &safe
			f := touchSafe(t, s)
			if want := finding.Exactly(0); f.Value != want || f.Verdict != finding.Pass {
				t.Errorf("%s touch-safe at %v V = %v, %s, want 0 s, pass", name, touch, f.Value, f.Verdict)
			}
			if err := findingtest.Redo(f.Explanation, 0); err != nil {
				t.Errorf("%s touch-safe at %v V: Redo = %v, want nil", name, touch, err)
			}
		}
	}
}
