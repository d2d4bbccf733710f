package precharge

import (
	"math"
	"strings"
	"testing"

	"chargehand/commission/finding"
	"chargehand/commission/finding/findingtest"
	"chargehand/commission/quantity"
	"chargehand/commission/remedy"
	"chargehand/commission/site"
)

// put puts one change of a remedy into a copy of the site.
func put(t *testing.T, s site.Site, c finding.Change) site.Site {
	t.Helper()
	changed, err := remedy.Apply(s, c)
	if err != nil {
		t.Fatal(err)
	}
	return changed
}

// Each remedy is put into the site and passes; where it is one value, one per cent less of the change does not.
func TestRemediesPassAndLessDoesNot(t *testing.T) {
	pulses := func(s *site.Site, energies ...float64) {
		s.Precharge.Pulse = append([]site.PulsePoint(nil), s.Precharge.Pulse...)
		for i, e := range energies {
			findingtest.Set(&s.Precharge.Pulse[i].Energy, e)
		}
	}
	for _, c := range []struct {
		name, id string
		change   func(*site.Site)
		keys     string // of the remedy
	}{
		{"time-out too short", "precharge.timeout", func(s *site.Site) { findingtest.Set(&s.Precharge.Timeout, 6) }, keyTimeout},
		{"time-out too long", "precharge.timeout", func(s *site.Site) { findingtest.Set(&s.Precharge.Timeout, 20) }, keyTimeout},
		{"time-out a little long", "precharge.shorted-bus", func(s *site.Site) { findingtest.Set(&s.Precharge.Timeout, 12) }, keyTimeout},
		{"resistor too small for the time-out", "precharge.shorted-bus", func(s *site.Site) { *s = withResistance(*s, 60) }, keyResistance},
		{"resistor too weak for the pulse", "precharge.pulse", func(s *site.Site) {
			*s = withResistance(*s, 30)
			pulses(s, 3e3, 8e3, 90e3, 200e3)
		}, keyResistance},
		{"resistor too large", "precharge.timeout", func(s *site.Site) { *s = withResistance(*s, 180); findingtest.Set(&s.Precharge.Timeout, 12) }, ""},
		{"closing difference too small", "precharge.stall", func(s *site.Site) { findingtest.Set(&s.Precharge.ClosingDifference, 17) }, "precharge.closing_difference"},
		{"supply too heavy", "precharge.stall", func(s *site.Site) {
			auxiliary := *s.Bus.Auxiliary
			findingtest.Set(&auxiliary.Power, 2500)
			s.Bus.Auxiliary = &auxiliary
		}, "bus.auxiliary.power"},
		{"attempts too soon", "precharge.repeat", func(s *site.Site) {
			s.Precharge.Attempts = 60
			findingtest.Set(&s.Precharge.Interval, 9)
			thermal := *s.Precharge.Thermal
			findingtest.Set(&thermal.MaxTemperature, 110)
			s.Precharge.Thermal = &thermal
		}, "precharge.interval"},
		{"attempts too soon without thermal model", "precharge.repeat", func(s *site.Site) {
			s.Precharge.Thermal = nil
			findingtest.Set(&s.Precharge.Interval, 3)
		}, "precharge.interval"},
		{"no cool-down", "precharge.wait", func(s *site.Site) { findingtest.Set(&s.Precharge.Interval, 4) }, "precharge.interval"},
		{"contactor too weak", "precharge.breaking", func(s *site.Site) {
			contactor := *s.Precharge.Contactor
			findingtest.Set(&contactor.BreakingCurrent, 5)
			s.Precharge.Contactor = &contactor
		}, "precharge.contactor.breaking_current"},
		{"contactor for too little voltage", "precharge.breaking", func(s *site.Site) {
			contactor := *s.Precharge.Contactor
			findingtest.Set(&contactor.Voltage, 800)
			s.Precharge.Contactor = &contactor
		}, "precharge.contactor.voltage"},
	} {
		s := findingtest.Load(t, "wagtail")
		c.change(&s)
		f := findingtest.Find(t, Findings(s), c.id, "")
		if f.Verdict == finding.Pass {
			t.Errorf("%s: %s passes already, want it to fail", c.name, c.id)
			continue
		}
		if len(f.Changes) == 0 || c.keys != "" && f.Changes[0].Key != c.keys {
			t.Errorf("%s: remedy = %q, want a change of %s", c.name, f.Remedy, c.keys)
			continue
		}
		mended := s
		for _, change := range f.Changes {
			mended = put(t, mended, change)
		}
		if g := findingtest.Find(t, Findings(mended), c.id, ""); g.Verdict != finding.Pass {
			t.Errorf("%s: with %q %s = %s (%v), want pass", c.name, f.Remedy, c.id, g.Verdict, g.Because)
		}
		if len(f.Changes) != 1 {
			continue
		}
		less := f.Changes[0]
		less.Value -= 0.01 * (less.Value - less.Was)
		ids := []string{c.id}
		if less.Key == keyResistance { // chosen to meet all three
			ids = []string{"precharge.pulse", "precharge.shorted-bus", "precharge.timeout"}
		}
		if passes(t, put(t, s, less), ids) {
			t.Errorf("%s: one per cent less than %q passes too", c.name, f.Remedy)
		}
	}
}

func passes(t *testing.T, s site.Site, ids []string) bool {
	for _, id := range ids {
		if findingtest.Find(t, Findings(s), id, "").Verdict != finding.Pass {
			return false
		}
	}
	return true
}

// The preferred value named in a remedy passes pulse, shorted bus and time-out together.
func TestPreferredResistorMeetsAllThree(t *testing.T) {
	s := withResistance(findingtest.Load(t, "wagtail"), 60)
	f := findingtest.Find(t, Findings(s), "precharge.shorted-bus", "")
	if !strings.Contains(f.Remedy, "preferred value 100.0 Ω (IEC 60063 E24)") {
		t.Fatalf("remedy of 60 Ω = %q, want the preferred value 100 Ω", f.Remedy)
	}
	for _, id := range []string{"precharge.pulse", "precharge.shorted-bus", "precharge.timeout"} {
		if g := findingtest.Find(t, Findings(withResistance(s, 100)), id, ""); g.Verdict != finding.Pass {
			t.Errorf("%s with 100 Ω = %s, want pass", id, g.Verdict)
		}
	}
}

// ouzel has no admissible time-out at all, and no resistor of that rating: what excludes what, and by how much.
func TestExclusionIsSaid(t *testing.T) {
	f := findingtest.Find(t, Findings(findingtest.Load(t, "ouzel")), "precharge.timeout", "")
	for _, want := range []string{"19.00 s", "5.803 s", "13.20 s"} {
		if want == "5.803 s" {
			want = "5.80" // 7.25386 s ⁄ 1.25
		}
		if !strings.Contains(f.Remedy, want) {
			t.Errorf("remedy = %q, want it to hold %q", f.Remedy, want)
		}
	}
	if len(f.Changes) != 0 {
		t.Errorf("changes = %v, want none where nothing helps", f.Changes)
	}
}

// IEC 60063: the least member at or above a value, decades included.
func TestPreferredNumbers(t *testing.T) {
	for _, c := range []struct {
		least, greatest quantity.Resistance
		series          int
		want            quantity.Resistance
		ok              bool
	}{
		{100, 1000, 24, 100, true},
		{100.1, 1000, 24, 110, true},
		{91.5, 1000, 24, 100, true},
		{8.3, 100, 12, 10, true},
		{0.69, 5, 6, 1, true},
		{2.61, 9, 24, 2.7, true}, // one of the eight that the rounding rule misses
		{4650, 9999, 24, 4700, true},
		{111, 119, 24, 0, false},
		{1563, 1e4, 24, 1600, true},
	} {
		got, ok := preferred(c.least, c.greatest, c.series)
		if ok != c.ok || math.Abs(float64(got-c.want)) > 1e-9 {
			t.Errorf("preferred(%v, %v, E%d) = %v, %v, want %v, %v", c.least, c.greatest, c.series, got, ok, c.want, c.ok)
		}
	}
	for n, series := range map[int][]float64{6: e6, 12: e12, 24: e24} {
		if len(series) != n {
			t.Errorf("E%d has %d members, want %d", n, len(series), n)
		}
		for i, v := range series {
			// Every member lies within half a step of the geometric series; the worst of E24 is 4.3 per cent off.
			if exact := math.Pow(10, float64(i)/float64(n)); math.Abs(v/exact-1) > 0.05 {
				t.Errorf("E%d member %d = %v, want near %v", n, i, v, exact)
			}
		}
	}
}
