package quantity

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"pgregory.net/rapid"
)

func TestFormatKeepsTheUnit(t *testing.T) {
	for _, tt := range []struct{ got, want string }{
		{fmt.Sprintf("%.1f", 565*Volt), "565.0 V"},
		{fmt.Sprintf("%v", 0.062*Ohm), "0.062 Ω"},
		{fmt.Sprintf("%.1f", Ratio(0.975)), "97.5 %"},
		{fmt.Sprintf("%v", Ratio(0.07)), "7 %"},
		{fmt.Sprintf("%v", Area(120e-6)), "120 mm²"},
		{fmt.Sprintf("%v", Charge(1008000)), "280 Ah"},
		{fmt.Sprintf("%+.2f", Temperature(35)), "+35.00 °C"},
		{fmt.Sprintf("%10.1f|", 5*Volt), "     5.0 V|"},
		{fmt.Sprintf("%-10.1f|", 5*Volt), "5.0 V     |"},
		{fmt.Sprintf("%.3g", 1234*Ampere), "1.23e+03 A"},
		{fmt.Sprintf("%d", 5*Volt), "%!d(5 V)"},
		{fmt.Sprintf("%v", Voltage(math.NaN())), "NaN V"},
		{fmt.Sprintf("%v", Ratio(math.Inf(1))), "+Inf %"},
	} {
		if tt.got != tt.want {
			t.Errorf("Sprintf = %q, want %q", tt.got, tt.want)
		}
	}
}

func TestEngineering(t *testing.T) {
	for _, tt := range []struct {
		value  float64
		unit   string
		digits int
		want   string
	}{
		{4280, "J", 3, "4.28 kJ"},
		{0.245, "V", 3, "245 mV"},
		{1030, "V", 3, "1030 V"},
		{1034.6, "V", 3, "1035 V"},
		{9999.6, "V", 4, "10.00 kV"},
		{50000, "A", 2, "50 kA"},
		{999.7, "Ω", 3, "1.00 kΩ"},
		{-0.0123, "A", 3, "-12.3 mA"},
		{0, "V", 3, "0 V"},
		{0, "m²", 3, "0 mm²"},
		{245.34, "°C", 4, "245.3 °C"},
		{0.93, "1", 3, "0.930"},
		{0.975, "%", 3, "97.5 %"},
		{3, "", 1, "3"},
		{5400, "s", 3, "90.0 min"},
		{30, "s", 3, "30.0 s"},
		{0.0105, "s", 3, "10.5 ms"},
		{90000, "A²s", 3, "90000 A²s"},
		{math.NaN(), "V", 3, "no value"},
		{math.Inf(1), "V", 3, "unlimited"},
		{math.Inf(-1), "V", 3, "-unlimited"},
		{1008000, "C", 3, "280 Ah"},
		{0.136, "V/A", 3, "136 mV/A"},
	} {
		if got := Engineering(tt.value, tt.unit, tt.digits); got != tt.want {
			t.Errorf("Engineering(%v, %q, %d) = %q, want %q", tt.value, tt.unit, tt.digits, got, tt.want)
		}
	}
}

// What is printed in full reads back as the same value, for every quantity. Ampere hours are 3600 coulombs and not a power
// of ten: they may lose the last bit.
func TestPrintedReadsBack(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		size := rapid.Float64Range(-12, 12).Draw(t, "power of ten")
		mantissa := rapid.Float64Range(1, 9.999).Draw(t, "mantissa")
		v := mantissa * math.Pow(10, size)
		if rapid.Bool().Draw(t, "negative") {
			v = -v
		}
		d := rapid.SampledFrom(dimensions).Draw(t, "dimension")
		if d == temperature {
			v = math.Max(v, absoluteZero)
		}
		text := d.inShown(v, 'g', -1) + " " + d.shown
		got, refusal := read(text, d, Rule{})
		if refusal != nil {
			t.Fatalf("read(%q) refused: %v", text, refusal)
		}
		if allowed := math.Abs(v) * 2e-16; got.nominal != v && (d != charge || math.Abs(got.nominal-v) > allowed) {
			t.Fatalf("read(%q) = %v, want %v", text, got.nominal, v)
		}
	})
}

// Engineering never shows a value that differs from the true one by more than half of its last digit.
func TestEngineeringRoundsOnce(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		v := rapid.Float64Range(1, 9.999).Draw(t, "mantissa") * math.Pow(10, float64(rapid.IntRange(-7, 7).Draw(t, "power")))
		d := rapid.SampledFrom([]*dimension{voltage, current, resistance, energy, power, frequency, capacitance, seconds, ratio}).Draw(t, "dimension")
		digits := rapid.IntRange(1, 6).Draw(t, "digits")
		text := Engineering(v, d.engineeringUnit(), digits)
		number, unit, _ := strings.Cut(text, " ")
		factor, ok := UnitFactor(unit, d.coherent)
		if !ok {
			// a prefix that is printed but never typed
			factor = map[string]float64{"µA": 1e-6, "mW": 1e-3, "mJ": 1e-3, "mHz": 1e-3}[unit]
		}
		var shown float64
		if _, err := fmt.Sscan(number, &shown); err != nil || factor == 0 {
			t.Fatalf("Engineering(%v, %q, %d) = %q, which does not read as a number", v, d.coherent, digits, text)
		}
		if got := math.Abs(shown*factor - v); got > 0.5*v*math.Pow(10, float64(1-digits))*(1+1e-9) {
			t.Fatalf("Engineering(%v, %q, %d) = %q, off by %v", v, d.coherent, digits, text, got)
		}
	})
}

// A wider tolerance never narrows the Spread.
func TestWiderToleranceNeverNarrows(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 9999).Draw(t, "nominal")
		a := rapid.IntRange(0, 99).Draw(t, "tolerance")
		b := rapid.IntRange(a, 100).Draw(t, "wider")
		narrow, refusal1 := read(fmt.Sprintf("%d mΩ ±%d %%", n, a), resistance, Rule{Tolerance: true})
		wide, refusal2 := read(fmt.Sprintf("%d mΩ ±%d %%", n, b), resistance, Rule{Tolerance: true})
		if refusal1 != nil || refusal2 != nil {
			t.Fatalf("read refused: %v, %v", refusal1, refusal2)
		}
		if wide.low > narrow.low || wide.high < narrow.high {
			t.Fatalf("±%d %% gives %v, ±%d %% gives %v", a, narrow, b, wide)
		}
	})
}
