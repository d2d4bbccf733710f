package window

import (
	"chargehand/commission/corner"
	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/remedy"
	"chargehand/commission/site"
)

// Duty is the ideal duty of the lower switch, 1 − source ⁄ bus. It is negative where the source stands above the bus.
func Duty(source, bus quantity.Voltage) quantity.Ratio { return quantity.Ratio(1 - source/bus) }

// Drops are the conduction drops of one phase: its series resistance, the drop of a conducting switch, of a diode.
type Drops struct {
	Resistance      quantity.Resistance
	Switch, Forward quantity.Voltage
}

// DutyWithDrops is the duty of the lower switch of one phase that carries current (positive from source to bus) with
// conduction drops: (V_bus + V_F − V_source + i·R) ⁄ (V_bus + V_F − V_CE) discharging, and charging
// 1 − (V_source + |i|·R + V_F) ⁄ (V_bus − V_CE + V_F).
func DutyWithDrops(source, bus quantity.Voltage, current quantity.Current, d Drops) quantity.Ratio {
	drop := quantity.Voltage(float64(current) * float64(d.Resistance))
	if current < 0 {
		return quantity.Ratio(1 - (source-drop+d.Forward)/(bus-d.Switch+d.Forward))
	}
	return quantity.Ratio((bus + d.Forward - source + drop) / (bus + d.Forward - d.Switch))
}

// dutyFinding judges the lowest duty, at the highest source and the lowest bus voltage, and the highest, at the lowest
// source and the highest bus, against what the hardware can make.
func dutyFinding(s site.Site) finding.Finding {
	f := finding.Finding{
		ID: "window.duty", Title: "Duty of the lower switch", Unit: "1", Guards: true,
		Basis: "D = 1 − V_source⁄V_bus within [D_hw, 1 − D_hw], D_hw = f_sw·(t_min + t_dead); " + powerElectronics,
	}
	high, missing := sourceHigh(s)
	low, more := sourceLow(s)
	missing.Add(more...)
	busLow, more := busEnd(s, false)
	missing.Add(more...)
	busHigh, more := busEnd(s, true)
	missing.Add(more...)
	least, more := hardwareDuty(s)
	missing.Add(more...)
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	if busLow.values.Low <= 0 {
		return f.Without(finding.Fail, "the lowest steady bus voltage is not above 0 V")
	}
	mean := (s.Source.HighestRest() + s.Source.LowestRest()) / 2
	f = f.Judged(finding.Value{
		Low:     1 - high.values.High/busLow.values.Low,
		Nominal: float64(Duty(mean, s.Bus.Nominal.Nominal)),
		High:    1 - low.values.Low/busHigh.values.High,
	}, finding.Between(float64(least), 1-float64(least)), 0)
	f.Explanation = dutyWorking(f, s, high, low, busLow, busHigh, float64(least))
	switch {
	case f.Verdict != finding.Fail:
	case f.Value.Low < *f.Limit.Low:
		f.Because = append(f.Because, "at the highest source and the lowest bus voltage the hardware cannot pulse that short")
		f.Remedy, f.Changes = raiseBus(s, high.values.High/(1-float64(least))-busLow.values.Low)
	default:
		f.Because = append(f.Because, "at the lowest source and the highest bus voltage the hardware cannot pulse that long")
		f.Remedy, f.Changes = liftSource(s, func(s site.Site) bool {
			low, _ := sourceLow(s)
			return low.values.Low >= busHigh.values.High*float64(least)
		})
	}
	return f
}

func dutyWorking(f finding.Finding, s site.Site, high, low, busLow, busHigh end, least float64) *finding.Explanation {
	w := finding.Explain(f.Basis, powerElectronics, "continuous current, drops neglected")
	w.Given("V_source_high", "highest source voltage over tolerances", "V", high.values.High)
	w.Given("V_source_low", "lowest source voltage over tolerances", "V", low.values.Low)
	w.Given("V_bus_low", "lowest steady bus voltage", "V", busLow.values.Low)
	w.Given("V_bus_high", "highest steady bus voltage", "V", busHigh.values.High)
	w.Given("E_high", "rest voltage at the top", "V", float64(s.Source.HighestRest()))
	w.Given("E_low", "rest voltage at the bottom", "V", float64(s.Source.LowestRest()))
	w.Given("V_nom", "nominal bus voltage", "V", float64(s.Bus.Nominal.Nominal))
	w.Given("D_hw", "least duty of the hardware", "1", least)
	w.Step("D_low", "1 - V_source_high / V_bus_low", "1", f.Value.Low)
	w.Step("D_high", "1 - V_source_low / V_bus_high", "1", f.Value.High)
	w.Step("D_greatest", "1 - D_hw", "1", 1-least)
	w.Step("D", "1 - (E_high + E_low) / 2 / V_nom", "1", f.Value.Nominal)
	w.Spread("lowest at the highest source and the lowest bus voltage, highest at the lowest source and the highest bus voltage",
		corner.Names([]corner.Axis{high.internal}), []float64{high.values.High - high.values.Low})
	return w.Done()
}

// liftSource is the remedy of stopping the discharge earlier: the lowest rest voltage, by cell where the source has cells,
// with which passes is true, and the state of charge it stands for.
func liftSource(s site.Site, passes func(site.Site) bool) (string, []finding.Change) {
	change := finding.Change{Key: "source.min_voltage", Unit: "V", Was: float64(s.Source.MinVoltage.Nominal)}
	limit := float64(s.Source.HighestRest())
	if n := s.Source.CellsInSeries; n > 0 {
		change.Key, change.Was = "source.cell_min", float64(s.Source.CellMin.Nominal)
		limit /= float64(n)
	}
	change, ok := remedy.LeastChange(s, change, limit, passes)
	if !ok {
		return "", nil
	}
	changes := []finding.Change{change}
	text := "end the discharge earlier: set " + remedy.Phrase(changes)
	rest := change.Value
	if n := s.Source.CellsInSeries; n > 0 {
		rest *= float64(n)
	}
	if charge, known := stateOfCharge(s, rest); known {
		text += ", a state of charge of " + remedy.Figure(charge, "1")
	}
	return text, changes
}

// lowerPower is the remedy of a lower rating: the greatest converter.rated_power with which passes is true.
func lowerPower(s site.Site, passes func(site.Site) bool) (string, []finding.Change) {
	change := finding.Change{Key: "converter.rated_power", Unit: "W", Was: float64(s.Converter.RatedPower.Nominal)}
	change, ok := remedy.LeastChange(s, change, 0, passes)
	if !ok {
		return "", nil
	}
	changes := []finding.Change{change}
	return "limit the power: set " + remedy.Phrase(changes), changes
}
