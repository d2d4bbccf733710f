package quantity

import (
	"strings"
	"testing"
)

// The values are the SI Brochure's prefixes and units (9th edition, tables 7 and 8) applied by hand.
func TestParseReadsEveryFormOfTheGrammar(t *testing.T) {
	tests := []struct {
		text string
		d    *dimension
		want reading
	}{
		{"62 mΩ ±15 %", resistance, reading{0.0527, 0.062, 0.0713, "mΩ"}},
		{"62mΩ ±15%", resistance, reading{0.0527, 0.062, 0.0713, "mΩ"}},
		{"62 mohm +-15 %", resistance, reading{0.0527, 0.062, 0.0713, "mΩ"}},
		{"62 m\u2126 +/-15 %", resistance, reading{0.0527, 0.062, 0.0713, "mΩ"}},
		{"62\u00a0mΩ\u202f±\u00a015\u202f%", resistance, reading{0.0527, 0.062, 0.0713, "mΩ"}},
		{"7.5 mF -10/+30 %", capacitance, reading{0.00675, 0.0075, 0.00975, "mF"}},
		{"7.5 mF +30/−10 %", capacitance, reading{0.00675, 0.0075, 0.00975, "mF"}},
		{"7.5 mF -10 / +30 %", capacitance, reading{0.00675, 0.0075, 0.00975, "mF"}},
		{"100 Ω ±5 Ω", resistance, reading{95, 100, 105, "Ω"}},
		{"1 kΩ -1/+2 Ω", resistance, reading{999, 1000, 1002, "kΩ"}},
		{"1 kΩ ±0.1 kΩ", resistance, reading{900, 1000, 1100, "kΩ"}},
		{"-40 °C", temperature, reading{-40, -40, -40, "°C"}},
		{"−40 degC ±2 K", temperature, reading{-42, -40, -38, "°C"}},
		{"35 ℃", temperature, reading{35, 35, 35, "°C"}},
		{"3 % ±1 points", ratio, reading{0.02, 0.03, 0.04, "%"}},
		{"-3 V ±50 %", voltage, reading{-4.5, -3, -1.5, "V"}},
		{"4700 uF +-20 %", capacitance, reading{0.00376, 0.0047, 0.00564, "µF"}},
		{"4700 µF", capacitance, reading{0.0047, 0.0047, 0.0047, "µF"}},
		{"4700 μF", capacitance, reading{0.0047, 0.0047, 0.0047, "µF"}},
		{"1.5e3 V", voltage, reading{1500, 1500, 1500, "V"}},
		{"1.5E-3 kV", voltage, reading{1.5, 1.5, 1.5, "kV"}},
		{"1e+2 A", current, reading{100, 100, 100, "A"}},
		{"0 V", voltage, reading{0, 0, 0, "V"}},
		{"0 V ±1 V", voltage, reading{-1, 0, 1, "V"}},
		{"120 mm2", area, reading{120e-6, 120e-6, 120e-6, "mm²"}},
		{"90000 A2s", joule, reading{90000, 90000, 90000, "A²s"}},
		{"90000 A^2s", joule, reading{90000, 90000, 90000, "A²s"}},
		{"280 Ah", charge, reading{1008000, 1008000, 1008000, "Ah"}},
		{"2 kWh", energy, reading{7.2e6, 7.2e6, 7.2e6, "kWh"}},
		{"1.5 min", seconds, reading{90, 90, 90, "min"}},
		{"2 h", seconds, reading{7200, 7200, 7200, "h"}},
		{"136 mV/A", droop, reading{0.136, 0.136, 0.136, "mV/A"}},
		{"0.22 K/W", thermal, reading{0.22, 0.22, 0.22, "K/W"}},
		{"5 K", difference, reading{5, 5, 5, "K"}},
		{"5 MHz", frequency, reading{5e6, 5e6, 5e6, "MHz"}},
		{"40 nH", inductance, reading{40e-9, 40e-9, 40e-9, "nH"}},
		{"18 m", length, reading{18, 18, 18, "m"}},
		{"1.2 MW", power, reading{1.2e6, 1.2e6, 1.2e6, "MW"}},
	}
	for _, tt := range tests {
		got, refusal := read(tt.text, tt.d, Rule{Tolerance: true})
		if refusal != nil {
			t.Errorf("read(%q) refused: %v", tt.text, refusal)
			continue
		}
		if got.unit != tt.want.unit || !near(got.low, tt.want.low) || got.nominal != tt.want.nominal || !near(got.high, tt.want.high) {
			t.Errorf("read(%q) = %v, want %v", tt.text, got, tt.want)
		}
	}
}

// near allows the one rounding that a tolerance adds; a nominal value has none.
func near(got, want float64) bool {
	return got-want <= 1e-14*max(1, want) && want-got <= 1e-14*max(1, want)
}

// Every refusal, with the place in characters, a word of what is wanted and a text that would do.
var refusals = []struct {
	text    string
	d       *dimension
	rule    Rule
	offset  int
	wanted  string
	example string
}{
	{"", voltage, Rule{}, 0, "a number and its unit", "750 V"},
	{" ", voltage, Rule{}, 0, "a number and its unit", "750 V"},
	{" 3 V", voltage, Rule{}, 0, "no space before or after", "3 V"},
	{"3 V ", voltage, Rule{}, 0, "no space before or after", "3 V"},
	{"many", voltage, Rule{}, 0, "a number and its unit", "750 V"},
	{"\xff 3 V", voltage, Rule{}, 0, "UTF-8", "750 V"},
	{strings.Repeat("1'", 1<<20), voltage, Rule{}, 0, "a number and its unit", "750 V"},
	{"+3 V", voltage, Rule{}, 0, "without plus sign", "3 V"},
	{"–3 V", voltage, Rule{}, 0, "a number and its unit", "750 V"},
	{"33", resistance, Rule{}, 2, "a unit: µΩ mΩ Ω kΩ MΩ GΩ", "33 Ω"},
	{"33", resistance, Rule{Example: "62 mΩ ±15 %"}, 2, "a unit", "33 Ω"},
	{"0.975", ratio, Rule{Example: "97.5 %"}, 5, "a unit: %", "97.5 %"},
	{"33 ±5 %", resistance, Rule{Tolerance: true}, 3, "a unit", "33 Ω"},
	{"33  Ω", resistance, Rule{}, 3, "one space", "33 Ω"},
	{"33\tΩ", resistance, Rule{}, 2, "a unit", "33 Ω"},
	{"4,7 mF", capacitance, Rule{}, 1, "a decimal point", "4.7 mF"},
	{",5 mF", capacitance, Rule{}, 0, "a decimal point", "0.5 mF"},
	{"4,700 V", voltage, Rule{}, 1, "4700 V or 4.700 V", "4.700 V"},
	{"4,700,000 V", voltage, Rule{}, 1, "without grouping", "4700000 V"},
	{"4,700.5 V", voltage, Rule{}, 1, "without grouping", "4700.5 V"},
	{"1.000.000 V", voltage, Rule{}, 5, "without grouping", "1000000 V"},
	{"1.000,5 V", voltage, Rule{}, 5, "without grouping", "1.0005 V"},
	{"1 000 V", voltage, Rule{}, 1, "without grouping", "1000 V"},
	{"1\u202f000\u202f000 V", voltage, Rule{}, 1, "without grouping", "1000000 V"},
	{"1'000 V", voltage, Rule{}, 1, "without grouping", "1000 V"},
	{"1_000 V", voltage, Rule{}, 1, "without grouping", "1000 V"},
	{"4k7", resistance, Rule{}, 1, "a decimal point and the unit", "4.7 kΩ"},
	{"4k7 Ω", resistance, Rule{}, 1, "a decimal point and the unit", "4.7 kΩ"},
	{"4R7", resistance, Rule{}, 1, "a decimal point and the unit", "4.7 Ω"},
	{"4u7", capacitance, Rule{}, 1, "a decimal point and the unit", "4.7 µF"},
	{".5 V", voltage, Rule{}, 0, "a digit before", "0.5 V"},
	{"-.5 V", voltage, Rule{}, 1, "a digit before", "-0.5 V"},
	{"5. V", voltage, Rule{}, 1, "a digit after", "5 V"},
	{"0x1F V", voltage, Rule{}, 1, "a decimal number", "31 V"},
	{"nan V", voltage, Rule{}, 0, "a finite number", "750 V"},
	{"NaN", voltage, Rule{}, 0, "a finite number", "750 V"},
	{"inf V", voltage, Rule{}, 0, "a finite number", "750 V"},
	{"-Infinity V", voltage, Rule{}, 1, "a finite number", "750 V"},
	{"1e1.5 V", voltage, Rule{}, 3, "an exponent without decimals", "750 V"},
	{"1e V", voltage, Rule{}, 1, "a unit that is one of", "750 V"},
	{"1e30 V", voltage, Rule{}, 0, "a size between 1e-15 and 1e15", "750 V"},
	{"1e400 V", voltage, Rule{}, 0, "a size between 1e-15 and 1e15", "750 V"},
	{"1e-400 V", voltage, Rule{}, 0, "a size between 1e-15 and 1e15", "750 V"},
	{"1e99999999999999999999 V", voltage, Rule{}, 0, "a size between", "750 V"},
	{"0.0001 pF", capacitance, Rule{}, 0, "a size between 1e-15 and 1e15", "4.7 mF"},
	{"33 V", resistance, Rule{}, 3, "a resistance in µΩ mΩ Ω kΩ MΩ GΩ, not a voltage", "33 Ω"},
	{"35 K", temperature, Rule{}, 3, "a temperature in °C, not a temperature difference", "35 °C"},
	{"35 C", temperature, Rule{}, 3, "the unit as °C", "35 °C"},
	{"5 m", seconds, Rule{}, 2, "not a length", "10 s"},
	{"33 KΩ", resistance, Rule{}, 3, "the unit as kΩ", "33 kΩ"},
	{"33 Ohm", resistance, Rule{}, 3, "the unit as Ω", "33 Ω"},
	{"5 MA", current, Rule{}, 2, "the unit as mA", "5 mA"},
	{"5 khz", frequency, Rule{}, 2, "the unit as kHz", "5 kHz"},
	{"5 MOHM", resistance, Rule{}, 2, "one of", "33 Ω"},
	{"5 furlongs", length, Rule{}, 2, "one of mm m", "18 m"},
	{"90 kA²s", joule, Rule{}, 3, "kA²s may mean 10³ A²s or 10⁶ A²s", "90000 A²s"},
	{"90.5 kA2s", joule, Rule{}, 5, "kA²s may mean", "90500 A²s"},
	{"0.0905 kA^2s", joule, Rule{}, 7, "kA²s may mean", "90.5 A²s"},
	{"33 Ω±5 %", resistance, Rule{Tolerance: true}, 4, "a space before the tolerance", "33 Ω ±5 %"},
	{"33 Ω  ±5 %", resistance, Rule{Tolerance: true}, 5, "one space before", "33 Ω ±5 %"},
	{"33 Ω 5 %", resistance, Rule{Tolerance: true}, 5, "± before", "33 Ω ±5 %"},
	{"33 Ω about", resistance, Rule{Tolerance: true}, 5, "a tolerance, or nothing", "33 Ω ±5 %"},
	{"33 Ω about", resistance, Rule{}, 5, "nothing behind the unit", "33 Ω"},
	{"33 Ω ±5", resistance, Rule{Tolerance: true}, 7, "a unit of the tolerance", "33 Ω ±5 %"},
	{"33 Ω ±", resistance, Rule{Tolerance: true}, 6, "a number in the tolerance", "33 Ω ±5 %"},
	{"33 Ω ±-5 %", resistance, Rule{Tolerance: true}, 6, "not negative", "33 Ω ±5 %"},
	{"33 Ω ±.5 %", resistance, Rule{Tolerance: true}, 6, "a digit before", "33 Ω ±0.5 %"},
	{"33 Ω ±5. %", resistance, Rule{Tolerance: true}, 7, "a digit after", "33 Ω ±5 %"},
	{"33 Ω ±0,5 %", resistance, Rule{Tolerance: true}, 7, "a decimal point", "33 Ω ±0.5 %"},
	{"33 Ω ±101 %", resistance, Rule{Tolerance: true}, 6, "at most 100 %", "33 Ω"},
	{"33 Ω -5/+101 %", resistance, Rule{Tolerance: true}, 9, "at most 100 %", "33 Ω"},
	{"33 Ω -5 %", resistance, Rule{Tolerance: true}, 7, "both sides", "33 Ω -5/+5 %"},
	{"33 Ω -5/-6 %", resistance, Rule{Tolerance: true}, 8, "one side with - and the other with +", "-5/+5 %"},
	{"33 Ω +5/+6 %", resistance, Rule{Tolerance: true}, 8, "one side with - and the other with +", "-5/+5 %"},
	{"33 Ω ±5 V", resistance, Rule{Tolerance: true}, 8, "a tolerance in % or one of", "33 Ω ±5 %"},
	{"33 Ω ±5 points", resistance, Rule{Tolerance: true}, 8, "points are for a value in %", "33 Ω ±5 %"},
	{"33 Ω ±5 % or so", resistance, Rule{Tolerance: true}, 9, "nothing behind the tolerance", "33 Ω ±5 %"},
	{"33 Ω ±1e20 Ω", resistance, Rule{Tolerance: true}, 7, "a tolerance in % or one of", "33 Ω ±1%"},
	{"3 % ±1 %", ratio, Rule{Tolerance: true}, 7, "in points", "3 % ±1 points"},
	{"35 °C ±5 %", temperature, Rule{Tolerance: true}, 9, "in K", "35 °C ±5 K"},
	{"35 °C ±5 °C", temperature, Rule{Tolerance: true}, 9, "in K", "35 °C ±5 K"},
	{"35 °C ±5", temperature, Rule{Tolerance: true}, 8, "a unit of the tolerance", "35 °C ±5 K"},
	{"0 Ω ±5 %", resistance, Rule{Tolerance: true}, 7, "per cent of 0 is 0", "0 Ω ±5 Ω"},
	{"33 Ω ±5 %", resistance, Rule{}, 5, "no tolerance", "33 Ω"},
	{"33 Ω -5/+6 %", resistance, Rule{}, 5, "no tolerance", "33 Ω"},
	{"-33 Ω", resistance, Rule{Sign: Positive}, 0, "above 0", "33 Ω"},
	{"0 Ω", resistance, Rule{Sign: Positive}, 0, "above 0", "33 Ω"},
	{"-33 Ω", resistance, Rule{Sign: NotNegative}, 0, "of 0 or more", "33 Ω"},
	{"33 Ω ±100 %", resistance, Rule{Sign: Positive, Tolerance: true}, 0, "lowest corner", "33 Ω"},
	{"-300 °C", temperature, Rule{}, 0, "above absolute zero", "35 °C"},
}

func TestParseRefuses(t *testing.T) {
	for _, tt := range refusals {
		got, refusal := read(tt.text, tt.d, tt.rule)
		if refusal == nil {
			t.Errorf("read(%q) = %v, want a refusal", tt.text, got)
			continue
		}
		if refusal.Offset != tt.offset || !strings.Contains(refusal.Wanted, tt.wanted) || refusal.Example != tt.example {
			t.Errorf("read(%q) refused at %d wanting %q with %q, want at %d wanting … %q … with %q",
				tt.text, refusal.Offset, refusal.Wanted, refusal.Example, tt.offset, tt.wanted, tt.example)
		}
	}
}

// A message that suggests a text which would be refused in its turn helps nobody. The one exception shows a tolerance alone.
func TestParseSuggestsOnlyWhatItAccepts(t *testing.T) {
	for _, tt := range refusals {
		_, refusal := read(tt.text, tt.d, tt.rule)
		if refusal == nil || strings.HasPrefix(refusal.Example, "-5/+5") {
			continue
		}
		if _, second := read(refusal.Example, tt.d, tt.rule); second != nil {
			t.Errorf("read(%q) suggests %q, which is refused: %v", tt.text, refusal.Example, second)
		}
	}
}

func TestParseGivesTheDimensionOfItsType(t *testing.T) {
	e, refusal := Parse[Resistance]("100 Ω ±5 %", Rule{Tolerance: true, Sign: Positive})
	if refusal != nil || e.Low != 95 || e.Nominal != 100 || e.High != 105 || e.Text != "100 Ω ±5 %" {
		t.Errorf("Parse(100 Ω ±5 %%) = %+v, %v", e, refusal)
	}
	if _, refusal := Parse[Voltage]("100 Ω", Rule{}); refusal == nil {
		t.Error("Parse[Voltage](100 Ω) was accepted, want a refusal")
	}
	if e, refusal := Parse[Current]("4,7 A", Rule{}); refusal == nil || e.IsGiven() {
		t.Errorf("Parse[Current](4,7 A) = %+v, want nothing", e)
	}
}

func TestParseErrorBoundTakesVoltsOrPerCent(t *testing.T) {
	for text, want := range map[string]ErrorBound{
		"0.5 %":  {Relative: 0.005},
		"2.5 V":  {Absolute: 2.5},
		"50 mV":  {Absolute: 0.05},
		"0 %":    {},
		"0 V":    {},
		"100 %":  {Relative: 1},
		"1e-3 V": {Absolute: 0.001},
	} {
		want.Text = text
		if got, refusal := ParseErrorBound(text); refusal != nil || got != want {
			t.Errorf("ParseErrorBound(%q) = %+v, %v, want %+v", text, got, refusal, want)
		}
	}
	for _, text := range []string{"", "0.5", "-0.5 %", "101 %", "0.5 % ±0.1 points", "2 V ±1 %", "2 A", "0,5 %"} {
		got, refusal := ParseErrorBound(text)
		if refusal == nil {
			t.Errorf("ParseErrorBound(%q) = %+v, want a refusal", text, got)
			continue
		}
		if _, second := ParseErrorBound(refusal.Example); second != nil {
			t.Errorf("ParseErrorBound(%q) suggests %q, which is refused: %v", text, refusal.Example, second)
		}
	}
}

func TestParseDroopTakesPerCentOrVoltsPerAmpere(t *testing.T) {
	for text, want := range map[string]DroopSetting{
		"3 %":      {Percent: 0.03},
		"136 mV/A": {PerAmpere: 0.136},
		"0.1 V/A":  {PerAmpere: 0.1},
	} {
		want.Text = text
		if got, refusal := ParseDroop(text); refusal != nil || got != want {
			t.Errorf("ParseDroop(%q) = %+v, %v, want %+v", text, got, refusal, want)
		}
	}
	for _, text := range []string{"", "3", "0 %", "-3 %", "300 %", "3 V", "136 mΩ", "3 % ±1 points"} {
		if got, refusal := ParseDroop(text); refusal == nil {
			t.Errorf("ParseDroop(%q) = %+v, want a refusal", text, got)
		}
	}
}

func TestParseUnitReadsWhatIsTypedAtAPrompt(t *testing.T) {
	for _, tt := range []struct {
		text, coherent string
		want           float64
	}{{"712.4 V", "V", 712.4}, {"1.2 MΩ", "Ω", 1.2e6}, {"35 °C", "°C", 35}, {"136 mV/A", "V/A", 0.136}, {"12", "", 12}, {"-0.5", "1", -0.5},
		{"40 N·m", "N·m", 40}} {
		if got, refusal := ParseUnit(tt.text, tt.coherent, Rule{}); refusal != nil || got != tt.want {
			t.Errorf("ParseUnit(%q, %q) = %v, %v, want %v", tt.text, tt.coherent, got, refusal, tt.want)
		}
	}
	for _, tt := range []struct{ text, coherent string }{{"712.4", "V"}, {"712.4 A", "V"}, {"12 V", ""}, {"1e99", ""}, {"", ""}, {"40", "N·m"},
		{"700 V ±1 %", "V"}} {
		if got, refusal := ParseUnit(tt.text, tt.coherent, Rule{}); refusal == nil {
			t.Errorf("ParseUnit(%q, %q) = %v, want a refusal", tt.text, tt.coherent, got)
		}
	}
}

func TestDoubtNamesAnImplausibleSize(t *testing.T) {
	rule := Rule{Sign: Positive, Tolerance: true, Least: 1e-5, Most: 100}
	for text, doubtful := range map[string]bool{"62 mΩ ±15 %": false, "62 MΩ ±15 %": true, "1 µΩ": true, "100 Ω": false} {
		e, refusal := Parse[Resistance](text, rule)
		if refusal != nil {
			t.Fatalf("Parse(%q) refused: %v", text, refusal)
		}
		if got := Doubt(e, rule); (got != "") != doubtful {
			t.Errorf("Doubt(%q) = %q, want doubt %v", text, got, doubtful)
		}
	}
	e, _ := Parse[Resistance]("62 MΩ", rule)
	if got, want := Doubt(e, rule), "62 MΩ is unusual here, common is 10 µΩ to 100 Ω; is the unit right?"; got != want {
		t.Errorf("Doubt(62 MΩ) = %q, want %q", got, want)
	}
	if got := Doubt(Entered[Resistance]{}, rule); got != "" {
		t.Errorf("Doubt(absent) = %q, want none", got)
	}
}

func TestUnitFactor(t *testing.T) {
	for _, tt := range []struct {
		unit, coherent string
		want           float64
		ok             bool
	}{{"kΩ", "Ω", 1000, true}, {"kohm", "Ω", 1000, true}, {"°C", "°C", 1, true}, {"mV/A", "V/A", 0.001, true}, {"kW", "W", 1000, true},
		{"V", "A", 0, false}, {"kW", "", 0, false}, {"Wh", "J", 3600, true}} {
		if got, ok := UnitFactor(tt.unit, tt.coherent); got != tt.want || ok != tt.ok {
			t.Errorf("UnitFactor(%q, %q) = %v, %v, want %v, %v", tt.unit, tt.coherent, got, ok, tt.want, tt.ok)
		}
	}
	if got := strings.Join(UnitsOf("A"), " "); got != "mA A kA" {
		t.Errorf("UnitsOf(A) = %q, want mA A kA", got)
	}
}
