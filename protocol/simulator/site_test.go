package simulator

import (
	"fmt"
	"testing"

	"chargehand/commission/quantity"
	"chargehand/commission/signal"
	"chargehand/commission/site"
	"chargehand/protocol/registermap"
)

// typed reads a quantity as a site file would.
func typed[Q quantity.Scalar](t testing.TB, text string) quantity.Entered[Q] {
	t.Helper()
	e, refusal := quantity.Parse[Q](text, quantity.Rule{Tolerance: true})
	if refusal != nil {
		t.Fatalf("%s: read %s, wanted %s", text, refusal.Read, refusal.Wanted)
	}
	return e
}

func bound(t testing.TB, text string) quantity.ErrorBound {
	t.Helper()
	e, refusal := quantity.ParseErrorBound(text)
	if refusal != nil {
		t.Fatal(text, refusal)
	}
	return e
}

// wagtail is the site of testdata/sites/wagtail.site.toml in values.
func wagtail(t testing.TB) site.Site {
	v := func(s string) quantity.Entered[quantity.Voltage] { return typed[quantity.Voltage](t, s) }
	a := func(s string) quantity.Entered[quantity.Current] { return typed[quantity.Current](t, s) }
	sec := func(s string) quantity.Entered[quantity.Seconds] { return typed[quantity.Seconds](t, s) }
	farad := func(s string) quantity.Entered[quantity.Capacitance] { return typed[quantity.Capacitance](t, s) }
	ohm := func(s string) quantity.Entered[quantity.Resistance] { return typed[quantity.Resistance](t, s) }
	henry := func(s string) quantity.Entered[quantity.Inductance] { return typed[quantity.Inductance](t, s) }
	watt := func(s string) quantity.Entered[quantity.Power] { return typed[quantity.Power](t, s) }
	ratio := func(s string) quantity.Entered[quantity.Ratio] { return typed[quantity.Ratio](t, s) }
	celsius := func(s string) quantity.Entered[quantity.Temperature] { return typed[quantity.Temperature](t, s) }
	cable := func(length string) *site.Cable {
		return &site.Cable{Length: typed[quantity.Length](t, length), Section: typed[quantity.Area](t, "120 mm²"), Material: "copper",
			Class: 5, Temperature: celsius("60 °C")}
	}
	droop, refusal := quantity.ParseDroop("3 %")
	if refusal != nil {
		t.Fatal(refusal)
	}
	s := site.Site{
		Name: "Ferry Wagtail, aft battery string", Reference: "WAG-017",
		Source: site.Source{Kind: site.Battery, CellsInSeries: 198, CellMax: v("4.15 V"), CellMin: v("3.20 V"),
			Capacity: typed[quantity.Charge](t, "280 Ah"), InternalResistance: ohm("62 mΩ ±15 %"), Inductance: henry("6 µH"),
			MaxChargeCurrent: a("260 A"), MaxDischargeCurrent: a("400 A"), MeasurementError: bound(t, "0.5 %"),
			Fuse: &site.Fuse{Rating: a("500 A"), PreArcingI2t: typed[quantity.CurrentTime2](t, "90000 A²s")}},
		Bus: site.Bus{Nominal: v("1000 V"), UnderVoltageTrip: v("860 V"), OverVoltageTrip: v("1130 V"),
			Chopper:          &site.Chopper{On: v("1090 V"), Off: v("1075 V"), Power: watt("150 kW"), Duration: sec("10 s")},
			MeasurementError: bound(t, "0.5 %"), RegulationError: bound(t, "0.3 %"),
			Capacitances: []site.Bank{{Name: "DC/DC converter", Value: farad("5.6 mF ±20 %")},
				{Name: "port propulsion drive", Value: farad("3.9 mF ±20 %")}, {Name: "hotel supply", Value: farad("2.2 mF ±20 %")}},
			Bleeders:  []site.Bleeder{{Name: "discharge resistor", Value: ohm("22 kΩ ±5 %")}},
			Auxiliary: &site.Auxiliary{Power: watt("40 W"), StartsAt: v("350 V"), StopsAt: v("300 V")}},
		Precharge: site.Precharge{Resistance: ohm("100 Ω ±5 %"), Ambient: celsius("35 °C"),
			Thermal: &site.ResistorThermal{Resistance: typed[quantity.Thermal](t, "0.22 K/W"), TimeConstant: sec("300 s"),
				MaxTemperature: celsius("275 °C")},
			ClosingDifference: v("25 V"), Compares: site.AcrossContactor, MinimumTime: sec("1 s"), Timeout: sec("10.5 s")},
		Converter: &site.Converter{RatedPower: watt("220 kW"), RatedCurrent: a("400 A"), Efficiency: ratio("97.5 %"), Phases: 3,
			Choke: henry("0.42 mH ±10 %"), ChokeResistance: ohm("3 mΩ"),
			Filter: &site.Filter{Capacitance: farad("0.8 mF ±10 %"), ESR: ohm("2 mΩ"), ESL: henry("40 nH"), Position: site.AtStar}},
		Load: &site.Load{Power: watt("200 kW"), Regeneration: watt("120 kW")},
		Infeeds: []site.Infeed{
			{Name: "aft string", RatedCurrent: a("220 A"), Setpoint: v("1030 V"), Droop: droop, SetpointError: bound(t, "0.2 %"),
				Regenerates: true, Cable: cable("18 m")},
			{Name: "shore rectifier", RatedCurrent: a("250 A"), Setpoint: v("1030 V"), Droop: droop, SetpointError: bound(t, "0.2 %"),
				Cable: cable("25 m")}},
		Device: &site.Device{UnitID: 1},
	}
	return s
}

// wagtailMap is the map of testdata/sites/wagtail.map.toml, but for the missing codes.
func wagtailMap() registermap.Map {
	m := registermap.Map{WordOrder: registermap.HighFirst, MaxBlock: 100, MaxGap: 8}
	word := func(n signal.Name, address registermap.Address, kind registermap.Type, scale float64) {
		m.Points = append(m.Points, registermap.Point{Name: n, Table: registermap.Holding, Address: address, Type: kind,
			WordOrder: registermap.HighFirst, ByteOrder: registermap.HighFirst, Scale: scale, UnitFactor: 1})
	}
	for k, n := range []signal.Name{signal.BusVoltage, signal.SourceVoltage, signal.StarPointVoltage} {
		word(n, registermap.Address(100+k), registermap.U16, 0.1)
	}
	for k, n := range []signal.Name{signal.SourceCurrent, signal.BusCurrent, signal.PhaseCurrent1, signal.PhaseCurrent2, signal.PhaseCurrent3} {
		word(n, registermap.Address(103+k), registermap.I16, 0.1)
	}
	word(signal.Power, 108, registermap.I32, 1)
	word(signal.ResistorTemperature, 110, registermap.I16, 0.1)
	word(signal.HeatsinkTemperature, 111, registermap.I16, 0.1)
	word(signal.InsulationResistance, 112, registermap.U16, 1)
	m.Points[len(m.Points)-1].UnitFactor = 1000
	for n, bit := range map[signal.Name]int{signal.Ready: 0, signal.Running: 1, signal.PrechargeClosed: 2, signal.BypassClosed: 3,
		signal.ChopperActive: 5, signal.Fault: 15} {
		m.Points = append(m.Points, registermap.Point{Name: n, Table: registermap.Holding, Address: 120, Type: registermap.Bit,
			BitNumber: bit, Scale: 1, UnitFactor: 1})
	}
	word(signal.FaultCode, 121, registermap.U16, 1)
	word(signal.Mode, 122, registermap.U16, 1)
	m.Points[len(m.Points)-1].Values = map[int64]float64{0: signal.ModeOff, 1: signal.ModeVoltage, 2: signal.ModeCurrent}
	word(signal.Heartbeat, 123, registermap.U16, 1)
	word(signal.VoltageSetpoint, 200, registermap.U16, 0.1)
	word(signal.DroopSetting, 201, registermap.U16, 0.0001)
	word(signal.PowerReference, 202, registermap.I32, 1)
	word(signal.ChargeLimit, 204, registermap.U16, 0.1)
	word(signal.DischargeLimit, 205, registermap.U16, 0.1)
	return m
}

// shown decodes a signal from the registers as they stand, high word first.
func (s *Simulator) shown(t testing.TB, n signal.Name) float64 {
	t.Helper()
	s.mu.Lock()
	defer s.mu.Unlock()
	p, found := s.options.Map.Find(n)
	if !found {
		t.Fatalf("the map has no %s", n)
	}
	image := s.images[0]
	raw := int64(0)
	for k := range p.Type.Words() {
		raw = raw<<16 | int64(image.words[place{image.unit, p.Table, p.Address + registermap.Address(k)}])
	}
	switch p.Type {
	case registermap.I16:
		raw = int64(int16(raw))
	case registermap.I32:
		raw = int64(int32(raw))
	case registermap.Bit:
		return float64(raw >> p.BitNumber & 1)
	case registermap.U16, registermap.U32:
	default:
		t.Fatal(fmt.Sprint("type ", p.Type))
	}
	return float64(raw) * p.Scale * p.UnitFactor
}
