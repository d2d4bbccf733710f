package main

import (
	"math"
	"testing"

	"chargehand/commission/signal"
	"chargehand/commission/site"
	"chargehand/protocol/registermap"
)

func wagtail(t *testing.T) (site.Site, registermap.Map) {
	t.Helper()
	s, _, err := site.Read("wagtail.site.toml", []byte(shared(t, "wagtail.site.toml")))
	if err != nil {
		t.Fatal(err)
	}
	m, err := registermap.Read("wagtail.map.toml", []byte(shared(t, "wagtail.map.toml")))
	if err != nil {
		t.Fatal(err)
	}
	return s, m
}

func TestExpectedNow(t *testing.T) {
	s, _ := wagtail(t)
	live := map[signal.Name]float64{signal.SourceVoltage: 724.8, signal.BusVoltage: 1024.3}
	tests := []struct {
		name      string
		read      map[signal.Name]float64
		signal    signal.Name
		low, high float64
		basis     basis
		source    string
	}{
		{"source in its window", live, signal.SourceVoltage, -64.11, 844.35, byLimits, "60 V and 0.5 % of 821.7 V; 198·4.15 + 62 mΩ·1.15·260 A + 0.5 %"},
		{"source in between", map[signal.Name]float64{signal.SourceVoltage: 72.5}, signal.SourceVoltage, 600.97, 844.35, byLimits,
			"198·3.20 − 62 mΩ·1.15·400 A − 0.5 % of 821.7 V; 198·4.15 + 62 mΩ·1.15·260 A + 0.5 %, by hand"},
		{"source tenfold", map[signal.Name]float64{signal.SourceVoltage: 7248}, signal.SourceVoltage, 600.97, 844.35, byLimits, "as in between"},
		{"source dead", map[signal.Name]float64{signal.SourceVoltage: 3}, signal.SourceVoltage, -64.11, 844.35, byLimits, "60 V touch-safe and 4.11 V"},
		{"bus in between", map[signal.Name]float64{signal.BusVoltage: 300}, signal.BusVoltage, 600.08, 1135, byRest, "605.08 V − 5 V to 1130 V + 5 V"},
		{"bus not read", nil, signal.BusVoltage, 600.08, 1135, byRest, "605.08 V − 5 V to 1130 V + 5 V"},
		{"bus dead", map[signal.Name]float64{signal.BusVoltage: -0.4}, signal.BusVoltage, -65, 1135, byRest, "60 V and 0.5 % of 1000 V"},
		{"setpoint", live, signal.VoltageSetpoint, 1027.94, 1032.06, bySetting, "1030 V ± 0.2 %"},
		{"droop", live, signal.DroopSetting, 30.0 / 220, 30.0 / 220, bySetting, "3 % of 1000 V at 220 A"},
		{"source current", live, signal.SourceCurrent, -600, 600, byLimits, "1.5 · 400 A"},
		{"phase current", live, signal.PhaseCurrent2, -200, 200, byLimits, "1.5 · 400 A / 3"},
		{"charge limit", live, signal.ChargeLimit, 0, 260, bySetting, "the source's"},
		{"resistor", live, signal.ResistorTemperature, -40, 412.5, byLimits, "1.5 · 275 °C"},
	}
	for _, test := range tests {
		e, ok := expectedNow(s, test.read)[test.signal]
		low, high := e.Value-e.Tolerance, e.Value+e.Tolerance
		if !ok || math.Abs(low-test.low) > 0.01 || math.Abs(high-test.high) > 0.01 || e.basis != test.basis {
			t.Errorf("%s: expectedNow = %.2f to %.2f by %s, want %.2f to %.2f by %s: %s", test.name, low, high, e.basis, test.low, test.high,
				test.basis, test.source)
		}
	}
	for value, want := range map[float64]bool{-70: false, 0: true, 60: true, 72.5: false, 590: false, 724: true, 850: false} {
		if got := expectedNow(s, live)[signal.SourceVoltage].agrees(registermap.Point{Scale: 0.1, UnitFactor: 1}, value); got != want {
			t.Errorf("agrees(%g V) of the source = %v, want %v: dead to 64.1 V, or 601.0 to 844.4 V", value, got, want)
		}
	}
	if e, ok := expectedNow(s, live)[signal.FaultCode]; ok {
		t.Errorf("expectedNow of a fault code = %v, want nothing: no site file knows it", e)
	}
	if all := expectedNow(site.Site{}, nil); len(all) == 0 {
		t.Error("expectedNow of an empty site is empty, want what holds everywhere")
	}
}

func TestParseMeter(t *testing.T) {
	s, m := wagtail(t)
	tests := []struct {
		text             string
		name             signal.Name
		value, tolerance float64
		source           string
	}{
		{"bus-voltage=712.4V", signal.BusVoltage, 712.4, 0.3562 + 0.1 + 5 + 0.05, "0.05 % + 0.1 V, 0.5 % of 1000 V, half of 0.1 V"},
		{"source-voltage = 0.71 kV", signal.SourceVoltage, 710, 0.355 + 0.1 + 4.1085 + 5, "0.05 % + 0.1 V, 0.5 % of 821.7 V, half of 10 V"},
		{"source-current=-26 A", signal.SourceCurrent, -26, 0.26 + 0.52 + 0.5, "1 % and 2 % common practice, half of 1 A"},
		{"heatsink-temperature=40 °C", signal.HeatsinkTemperature, 40, 0.4 + 3 + 0.5, "1 %, 3 K common practice, half of 1 K"},
		{"voltage-setpoint=1030.0 V", signal.VoltageSetpoint, 1030, 0.615 + 0.05, "0.05 % + 0.1 V, half of 0.1 V"},
		{"running=on", signal.Running, 1, 0, "a state"},
		{"bypass-closed=open", signal.BypassClosed, 0, 0, "a state"},
	}
	for _, test := range tests {
		n, e, err := parseMeter(test.text, s, m)
		if err != nil || n != test.name || math.Abs(e.Value-test.value) > 1e-9 || math.Abs(e.Tolerance-test.tolerance) > 1e-9 {
			t.Errorf("parseMeter(%q) = %s %g ± %g, %v, want %s %g ± %g: %s", test.text, n, e.Value, e.Tolerance, err, test.name, test.value,
				test.tolerance, test.source)
		}
	}
	for _, bad := range []string{"", "=", "bus-voltage", "bus-voltage=", "bus-voltage=1", "bus-voltage=1 A", "bus-voltage=1,5 V", "x=1", "main-closed=1"} {
		if n, e, err := parseMeter(bad, s, m); err == nil {
			t.Errorf("parseMeter(%q) = %s %v, want an error", bad, n, e)
		}
	}
}

func TestSetOtherwise(t *testing.T) {
	e := between(1028, 1032, bySetting, "")
	for value, want := range map[float64]bool{0: true, 1000: true, 520: true, 136: false, 10300: false, -1030: false} {
		if got := e.setOtherwise(value); got != want {
			t.Errorf("setOtherwise(%g) = %v, want %v", value, got, want)
		}
	}
}

func TestLineOf(t *testing.T) {
	text := "a = 1\n[[signal]]\nname = \"x\"\nreference = \"40101\" # list 3\n[[signal]]\naddress = 7\n"
	for _, test := range []struct {
		table            int
		key, found, line string
		at               int
	}{
		{2, "address", "reference", `reference = "40101"`, 4},
		{2, "scale", "scale", "", 2},
		{5, "address", "address", "address = 7", 6},
	} {
		if at, key, line := lineOf(text, test.table, test.key); at != test.at || key != test.found || line != test.line {
			t.Errorf("lineOf(%d, %q) = %d, %q, %q, want %d, %q, %q", test.table, test.key, at, key, line, test.at, test.found, test.line)
		}
	}
}
