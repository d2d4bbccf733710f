package site

import "chargehand/commission/document"

func readBus(t *document.Table) Bus {
	var b Bus
	if t == nil {
		return b
	}
	document.Quantity(t, "nominal", &b.Nominal, volts("1000 V"))
	document.Quantity(t, "under_voltage_trip", &b.UnderVoltageTrip, volts("860 V"))
	document.Quantity(t, "over_voltage_trip", &b.OverVoltageTrip, volts("1130 V"))
	b.Chopper = readChopper(t.Table("chopper"))
	document.Quantity(t, "capacitor_rating", &b.CapacitorRating, volts("1200 V"))
	t.ErrorBound("measurement_error", &b.MeasurementError)
	t.ErrorBound("regulation_error", &b.RegulationError)
	document.Quantity(t, "ripple", &b.Ripple, amount(0.01, 500, "4 V"))
	document.Quantity(t, "wanted_margin", &b.WantedMargin, amount(0.1, 500, "30 V"))
	document.Quantity(t, "margin_fail", &b.MarginFail, amount(0.1, 500, "20 V"))
	b.TouchSafe = readTouchSafe(t.Table("touch_safe"))
	document.Choice(t, "earthing", &b.Earthing, Insulated, MidPoint, NegativeEarth)
	b.Capacitances = readBanks(t.Tables("capacitance"))
	b.Bleeders = readBleeders(t.Tables("bleeder"))
	b.Auxiliary = readAuxiliary(t.Table("auxiliary"))
	b.InsulationMonitors = readMonitors(t.Tables("insulation_monitor"))
	t.Require(`nominal = "1000 V"`)
	if t.Has("capacitance") && len(b.Capacitances) == 0 {
		t.Refuse("capacitance", "one bank at least", `capacitance = [ { name = "converter", value = "5.6 mF ±20 %" } ]`)
	}
	t.RequireTable("[[bus.capacitance]]", `[[bus.capacitance]] with value = "5.6 mF ±20 %"`)
	below(t, "under_voltage_trip", b.UnderVoltageTrip, "over_voltage_trip", b.OverVoltageTrip)
	notAbove(t, "margin_fail", b.MarginFail, "wanted_margin", b.WantedMargin)
	return b
}

func readChopper(t *document.Table) *Chopper {
	if t == nil {
		return nil
	}
	var c Chopper
	document.Quantity(t, "on", &c.On, volts("1090 V"))
	document.Quantity(t, "off", &c.Off, volts("1075 V"))
	document.Quantity(t, "power", &c.Power, limit(10, 1e8, "150 kW"))
	document.Quantity(t, "duration", &c.Duration, limit(1e-3, 1e5, "10 s"))
	t.Require(`on = "1090 V"`)
	notAbove(t, "off", c.Off, "on", c.On)
	return &c
}

func readTouchSafe(t *document.Table) *TouchSafe {
	if t == nil {
		return nil
	}
	var s TouchSafe
	document.Quantity(t, "voltage", &s.Voltage, limit(1, 120, "60 V"))
	document.Quantity(t, "within", &s.Within, limit(0.1, 3600, "5 s"))
	t.Require(`voltage = "60 V"`, `within = "5 s"`)
	return &s
}

func readBanks(rows []*document.Table) []Bank {
	var banks []Bank
	names := unique{}
	for _, t := range rows {
		var b Bank
		t.Text("name", &b.Name, "port propulsion drive")
		document.Quantity(t, "value", &b.Value, component(1e-6, 10, "3.9 mF ±20 %"))
		t.Bool("isolated", &b.Isolated)
		t.Require(`name = "port propulsion drive"`, `value = "3.9 mF ±20 %"`)
		names.check(t, "name", b.Name, "capacitance")
		banks = append(banks, b)
	}
	return banks
}

func readBleeders(rows []*document.Table) []Bleeder {
	var bleeders []Bleeder
	names := unique{}
	for _, t := range rows {
		var b Bleeder
		t.Text("name", &b.Name, "discharge resistor")
		document.Quantity(t, "value", &b.Value, component(1, 1e7, "22 kΩ ±5 %"))
		document.Quantity(t, "power", &b.Power, limit(0.1, 1e6, "120 W"))
		t.Require(`value = "22 kΩ ±5 %"`)
		names.check(t, "name", b.Name, "bleeder")
		bleeders = append(bleeders, b)
	}
	return bleeders
}

func readAuxiliary(t *document.Table) *Auxiliary {
	if t == nil {
		return nil
	}
	var a Auxiliary
	document.Quantity(t, "power", &a.Power, amount(0.1, 1e5, "40 W"))
	document.Quantity(t, "starts_at", &a.StartsAt, volts("350 V"))
	document.Quantity(t, "stops_at", &a.StopsAt, volts("300 V"))
	t.Require(`power = "40 W"`, `starts_at = "350 V"`, `stops_at = "300 V"`)
	notAbove(t, "stops_at", a.StopsAt, "starts_at", a.StartsAt)
	return &a
}

func readMonitors(rows []*document.Table) []InsulationMonitor {
	var monitors []InsulationMonitor
	places := unique{}
	for _, t := range rows {
		var m InsulationMonitor
		t.Text("where", &m.Where, "main switchboard")
		t.Bool("active", &m.Active)
		t.Require(`where = "main switchboard"`, "active = true")
		places.check(t, "where", m.Where, "insulation monitor")
		monitors = append(monitors, m)
	}
	return monitors
}
