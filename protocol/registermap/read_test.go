package registermap

import (
	"errors"
	"os"
	"reflect"
	"strings"
	"testing"
	"time"
	"unicode/utf8"

	"chargehand/commission/document"
	"chargehand/commission/signal"
)

func wagtail(t testing.TB) string {
	t.Helper()
	text, err := os.ReadFile("../../testdata/sites/wagtail.map.toml")
	if err != nil {
		t.Fatal(err)
	}
	return string(text)
}

// The numbers are those of the file.
func TestReadWagtail(t *testing.T) {
	m, err := Read("wagtail.map.toml", []byte(wagtail(t)))
	if err != nil {
		t.Fatal(err)
	}
	if m.WordOrder != HighFirst || m.MinInterval != 10*time.Millisecond || m.MaxBlock != 100 || m.MaxGap != 8 || len(m.Points) != 26 {
		t.Errorf("Read = %s, %v, %d, %d, %d points, want high-first, 10ms, 100, 8, 26", m.WordOrder, m.MinInterval, m.MaxBlock, m.MaxGap, len(m.Points))
	}
	point := func(name signal.Name, address Address, kind Type, bit int, scale float64, unit string, factor float64, line int) Point {
		return Point{Name: name, Table: Holding, Address: address, Type: kind, BitNumber: bit, WordOrder: HighFirst, ByteOrder: HighFirst, Scale: scale,
			Unit: unit, UnitFactor: factor, Line: line}
	}
	with := func(p Point, change func(*Point)) Point { change(&p); return p }
	for _, want := range []Point{
		point(signal.BusVoltage, 100, U16, 0, 0.1, "V", 1, 7),
		with(point(signal.SourceCurrent, 103, I16, 0, 0.1, "A", 1, 28), func(p *Point) { p.Missing = [][]uint16{{0x8000}} }),
		point(signal.Power, 108, I32, 0, 1, "W", 1, 65),
		point(signal.ResistorTemperature, 110, I16, 0, 0.1, "°C", 1, 71),
		with(point(signal.InsulationResistance, 112, U16, 0, 1, "kΩ", 1000, 86), func(p *Point) { p.Missing = [][]uint16{{0xFFFF}} }),
		with(point(signal.Fault, 120, Bit, 15, 1, "", 1, 123), func(p *Point) { p.Range = &[2]float64{0, 1} }),
		with(point(signal.Mode, 122, U16, 0, 1, "", 1, 134), func(p *Point) {
			p.Values = map[int64]float64{0: signal.ModeOff, 1: signal.ModeVoltage, 2: signal.ModeCurrent}
		}),
		point(signal.DroopSetting, 201, U16, 0, 0.0001, "V/A", 1, 152),
	} {
		got, ok := m.Find(want.Name)
		if !ok || !reflect.DeepEqual(got, want) {
			t.Errorf("Find(%s) = %+v, want %+v", want.Name, got, want)
		}
	}
}

// one is a map of one signal with every optional key's default, to be changed by the rows below.
const one = `format = "chargehand-map/1"
[[signal]]
name = "bus-voltage"
table = "holding"
address = 100
type = "u16"
unit = "V"
`

func TestReadEveryKey(t *testing.T) {
	m, err := Read("x", []byte(`format = "chargehand-map/1"
word_order = "low-first"
[[signal]]
name = "bus-voltage"
unit_id = 7
reference = "400101"
type = "u32"
scale = 2
offset = -5
byte_order = "low-first"
word_order = "high-first"
sign_reversed = true
unit = "mV"
range = [0, 1.3e6]
missing = ["FFFF FFFF", "80000000"]
[[signal]]
name = "source-voltage"
reference = "30001"
type = "f32"
unit = "kV"
[[signal]]
name = "ready"
table = "coil"
address = 0xFFFF
[[signal]]
name = "running"
reference = "10003"
type = "bit"
[[signal]]
name = "fault"
table = "input"
address = 65535
type = "u16"
[[signal]]
name = "mode"
table = "holding"
address = 0
type = "i16"
values = { "-1" = "off", 0x10 = "current", 7 = "off" }
`))
	if err != nil {
		t.Fatal(err)
	}
	state := &[2]float64{0, 1}
	want := Map{WordOrder: LowFirst, MaxBlock: 100, MaxGap: 8, Points: []Point{
		{Name: signal.BusVoltage, UnitID: 7, HasUnitID: true, Table: Holding, Address: 100, Type: U32, WordOrder: HighFirst, ByteOrder: LowFirst, Scale: 2, Offset: -5,
			Unit: "mV", UnitFactor: 0.001, SignReversed: true, Range: &[2]float64{0, 1.3e6}, Missing: [][]uint16{{0xFFFF, 0xFFFF}, {0x8000, 0}}, Line: 3},
		{Name: signal.SourceVoltage, Table: Input, Address: 0, Type: F32, WordOrder: LowFirst, ByteOrder: HighFirst, Scale: 1, Unit: "kV", UnitFactor: 1000, Line: 16},
		{Name: signal.Ready, Table: Coil, Address: 65535, Type: Bit, WordOrder: LowFirst, ByteOrder: HighFirst, Scale: 1, UnitFactor: 1, Range: state, Line: 21},
		{Name: signal.Running, Table: Discrete, Address: 2, Type: Bit, WordOrder: LowFirst, ByteOrder: HighFirst, Scale: 1, UnitFactor: 1, Range: state, Line: 25},
		{Name: signal.Fault, Table: Input, Address: 65535, Type: U16, WordOrder: LowFirst, ByteOrder: HighFirst, Scale: 1, UnitFactor: 1, Range: state, Line: 29},
		{Name: signal.Mode, Table: Holding, Address: 0, Type: I16, WordOrder: LowFirst, ByteOrder: HighFirst, Scale: 1, UnitFactor: 1,
			Values: map[int64]float64{-1: signal.ModeOff, 16: signal.ModeCurrent, 7: signal.ModeOff}, Line: 34},
	}}
	if !reflect.DeepEqual(m, want) {
		t.Errorf("Read = %+v\nwant %+v", m, want)
	}
}

// Each row changes the map of one signal; the mark stands where the one problem is expected.
func TestReadRefuses(t *testing.T) {
	const mark = "‸"
	for _, tt := range []struct{ name, old, new, read, wanted string }{
		{"empty", one, mark, "an empty file", "the file's format"},
		{"a site file", `"chargehand-map/1"`, mark + `"chargehand-site/1"`, "chargehand-site/1", "another kind of file"},
		{"newer", `"chargehand-map/1"`, mark + `"chargehand-map/2"`, "chargehand-map/2", "another version"},
		{"no signal", one, mark + "format = \"chargehand-map/1\"\n", "no [[signal]]", "the table [[signal]]"},
		{"empty list", one, "format = \"chargehand-map/1\"\nsignal = ‸[]\n", "a list", "one signal at least"},
		{"unknown signal", `"bus-voltage"`, `‸"bus-volatge"`, `"bus-volatge"`, "perhaps bus-voltage"},
		{"unheard signal", `"bus-voltage"`, `‸"moon-phase"`, `"moon-phase"`, "a known signal: bus-voltage source-voltage"},
		{"no name", "[[signal]]\nname = \"bus-voltage\"", "‸[[signal]]", "no name", "the key name"},
		{"signal twice", "unit = \"V\"\n", "unit = \"V\"\n[[signal]]\nname = ‸\"bus-voltage\"\ntable = \"holding\"\naddress = 101\ntype = \"u16\"\nunit = \"V\"\n",
			`"bus-voltage"`, "each signal once; it stands in line 2 already"},
		{"unknown key", "type =", "‸typ = \"u16\"\ntype =", "the key typ in [signal]", "perhaps type"},
		{"wrong case", "type =", "‸Type = \"u16\"\ntype =", "the key Type in [signal]", "lower case exactly: type"},
		{"no table", "[[signal]]\nname = \"bus-voltage\"\ntable = \"holding\"\n", "‸[[signal]]\nname = \"bus-voltage\"\n", "no table", "the key table"},
		{"no address", "[[signal]]\nname = \"bus-voltage\"\ntable = \"holding\"\naddress = 100\n", "‸[[signal]]\nname = \"bus-voltage\"\ntable = \"holding\"\n", "no address", "the key address"},
		{"no type", "[[signal]]\nname = \"bus-voltage\"\ntable = \"holding\"\naddress = 100\ntype = \"u16\"\n", "‸[[signal]]\nname = \"bus-voltage\"\ntable = \"holding\"\naddress = 100\n", "no type", "the key type"},
		{"no unit", "[[signal]]\nname = \"bus-voltage\"\ntable = \"holding\"\naddress = 100\ntype = \"u16\"\nunit = \"V\"\n", "‸[[signal]]\nname = \"bus-voltage\"\ntable = \"holding\"\naddress = 100\ntype = \"u16\"\n", "no unit", "the key unit"},
		{"unknown table", `"holding"`, `‸"holdings"`, `"holdings"`, "one of holding, input, coil, discrete"},
		{"address beyond", "address = 100", "address = ‸65536", "65536", "from 0 to 65535"},
		{"address in quotes", "address = 100", "address = ‸\"100\"", `"100"`, "without quotes"},
		{"no room for two words", "address = 100\ntype = \"u16\"", "address = ‸65535\ntype = \"u32\"\nword_order = \"low-first\"", "65535", "room for 2 registers"},
		{"reference as number", "table = \"holding\"\naddress = 100", "reference = ‸40101", "40101", "text in quotes"},
		{"reference too short", "table = \"holding\"\naddress = 100", "reference = ‸\"4101\"", `"4101"`, "5 or 6 digits"},
		{"reference with a letter", "table = \"holding\"\naddress = 100", "reference = ‸\"4x101\"", `"4x101"`, "5 or 6 digits"},
		{"reference of no table", "table = \"holding\"\naddress = 100", "reference = ‸\"20101\"", `"20101"`, "0 for coils"},
		{"reference of 0", "table = \"holding\"\naddress = 100", "reference = ‸\"40000\"", `"40000"`, "1 to 9999"},
		{"reference beyond", "table = \"holding\"\naddress = 100", "reference = ‸\"465537\"", `"465537"`, "65536 in 6 digits"},
		{"reference and address", "address = 100", "address = 100\nreference = ‸\"40101\"", `"40101"`, "not both"},
		{"reference in another table", "table = \"holding\"\naddress = 100", "table = \"holding\"\nreference = ‸\"30101\"", `"30101"`, "in the table holding"},
		{"unknown type", `"u16"`, `‸"uint16"`, `"uint16"`, "one of u16, i16"},
		{"bit without number", "[[signal]]\nname = \"bus-voltage\"\ntable = \"holding\"\naddress = 100\ntype = \"u16\"\nunit = \"V\"", "‸[[signal]]\nname = \"ready\"\ntable = \"holding\"\naddress = 100\ntype = \"bit\"", "no bit", "the key bit"},
		{"bit beyond", "name = \"bus-voltage\"\ntable = \"holding\"\naddress = 100\ntype = \"u16\"\nunit = \"V\"", "name = \"ready\"\ntable = \"holding\"\naddress = 100\ntype = \"bit\"\nbit = ‸16", "16", "from 0 to 15"},
		{"bit of a number", "unit =", "bit = ‸3\nunit =", "3", "no bit beside the type u16"},
		{"state as float", "name = \"bus-voltage\"\ntable = \"holding\"\naddress = 100\ntype = \"u16\"\nunit = \"V\"", "name = \"ready\"\ntable = \"holding\"\naddress = 100\ntype = ‸\"f32\"\nword_order = \"low-first\"", `"f32"`, "bit or a whole number"},
		{"order not stated", "[[signal]]\nname = \"bus-voltage\"\ntable = \"holding\"\naddress = 100\ntype = \"u16\"", "‸[[signal]]\nname = \"bus-voltage\"\ntable = \"holding\"\naddress = 100\ntype = \"i32\"", "no word_order for the i32 bus-voltage", "the order of words"},
		{"unknown order", "unit =", "word_order = ‸\"big\"\nunit =", `"big"`, "one of high-first, low-first"},
		{"scale of 0", "unit =", "scale = ‸0.0\nunit =", "0.0", "not 0"},
		{"scale of nan", "unit =", "scale = ‸nan\nunit =", "nan", "a finite number"},
		{"unit of another dimension", `unit = "V"`, `unit = ‸"A"`, `"A"`, "a unit of bus-voltage: µV mV V kV"},
		{"unit for a state", "name = \"bus-voltage\"\ntable = \"holding\"\naddress = 100\ntype = \"u16\"\nunit = \"V\"", "name = \"ready\"\ntable = \"coil\"\naddress = 100\nunit = ‸\"V\"", `"V"`, "no unit: ready is a state"},
		{"scale for a bit", "name = \"bus-voltage\"\ntable = \"holding\"\naddress = 100\ntype = \"u16\"\nunit = \"V\"", "name = \"ready\"\ntable = \"coil\"\naddress = 100\nscale = ‸2", "2", "no scale for a bit"},
		{"missing for a bit", "name = \"bus-voltage\"\ntable = \"holding\"\naddress = 100\ntype = \"u16\"\nunit = \"V\"", "name = \"ready\"\ntable = \"coil\"\naddress = 100\nmissing = ‸\"8000\"", `"8000"`, "no missing for a bit"},
		{"bit of a coil", "name = \"bus-voltage\"\ntable = \"holding\"\naddress = 100\ntype = \"u16\"\nunit = \"V\"", "name = \"ready\"\ntable = \"coil\"\naddress = 100\nbit = ‸2", "2", "each item of this table is one"},
		{"number in a coil", "name = \"bus-voltage\"\ntable = \"holding\"\naddress = 100\ntype = \"u16\"\nunit = \"V\"", "name = \"ready\"\ntable = \"coil\"\naddress = 100\ntype = ‸\"u16\"", `"u16"`, "bit"},
		{"voltage in a coil", "table = \"holding\"\naddress = 100\ntype = \"u16\"", "table = ‸\"coil\"\naddress = 100", `"coil"`, "registers that hold a number"},
		{"voltage as a bit", "type = \"u16\"", "type = ‸\"bit\"\nbit = 3", `"bit"`, "registers that hold a number"},
		{"range upside down", "unit =", "range = ‸[5, 5]\nunit =", "a list", "the lower bound first"},
		{"range of one", "unit =", "range = ‸[5]\nunit =", "a list", "a list of 2 numbers"},
		{"missing of wrong length", "unit =", "missing = ‸\"8000 0000\"\nunit =", `"8000 0000"`, "1 hex words of 4 digits"},
		{"missing not hex", "unit =", "missing = ‸\"0x8000\"\nunit =", `"0x8000"`, "hex words"},
		{"missing as number", "unit =", "missing = ‸8000\nunit =", "8000", "text in quotes, or a list"},
		{"values for another", "unit =", "values = ‸{ 0 = \"off\" }\nunit =", "a table", "only for the signal mode"},
		{"mode without values", "[[signal]]\nname = \"bus-voltage\"\ntable = \"holding\"\naddress = 100\ntype = \"u16\"\nunit = \"V\"", "‸[[signal]]\nname = \"mode\"\ntable = \"holding\"\naddress = 100\ntype = \"u16\"", "no values", "the key values"},
		{"mode of unknown meaning", "name = \"bus-voltage\"\ntable = \"holding\"\naddress = 100\ntype = \"u16\"\nunit = \"V\"", "name = \"mode\"\ntable = \"holding\"\naddress = 100\ntype = \"u16\"\nvalues = { 0 = ‸\"power\" }", `"power"`, "one of off, voltage, current"},
		{"mode of no number", "name = \"bus-voltage\"\ntable = \"holding\"\naddress = 100\ntype = \"u16\"\nunit = \"V\"", "name = \"mode\"\ntable = \"holding\"\naddress = 100\ntype = \"u16\"\nvalues = ‸{ zero = \"off\" }", "the raw number zero", "a whole number"},
		{"mode number twice", "name = \"bus-voltage\"\ntable = \"holding\"\naddress = 100\ntype = \"u16\"\nunit = \"V\"", "name = \"mode\"\ntable = \"holding\"\naddress = 100\ntype = \"u16\"\nvalues = ‸{ 16 = \"off\", 0x10 = \"off\" }", "the raw number 0x10 twice", "each raw number once"},
		{"block too large", "[[signal]]", "max_block = ‸126\n[[signal]]", "126", "from 1 to 125"},
		{"value larger than a block", "[[signal]]\nname = \"bus-voltage\"\ntable = \"holding\"\naddress = 100\ntype = \"u16\"", "max_block = 1\nword_order = \"high-first\"\n[[signal]]\nname = \"bus-voltage\"\ntable = \"holding\"\naddress = 100\ntype = ‸\"u32\"", `"u32"`, "no more registers than max_block, 1"},
		{"interval without unit", "[[signal]]", "min_interval = ‸10\n[[signal]]", "10", "a value with its unit"},
		{"unit_id beyond", "unit =", "unit_id = ‸256\nunit =", "256", "from 0 to 255"},
	} {
		t.Run(tt.name, func(t *testing.T) {
			if !strings.Contains(one, tt.old) {
				t.Fatalf("the map has no %q", tt.old)
			}
			before, after, _ := strings.Cut(strings.Replace(one, tt.old, tt.new, 1), mark)
			line := strings.Count(before, "\n") + 1
			column := utf8.RuneCountInString(before[strings.LastIndexByte(before, '\n')+1:]) + 1
			_, err := Read("x.map.toml", []byte(before+after))
			var p *document.Problems
			if !errors.As(err, &p) || len(p.List) != 1 {
				t.Fatalf("Read = %v, want one problem", err)
			}
			q := p.List[0]
			if q.Line != line || q.Column != column || !strings.Contains(q.Read, tt.read) || !strings.Contains(q.Wanted, tt.wanted) {
				t.Errorf("Read = %v\nwant x.map.toml:%d:%d: read … %s …, wanted … %s …", err, line, column, tt.read, tt.wanted)
			}
		})
	}
}

func TestReadReportsAllProblemsInOneGo(t *testing.T) {
	text := strings.NewReplacer(`name    = "bus-voltage"`, `name    = "bus"`, "address = 101", "address = -1", `unit    = "kΩ"`, `unit    = "kV"`, `"i32"`, `"s32"`).Replace(wagtail(t))
	_, err := Read("x", []byte(text))
	var p *document.Problems
	if !errors.As(err, &p) || len(p.List) != 5 { // s32 stands twice
		t.Errorf("Read = %v, want 5 problems", err)
	}
}

// The maps that the program brings along read as they stand, with either line end.
func TestReadBuiltInMaps(t *testing.T) {
	for _, name := range []string{"example.map.toml", "template.map.toml"} {
		text, err := os.ReadFile("../../commission/site/" + name)
		if err != nil {
			t.Fatal(err)
		}
		plain, err := Read(name, text)
		if err != nil || len(plain.Points) != 26 {
			t.Errorf("Read(%s) = %d points, %v, want 26", name, len(plain.Points), err)
		}
		windows, err := Read(name, []byte("\ufeff"+strings.ReplaceAll(string(text), "\n", "\r\n")))
		if err != nil || !reflect.DeepEqual(windows, plain) {
			t.Errorf("Read(%s) with CR LF = %v, and differs", name, err)
		}
	}
}
