package window

import (
	"fmt"
	"math"

	"chargehand/commission/finding"
	"chargehand/commission/remedy"
	"chargehand/commission/site"
)

// rung is one voltage of the ladder of limits.
type rung struct {
	name, symbol string
	value        finding.Value
}

// thresholdsFinding judges the ladder source-high < under-voltage trip < bus-low and bus-high < chopper < over-voltage trip <
// capacitor rating: the smallest gap must be at least the measurement error of the bus. Without a chopper its rung falls
// away.
func thresholdsFinding(s site.Site) finding.Finding {
	f := finding.Finding{
		ID: "window.thresholds", Title: "Smallest gap in the ladder of limits", Unit: "V", Guards: true,
		Basis: "source-high < under-voltage trip < bus-low; bus-high < chopper < over-voltage trip < capacitor rating, each by the bus measurement error; " + circuitTheory,
	}
	lower, upper, missing := ladder(s)
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	w := finding.Explain(f.Basis, circuitTheory, "steady state; trips as set")
	f.Parts = append(gaps(w, lower), gaps(w, upper)...)
	value := finding.Exactly(math.Inf(1))
	least, names := f.Parts[0], ""
	for i, p := range f.Parts {
		value = finding.Value{Low: math.Min(value.Low, p.Value.Low), Nominal: math.Min(value.Nominal, p.Value.Nominal), High: math.Min(value.High, p.Value.High)}
		if p.Value.Low < least.Value.Low {
			least = p
		}
		if i > 0 {
			names += ", "
		}
		names += fmt.Sprintf("gap_%d", i+1)
	}
	errorBound := float64(s.Bus.Error())
	f = f.Judged(value, finding.AtLeast(errorBound), 0)
	f.Because = append(f.Because, fmt.Sprintf("smallest: %s, %.4g V at worst", least.Name, least.Value.Low))
	w.Step("gap", "min("+names+")", "V", value.Nominal)
	w.Spread("the internal resistance of the source at its greatest lifts source-high", nil, nil)
	f.Explanation = w.Done()
	if f.Verdict == finding.Fail {
		f.Remedy, f.Changes = mendLadder(s, lower[0].value.High, lower[2].value.Low, upper[0].value.High)
	}
	return f
}

func ladder(s site.Site) (lower, upper []rung, missing finding.Missing) {
	source, missing := sourceHigh(s)
	low, more := busEnd(s, false)
	missing.Add(more...)
	high, more := busEnd(s, true)
	missing.Add(more...)
	missing.Need("bus.under_voltage_trip", s.Bus.UnderVoltageTrip.IsGiven())
	missing.Need("bus.over_voltage_trip", s.Bus.OverVoltageTrip.IsGiven())
	missing.Need("bus.capacitor_rating", s.Bus.CapacitorRating.IsGiven())
	exactly := func(v float64) finding.Value { return finding.Exactly(v) }
	lower = []rung{
		{"source-high", "V_source_high", source.values},
		{"under-voltage trip", "V_uv", exactly(float64(s.Bus.UnderVoltageTrip.Nominal))},
		{"bus-low", "V_bus_low", low.values},
	}
	upper = []rung{{"bus-high", "V_bus_high", high.values}}
	if c := s.Bus.Chopper; c != nil {
		missing.Need("bus.chopper.on", c.On.IsGiven())
		upper = append(upper, rung{"chopper", "V_chopper", exactly(float64(c.On.Nominal))})
	}
	upper = append(upper,
		rung{"over-voltage trip", "V_ov", exactly(float64(s.Bus.OverVoltageTrip.Nominal))},
		rung{"capacitor rating", "V_cap", exactly(float64(s.Bus.CapacitorRating.Nominal))})
	return lower, upper, missing
}

// gaps are the distances from rung to rung; their steps number on after those that w already holds.
func gaps(w *finding.Working, rungs []rung) []finding.Part {
	var parts []finding.Part
	first := len(w.Done().Steps)
	for i, r := range rungs {
		w.Given(r.symbol, r.name, "V", r.value.Nominal)
		if i == 0 {
			continue
		}
		below := rungs[i-1]
		gap := finding.Value{Low: r.value.Low - below.value.High, Nominal: r.value.Nominal - below.value.Nominal, High: r.value.High - below.value.Low}
		parts = append(parts, finding.Part{Name: below.name + " to " + r.name, Unit: "V", Value: gap})
		w.Step(fmt.Sprintf("gap_%d", first+i), r.symbol+" - "+below.symbol, "V", gap.Nominal)
	}
	return parts
}

// mendLadder finds the nearest places for the trips, from below upwards: the under-voltage trip between source and bus
// (lifting the bus where there is no such place), then chopper and over-voltage trip above the bus. The capacitor rating
// is hardware and stays.
func mendLadder(s site.Site, sourceHigh, busLow, busHigh float64) (string, []finding.Change) {
	errorBound := float64(s.Bus.Error())
	var changes []finding.Change
	var text string
	move := func(key string, was, to float64) float64 {
		if was != to {
			to = beyond(was, to)
			changes = append(changes, finding.Change{Key: key, Unit: "V", Was: was, Value: to})
		}
		return to
	}
	under := float64(s.Bus.UnderVoltageTrip.Nominal)
	lowest, highest := sourceHigh+errorBound, busLow-errorBound
	switch {
	case lowest <= highest:
		move("bus.under_voltage_trip", under, math.Min(math.Max(under, lowest), highest))
	default:
		text = fmt.Sprintf("source-high %.5g V and bus-low %.5g V exclude each other: a trip between them needs %.4g V more; ", sourceHigh, busLow, lowest-highest)
		moved := under
		if under < lowest { // a trip above it may stay: only the bus has to rise
			moved = move("bus.under_voltage_trip", under, lowest)
		}
		_, lift := raiseBus(s, moved-highest)
		changes = append(changes, lift...)
		busHigh = busHighWith(s, lift, busHigh)
	}
	top := busHigh
	if c := s.Bus.Chopper; c != nil {
		was := float64(c.On.Nominal)
		top = move("bus.chopper.on", was, math.Max(was, top+errorBound))
	}
	over := float64(s.Bus.OverVoltageTrip.Nominal)
	top = move("bus.over_voltage_trip", over, math.Max(over, top+errorBound))
	if short := top + errorBound - float64(s.Bus.CapacitorRating.Nominal); short > 0 {
		return text + fmt.Sprintf("bus-high %.5g V and the capacitor rating %.5g V exclude each other: the trips between them need %.4g V more; a lower setpoint or less droop is needed",
			busHigh, float64(s.Bus.CapacitorRating.Nominal), short), nil
	}
	return text + "set " + remedy.Phrase(changes), changes
}

// beyond rounds a value away from what it was, by at least a part in 10⁹, so that a gap that is met exactly is not lost to
// rounding.
func beyond(was, to float64) float64 { return remedy.AwayFrom(was, to+(to-was)*1e-9) }

func busHighWith(s site.Site, changes []finding.Change, otherwise float64) float64 {
	changed, err := remedy.Apply(s, changes...)
	if err != nil {
		return otherwise
	}
	high, _ := busEnd(changed, true)
	return high.values.High
}
