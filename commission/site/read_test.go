package site

import (
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"
	"unicode/utf8"

	"chargehand/commission/document"
)

const sites = "../../testdata/sites"

func load(t testing.TB, name string) string {
	t.Helper()
	text, err := os.ReadFile(filepath.Join(sites, name))
	if err != nil {
		t.Fatal(err)
	}
	return string(text)
}

func readFile(t *testing.T, name string) Site {
	t.Helper()
	s, warnings, err := Read(name, []byte(load(t, name)))
	if err != nil {
		t.Fatalf("Read(%s) = %v", name, err)
	}
	if len(warnings) > 0 {
		t.Errorf("Read(%s) warns %v, want no warning", name, warnings)
	}
	return s
}

// near tells equal but for the rounding of one operation.
func near(got, want float64) bool {
	return got-want <= 1e-12*max(1, want) && want-got <= 1e-12*max(1, want)
}

type figure struct {
	what      string
	got, want float64
}

func compare(t *testing.T, site string, figures []figure) {
	t.Helper()
	for _, f := range figures {
		if !near(f.got, f.want) {
			t.Errorf("%s: %s = %v, want %v", site, f.what, f.got, f.want)
		}
	}
}

// The figures are those of the files, turned into SI by hand.
func TestReadWagtail(t *testing.T) {
	s := readFile(t, "wagtail.site.toml")
	compare(t, "wagtail", []figure{
		{"E_high, 198 · 4.15 V", float64(s.Source.HighestRest()), 821.7},
		{"E_low, 198 · 3.20 V", float64(s.Source.LowestRest()), 633.6},
		{"source error, 0.5 % of 821.7 V", float64(s.Source.Error()), 4.1085},
		{"capacity", float64(s.Source.Capacity.Nominal), 1.008e6},
		{"R_i low", float64(s.Source.InternalResistance.Low), 0.0527},
		{"R_i high", float64(s.Source.InternalResistance.High), 0.0713},
		{"L source", float64(s.Source.Inductance.Nominal), 6e-6},
		{"charge", float64(s.Source.MaxChargeCurrent.Nominal), 260},
		{"discharge", float64(s.Source.MaxDischargeCurrent.Nominal), 400},
		{"ripple", float64(s.Source.MaxRippleCurrent.Nominal), 12},
		{"fuse rating", float64(s.Source.Fuse.Rating.Nominal), 500},
		{"fuse I²t", float64(s.Source.Fuse.PreArcingI2t.Nominal), 90000},
		{"fuse voltage", float64(s.Source.Fuse.Voltage.Nominal), 1250},
		{"fuse capacity", float64(s.Source.Fuse.BreakingCapacity.Nominal), 50000},
		{"switch poles", float64(s.Source.Switch.Poles), 2},
		{"switch voltage", float64(s.Source.Switch.Voltage.Nominal), 1250},
		{"switch current", float64(s.Source.Switch.BreakingCurrent.Nominal), 500},
		{"soc points", float64(len(s.Source.StateOfCharge)), 5},
		{"soc of the third", float64(s.Source.StateOfCharge[2].StateOfCharge.Nominal), 0.5},
		{"cell of the third", float64(s.Source.StateOfCharge[2].Cell.Nominal), 3.66},
		{"bus nominal", float64(s.Bus.Nominal.Nominal), 1000},
		{"under voltage", float64(s.Bus.UnderVoltageTrip.Nominal), 860},
		{"over voltage", float64(s.Bus.OverVoltageTrip.Nominal), 1130},
		{"chopper on", float64(s.Bus.Chopper.On.Nominal), 1090},
		{"chopper off", float64(s.Bus.Chopper.Off.Nominal), 1075},
		{"chopper power", float64(s.Bus.Chopper.Power.Nominal), 150000},
		{"chopper duration", float64(s.Bus.Chopper.Duration.Nominal), 10},
		{"capacitor rating", float64(s.Bus.CapacitorRating.Nominal), 1200},
		{"bus error", float64(s.Bus.Error()), 5},
		{"regulation", float64(s.Bus.Regulation()), 3},
		{"bus ripple", float64(s.Bus.Ripple.Nominal), 4},
		{"wanted margin", float64(s.Bus.WantedMargin.Nominal), 30},
		{"margin fail", float64(s.Bus.MarginFail.Nominal), 20},
		{"touch safe", float64(s.Bus.TouchSafe.Voltage.Nominal), 60},
		{"within", float64(s.Bus.TouchSafe.Within.Nominal), 5},
		{"banks", float64(len(s.Bus.Capacitances)), 3},
		{"first bank high", float64(s.Bus.Capacitances[0].Value.High), 6.72e-3},
		{"bleeder low", float64(s.Bus.Bleeders[0].Value.Low), 20900},
		{"bleeder power", float64(s.Bus.Bleeders[0].Power.Nominal), 120},
		{"auxiliary", float64(s.Bus.Auxiliary.Power.Nominal), 40},
		{"starts", float64(s.Bus.Auxiliary.StartsAt.Nominal), 350},
		{"stops", float64(s.Bus.Auxiliary.StopsAt.Nominal), 300},
		{"monitors", float64(len(s.Bus.InsulationMonitors)), 1},
		{"R", float64(s.Precharge.Resistance.Nominal), 100},
		{"rated power", float64(s.Precharge.RatedPower.Nominal), 1000},
		{"full to", float64(s.Precharge.Derating.FullTo.Nominal), 40},
		{"zero at", float64(s.Precharge.Derating.ZeroAt.Nominal), 275},
		{"ambient", float64(s.Precharge.Ambient.Nominal), 35},
		{"multiple", s.Precharge.Overload.Multiple, 10},
		{"overload duration", float64(s.Precharge.Overload.Duration.Nominal), 5},
		{"pulse points", float64(len(s.Precharge.Pulse)), 4},
		{"pulse duration", float64(s.Precharge.Pulse[0].Duration.Nominal), 0.1},
		{"pulse energy", float64(s.Precharge.Pulse[3].Energy.Nominal), 200000},
		{"thermal", float64(s.Precharge.Thermal.Resistance.Nominal), 0.22},
		{"time constant", float64(s.Precharge.Thermal.TimeConstant.Nominal), 300},
		{"max temperature", float64(s.Precharge.Thermal.MaxTemperature.Nominal), 275},
		{"attempts", float64(s.Precharge.Attempts), 3},
		{"interval", float64(s.Precharge.Interval.Nominal), 90},
		{"closing difference", float64(s.Precharge.ClosingDifference.Nominal), 25},
		{"minimum time", float64(s.Precharge.MinimumTime.Nominal), 1},
		{"timeout", float64(s.Precharge.Timeout.Nominal), 10.5},
		{"contactor voltage", float64(s.Precharge.Contactor.Voltage.Nominal), 1200},
		{"contactor current", float64(s.Precharge.Contactor.BreakingCurrent.Nominal), 20},
		{"making", float64(s.Bypass.MakingCurrent.Nominal), 2000},
		{"carrying", float64(s.Bypass.CarryingCurrent.Nominal), 450},
		{"bypass voltage", float64(s.Bypass.Voltage.Nominal), 1200},
		{"converter power", float64(s.Converter.RatedPower.Nominal), 220000},
		{"converter current", float64(s.Converter.RatedCurrent.Nominal), 400},
		{"efficiency", float64(s.Converter.Efficiency.Nominal), 0.975},
		{"phases", float64(s.Converter.Phases), 3},
		{"choke low", float64(s.Converter.Choke.Low), 0.378e-3},
		{"choke resistance", float64(s.Converter.ChokeResistance.Nominal), 3e-3},
		{"saturation", float64(s.Converter.ChokeSaturation.Nominal), 240},
		{"sharing", float64(s.Converter.PhaseSharingError.Nominal), 0.03},
		{"frequency", float64(s.Converter.SwitchingFrequency.Nominal), 5000},
		{"dead time", float64(s.Converter.DeadTime.Nominal), 3e-6},
		{"minimum pulse", float64(s.Converter.MinimumPulse.Nominal), 8e-6},
		{"filter", float64(s.Converter.Filter.Capacitance.Nominal), 0.8e-3},
		{"esr", float64(s.Converter.Filter.ESR.Nominal), 2e-3},
		{"esl", float64(s.Converter.Filter.ESL.Nominal), 40e-9},
		{"load", float64(s.Load.Power.Nominal), 200000},
		{"regeneration", float64(s.Load.Regeneration.Nominal), 120000},
		{"share", float64(s.Load.ShareTolerance.Nominal), 0.1},
		{"infeeds", float64(len(s.Infeeds)), 2},
		{"infeed current", float64(s.Infeeds[0].RatedCurrent.Nominal), 220},
		{"setpoint", float64(s.Infeeds[1].Setpoint.Nominal), 1030},
		{"droop, 3 % · 1000 V ⁄ 220 A", float64(s.Infeeds[0].Droop.At(1000, 220)), 30.0 / 220},
		{"setpoint error, 0.2 % of 1030 V", float64(s.Infeeds[0].SetpointError.Of(1030)), 2.06},
		{"length", float64(s.Infeeds[1].Cable.Length.Nominal), 25},
		{"section", float64(s.Infeeds[0].Cable.Section.Nominal), 120e-6},
		{"class", float64(s.Infeeds[0].Cable.Class), 5},
		{"cable temperature", float64(s.Infeeds[0].Cable.Temperature.Nominal), 60},
		{"of reading", float64(s.Instruments[0].OfReading), 0.0005},
		{"plus", float64(s.Instruments[0].Plus.Nominal), 0.1},
		{"meter", float64(s.Instruments[0].MaxVoltage.Nominal), 1500},
		{"unit", float64(s.Device.UnitID), 1},
		{"max age", float64(s.Device.MaxAge.Nominal), 0.5},
	})
	got := fmt.Sprint(s.Name, s.Reference, s.Location, s.Source.Kind, s.Source.LimitsUnderCurrent, s.Bus.Earthing, s.Bus.Capacitances[2].Name,
		s.Bus.Capacitances[2].Isolated, s.Bus.Bleeders[0].Name, s.Bus.InsulationMonitors[0], s.Precharge.Compares, s.Bypass.Polarised, s.Converter.Filter.Position,
		s.Infeeds[0].Name, s.Infeeds[0].Regenerates, s.Infeeds[1].Regenerates, s.Infeeds[0].Cable.Material, s.Instruments[0].Name, s.Instruments[0].Serial, s.Instruments[0].Category,
		s.Instruments[0].Calibrated.Format("2006-01-02"), s.Instruments[0].Due.Format("2006-01-02"), s.Instruments[0].HasAccuracy, s.Device.Address, s.Device.Map,
		s.Source.InternalResistance.Text)
	want := fmt.Sprint("Ferry Wagtail, aft battery string", "WAG-017", "Aldermere slipway", "battery", false, "insulated", "hotel supply",
		false, "discharge resistor", InsulationMonitor{"main switchboard", true}, "contactor", false, "star",
		"aft string", true, false, "copper", "hand multimeter", "HM-0417", "CAT III", "2026-03-01", "2027-03-01", true, "192.0.2.21:502", "wagtail.map.toml",
		"62 mΩ ±15 %")
	if got != want {
		t.Errorf("wagtail = %s\nwant %s", got, want)
	}
}

func TestReadNightjar(t *testing.T) {
	s := readFile(t, "nightjar.site.toml")
	compare(t, "nightjar", []figure{
		{"E_high", float64(s.Source.HighestRest()), 540},
		{"E_low", float64(s.Source.LowestRest()), 300},
		{"capacitance low, 14 F - 10 %", float64(s.Source.Capacitance.Low), 12.6},
		{"capacitance high, 14 F + 20 %", float64(s.Source.Capacitance.High), 16.8},
		{"error", float64(s.Source.Error()), 2.5},
		{"R_i", float64(s.Source.InternalResistance.Nominal), 0.024},
		{"failing margin, two thirds of 25 V", func() float64 { m, _ := s.Bus.FailingMargin(); return float64(m) }(), 50.0 / 3},
		{"second bank", float64(s.Bus.Capacitances[1].Value.Nominal), 4.7e-3},
		{"droop in V/A", float64(s.Infeeds[1].Droop.At(700, 260)), 0.108},
		{"class by default", float64(s.Infeeds[1].Cable.Class), 2},
	})
	if s.Source.Kind != Supercapacitor || s.Bus.Chopper != nil || s.Bus.Auxiliary != nil || s.Bus.Bleeders != nil || s.Converter.Filter != nil ||
		s.Device != nil || s.Infeeds[0].Cable != nil || s.Precharge.Pulse != nil {
		t.Errorf("nightjar has what its file lacks: %+v", s)
	}
}

func TestReadOuzel(t *testing.T) {
	s := readFile(t, "ouzel.site.toml")
	compare(t, "ouzel", []figure{
		{"E_high, 230 · 3.65 V", float64(s.Source.HighestRest()), 839.5},
		{"E_low, 230 · 2.80 V", float64(s.Source.LowestRest()), 644},
		{"poles", float64(s.Source.Switch.Poles), 1},
		{"phases", float64(s.Converter.Phases), 2},
		{"monitors", float64(len(s.Bus.InsulationMonitors)), 2},
		{"making", float64(s.Bypass.MakingCurrent.Nominal), 200},
	})
	if s.Precharge.Compares != SourceAgainstBus || s.Precharge.Pulse != nil {
		t.Errorf("ouzel compares %q, pulse %v", s.Precharge.Compares, s.Precharge.Pulse)
	}
}

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

// What design 4.2 allows although it looks odd.
func TestReadAllows(t *testing.T) {
	wagtail := load(t, "wagtail.site.toml")
	for name, change := range map[string][2]string{
		"max_voltage = min_voltage":    {`cell_min              = "3.20 V"`, `cell_min = "4.15 V"`},
		"error of 0":                   {`measurement_error     = "0.5 %"`, `measurement_error = "0 V"`},
		"regulation of 0":              {`regulation_error   = "0.3 %"`, `regulation_error = "0 %"`},
		"choke without resistance":     {`choke_resistance    = "3 mΩ"`, `choke_resistance = "0 mΩ"`},
		"chopper without hysteresis":   {`off = "1075 V"`, `off = "1090 V"`},
		"no reference":                 {`reference = "WAG-017"`, ``},
		"stage by title":               {"[device]", "[[point]]\nid = \"own.x\"\nstage = \"Dead checks\"\nkind = \"hold\"\nwhat = \"x\"\n[device]"},
		"no bleeder":                   {"[[bus.bleeder]]\nname  = \"discharge resistor\"\nvalue = \"22 kΩ ±5 %\"\npower = \"120 W\"", ""},
		"switch without breaking data": {`switch                = { poles = 2, voltage = "1250 V", breaking_current = "500 A" }`, "switch = { poles = 2 }"},
	} {
		if _, _, err := Read("x.site.toml", []byte(strings.Replace(wagtail, change[0], change[1], 1))); err != nil || !strings.Contains(wagtail, change[0]) {
			t.Errorf("%s: Read = %v, want no problem", name, err)
		}
	}
}

const minimal = `format = "chargehand-site/1"
[site]
name = "x"
[source]
max_voltage = "820 V"
min_voltage = "630 V"
internal_resistance = "62 mΩ"
[bus]
nominal = "1000 V"
[[bus.capacitance]]
name = "a"
value = "5 mF"
[precharge]
resistance = "100 Ω"
closing_difference = "25 V"
`

func TestReadMinimal(t *testing.T) {
	s, _, err := Read("x", []byte(minimal))
	if err != nil {
		t.Fatalf("Read = %v", err)
	}
	if s.Source.Kind != OtherSource || s.Converter != nil || s.Bypass != nil || s.Load != nil || s.Device != nil || s.Precharge.Timeout.IsGiven() || s.Precharge.Attempts != 0 {
		t.Errorf("Read = %+v", s)
	}
	cell := strings.Replace(minimal, "[source]\n", "[source]\nkind = \"fuel-cell\"\nblocking_diode = true\n", 1)
	s, _, err = Read("x", []byte(cell))
	if err != nil || !s.Source.MaxChargeCurrent.IsGiven() || s.Source.MaxChargeCurrent.High != 0 {
		t.Errorf("a fuel cell's max_charge_current = %+v, %v, want 0 A given", s.Source.MaxChargeCurrent, err)
	}
	for _, bad := range []string{
		strings.Replace(cell, "blocking_diode = true\n", "", 1),
		strings.Replace(cell, "blocking_diode = true\n", "blocking_diode = false\n", 1),
		strings.Replace(cell, "blocking_diode = true\n", "blocking_diode = true\nmax_charge_current = \"5 A\"\n", 1),
		strings.Replace(minimal, "value = \"5 mF\"\n", "value = \"5 mF\"\nisolated = true\n", 1),
		strings.Replace(minimal, "[[bus.capacitance]]\nname = \"a\"\nvalue = \"5 mF\"\n", "", 1),
		strings.Replace(minimal, "[[bus.capacitance]]\nname = \"a\"\nvalue = \"5 mF\"\n", "capacitance = []\n", 1),
		strings.Replace(minimal, "min_voltage = \"630 V\"\n", "", 1),
		strings.Replace(minimal, "min_voltage = \"630 V\"\n", "min_voltage = \"821 V\"\n", 1),
	} {
		var p *document.Problems
		if _, _, err := Read("x", []byte(bad)); !errors.As(err, &p) || len(p.List) != 1 {
			t.Errorf("Read(%s) = %v, want one problem", bad, err)
		}
	}
}

func TestReadReportsAllProblemsInOneGo(t *testing.T) {
	wagtail := load(t, "wagtail.site.toml")
	text := strings.NewReplacer(`"62 mΩ ±15 %"`, `"62"`, `"5.6 mF ±20 %"`, `"5,6 mF"`, "phases              = 3", "phases = -1",
		`timeout            = "10.5 s"`, "timeout = 10.5 s", "[load]", "[lod]", `cell_min              = "3.20 V"`, `cell_min = "9 V"`).Replace(wagtail)
	_, _, err := Read("x", []byte(text))
	var p *document.Problems
	if !errors.As(err, &p) || len(p.List) != 6 {
		t.Fatalf("Read = %v, want 6 problems", err)
	}
	for i := 1; i < len(p.List); i++ {
		if p.List[i].Line < p.List[i-1].Line {
			t.Errorf("Read = %v, not in order of place", err)
		}
	}
}

func TestReadWarns(t *testing.T) {
	wagtail := load(t, "wagtail.site.toml")
	text, line, column := marked(t, strings.Replace(wagtail, `"62 mΩ ±15 %"`, `‸"62 MΩ ±15 %"`, 1))
	_, warnings, err := Read("x", []byte(text))
	if err != nil || len(warnings) != 1 || warnings[0].Line != line || warnings[0].Column != column || !strings.Contains(warnings[0].Text, "62 MΩ ±15 %") {
		t.Errorf("Read = %v, %v, want one warning at %d:%d", warnings, err, line, column)
	}
}

func TestReadPeopleAndPoints(t *testing.T) {
	s, _, err := Read("x", []byte(minimal+`
[[infeed]]
name = "main"
[[person]]
role = "surveyor"
name = "A. Example"
organisation = "Example Class"
key = "SHA256:abc"
[[point]]
id = "own.torque"
stage = 3
kind = "hold"
what = "Torque"
accept = "25 N·m"
caution = "dead"
basis = "drawing"
[[peer]]
infeed = "main"
address = "[2001:db8::1]:502"
unit_id = 7
map = "m.map.toml"
`))
	if err != nil {
		t.Fatal(err)
	}
	if got, want := s.People[0], (Person{"surveyor", "A. Example", "Example Class", "SHA256:abc"}); got != want {
		t.Errorf("person = %+v, want %+v", got, want)
	}
	if got, want := s.Points[0], (OwnPoint{"own.torque", "3", "hold", "Torque", "25 N·m", "dead", "drawing"}); got != want {
		t.Errorf("point = %+v, want %+v", got, want)
	}
	if got, want := s.Peers[0], (Peer{"main", "[2001:db8::1]:502", 7, "m.map.toml"}); got != want {
		t.Errorf("peer = %+v, want %+v", got, want)
	}
}

// Windows line ends and a byte-order mark change nothing.
func TestReadTakesMarkAndCRLF(t *testing.T) {
	plain := readFile(t, "wagtail.site.toml")
	s, _, err := Read("x", []byte("\ufeff"+strings.ReplaceAll(load(t, "wagtail.site.toml"), "\n", "\r\n")))
	if err != nil || !reflect.DeepEqual(s, plain) {
		t.Errorf("Read with CR LF and a byte-order mark = %+v, %v", s, err)
	}
}

func TestExampleAndTemplatesReadUnchanged(t *testing.T) {
	example, registers := Example()
	template, err := Template("other.map.toml")
	if err != nil {
		t.Fatal(err)
	}
	for name, text := range map[string]string{ExampleName: example, "template": template, "template with CR LF": strings.ReplaceAll(template, "\n", "\r\n")} {
		s, warnings, err := Read(name, []byte(text))
		if err != nil || len(warnings) > 0 {
			t.Errorf("Read(%s) = %v, %v, want neither problem nor warning", name, warnings, err)
		}
		if strings.HasPrefix(name, "template") && s.Device.Map != "other.map.toml" {
			t.Errorf("%s: map = %q, want other.map.toml", name, s.Device.Map)
		}
	}
	if s, _, _ := Read(ExampleName, []byte(example)); s.Device.Map != ExampleMapName {
		t.Errorf("the example's map = %q, want %s", s.Device.Map, ExampleMapName)
	}
	for name, text := range map[string]string{"example": example, "example map": registers, "template": template, "map template": MapTemplate()} {
		if strings.Contains(text, "\r") || !strings.HasSuffix(text, "\n") {
			t.Errorf("%s: lines are not ended by LF alone", name)
		}
	}
	// What stands commented out in the template must be right too.
	uncommented := template
	for _, header := range []string{"person", "point", "peer"} {
		start := strings.Index(uncommented, "# [["+header+"]]")
		end := start + strings.Index(uncommented[start:], "\n\n")
		uncommented = uncommented[:start] + strings.ReplaceAll(uncommented[start:end], "# ", "") + uncommented[end:]
	}
	uncommented = strings.Replace(uncommented, `"SHA256:…"             fingerprint`, `"SHA256:…"           # fingerprint`, 1)
	if _, _, err := Read("uncommented", []byte(uncommented)); err != nil {
		t.Errorf("the template's commented tables: %v", err)
	}
}

func TestReviseKeepsTheRestByteForByte(t *testing.T) {
	wagtail := load(t, "wagtail.site.toml")
	got, err := Revise([]byte(wagtail), map[string]string{"precharge.resistance": "120 Ω ±5 %", "infeed.0.droop": "136 mV/A", "precharge.attempts": "2",
		"source.fuse.rating": "400 A", "bus.capacitance.1.value": "4.1 mF ±20 %"})
	want := strings.Replace(wagtail, `"100 Ω ±5 %"`, `"120 Ω ±5 %"`, 1)
	want = strings.Replace(want, `droop          = "3 %"`, `droop          = "136 mV/A"`, 1)
	want = strings.Replace(want, "attempts           = 3", "attempts           = 2", 1)
	want = strings.Replace(want, `rating = "500 A"`, `rating = "400 A"`, 1)
	want = strings.Replace(want, `"3.9 mF ±20 %"`, `"4.1 mF ±20 %"`, 1)
	if err != nil || string(got) != want {
		t.Errorf("Revise = %v, and the texts differ: %v", err, string(got) != want)
	}
	s, _, err := Read("x", got)
	if err != nil || s.Precharge.Resistance.Nominal != 120 || s.Infeeds[0].Droop.PerAmpere != 0.136 || s.Precharge.Attempts != 2 {
		t.Errorf("Read after Revise = %+v, %v", s.Precharge, err)
	}
}
