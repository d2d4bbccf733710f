package site

import "chargehand/commission/document"

func readPrecharge(t *document.Table) Precharge {
	var p Precharge
	if t == nil {
		return p
	}
	document.Quantity(t, "resistance", &p.Resistance, component(0.1, 1e5, "100 Ω ±5 %"))
	document.Quantity(t, "rated_power", &p.RatedPower, limit(0.1, 1e6, "1 kW"))
	p.Derating = readDerating(t.Table("derating"))
	document.Quantity(t, "ambient", &p.Ambient, degrees("35 °C"))
	p.Overload = readOverload(t.Table("overload"))
	p.Pulse = readPulse(t, t.Tables("pulse"))
	p.Thermal = readThermal(t.Table("thermal"))
	t.Whole("attempts", &p.Attempts, 1, 1000)
	document.Quantity(t, "interval", &p.Interval, limit(0.1, 1e5, "90 s"))
	document.Quantity(t, "closing_difference", &p.ClosingDifference, limit(0.1, 500, "25 V"))
	document.Choice(t, "compares", &p.Compares, AcrossContactor, SourceAgainstBus)
	document.Quantity(t, "minimum_time", &p.MinimumTime, amount(1e-3, 600, "1 s"))
	document.Quantity(t, "timeout", &p.Timeout, limit(1e-3, 3600, "10 s"))
	p.Contactor = readContactor(t.Table("contactor"))
	t.Require(`resistance = "100 Ω ±5 %"`, `closing_difference = "25 V"`)
	notAbove(t, "minimum_time", p.MinimumTime, "timeout", p.Timeout)
	if p.Thermal != nil {
		below(t, "ambient", p.Ambient, "thermal.max_temperature", p.Thermal.MaxTemperature)
	}
	return p
}

func readDerating(t *document.Table) *Derating {
	if t == nil {
		return nil
	}
	var d Derating
	document.Quantity(t, "full_to", &d.FullTo, degrees("40 °C"))
	document.Quantity(t, "zero_at", &d.ZeroAt, degrees("275 °C"))
	t.Require(`full_to = "40 °C"`, `zero_at = "275 °C"`)
	below(t, "full_to", d.FullTo, "zero_at", d.ZeroAt)
	return &d
}

func readOverload(t *document.Table) *Overload {
	if t == nil {
		return nil
	}
	var o Overload
	t.Number("multiple", &o.Multiple)
	document.Quantity(t, "duration", &o.Duration, limit(1e-3, 3600, "5 s"))
	t.Require("multiple = 10", `duration = "5 s"`)
	if o.Multiple != 0 && (o.Multiple < 1 || o.Multiple > 1e6) || t.Has("multiple") && o.Multiple == 0 {
		t.Refuse("multiple", "a multiple of the rated power, 1 or more", "multiple = 10")
	}
	return &o
}

// readPulse wants the points ascending in time, the energy never falling: a resistor that stands 30 kJ in 1 s stands them in
// 10 s too.
func readPulse(t *document.Table, rows []*document.Table) []PulsePoint {
	var points []PulsePoint
	for i, row := range rows {
		var p PulsePoint
		document.Quantity(row, "duration", &p.Duration, limit(1e-6, 1e5, "1 s"))
		document.Quantity(row, "energy", &p.Energy, limit(1e-3, 1e9, "30 kJ"))
		row.Require(`duration = "1 s"`, `energy = "30 kJ"`)
		if i > 0 {
			ascends(row, "duration", p.Duration, points[i-1].Duration)
			neverFalls(row, "energy", "an energy", p.Energy, points[i-1].Energy)
		}
		points = append(points, p)
	}
	if t.Has("pulse") && len(rows) == 0 {
		t.Refuse("pulse", "one point at least", `pulse = [ { duration = "1 s", energy = "30 kJ" } ]`)
	}
	return points
}

func readThermal(t *document.Table) *ResistorThermal {
	if t == nil {
		return nil
	}
	var r ResistorThermal
	document.Quantity(t, "resistance", &r.Resistance, limit(1e-3, 1000, "0.22 K/W"))
	document.Quantity(t, "time_constant", &r.TimeConstant, limit(0.1, 1e5, "300 s"))
	document.Quantity(t, "max_temperature", &r.MaxTemperature, degrees("275 °C"))
	t.Require(`resistance = "0.22 K/W"`, `time_constant = "300 s"`, `max_temperature = "275 °C"`)
	return &r
}

func readContactor(t *document.Table) *Contactor {
	if t == nil {
		return nil
	}
	var c Contactor
	document.Quantity(t, "voltage", &c.Voltage, volts("1200 V"))
	document.Quantity(t, "breaking_current", &c.BreakingCurrent, amperes("20 A"))
	return &c
}

func readBypass(t *document.Table) *Bypass {
	if t == nil {
		return nil
	}
	var b Bypass
	document.Quantity(t, "making_current", &b.MakingCurrent, amperes("2 kA"))
	document.Quantity(t, "carrying_current", &b.CarryingCurrent, amperes("450 A"))
	document.Quantity(t, "voltage", &b.Voltage, volts("1200 V"))
	t.Bool("polarised", &b.Polarised)
	return &b
}
