package site

import (
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"

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
