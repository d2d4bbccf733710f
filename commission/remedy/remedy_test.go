package remedy

import (
	"fmt"
	"math"
	"testing"

	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/site"

	"pgregory.net/rapid"
)

// The value passes, 99 % of the change does not, and the figure has no more digits than that takes.
func TestLeast(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		from := rapid.Float64Range(1e-6, 1e6).Draw(t, "from")
		threshold := from * (1 + rapid.Float64Range(1e-4, 3).Draw(t, "change")*float64(2*rapid.IntRange(0, 1).Draw(t, "up")-1)/3.01)
		passes := func(x float64) bool {
			return (x-from)*(threshold-from) >= 0 && math.Abs(x-from) >= math.Abs(threshold-from)
		}
		got, ok := Least(from, from+4*(threshold-from), passes)
		if !ok || !passes(got) {
			t.Fatalf("Least(%v → %v) = %v, %v, want one that passes", from, threshold, got, ok)
		}
		if less := from + 0.99*(got-from); passes(less) {
			t.Fatalf("Least(%v → %v) = %v, and 99 %% of the change passes", from, threshold, got)
		}
	})
}

func TestLeastHasNone(t *testing.T) {
	never := func(float64) bool { return false }
	always := func(float64) bool { return true }
	if _, ok := Least(1, 2, never); ok {
		t.Error("Least(never) = a value, want none")
	}
	if _, ok := Least(1, 2, always); ok {
		t.Error("Least(passes already) = a value, want none")
	}
}

func TestAwayFrom(t *testing.T) {
	for _, row := range []struct{ from, value, want float64 }{
		{870, 945.4123, 945.42}, {870, 869.51234, 869.5123}, {100, 33.3333, 33.33}, {0.1, 0.13333333, 0.13334}, {0, 1234567, 1235000}, {5, 5, 5},
	} {
		if got := AwayFrom(row.from, row.value); math.Abs(got-row.want) > 1e-9*math.Abs(row.want) {
			t.Errorf("AwayFrom(%v, %v) = %v, want %v", row.from, row.value, got, row.want)
		}
	}
}

func TestFigure(t *testing.T) {
	for _, row := range []struct {
		v    float64
		unit string
		want string
	}{{945.42, "V", "945.42 V"}, {0.136, "V/A", "136 mV/A"}, {0.05, "1", "5 %"}, {150500, "W", "150.5 kW"}, {0.42e-3, "H", "420 µH"}, {1.5e-3, "F", "1.5 mF"}, {2, "poles", "2 poles"}} {
		if got := Figure(row.v, row.unit); got != row.want {
			t.Errorf("Figure(%v, %q) = %q, want %q", row.v, row.unit, got, row.want)
		}
	}
}

// What a remedy prints for a key can be typed into a site file.
func TestFiguresCanBeTyped(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := rapid.Float64Range(1e-3, 1e5).Draw(t, "v")
		e, refusal := quantity.Parse[quantity.Voltage](Figure(v, "V"), quantity.Rule{})
		if refusal != nil || math.Abs(float64(e.Nominal)-v) > 1e-6*v {
			t.Fatalf("Parse(%q) = %v, %v, want %v", Figure(v, "V"), e.Nominal, refusal, v)
		}
	})
}

// The site handed in stays as it was, tolerances keep their proportion.
func TestApplyTouchesNothing(t *testing.T) {
	volts := func(v float64) quantity.Entered[quantity.Voltage] {
		return quantity.Entered[quantity.Voltage]{Spread: quantity.Exactly(quantity.Voltage(v)), Text: "typed"}
	}
	s := site.Site{
		Converter: &site.Converter{Choke: quantity.Entered[quantity.Inductance]{Spread: quantity.Spread[quantity.Inductance]{Low: 0.9, Nominal: 1, High: 1.2}, Text: "typed"}, Filter: &site.Filter{}},
		Infeeds:   []site.Infeed{{Name: "a", Setpoint: volts(1000)}, {Name: "b", Setpoint: volts(1001)}},
		Bus:       site.Bus{Chopper: &site.Chopper{On: volts(1100)}},
	}
	changed, err := Apply(s, finding.Change{Key: "converter.choke", Value: 2}, finding.Change{Key: "infeed.setpoint", Subject: "b", Value: 1010}, finding.Change{Key: "bus.chopper.on", Value: 1120})
	if err != nil {
		t.Fatal(err)
	}
	if c := changed.Converter.Choke; c.Low != 1.8 || c.High != 2.4 {
		t.Errorf("Apply(converter.choke 2 H) = %v … %v, want 1.8 … 2.4", c.Low, c.High)
	}
	if changed.Infeeds[1].Setpoint.Nominal != 1010 || changed.Infeeds[0].Setpoint.Nominal != 1000 || changed.Bus.Chopper.On.Nominal != 1120 {
		t.Errorf("Apply = %v, %v, want only b and the chopper changed", changed.Infeeds, changed.Bus.Chopper)
	}
	if s.Converter.Choke.Nominal != 1 || s.Infeeds[1].Setpoint.Nominal != 1001 || s.Bus.Chopper.On.Nominal != 1100 {
		t.Error("Apply changed the site handed in")
	}
}

// Every setter says no, and does not panic, where the site has no place for its value.
func TestSettersOnAnEmptySite(t *testing.T) {
	for key := range setters {
		_, err := Apply(site.Site{}, finding.Change{Key: key, Subject: "nobody", Value: 1, Unit: "1"})
		table := map[string]bool{"source.min_voltage": true, "source.internal_resistance": true, "bus.under_voltage_trip": true, "bus.over_voltage_trip": true, "bus.bleeder": true,
			"precharge.resistance": true, "precharge.timeout": true, "precharge.interval": true, "precharge.minimum_time": true, "precharge.closing_difference": true}[key]
		if (err == nil) != table {
			t.Errorf("Apply(empty site, %s) = %v, want an error unless the key needs no table", key, err)
		}
	}
}

// The least voltage above 870 V whose square exceeds 800 000 V², rounded so that it does.
func ExampleLeast() {
	v, ok := Least(870, 1000, func(v float64) bool { return v*v > 800_000 })
	fmt.Println(v, ok)
	// Output: 894.43 true
}

func ExamplePhrase() {
	fmt.Println(Phrase([]finding.Change{{Key: "infeed.setpoint", Subject: "aft string", Unit: "V", Was: 870, Value: 945.42}}))
	// Output: infeed.setpoint of "aft string" to 945.42 V (now 870 V)
}
