package main

import (
	"slices"
	"strings"
	"testing"

	"chargehand/commission/signal"
	"chargehand/protocol/registermap"
)

// floats is a map of floats side by side in one word order, and what a plant with a charged source and a dead bus sends in
// another.
func floats(t *testing.T, mapped, sent registermap.Order) (registermap.Map, registermap.Words) {
	t.Helper()
	m := registermap.Map{WordOrder: mapped, MaxBlock: 100}
	words := registermap.Words{}
	for i, s := range []struct {
		name  signal.Name
		value float64
	}{{signal.BusVoltage, 0.8}, {signal.SourceVoltage, 795}, {signal.StarPointVoltage, 0.6}, {signal.SourceCurrent, -0.1},
		{signal.VoltageSetpoint, 1030}, {signal.DroopSetting, 30.0 / 220}, {signal.ResistorTemperature, 34.1}} {
		p := registermap.Point{Name: s.name, Table: registermap.Input, Address: registermap.Address(10 + 2*i), Type: registermap.F32,
			WordOrder: sent, ByteOrder: registermap.HighFirst, Scale: 1, UnitFactor: 1}
		raw, err := p.Encode(s.value)
		if err != nil {
			t.Fatal(err)
		}
		words.Put(registermap.Span{UnitID: 1, Table: p.Table, Address: p.Address, Quantity: 2}, raw)
		p.WordOrder = mapped
		m.Points = append(m.Points, p)
	}
	return m, words
}

func TestJudgeFindsTheWordOrderOfTheWholeMap(t *testing.T) {
	s, _ := wagtail(t)
	for _, test := range []struct {
		mapped, sent registermap.Order
		accused      bool
	}{{registermap.HighFirst, registermap.LowFirst, true}, {registermap.LowFirst, registermap.HighFirst, true},
		{registermap.LowFirst, registermap.LowFirst, false}} {
		m, words := floats(t, test.mapped, test.sent)
		read := map[signal.Name]float64{}
		for _, p := range m.Points {
			raw, _ := words.Of(p, 1)
			if r := p.Decode(raw); r.Quality.HasValue() {
				read[p.Name] = r.Value
			}
		}
		d, expected := judge(m, 1, []linkSample{{words: words, site: expectedNow(s, read)}})
		o := opinionOf(papers{site: s, registers: m, mapFile: "f.map.toml"}, d, expected, nil)
		want := `  f.map.toml: word_order = "` + string(test.sent) + `"`
		if o.accused != test.accused || slices.Contains(o.lines, want) != test.accused {
			t.Errorf("map %s, device %s: opinion = %v\n%s\nwant accused %v by %s", test.mapped, test.sent, o.accused,
				strings.Join(o.lines, "\n"), test.accused, want)
		}
	}
}

func TestAHandMeterSpeaksLouderThanTheSite(t *testing.T) {
	site := map[signal.Name]expectation{signal.BusVoltage: between(0, 1135, byRest, "rest"), signal.Power: between(-1, 1, byLimits, "limits")}
	meter := map[signal.Name]expectation{signal.BusVoltage: between(712, 713, byMeter, "hand meter")}
	samples, latest := compared([]linkSample{{site: site}, {site: site, meters: meter}}, narrowly)
	if _, ok := samples[0].Expected[signal.BusVoltage]; ok {
		t.Error("compared: a metered signal is held against the site's range too, want the meter alone")
	}
	if got := samples[1].Expected[signal.BusVoltage].Value; got != 712.5 || latest[signal.BusVoltage].basis != byMeter {
		t.Errorf("compared: the bus is expected at %g by %s, want 712.5 by the meter", got, latest[signal.BusVoltage].basis)
	}
	if _, ok := samples[0].Expected[signal.Power]; !ok {
		t.Error("compared: power is not expected, want the site's range")
	}
}
