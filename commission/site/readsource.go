package site

import (
	"chargehand/commission/document"
	"chargehand/commission/quantity"
)

func readSource(t *document.Table) Source {
	s := Source{Kind: OtherSource}
	if t == nil {
		return s
	}
	document.Choice(t, "kind", &s.Kind, Battery, Supercapacitor, FuelCell, OtherSource)
	t.Whole("cells_in_series", &s.CellsInSeries, 1, 100_000)
	document.Quantity(t, "cell_max", &s.CellMax, limit(0.3, 6, "4.15 V"))
	document.Quantity(t, "cell_min", &s.CellMin, limit(0.3, 6, "3.20 V"))
	document.Quantity(t, "max_voltage", &s.MaxVoltage, volts("820 V"))
	document.Quantity(t, "min_voltage", &s.MinVoltage, volts("630 V"))
	limits := "rest"
	document.Choice(t, "limits", &limits, "rest", "under-current")
	s.LimitsUnderCurrent = limits == "under-current"
	document.Quantity(t, "capacitance", &s.Capacitance, component(0.01, 1e5, "14 F -10/+20 %"))
	t.Bool("blocking_diode", &s.BlockingDiode)
	document.Quantity(t, "capacity", &s.Capacity, limit(0.1*3600, 1e6*3600, "280 Ah"))
	document.Quantity(t, "internal_resistance", &s.InternalResistance, component(10e-6, 100, "62 mΩ ±15 %"))
	document.Quantity(t, "inductance", &s.Inductance, parasitic(10e-9, 10e-3, "6 µH"))
	document.Quantity(t, "max_charge_current", &s.MaxChargeCurrent, amount(0.1, 1e5, "260 A"))
	document.Quantity(t, "max_discharge_current", &s.MaxDischargeCurrent, amount(0.1, 1e5, "400 A"))
	document.Quantity(t, "max_ripple_current", &s.MaxRippleCurrent, amount(0.01, 1e4, "12 A"))
	t.ErrorBound("measurement_error", &s.MeasurementError)
	s.Fuse = readFuse(t.Table("fuse"))
	s.Switch = readSwitch(t.Table("switch"))
	s.StateOfCharge = readStateOfCharge(t, t.Tables("soc"))
	t.Require(`internal_resistance = "62 mΩ ±15 %"`)
	checkVoltages(t, s)
	checkKind(t, &s)
	return s
}

// checkVoltages wants the voltage window once: by cells, or of the whole source.
func checkVoltages(t *document.Table, s Source) {
	byCells := t.Has("cells_in_series") || t.Has("cell_max") || t.Has("cell_min")
	whole := t.Has("max_voltage") || t.Has("min_voltage")
	switch {
	case byCells && whole:
		for _, key := range []string{"max_voltage", "min_voltage"} {
			if t.Has(key) {
				t.Refuse(key, "the voltages once: by cells_in_series with cell_max and cell_min, or by max_voltage and min_voltage", "")
			}
		}
	case whole:
		t.Require(`max_voltage = "820 V"`, `min_voltage = "630 V"`)
	default:
		t.Require("cells_in_series = 198", `cell_max = "4.15 V"`, `cell_min = "3.20 V"`)
	}
	notAbove(t, "cell_min", s.CellMin, "cell_max", s.CellMax)
	notAbove(t, "min_voltage", s.MinVoltage, "max_voltage", s.MaxVoltage)
}

func checkKind(t *document.Table, s *Source) {
	switch s.Kind {
	case Supercapacitor:
		t.Require(`capacitance = "14 F -10/+20 %"`)
	case FuelCell:
		if !s.BlockingDiode {
			t.Refuse("blocking_diode", "blocking_diode = true, without which a fuel cell is fed backwards", "blocking_diode = true")
		}
		if s.MaxChargeCurrent.Nominal > 0 {
			t.Refuse("max_charge_current", "0 A: nothing charges a fuel cell through its blocking diode", `max_charge_current = "0 A"`)
		}
		if !t.Has("max_charge_current") {
			s.MaxChargeCurrent = quantity.Entered[quantity.Current]{Text: "0 A"}
		}
	}
	if s.Kind != Supercapacitor && s.Capacitance.IsGiven() {
		t.Warn("capacitance", "only a supercapacitor's is used")
	}
}

func readFuse(t *document.Table) *Fuse {
	if t == nil {
		return nil
	}
	var f Fuse
	document.Quantity(t, "rating", &f.Rating, amperes("500 A"))
	document.Quantity(t, "pre_arcing_i2t", &f.PreArcingI2t, limit(0.1, 1e9, "90000 A²s"))
	document.Quantity(t, "voltage", &f.Voltage, volts("1250 V"))
	document.Quantity(t, "breaking_capacity", &f.BreakingCapacity, amperes("50 kA"))
	return &f
}

func readSwitch(t *document.Table) *Switch {
	if t == nil {
		return nil
	}
	var s Switch
	t.Whole("poles", &s.Poles, 1, 8)
	document.Quantity(t, "voltage", &s.Voltage, volts("1250 V"))
	document.Quantity(t, "breaking_current", &s.BreakingCurrent, amperes("500 A"))
	return &s
}

// readStateOfCharge wants two points at least, ascending, the voltage never falling: it is read backwards too.
func readStateOfCharge(t *document.Table, rows []*document.Table) []ChargePoint {
	var points []ChargePoint
	for i, row := range rows {
		var p ChargePoint
		document.Quantity(row, "soc", &p.StateOfCharge, amount(0, 0, "10 %"))
		document.Quantity(row, "cell", &p.Cell, limit(0.3, 5000, "3.45 V"))
		row.Require(`soc = "10 %"`, `cell = "3.45 V"`)
		atMostAll(row, "soc", p.StateOfCharge)
		if i > 0 {
			ascends(row, "soc", p.StateOfCharge, points[i-1].StateOfCharge)
			neverFalls(row, "cell", "a voltage", p.Cell, points[i-1].Cell)
		}
		points = append(points, p)
	}
	if t.Has("soc") && len(rows) < 2 {
		t.Refuse("soc", "two points at least", `soc = [ { soc = "0 %", cell = "3.20 V" }, { soc = "100 %", cell = "4.15 V" } ]`)
	}
	return points
}
