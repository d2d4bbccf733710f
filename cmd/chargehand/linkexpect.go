package main

import (
	"fmt"
	"math"
	"strings"

	"chargehand/commission/quantity"
	"chargehand/commission/signal"
	"chargehand/commission/site"
	"chargehand/protocol/registermap"
)

// expectation is what a signal ought to read now, and how far that can be relied on.
type expectation struct {
	registermap.Expected
	basis basis
	why   string
	gap   [2]float64           // values within it do not agree: neither dead nor in the window; none where both are 0
	wide  registermap.Expected // with the gap in it; what one change to the whole map must meet
}

// basis is where an expectation comes from.
type basis string

const (
	byMeter   basis = "hand meter"
	bySetting basis = "setting" // the site file's; the device may simply be set otherwise
	byLimits  basis = "limits"  // of what the plant can do
	byRest    basis = "rest"    // of a plant at rest; one that moves, or rests in between, is no proof of anything
)

// Limits that no site file states. Common practice.
const (
	currentMargin  = 1.5   // of a rated current or power, that a healthy plant may show for a moment
	coldest        = -40.0 // °C
	hottest        = 150.0 // °C, of a heat sink
	deadShare      = 0.06  // of the nominal voltage, below which a side counts as dead where the site names no touch-safe voltage
	meterShare     = 0.01  // of a reading, where no accuracy is known
	sensorShare    = 0.02  // of a reading, of sensors whose error the site does not state
	sensorTempSpan = 3.0   // K, between a hand thermometer and the device's sensor
)

// between is the expectation of any value from low to high.
func between(low, high float64, b basis, why string) expectation {
	e := registermap.Expected{Value: (low + high) / 2, Tolerance: (high - low) / 2}
	return expectation{Expected: e, wide: e, basis: b, why: why}
}

// expectedNow says what a site's signals ought to read, given what they do read: a side is dead or in its window, currents
// and power are within what the converter can do, temperatures are possible, settings are those of the site file. A signal
// about which the site says nothing, or too little, is not in the result. read holds the signals that have a value.
func expectedNow(s site.Site, read map[signal.Name]float64) map[signal.Name]expectation {
	all := map[signal.Name]expectation{}
	expectVoltages(all, s, read)
	expectCurrents(all, s)
	expectTemperatures(all, s)
	expectSettings(all, s)
	return all
}

// dead is the voltage up to which a side counts as dead.
func dead(s site.Site) float64 {
	if t := s.Bus.TouchSafe; t != nil && t.Voltage.IsGiven() {
		return float64(t.Voltage.Nominal)
	}
	return deadShare * float64(s.Bus.Nominal.Nominal)
}

func highestBus(s site.Site) float64 {
	if trip := s.Bus.OverVoltageTrip; trip.IsGiven() {
		return float64(trip.Nominal)
	}
	return currentMargin * float64(s.Bus.Nominal.Nominal)
}

// sourceWindow is the source voltage from empty under full discharge to full under full charge.
func sourceWindow(s site.Site) (low, high float64) {
	resistance := float64(s.Source.InternalResistance.High)
	low = float64(s.Source.LowestRest()) - resistance*float64(s.Source.MaxDischargeCurrent.Nominal)
	high = float64(s.Source.HighestRest()) + resistance*float64(s.Source.MaxChargeCurrent.Nominal)
	return max(low, 0), high
}

func expectVoltages(all map[signal.Name]expectation, s site.Site, read map[signal.Name]float64) {
	low, high := sourceWindow(s)
	sourceError, busError := float64(s.Source.Error()), float64(s.Bus.Error())
	put := func(n signal.Name, most, err float64, b basis, what string) {
		gap := [2]float64{dead(s) + err, low - err}
		why := fmt.Sprintf("%s is dead, or within %.0f to %.0f V", what, low, most)
		u, ok := read[n]
		e := between(-gap[0], most+err, b, why)
		e.gap = gap
		if !ok || !e.agrees(registermap.Point{}, u) {
			e.Expected = between(gap[1], most+err, b, why).Expected // what is mapped wrong is rarely dead
		}
		all[n] = e
	}
	put(signal.SourceVoltage, high, sourceError, byLimits, "the source")
	put(signal.BusVoltage, max(high, highestBus(s)), busError, byRest, "the bus at rest")
	put(signal.StarPointVoltage, high, sourceError, byRest, "the star point at rest")
}

func expectCurrents(all map[signal.Name]expectation, s site.Site) {
	within := func(n signal.Name, rated float64, what string) {
		if rated > 0 {
			most := currentMargin * rated
			all[n] = between(-most, most, byLimits, fmt.Sprintf("%.3g times the %s at most", currentMargin, what))
		}
	}
	if c := s.Converter; c != nil {
		within(signal.SourceCurrent, float64(c.RatedCurrent.Nominal), "converter's rated current")
		within(signal.Power, float64(c.RatedPower.Nominal), "converter's rated power")
		within(signal.PowerReference, float64(c.RatedPower.Nominal), "converter's rated power")
		if c.Phases > 0 {
			for _, n := range []signal.Name{signal.PhaseCurrent1, signal.PhaseCurrent2, signal.PhaseCurrent3} {
				within(n, float64(c.RatedCurrent.Nominal)/float64(c.Phases), "rated current of a phase")
			}
		}
	}
	if len(s.Infeeds) > 0 {
		within(signal.BusCurrent, float64(s.Infeeds[0].RatedCurrent.Nominal), "infeed's rated current")
	}
}

func expectTemperatures(all map[signal.Name]expectation, s site.Site) {
	all[signal.HeatsinkTemperature] = between(coldest, hottest, byLimits, "a heat sink's temperature")
	if t := s.Precharge.Thermal; t != nil && t.MaxTemperature.IsGiven() {
		all[signal.ResistorTemperature] = between(coldest, float64(t.MaxTemperature.Nominal)*currentMargin, byLimits, "a resistor's temperature")
	}
}

func expectSettings(all map[signal.Name]expectation, s site.Site) {
	if len(s.Infeeds) > 0 {
		own := s.Infeeds[0]
		if u := own.Setpoint; u.IsGiven() {
			err := float64(own.SetpointError.Of(u.Nominal))
			all[signal.VoltageSetpoint] = between(float64(u.Nominal)-err, float64(u.Nominal)+err, bySetting, "the site's setpoint")
		}
		if own.Droop.IsGiven() {
			droop := float64(own.Droop.At(s.Bus.Nominal.Nominal, own.RatedCurrent.Nominal))
			all[signal.DroopSetting] = between(droop, droop, bySetting, "the site's droop")
		}
	}
	limit := func(n signal.Name, most quantity.Current, what string) {
		if most > 0 {
			all[n] = between(0, float64(most), bySetting, "the source's highest "+what+" current at most")
		}
	}
	limit(signal.ChargeLimit, s.Source.MaxChargeCurrent.Nominal, "charging")
	limit(signal.DischargeLimit, s.Source.MaxDischargeCurrent.Nominal, "discharging")
}

// isNarrow tells whether an expectation is a value rather than a range.
func (e expectation) isNarrow() bool {
	return e.basis == byMeter || e.basis == bySetting && e.Tolerance < 0.1*math.Abs(e.Value)
}

// agrees tells whether a reading of a point is what is expected: within the expectation's own tolerance and half a step of the
// register, or a thousandth of the value, and not in the gap.
func (e expectation) agrees(p registermap.Point, value float64) bool {
	step := 0.0
	if !isFloat(p) {
		step = math.Abs(p.Scale * p.UnitFactor)
	}
	within := max(0.001*math.Abs(e.Value), (e.Tolerance+step/2)*(1+1e-9))
	return math.Abs(value-e.Value) <= within && (value <= e.gap[0] || value >= e.gap[1])
}

// setOtherwise tells whether a value that differs from a setting may well be another setting of the same thing: none at all,
// or from half to twice of what the site has.
func (e expectation) setOtherwise(value float64) bool {
	most := e.Value + e.Tolerance
	return e.basis == bySetting && (value == 0 || value >= most/2 && value <= 2*most)
}

// parseMeter reads SIGNAL=VALUE, such as "bus-voltage=712.4V" or "running=1": what a hand meter says, with how far it, its
// last digit and the device's own sensor may be off together.
func parseMeter(text string, s site.Site, m registermap.Map) (signal.Name, expectation, error) {
	name, value, ok := strings.Cut(text, "=")
	n := signal.Name(strings.TrimSpace(name))
	value = strings.TrimSpace(value)
	switch _, mapped := m.Find(n); {
	case !ok:
		return "", expectation{}, fmt.Errorf("a hand reading is SIGNAL=VALUE, such as bus-voltage=712.4V, read %q", text)
	case !n.IsKnown():
		return "", expectation{}, fmt.Errorf("there is no signal %q; a hand reading is such as bus-voltage=712.4V", n)
	case !mapped:
		return "", expectation{}, fmt.Errorf("the map has no signal %s, so that there is nothing to compare %s with", n, value)
	}
	if n.IsState() {
		value = stateNumber(value)
	}
	v, refusal := quantity.ParseUnit(value, n.Unit(), quantity.Rule{})
	if refusal != nil {
		return "", expectation{}, fmt.Errorf("%s=%s: read %s, want %s, such as %s", n, value, refusal.Read, refusal.Wanted, refusal.Example)
	}
	e := between(v, v, byMeter, "hand meter")
	if n.Unit() != "" {
		e.Tolerance = meterError(n, v, s) + sensorError(n, v, s) + lastDigit(value, n.Unit())/2
	}
	return n, e, nil
}

func stateNumber(word string) string {
	switch strings.ToLower(word) {
	case "on", "yes", "closed", "true":
		return "1"
	case "off", "no", "open", "false":
		return "0"
	}
	return word
}

// meterError is what the site's first hand instrument may be off by.
func meterError(n signal.Name, value float64, s site.Site) float64 {
	if n.Unit() == "V" {
		for _, i := range s.Instruments {
			if i.HasAccuracy {
				return float64(i.ErrorAt(quantity.Voltage(value)))
			}
		}
	}
	return meterShare * math.Abs(value)
}

// sensorError is what the device's own reading may be off by while its map is right.
func sensorError(n signal.Name, value float64, s site.Site) float64 {
	switch n {
	case signal.BusVoltage:
		return float64(s.Bus.Error())
	case signal.SourceVoltage, signal.StarPointVoltage:
		return float64(s.Source.Error())
	case signal.VoltageSetpoint, signal.DroopSetting, signal.ChargeLimit, signal.DischargeLimit, signal.PowerReference:
		return 0 // a number that was keyed in, not measured
	}
	if n.Unit() == "°C" {
		return sensorTempSpan
	}
	return sensorShare * math.Abs(value)
}

// lastDigit is the value, in the coherent unit, of one step of the last digit typed.
func lastDigit(typed, unit string) float64 {
	end := strings.LastIndexAny(typed, "0123456789")
	mantissa, _, _ := strings.Cut(strings.ToLower(typed[:end+1]), "e")
	step := strings.Map(func(r rune) rune {
		if r >= '0' && r <= '9' {
			return '0'
		}
		return r
	}, strings.TrimLeft(mantissa, "-−"))
	rest := typed[len(mantissa):]
	one, refusal := quantity.ParseUnit(step[:len(step)-1]+"1"+rest, unit, quantity.Rule{})
	if refusal != nil {
		return 0
	}
	return one
}
