package desk

import (
	"testing"

	"chargehand/commission/finding"
	"chargehand/commission/finding/findingtest"
	"chargehand/commission/quantity"
	"chargehand/commission/remedy"
	"chargehand/commission/site"
)

func typed[Q quantity.Scalar](v float64) quantity.Entered[Q] {
	return quantity.Entered[Q]{Spread: quantity.Exactly(Q(v)), Text: "typed"}
}

// Each row spoils the example site so that one finding does not pass; its remedy put in makes it pass, and one per cent
// less of every change does not.
func TestRemedies(t *testing.T) {
	for _, row := range []struct {
		id, subject string
		spoil       func(s *site.Site)
	}{
		{"window.margin", "", func(s *site.Site) { s.Infeeds[0].Setpoint = typed[quantity.Voltage](920) }},
		{"window.thresholds", "", func(s *site.Site) { s.Bus.UnderVoltageTrip = typed[quantity.Voltage](845) }},
		{"window.thresholds", "", func(s *site.Site) { s.Bus.UnderVoltageTrip = typed[quantity.Voltage](988) }},
		{"window.thresholds", "", func(s *site.Site) { s.Bus.Chopper.On = typed[quantity.Voltage](1072) }},
		{"window.thresholds", "", func(s *site.Site) {
			s.Infeeds[0].Setpoint, s.Infeeds[1].Setpoint = typed[quantity.Voltage](885), typed[quantity.Voltage](888)
		}},
		{"window.duty", "", func(s *site.Site) { s.Converter.MinimumPulse = typed[quantity.Seconds](35e-6) }},
		{"window.duty", "", func(s *site.Site) {
			s.Source.CellMin, s.Converter.MinimumPulse, s.Infeeds[0].Setpoint = typed[quantity.Voltage](0.6), typed[quantity.Seconds](20e-6), typed[quantity.Voltage](1040)
		}},
		{"window.current", "", func(s *site.Site) { s.Converter.RatedPower = typed[quantity.Power](250e3) }},
		{"window.choke-peak", "", func(s *site.Site) { s.Converter.ChokeSaturation = typed[quantity.Current](180) }},
		{"window.full-power", "", func(s *site.Site) { s.Converter.RatedPower = typed[quantity.Power](245e3) }},
		{"ripple.source", "", func(s *site.Site) { s.Source.MaxRippleCurrent = typed[quantity.Current](1) }},
		{"ripple.source", "", func(s *site.Site) { s.Converter.Filter = nil }},
		{"ripple.resonance", "", func(s *site.Site) { s.Converter.SwitchingFrequency = typed[quantity.Frequency](2300) }},
		{"ripple.resonance", "", func(s *site.Site) { s.Converter.Filter.Capacitance = typed[quantity.Capacitance](45e-6) }},
		{"droop.advice", "", func(s *site.Site) { s.Infeeds[1].Droop = quantity.DroopSetting{Percent: 0.01, Text: "1 %"} }},
		{"droop.advice", "", func(s *site.Site) { s.Infeeds[0].Setpoint = typed[quantity.Voltage](1060) }},
		{"droop.advice", "", func(s *site.Site) { s.Load.ShareTolerance = typed[quantity.Ratio](0.01) }},
		{"droop.bus-range", "", func(s *site.Site) {
			s.Infeeds[0].Setpoint, s.Infeeds[1].Setpoint = typed[quantity.Voltage](1075), typed[quantity.Voltage](1075)
		}},
		{"droop.bus-range", "", func(s *site.Site) {
			s.Infeeds[0].Setpoint, s.Infeeds[1].Setpoint = typed[quantity.Voltage](870), typed[quantity.Voltage](870)
		}},
		{"droop.share", "", func(s *site.Site) { s.Load.ShareTolerance = typed[quantity.Ratio](0.05) }},
		{"droop.lost-infeed", "aft string", func(s *site.Site) { s.Load.Power = typed[quantity.Power](280e3) }},
		{"droop.lost-infeed", "shore rectifier", func(s *site.Site) { s.Load.Power = typed[quantity.Power](280e3) }},
		{"droop.regeneration", "", func(s *site.Site) { s.Bus.Chopper.On = typed[quantity.Voltage](1047) }},
		{"droop.regeneration", "", func(s *site.Site) { s.Infeeds[0].Regenerates = false; s.Load.Regeneration = typed[quantity.Power](1) }},
		{"droop.stability", "", func(s *site.Site) {
			s.Load.Power = typed[quantity.Power](320e3)
			s.Infeeds[0].Droop, s.Infeeds[1].Droop = quantity.DroopSetting{PerAmpere: 2.2, Text: "t"}, quantity.DroopSetting{PerAmpere: 2.2, Text: "t"}
		}},
		{"droop.instrument", "hand multimeter", func(s *site.Site) { s.Instruments[0].OfReading = 0.01 }},
	} {
		s := findingtest.Clone(findingtest.Load(t, "wagtail"))
		if row.spoil != nil {
			row.spoil(&s)
		}
		f := pick(t, s, row.id, row.subject)
		if f.Verdict == finding.Pass || f.Verdict == finding.Undecided {
			t.Errorf("%s: spoilt site gives %s, want fail or marginal", row.id, f.Verdict)
			continue
		}
		tryOut(t, s, f)
	}
}

// The same for every remedy of the site where nearly everything is wrong.
func TestRemediesOfOuzel(t *testing.T) {
	s := findingtest.Load(t, "ouzel")
	tried := 0
	for _, f := range Check(s, tenths{}).Findings {
		if len(f.Changes) > 0 {
			tryOut(t, s, f)
			tried++
		}
	}
	if tried < 8 {
		t.Errorf("remedies tried = %d, want at least 8", tried)
	}
}

func pick(t *testing.T, s site.Site, id, subject string) finding.Finding {
	t.Helper()
	for _, f := range Findings(s, tenths{}) {
		if f.ID == id && f.Subject == subject {
			return f
		}
	}
	t.Fatalf("no finding %s %q", id, subject)
	return finding.Finding{}
}

func tryOut(t *testing.T, s site.Site, f finding.Finding) {
	t.Helper()
	if len(f.Changes) == 0 || f.Remedy == "" {
		t.Errorf("%s %s: remedy %q changes nothing, want a change (%v)", f.ID, f.Subject, f.Remedy, f.Because)
		return
	}
	mended, err := Try(s, tenths{}, f)
	if err != nil || mended.Verdict != finding.Pass {
		t.Errorf("%s %s with %v = %s (%v, %v), %v, want pass", f.ID, f.Subject, remedy.Phrase(f.Changes), mended.Verdict, mended.Value, mended.Because, err)
	}
	less := f
	less.Changes = nil
	for _, c := range f.Changes {
		c.Value = c.Was + 0.99*(c.Value-c.Was)
		less.Changes = append(less.Changes, c)
	}
	if almost, err := Try(s, tenths{}, less); err != nil || almost.Verdict == finding.Pass {
		t.Errorf("%s %s with one per cent less of %v = %s, %v, want it not to pass", f.ID, f.Subject, remedy.Phrase(f.Changes), almost.Verdict, err)
	}
}

func TestTryRefuses(t *testing.T) {
	s := findingtest.Load(t, "wagtail")
	for _, f := range []finding.Finding{
		{ID: "window.margin"},
		{ID: "window.margin", Changes: []finding.Change{{Key: "site.name"}}},
		{ID: "window.margin", Changes: []finding.Change{{Key: "infeed.setpoint", Subject: "nobody"}}},
		{ID: "window.none", Changes: []finding.Change{{Key: "load.power", Value: 1, Unit: "W"}}},
	} {
		if _, err := Try(s, tenths{}, f); err == nil {
			t.Errorf("Try(%s, %v) = nil, want an error", f.ID, f.Changes)
		}
	}
}
