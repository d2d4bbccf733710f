package closing

import (
	"math"
	"testing"

	"chargehand/commission/finding"
	"chargehand/commission/finding/findingtest"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

func withBypass(s site.Site, making float64) site.Site {
	b := *s.Bypass
	findingtest.Set(&b.MakingCurrent, making)
	s.Bypass = &b
	return s
}

func withConverter(s site.Site, change func(*site.Converter)) site.Site {
	c := *s.Converter
	if c.Filter != nil {
		f := *c.Filter
		c.Filter = &f
	}
	change(&c)
	s.Converter = &c
	return s
}

// put puts one change of a remedy into a copy of the site.
func put(t *testing.T, s site.Site, c finding.Change) site.Site {
	t.Helper()
	switch c.Key {
	case keyDifference:
		findingtest.Set(&s.Precharge.ClosingDifference, c.Value)
	case "bypass.making_current":
		return withBypass(s, c.Value)
	case "precharge.minimum_time":
		findingtest.Set(&s.Precharge.MinimumTime, c.Value)
	case "source.fuse.pre_arcing_i2t":
		f := *s.Source.Fuse
		findingtest.Set(&f.PreArcingI2t, c.Value)
		s.Source.Fuse = &f
	default:
		t.Fatalf("remedy changes %s, which no finding of this family asks for", c.Key)
	}
	return s
}

// Each remedy is put into the site and passes; where it is one value, one per cent less of the change does not.
func TestRemediesPassAndLessDoesNot(t *testing.T) {
	fused := func(s site.Site, i2t float64) site.Site {
		f := *s.Source.Fuse
		findingtest.Set(&f.PreArcingI2t, i2t)
		s.Source.Fuse = &f
		return s
	}
	differing := func(s site.Site, v float64) site.Site {
		findingtest.Set(&s.Precharge.ClosingDifference, v)
		return s
	}
	whole := findingtest.Load(t, "wagtail")
	short := whole
	findingtest.Set(&short.Precharge.MinimumTime, 0.2)
	for _, c := range []struct {
		name, id string
		site     site.Site
		key      string
	}{
		{"bypass too weak, smaller difference helps", "closing.inrush", withBypass(whole, 230), keyDifference},
		{"bypass too weak for any difference", "closing.inrush", withBypass(whole, 100), "bypass.making_current"},
		{"fuse too small, smaller difference helps", "closing.i2t", fused(whole, 110), keyDifference},
		{"fuse too small for any difference", "closing.i2t", fused(whole, 10), "source.fuse.pre_arcing_i2t"},
		{"difference too small", "closing.threshold", differing(whole, 12), keyDifference},
		{"difference too large", "closing.threshold", differing(whole, 300), keyDifference},
		{"no window", "closing.threshold", withBypass(whole, 100), "bypass.making_current"},
		{"dwell too short", "closing.live-bus", short, "precharge.minimum_time"},
	} {
		f := findingtest.Find(t, Findings(c.site), c.id, "")
		if f.Verdict == finding.Pass || len(f.Changes) == 0 || f.Changes[0].Key != c.key {
			t.Errorf("%s: %s = %s, remedy %q, want a change of %s", c.name, c.id, f.Verdict, f.Remedy, c.key)
			continue
		}
		mended := c.site
		for _, change := range f.Changes {
			mended = put(t, mended, change)
		}
		if g := findingtest.Find(t, Findings(mended), c.id, ""); g.Verdict != finding.Pass {
			t.Errorf("%s: with %q %s = %s (%v), want pass", c.name, f.Remedy, c.id, g.Verdict, g.Because)
		}
		less := f.Changes[0]
		less.Value -= 0.01 * (less.Value - less.Was)
		if g := findingtest.Find(t, Findings(put(t, c.site, less)), c.id, ""); g.Verdict == finding.Pass {
			t.Errorf("%s: one per cent less than %q passes too", c.name, f.Remedy)
		}
	}
}

// Where a third of the inrush exceeds the saturation, the value stays and the verdict uses the bound with the source
// inductance alone, which is never above u⁄R.
func TestSaturatedChokesAreJudgedByTheUpperBound(t *testing.T) {
	s := findingtest.Load(t, "wagtail")
	s.Converter.Filter = nil // whose own loop is the larger one otherwise
	linear := findingtest.Find(t, Findings(s), "closing.inrush", "")
	saturating := withConverter(s, func(c *site.Converter) { findingtest.Set(&c.ChokeSaturation, 40) })
	f := findingtest.Find(t, Findings(saturating), "closing.inrush", "")
	if f.Value != linear.Value {
		t.Errorf("value with chokes that saturate = %v, want it unchanged, %v", f.Value, linear.Value)
	}
	if len(f.Parts) == 0 || !(f.Parts[0].Value.High > 2*f.Value.High) {
		t.Fatalf("parts = %v, want an upper bound well above %v", f.Parts, f.Value.High)
	}
	u := float64(step(s).High)
	if bound, most := f.Parts[0].Value.High, u/(0.062*0.85+0.001); bound > most {
		t.Errorf("upper bound = %v A, want at most u⁄R = %v A", bound, most)
	}
	between := (f.Value.High + f.Parts[0].Value.High) / 2
	if g := findingtest.Find(t, Findings(withBypass(saturating, between)), "closing.inrush", ""); g.Verdict != finding.Fail {
		t.Errorf("verdict between value and bound = %s, want fail", g.Verdict)
	}
	if g := findingtest.Find(t, Findings(withBypass(s, between)), "closing.inrush", ""); g.Verdict != finding.Pass {
		t.Errorf("verdict of the same bypass without saturation = %s, want pass", g.Verdict)
	}
}

// A filter before the bypass is charged by the source switch: a second inrush without a limit, and no longer in the bypass's
// loops. E·√(C⁄L)·e^(−α·t_p) by hand for 821.7 V, 64 mΩ, 6.04 µH, 0.8 mF.
func TestFilterBeforeTheBypass(t *testing.T) {
	s := withConverter(findingtest.Load(t, "wagtail"), func(c *site.Converter) { c.Filter.Position = site.AtSource })
	f := findingtest.Find(t, Findings(s), "closing.inrush", "filter")
	l, c, r := 6.04e-6, 0.8e-3, 0.064
	alpha := r / (2 * l)
	omega := math.Sqrt(1/(l*c) - alpha*alpha)
	want := 821.7 * math.Sqrt(c/l) * math.Exp(-alpha*math.Atan2(omega, alpha)/omega)
	if math.Abs(f.Value.Nominal-want) > 1e-6*want || f.Verdict != finding.Info {
		t.Errorf("closing.inrush filter = %v A, %s, want %v A, info", f.Value.Nominal, f.Verdict, want)
	}
	if g := findingtest.Find(t, Findings(s), "closing.live-bus", ""); g.Verdict != finding.Info || g.State != finding.None {
		t.Errorf("closing.live-bus = %s, %s, want info and no value: nothing behind the resistor to charge", g.Verdict, g.State)
	}
	bare := withConverter(findingtest.Load(t, "wagtail"), func(c *site.Converter) { c.Filter = nil })
	if got, want := findingtest.Find(t, Findings(s), "closing.i2t", "").Value, findingtest.Find(t, Findings(bare), "closing.i2t", "").Value; got != want {
		t.Errorf("closing.i2t with the filter before the bypass = %v, want as without, %v", got, want)
	}
}

func TestWhetherTheFuseClears(t *testing.T) {
	whole := findingtest.Load(t, "wagtail") // I²t 39,900 … 57,109 … 79,362 A²s by the expected findings
	for i2t, want := range map[float64][3]float64{30_000: {1, 1, 1}, 50_000: {0, 1, 1}, 70_000: {0, 0, 1}, 90_000: {0, 0, 0}} {
		s := whole
		f := *s.Source.Fuse
		findingtest.Set(&f.PreArcingI2t, i2t)
		s.Source.Fuse = &f
		got := findingtest.Find(t, Findings(s), "closing.without-precharge", "").Parts[1]
		if v := [3]float64{got.Value.Low, got.Value.Nominal, got.Value.High}; v != want || got.Name != "fuse clears it" {
			t.Errorf("%s at %v A²s = %v, want %v", got.Name, i2t, v, want)
		}
	}
}

func TestStepHoldsBothErrors(t *testing.T) {
	// 25 V, 0.5 % of 821.7 V and 0.5 % of 1000 V.
	want := quantity.Spread[quantity.Voltage]{Low: 25 - 9.1085, Nominal: 25, High: 34.1085}
	got := step(findingtest.Load(t, "wagtail"))
	for _, d := range []quantity.Voltage{got.Low - want.Low, got.Nominal - want.Nominal, got.High - want.High} {
		if math.Abs(float64(d)) > 1e-9 {
			t.Fatalf("Step = %v, want %v", got, want)
		}
	}
}

func TestFindingsNameTheKeysThatAreMissing(t *testing.T) {
	loops := []string{"inrush", "i2t", "overshoot", "threshold", "without-precharge"}
	findingtest.NameWhatIsMissing(t, Findings, []findingtest.Absence{
		findingtest.Without("source.inductance", func(s *site.Site) { s.Source.Inductance = quantity.Entered[quantity.Inductance]{} }, loops),
		findingtest.Without("converter.choke", func(s *site.Site) {
			*s = withConverter(*s, func(c *site.Converter) { c.Choke = quantity.Entered[quantity.Inductance]{} })
		}, loops),
		findingtest.Without("converter.phases", func(s *site.Site) { s.Converter = nil }, loops),
		findingtest.Without("converter.choke_saturation", func(s *site.Site) {
			*s = withConverter(*s, func(c *site.Converter) { c.ChokeSaturation = quantity.Entered[quantity.Current]{} })
		}, []string{"inrush"}),
		findingtest.Without("converter.filter.esr", func(s *site.Site) {
			*s = withConverter(*s, func(c *site.Converter) { c.Filter.ESR = quantity.Entered[quantity.Resistance]{} })
		}, []string{"inrush", "threshold", "without-precharge"}),
		findingtest.Without("bypass.making_current", func(s *site.Site) { s.Bypass = nil }, []string{"inrush", "threshold"}),
		findingtest.Without("source.fuse.pre_arcing_i2t", func(s *site.Site) { s.Source.Fuse = nil }, []string{"i2t"}),
		findingtest.Without("bus.measurement_error", func(s *site.Site) { s.Bus.MeasurementError = quantity.ErrorBound{} }, []string{"inrush", "i2t", "overshoot", "threshold"}),
		findingtest.Without("precharge.compares", func(s *site.Site) { s.Precharge.Compares = "" }, []string{"live-bus"}),
		findingtest.Without("precharge.minimum_time", func(s *site.Site) { s.Precharge.MinimumTime = quantity.Entered[quantity.Seconds]{} }, []string{"live-bus"}),
		findingtest.Without("a bleeder, which may be absent", func(s *site.Site) { s.Bus.Bleeders = nil }, nil),
	})
}

// Values without the parts that may be 0: no choke resistance, no source inductance, no internal resistance.
func TestFindingsWithNothingInTheLoop(t *testing.T) {
	for _, change := range []func(*site.Site){
		func(s *site.Site) { findingtest.Set(&s.Source.Inductance, 0) },
		func(s *site.Site) { findingtest.Set(&s.Source.InternalResistance, 0) },
		func(s *site.Site) {
			*s = withConverter(*s, func(c *site.Converter) {
				findingtest.Set(&c.ChokeResistance, 0)
				findingtest.Set(&c.Filter.ESL, 0)
				findingtest.Set(&c.Filter.ESR, 0)
			})
			findingtest.Set(&s.Source.Inductance, 0)
		},
		func(s *site.Site) {
			*s = withConverter(*s, func(c *site.Converter) { findingtest.Set(&c.ChokeResistance, 0) })
			findingtest.Set(&s.Source.InternalResistance, 0)
		},
	} {
		s := findingtest.Load(t, "wagtail")
		change(&s)
		found := Findings(s)
		findingtest.AreOrdered(t, "bare loop", found)
		areExplained(t, "bare loop", found)
	}
}

// areExplained reports every finding with a value whose printed calculation does not come out as printed.
func areExplained(t *testing.T, what string, findings []finding.Finding) {
	t.Helper()
	for _, f := range findings {
		if f.State == finding.None {
			continue
		}
		if err := findingtest.Redo(f.Explanation, f.Value.Nominal); err != nil {
			t.Errorf("%s: Redo(%s %s) = %v, want nil", what, f.ID, f.Subject, err)
		}
	}
}

// Every regime of damping, either filter position, and a supercapacitor are explained.
func TestOddLoopsAreExplained(t *testing.T) {
	for name, change := range map[string]func(*site.Site){
		"overdamped": func(s *site.Site) { findingtest.Set(&s.Source.InternalResistance, 2) },
		"filter before the bypass": func(s *site.Site) {
			*s = withConverter(*s, func(c *site.Converter) { c.Filter.Position = site.AtSource })
		},
		"supercapacitor with both": func(s *site.Site) { s.Source.Kind = site.Supercapacitor; findingtest.Set(&s.Source.Capacitance, 14) },
		"supercapacitor before": func(s *site.Site) {
			*s = withConverter(*s, func(c *site.Converter) { c.Filter.Position = site.AtSource })
			s.Source.Kind = site.Supercapacitor
			findingtest.Set(&s.Source.Capacitance, 14)
		},
	} {
		s := findingtest.Load(t, "wagtail")
		change(&s)
		found := Findings(s)
		findingtest.AreOrdered(t, name, found)
		areExplained(t, name, found)
	}
}
