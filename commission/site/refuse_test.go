package site

import (
	"errors"
	"strings"
	"testing"
	"unicode/utf8"

	"chargehand/commission/document"
)

// mark is where a problem is expected.
const mark = "‸"

// marked takes the mark out of a text and gives its place.
func marked(t *testing.T, text string) (plain string, line, column int) {
	t.Helper()
	before, after, ok := strings.Cut(text, mark)
	if !ok {
		return text, 1, 1
	}
	line = strings.Count(before, "\n") + 1
	column = utf8.RuneCountInString(before[strings.LastIndexByte(before, '\n')+1:]) + 1
	return before + after, line, column
}

// Each row changes wagtail's file; the mark stands where the one problem is expected, "1:1" where there is none.
func TestReadRefuses(t *testing.T) {
	wagtail := load(t, "wagtail.site.toml")
	tests := []struct{ name, old, new, read, wanted string }{
		// what a table lacks
		{"no site", "[site]\nname      = \"Ferry Wagtail, aft battery string\"\nreference = \"WAG-017\"\nlocation  = \"Aldermere slipway\"\n", "", "no [site]", "the table [site]"},
		{"no name", "[site]\nname      = \"Ferry Wagtail, aft battery string\"", "‸[site]", "no name in [site]", "the key name"},
		{"no internal resistance", "[source]", "‸[source]", "no internal_resistance", "internal_resistance"},
		{"no nominal", "[bus]\nnominal            = \"1000 V\"", "‸[bus]", "no nominal in [bus]", "nominal"},
		{"no resistance", "[precharge]\nresistance         = \"100 Ω ±5 %\"", "‸[precharge]", "no resistance in [precharge]", "resistance"},
		{"no closing difference", "[precharge]", "‸[precharge]", "no closing_difference in [precharge]", "closing_difference"},
		{"no bank value", "[[bus.capacitance]]\nname  = \"DC/DC converter\"\nvalue = \"5.6 mF ±20 %\"", "‸[[bus.capacitance]]\nname  = \"DC/DC converter\"", "no value in [bus.capacitance]", "value"},

		// quantities
		{"missing unit", `"62 mΩ ±15 %"`, `‸"62"`, `"62"`, "a unit: µΩ mΩ Ω"},
		{"bare number", `"62 mΩ ±15 %"`, `‸62`, "62", "a value with its unit, in quotes"},
		{"wrong dimension", `"62 mΩ ±15 %"`, `‸"62 mV"`, `"62 mV"`, "not a voltage"},
		{"decimal comma", `"5.6 mF ±20 %"`, `‸"5,6 mF ±20 %"`, `"5,6 mF ±20 %"`, "a decimal point"},
		{"negative resistance", `"62 mΩ ±15 %"`, `‸"-62 mΩ ±15 %"`, `"-62`, "above 0"},
		{"zero resistance", `"100 Ω ±5 %"`, `‸"0 Ω"`, `"0 Ω"`, "above 0"},
		{"zero capacitance", `"5.6 mF ±20 %"`, `‸"0 mF"`, `"0 mF"`, "above 0"},
		{"resistance down to zero", `"100 Ω ±5 %"`, `‸"100 Ω ±100 %"`, `"100 Ω ±100 %"`, "lowest corner"},
		{"tolerance on a limit", `"2 kA"`, `‸"2 kA ±5 %"`, `"2 kA ±5 %"`, "no tolerance"},
		{"tolerance on an error", `measurement_error     = "0.5 %"`, `measurement_error     = ‸"0.5 % ±0.1 points"`, `"0.5 %`, "no tolerance"},
		{"kA²s", `"90000 A²s"`, `‸"90 kA²s"`, `"90 kA²s"`, "kA²s may mean"},
		{"beyond size", `"2 kA"`, `‸"1e30 A"`, `"1e30 A"`, "a size between"},
		{"not a number", `"2 kA"`, `‸"nan A"`, `"nan A"`, "a finite number"},
		{"below absolute zero", `"35 °C"`, `‸"-300 °C"`, `"-300 °C"`, "absolute zero"},
		{"negative error", `regulation_error   = "0.3 %"`, `regulation_error   = ‸"-0.3 %"`, `"-0.3 %"`, "of 0 or more"},
		{"droop of zero", `setpoint       = "1030 V"
droop          = "3 %"                  # of`, `setpoint       = "1030 V"
droop          = ‸"0 %"                  # of`, `"0 %"`, "above 0"},

		{"section between two sizes", `"18 m", section = "120 mm²"`, `"18 m", section = ‸"100 mm²"`, `"100 mm²"`, "nearest are 95 mm² and 120 mm²"},
		{"section below the smallest", `"18 m", section = "120 mm²"`, `"18 m", section = ‸"6 mm²"`, `"6 mm²"`, "smallest is 10 mm²"},
		{"section above the largest", `"18 m", section = "120 mm²"`, `"18 m", section = ‸"500 mm²"`, `"500 mm²"`, "largest is 400 mm²"},

		// keys
		{"unknown key", "capacitor_rating   = ", "‸capacitor_ratting   = ", "the key capacitor_ratting in [bus]", "capacitor_rating; or the file is for a newer version"},
		{"Name beside name", "reference = \"WAG-017\"", "reference = \"WAG-017\"\n‸Name = \"other\"", "the key Name in [site]", "lower case exactly: name"},
		{"unknown table", "[load]", "[‸loads]", "the table loads", "perhaps load"},
		{"key twice", "location  = ", "location = \"x\"\n‸location  = ", "location a second time", "once"},
		{"unknown key in an inline table", "{ rating = ", "{ ‸ratings = ", "the key ratings in [source.fuse]", "perhaps rating"},

		// choices and counts
		{"unknown kind", `"battery"       #`, `‸"batery"       #`, `"batery"`, "one of battery, supercapacitor, fuel-cell, other"},
		{"phases of zero", "phases              = 3", "phases              = ‸0", "0", "a whole number from 1"},
		{"phases in quotes", "phases              = 3", "phases              = ‸\"3\"", `"3"`, "a whole number from 1"},
		{"cells of zero", "cells_in_series       = 198 ", "cells_in_series       = ‸0 ", "0", "a whole number from 1"},
		{"aluminium", `length = "18 m", section = "120 mm²", material = "copper"`, `length = "18 m", section = "120 mm²", material = ‸"aluminium"`, `"aluminium"`, "copper"},
		{"class", `class = 5, temperature = "60 °C" }
[[infeed]]`, `class = ‸3, temperature = "60 °C" }
[[infeed]]`, "3", "class 2 (stranded) or 5 (flexible)"},
		{"unit beyond a byte", "unit_id = 1 ", "unit_id = ‸256 ", "256", "from 0 to 255"},
		{"address without port", `"192.0.2.21:502"`, `‸"192.0.2.21"`, `"192.0.2.21"`, "host:port"},
		{"address with port 0", `"192.0.2.21:502"`, `‸"192.0.2.21:0"`, `"192.0.2.21:0"`, "host:port"},

		// impossible combinations
		{"cell_min above cell_max", `cell_min              = "3.20 V"`, `cell_min              = ‸"4.20 V"`, `"4.20 V"`, "at most the cell_max of 4.15 V"},
		{"both cells and voltage", `cell_min              = "3.20 V"`, "cell_min = \"3.20 V\"\nmax_voltage = ‸\"820 V\"", `"820 V"`, "the voltages once"},
		{"soc not ascending", `soc = "50 %", cell = "3.66 V"`, `soc = ‸"10 %", cell = "3.66 V"`, `"10 %"`, "more than the 10 % before"},
		{"soc above all", `soc = "100 %"`, `soc = ‸"101 %"`, `"101 %"`, "at most 100 %"},
		{"cell falling", `soc = "50 %", cell = "3.66 V"`, `soc = "50 %", cell = ‸"3.44 V"`, `"3.44 V"`, "does not fall below the 3.45 V"},
		{"supercapacitor without capacitance", "[source]\nkind                  = \"battery\"", "‸[source]\nkind = \"supercapacitor\"", "no capacitance", "capacitance"},
		{"trips crossed", `under_voltage_trip = "860 V"`, `under_voltage_trip = ‸"1130 V"`, `"1130 V"`, "less than the over_voltage_trip"},
		{"chopper off above on", `off = "1075 V"`, `off = ‸"1095 V"`, `"1095 V"`, "at most the on of 1090 V"},
		{"margin_fail above wanted", `margin_fail        = "20 V"`, `margin_fail        = ‸"31 V"`, `"31 V"`, "at most the wanted_margin"},
		{"stops above starts", `stops_at  = "300 V"`, `stops_at  = ‸"351 V"`, `"351 V"`, "at most the starts_at"},
		{"bank twice", `name  = "port propulsion drive"`, `name  = ‸"DC/DC converter"`, `"DC/DC converter"`, "no other capacitance has"},
		{"infeed twice", `name           = "shore rectifier"`, `name           = ‸"aft string"`, `"aft string"`, "no other infeed has"},
		{"derating upside down", `full_to = "40 °C"`, `full_to = ‸"275 °C"`, `"275 °C"`, "less than the zero_at"},
		{"ambient above the resistor's limit", `ambient            = "35 °C"`, `ambient            = ‸"280 °C"`, `"280 °C"`, "less than the thermal.max_temperature"},
		{"overload below rating", "multiple = 10", "multiple = ‸0.5", "0.5", "1 or more"},
		{"overload of zero", "multiple = 10", "multiple = ‸0", "0", "1 or more"},
		{"pulse not ascending", `duration = "10 s", energy = "90 kJ"`, `duration = ‸"1 s", energy = "90 kJ"`, `"1 s"`, "more than the 1 s before"},
		{"pulse energy falling", `duration = "10 s", energy = "90 kJ"`, `duration = "10 s", energy = ‸"29 kJ"`, `"29 kJ"`, "does not fall below the 30 kJ"},
		{"minimum above time-out", `minimum_time       = "1 s"`, `minimum_time       = ‸"11 s"`, `"11 s"`, "at most the timeout of 10.5 s"},
		{"time-out of zero", `timeout            = "10.5 s"`, `timeout            = ‸"0 s"`, `"0 s"`, "above 0"},
		{"closing at any voltage", `closing_difference = "25 V"`, `closing_difference = ‸"821.7 V"`, `"821.7 V"`, "less than the highest source voltage, 822 V"},
		{"efficiency above 100 %", `"97.5 %"`, `‸"102 %"`, `"102 %"`, "at most 100 %"},
		{"no room for a pulse", `switching_frequency = "5 kHz"`, `switching_frequency = ‸"46 kHz"`, `"46 kHz"`, "a period longer"},
		{"due before calibrated", "due         = 2027-03-01", "due         = ‸2025-03-01", "2025-03-01", "a date after calibrated"},
		{"date in quotes", "due         = 2027-03-01", "due         = ‸\"2027-03-01\"", `"2027-03-01"`, "without quotes"},
		{"peer of no infeed", "[device]", "[[peer]]\ninfeed = ‸\"nobody\"\naddress = \"192.0.2.22:502\"\nmap = \"x.map.toml\"\n[device]", `"nobody"`, "one of aft string, shore rectifier"},
		{"point of no stage", "[device]", "[[point]]\nid = \"own.x\"\nstage = ‸13\nkind = \"hold\"\nwhat = \"x\"\n[device]", "13", "from 1 to 12"},
		{"point of misspelt stage", "[device]", "[[point]]\nid = \"own.x\"\nstage = ‸\"Death checks\"\nkind = \"hold\"\nwhat = \"x\"\n[device]", `"Death checks"`, "Dead checks"},
		{"point id", "[device]", "[[point]]\nid = ‸\"Own X\"\nstage = 3\nkind = \"hold\"\nwhat = \"x\"\n[device]", `"Own X"`, "lower-case letters"},
		{"role", "[device]", "[[person]]\nrole = ‸\"boss\"\nname = \"A. Example\"\n[device]", `"boss"`, "one of technician, witness, surveyor, owner"},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			if !strings.Contains(wagtail, tt.old) {
				t.Fatalf("the file has no %q", tt.old)
			}
			text := strings.Replace(wagtail, tt.old, tt.new, 1)
			switch tt.name {
			case "no internal resistance":
				text = without(text, "internal_resistance")
			case "no closing difference":
				text = without(text, "closing_difference")
			}
			text, line, column := marked(t, text)
			_, _, err := Read("x.site.toml", []byte(text))
			var p *document.Problems
			if !errors.As(err, &p) || len(p.List) != 1 {
				t.Fatalf("Read = %v, want one problem", err)
			}
			q := p.List[0]
			if q.Line != line || q.Column != column || !strings.Contains(q.Read, tt.read) || !strings.Contains(q.Wanted, tt.wanted) {
				t.Errorf("Read = %v\nwant x.site.toml:%d:%d: read … %s …, wanted … %s …", err, line, column, tt.read, tt.wanted)
			}
		})
	}
}

// without drops the line of a key.
func without(text, key string) string {
	start := strings.Index(text, "\n"+key) + 1
	return text[:start] + text[start+strings.IndexByte(text[start:], '\n')+1:]
}
