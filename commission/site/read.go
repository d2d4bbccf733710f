package site

import (
	"chargehand/commission/document"
	"chargehand/commission/quantity"
)

// Warning is something in a site file that is allowed and likely a slip, such as 62 MΩ inside a battery.
type Warning = document.Warning

// Read reads a site file. The error is a [*document.Problems] that holds everything wrong with it, in order of place; name is
// only for its messages. A Site is given only where there is none.
//
// Required are [site] with its name, [source] with its voltages and internal_resistance, [bus] with nominal and one
// capacitance, and [precharge] with resistance and closing_difference. Of a table that is there, the keys without which it
// means nothing are required too. Everything else may be absent and is then not given in the Site, except these, which have
// a value of their own: source.kind "other", cable.class 2 (IEC 60228 for fixed installation), unit_id 1, device.max_age
// 500 ms, and max_charge_current 0 of a fuel cell.
func Read(name string, text []byte) (Site, []Warning, error) {
	f := document.Open(name, text, Format)
	s := read(f.Root())
	if err := f.Err(); err != nil {
		return Site{}, f.Warnings(), err
	}
	return s, f.Warnings(), nil
}

func read(t *document.Table) Site {
	t.RequireTable("[site]", `[site] with name = "Ferry Wagtail, aft battery string"`)
	t.RequireTable("[source]", `[source] with max_voltage = "820 V"`)
	t.RequireTable("[bus]", `[bus] with nominal = "1000 V"`)
	t.RequireTable("[precharge]", `[precharge] with resistance = "100 Ω ±5 %"`)
	var s Site
	readHeading(t.Table("site"), &s)
	s.Source = readSource(t.Table("source"))
	s.Bus = readBus(t.Table("bus"))
	s.Precharge = readPrecharge(t.Table("precharge"))
	s.Bypass = readBypass(t.Table("bypass"))
	s.Converter = readConverter(t.Table("converter"))
	s.Load = readLoad(t.Table("load"))
	s.Infeeds = readInfeeds(t.Tables("infeed"))
	s.Instruments = readInstruments(t.Tables("instrument"))
	s.People = readPeople(t.Tables("person"))
	s.Points = readPoints(t.Tables("point"))
	s.Peers = readPeers(t.Tables("peer"), s.Infeeds)
	s.Device = readDevice(t.Table("device"))
	checkAcross(t, s)
	return s
}

func readHeading(t *document.Table, s *Site) {
	t.Text("name", &s.Name, "Ferry Wagtail, aft battery string")
	t.Text("reference", &s.Reference, "WAG-017")
	t.Text("location", &s.Location, "Aldermere slipway")
	t.Require(`name = "Ferry Wagtail, aft battery string"`)
}

// checkAcross refuses what two tables make impossible together.
func checkAcross(t *document.Table, s Site) {
	precharge, bus := t.Table("precharge"), t.Table("bus")
	high := s.Source.HighestRest()
	if d := s.Precharge.ClosingDifference; d.IsGiven() && high > 0 && d.Nominal >= high {
		precharge.Refuse("closing_difference", "less than the highest source voltage, "+quantity.Engineering(float64(high), "V", 3), `closing_difference = "25 V"`)
	}
	if len(s.Bus.Capacitances) > 0 && s.StarFilter() == nil && allIsolated(s.Bus.Capacitances) {
		bus.RefuseTable("every bank isolated", "one capacitance that is charged through the resistor", "isolated = false")
	}
}

func allIsolated(banks []Bank) bool {
	for _, b := range banks {
		if !b.Isolated {
			return false
		}
	}
	return true
}
