package quantity

import (
	"math"
	"strconv"
	"strings"
)

// scale is one unit that a result may be printed in, from a size on.
type scale struct {
	from   float64 // least size in the coherent unit
	factor float64 // the value in the unit times this is the value in the coherent unit
	unit   string
}

// prefixed are the units that people read each dimension in, greatest first. Volts and amperes keep four digits before the
// k begins, because a bus is compared in volts: 1030 V, not 1.03 kV.
var prefixed = map[string][]scale{
	"V":   {{1e4, 1e3, "kV"}, {1, 1, "V"}, {1e-3, 1e-3, "mV"}, {0, 1e-6, "µV"}},
	"A":   {{1e4, 1e3, "kA"}, {1, 1, "A"}, {1e-3, 1e-3, "mA"}, {0, 1e-6, "µA"}},
	"Ω":   {{1e9, 1e9, "GΩ"}, {1e6, 1e6, "MΩ"}, {1e3, 1e3, "kΩ"}, {1, 1, "Ω"}, {1e-3, 1e-3, "mΩ"}, {0, 1e-6, "µΩ"}},
	"F":   {{1, 1, "F"}, {1e-3, 1e-3, "mF"}, {1e-6, 1e-6, "µF"}, {1e-9, 1e-9, "nF"}, {0, 1e-12, "pF"}},
	"H":   {{1, 1, "H"}, {1e-3, 1e-3, "mH"}, {1e-6, 1e-6, "µH"}, {0, 1e-9, "nH"}},
	"W":   {{1e6, 1e6, "MW"}, {1e3, 1e3, "kW"}, {1, 1, "W"}, {0, 1e-3, "mW"}},
	"J":   {{1e6, 1e6, "MJ"}, {1e3, 1e3, "kJ"}, {1, 1, "J"}, {0, 1e-3, "mJ"}},
	"s":   {{3 * 3600, 3600, "h"}, {600, 60, "min"}, {1, 1, "s"}, {1e-3, 1e-3, "ms"}, {1e-6, 1e-6, "µs"}, {0, 1e-9, "ns"}},
	"Hz":  {{1e6, 1e6, "MHz"}, {1e3, 1e3, "kHz"}, {1, 1, "Hz"}, {0, 1e-3, "mHz"}},
	"m":   {{1, 1, "m"}, {0, 1e-3, "mm"}},
	"m²":  {{0, 1e-6, "mm²"}},
	"V/A": {{1, 1, "V/A"}, {0, 1e-3, "mV/A"}},
	"C":   {{0, 3600, "Ah"}},
	"%":   {{0, 0.01, "%"}},
	"A/s": {{1e6, 1e6, "A/µs"}, {1e3, 1e3, "A/ms"}, {0, 1, "A/s"}},
}

// engineeringUnit is the dimension's unit in the words of [Engineering].
func (d *dimension) engineeringUnit() string {
	if d == ratio {
		return "%"
	}
	return d.coherent
}

// Engineering prints a value of the coherent unit for people: with the prefix that suits its size and at least so many
// significant digits, never rounding away a digit before the decimal point: Engineering(4280, "J", 3) is "4.28 kJ". The unit
// "1" prints a plain number and "%" a fraction of 1 as per cent. NaN is "no value", an infinity "unlimited".
func Engineering(value float64, unit string, digits int) string {
	switch {
	case math.IsNaN(value):
		return "no value"
	case math.IsInf(value, 1):
		return "unlimited"
	case math.IsInf(value, -1):
		return "-unlimited"
	}
	size := math.Abs(roundTo(value, digits))
	chosen := scale{0, 1, unit}
	scales := prefixed[unit]
	for _, s := range scales {
		if size >= s.from {
			chosen = s
			break
		}
	}
	if value == 0 && len(scales) > 0 {
		chosen = zeroScale(scales)
	}
	number := significant(value/chosen.factor, digits)
	if chosen.unit == "" || chosen.unit == "1" {
		return number
	}
	return number + " " + chosen.unit
}

// zeroScale is the unit that 0 is printed in: the one without prefix.
func zeroScale(scales []scale) scale {
	for _, s := range scales {
		if s.factor == 1 {
			return s
		}
	}
	return scales[0]
}

func roundTo(value float64, digits int) float64 {
	rounded, _ := strconv.ParseFloat(strconv.FormatFloat(value, 'e', max(digits, 1)-1, 64), 64)
	return rounded
}

// significant prints at least so many significant digits, without exponent. 0 has no digits after the point.
func significant(value float64, digits int) string {
	if value == 0 {
		return "0"
	}
	_, exponent, _ := strings.Cut(strconv.FormatFloat(value, 'e', max(digits, 1)-1, 64), "e")
	e, _ := strconv.Atoi(exponent)
	number := strconv.FormatFloat(value, 'f', max(0, digits-1-e), 64)
	if number == "-0" {
		return "0"
	}
	return number
}
