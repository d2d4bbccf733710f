package precharge

import (
	"slices"
	"strings"
	"testing"

	"chargehand/commission/finding"
	"chargehand/commission/finding/findingtest"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

// What is taken away, which findings are undecided then and by which key; all others stay decided.
func TestFindingsNameTheKeysThatAreMissing(t *testing.T) {
	all := []string{"time-constant", "final-voltage", "stall", "time-to-close", "peak-current", "peak-power", "energy", "pulse",
		"repeat", "wait", "shorted-bus", "timeout", "breaking"}
	released := []string{"stall", "time-to-close", "wait", "timeout"}
	findingtest.NameWhatIsMissing(t, Findings, []findingtest.Absence{
		findingtest.Without("converter.choke_resistance", func(s *site.Site) { s.Converter = nil }, all),
		findingtest.Without("converter.phases", func(s *site.Site) { v := *s.Converter; v.Phases = 0; s.Converter = &v }, all),
		findingtest.Without("source.measurement_error", func(s *site.Site) { s.Source.MeasurementError = quantity.ErrorBound{} }, released),
		findingtest.Without("bus.measurement_error", func(s *site.Site) { s.Bus.MeasurementError = quantity.ErrorBound{} }, released),
		findingtest.Without("bus.auxiliary.stops_at", func(s *site.Site) {
			v := *s.Bus.Auxiliary
			v.StopsAt = quantity.Entered[quantity.Voltage]{}
			s.Bus.Auxiliary = &v
		}, slices.DeleteFunc(slices.Clone(all), func(id string) bool { return strings.HasPrefix(id, "peak") || id == "breaking" })),
		findingtest.Without("precharge.rated_power", func(s *site.Site) { s.Precharge.RatedPower = quantity.Entered[quantity.Power]{} },
			[]string{"pulse", "wait", "shorted-bus", "timeout"}),
		findingtest.Without("precharge.derating", func(s *site.Site) { s.Precharge.Derating = nil }, []string{"pulse", "wait", "shorted-bus", "timeout"}),
		findingtest.Without("precharge.ambient", func(s *site.Site) { s.Precharge.Ambient = quantity.Entered[quantity.Temperature]{} },
			[]string{"pulse", "repeat", "wait", "shorted-bus", "timeout"}),
		findingtest.Without("precharge.pulse", func(s *site.Site) { s.Precharge.Pulse, s.Precharge.Overload = nil, nil }, []string{"pulse", "shorted-bus", "timeout"}),
		findingtest.Without("precharge.thermal", func(s *site.Site) { s.Precharge.Thermal = nil }, []string{"shorted-bus", "timeout"}),
		findingtest.Without("precharge.attempts", func(s *site.Site) { s.Precharge.Attempts = 0 }, []string{"repeat", "shorted-bus", "timeout"}),
		findingtest.Without("precharge.interval", func(s *site.Site) { s.Precharge.Interval = quantity.Entered[quantity.Seconds]{} },
			[]string{"repeat", "wait", "shorted-bus", "timeout"}),
		findingtest.Without("precharge.timeout", func(s *site.Site) { s.Precharge.Timeout = quantity.Entered[quantity.Seconds]{} }, []string{"shorted-bus", "timeout"}),
		findingtest.Without("precharge.contactor", func(s *site.Site) { s.Precharge.Contactor = nil }, []string{"breaking"}),
		findingtest.Without("a bleeder, which may be absent", func(s *site.Site) { s.Bus.Bleeders = nil }, nil),
		findingtest.Without("the auxiliary supply, which may be absent", func(s *site.Site) { s.Bus.Auxiliary = nil }, nil),
		findingtest.Without("the filter, which may be absent", func(s *site.Site) { v := *s.Converter; v.Filter = nil; s.Converter = &v }, nil),
		findingtest.Without("the overload, beside a pulse curve", func(s *site.Site) { s.Precharge.Overload = nil }, nil),
	})
}

// One attempt starts at ambient, so it needs no thermal model.
func TestShortedBusOfOneAttemptNeedsNoThermalModel(t *testing.T) {
	s := findingtest.Load(t, "wagtail")
	s.Precharge.Attempts, s.Precharge.Thermal = 1, nil
	if f := findingtest.Find(t, Findings(s), "precharge.shorted-bus", ""); f.Verdict == finding.Undecided {
		t.Errorf("shorted-bus of one attempt = undecided (%v), want a verdict", f.Because)
	}
}

// Every kind of source with every optional table there or not: no panic, values in order, undecided findings name a key.
func TestEveryKindOfSourceAndOptionalTable(t *testing.T) {
	tables := []struct {
		name string
		take func(*site.Site)
	}{
		{"bleeder", func(s *site.Site) { s.Bus.Bleeders = nil }},
		{"auxiliary", func(s *site.Site) { s.Bus.Auxiliary = nil }},
		{"filter", func(s *site.Site) { v := *s.Converter; v.Filter = nil; s.Converter = &v }},
		{"thermal", func(s *site.Site) { s.Precharge.Thermal = nil }},
		{"pulse", func(s *site.Site) { s.Precharge.Pulse = nil }},
		{"overload", func(s *site.Site) { s.Precharge.Overload = nil }},
		{"contactor", func(s *site.Site) { s.Precharge.Contactor = nil }},
		{"timeout", func(s *site.Site) { s.Precharge.Timeout = quantity.Entered[quantity.Seconds]{} }},
	}
	for _, kind := range []site.SourceKind{site.Battery, site.Supercapacitor, site.FuelCell, site.OtherSource} {
		for mask := range 1 << len(tables) {
			if kind != site.Battery && mask >= 16 {
				continue // what lies behind the first four does not know the kind of source
			}
			s := findingtest.Load(t, "wagtail")
			s.Source.Kind = kind
			if kind == site.Supercapacitor {
				findingtest.Set(&s.Source.Capacitance, 14)
			}
			name := string(kind) + " without"
			for i, table := range tables {
				if mask>>i&1 == 1 {
					table.take(&s)
					name += " " + table.name
				}
			}
			a := assess(s)
			a.workings = true
			found := a.findings()
			findingtest.AreOrdered(t, name, found)
			findingtest.Explained(t, name, found)
			if mask >= 8 { // the tables behind the first three do not enter a prediction
				continue
			}
			p := Predict(s, quantity.Exactly(s.Source.HighestRest()), 0)
			if len(p.Missing) > 0 || len(p.Band) == 0 {
				t.Errorf("%s: Predict lacks %v and has %d points, want a band", name, p.Missing, len(p.Band))
			}
		}
	}
}

// Charges that stall, hiccup, never end or hardly begin are explained too.
func TestOddChargesAreExplained(t *testing.T) {
	auxiliary := func(s *site.Site, power, on, off float64) {
		a := *s.Bus.Auxiliary
		findingtest.Set(&a.Power, power)
		findingtest.Set(&a.StartsAt, on)
		findingtest.Set(&a.StopsAt, off)
		s.Bus.Auxiliary = &a
	}
	for name, change := range map[string]func(*site.Site){
		"stalls at the equilibrium":     func(s *site.Site) { findingtest.Set(&s.Precharge.ClosingDifference, 5) },
		"stalls at the divider":         func(s *site.Site) { s.Bus.Auxiliary = nil; findingtest.Set(&s.Precharge.ClosingDifference, 2) },
		"hiccups":                       func(s *site.Site) { auxiliary(s, 2500, 350, 300) },
		"is pulled down to equilibrium": func(s *site.Site) { auxiliary(s, 300, 800, 300); findingtest.Set(&s.Precharge.ClosingDifference, 10) },
		"closes before the supply":      func(s *site.Site) { auxiliary(s, 40, 815, 800) },
		"runs out of time":              func(s *site.Site) { auxiliary(s, 2500, 350, 300); findingtest.Set(&s.Precharge.Timeout, 0.1) },
		"is over at once":               func(s *site.Site) { findingtest.Set(&s.Precharge.ClosingDifference, 820) },
		"no permitted temperature left": func(s *site.Site) { findingtest.Set(&s.Precharge.Ambient, 275) },
		"continuous rating": func(s *site.Site) {
			findingtest.Set(&s.Precharge.RatedPower, 20e3)
			v := *s.Precharge.Thermal
			findingtest.Set(&v.Resistance, 0.001)
			s.Precharge.Thermal = &v
		},
		"pulse on a point of the curve": func(s *site.Site) {
			s.Bus.Bleeders, s.Bus.Auxiliary = nil, nil
			s.Precharge.Pulse = s.Precharge.Pulse[:1]
		},
		"pulse before the curve": func(s *site.Site) { s.Precharge.Pulse = s.Precharge.Pulse[2:] },
		"one attempt":            func(s *site.Site) { s.Precharge.Attempts = 1 },
	} {
		s := findingtest.Load(t, "wagtail")
		change(&s)
		found := Findings(s)
		findingtest.AreOrdered(t, name, found)
		findingtest.Explained(t, name, found)
	}
}

// With tolerances on everything that may have one the corners still hold every draw.
func TestCornersHoldWithTolerancesOnEverything(t *testing.T) {
	s := findingtest.Load(t, "wagtail")
	loose := func(q float64, by float64) (low, high float64) { return q * (1 - by), q * (1 + by) }
	auxiliary, thermal, converter := *s.Bus.Auxiliary, *s.Precharge.Thermal, *s.Converter
	for _, e := range []*quantity.Entered[quantity.Voltage]{&auxiliary.StartsAt, &auxiliary.StopsAt} {
		l, h := loose(float64(e.Nominal), 0.05)
		e.Low, e.High = quantity.Voltage(l), quantity.Voltage(h)
	}
	l, h := loose(float64(auxiliary.Power.Nominal), 0.3)
	auxiliary.Power.Low, auxiliary.Power.High = quantity.Power(l), quantity.Power(h)
	l, h = loose(float64(thermal.Resistance.Nominal), 0.2)
	thermal.Resistance.Low, thermal.Resistance.High = quantity.Thermal(l), quantity.Thermal(h)
	l, h = loose(float64(thermal.TimeConstant.Nominal), 0.2)
	thermal.TimeConstant.Low, thermal.TimeConstant.High = quantity.Seconds(l), quantity.Seconds(h)
	l, h = loose(float64(converter.ChokeResistance.Nominal), 0.5)
	converter.ChokeResistance.Low, converter.ChokeResistance.High = quantity.Resistance(l), quantity.Resistance(h)
	s.Precharge.Ambient.Low, s.Precharge.Ambient.High = 20, 60
	s.Bus.Auxiliary, s.Precharge.Thermal, s.Converter = &auxiliary, &thermal, &converter
	findingtest.Contains(t, s, 1000, verdicts)
}
