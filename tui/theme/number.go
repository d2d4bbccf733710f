package theme

import (
	"math"
	"strconv"
	"strings"
)

// Number writes a value in a coherent SI unit with an engineering prefix where one reads better: 1650 W is "1.65 kW",
// 0.0042 F "4.20 mF", 412.6 V "412.6 V". Digits is how many places follow the point before a prefix is put in.
// A value that is not finite reads "no value".
func (t Theme) Number(value float64, unit string, digits int) string {
	number, prefixed := t.Parts(value, unit, digits)
	if prefixed == "" {
		return number
	}
	return number + " " + prefixed
}

// Signed is [Theme.Number] with a sign also on what is positive, for values whose direction matters.
func (t Theme) Signed(value float64, unit string, digits int) string {
	number := t.Number(value, unit, digits)
	if value > 0 && !isZero(number) {
		return "+" + number
	}
	return number
}

// Parts gives the number and the unit of [Theme.Number] apart.
func (t Theme) Parts(value float64, unit string, digits int) (number, prefixed string) {
	if math.IsNaN(value) || math.IsInf(value, 0) {
		return "no value", ""
	}
	exponent := prefixExponent(value, unit)
	scaled := value / math.Pow10(exponent)
	switch {
	case math.Abs(scaled) >= 1e7:
		number = strconv.FormatFloat(scaled, 'e', 2, 64)
	case exponent != 0:
		number = strconv.FormatFloat(scaled, 'f', placesForThreeDigits(scaled), 64)
	default:
		number = strconv.FormatFloat(scaled, 'f', digits, 64)
	}
	if isZero(number) {
		number = strings.TrimPrefix(number, "-")
	}
	return t.Minus(number), t.Unit(prefixes[exponent] + unit)
}

// Minus writes a number's leading hyphen as a minus sign where the theme may.
func (t Theme) Minus(number string) string {
	if strings.HasPrefix(number, "-") {
		return t.Pick("−", "-") + number[1:]
	}
	return number
}

func isZero(number string) bool {
	return strings.Trim(strings.SplitN(number, " ", 2)[0], "-−0.") == ""
}

var prefixes = map[int]string{9: "G", 6: "M", 3: "k", 0: "", -3: "m", -6: "µ", -9: "n", -12: "p"}

// takesPrefix lists the units that are written with a prefix, and from which size on. Volts and amperes of a power
// circuit read best without one up to 10 000.
func takesPrefix(unit string) (smallest, greatest float64, ok bool) {
	switch unit {
	case "V", "A":
		return 0, 1e4, true
	case "W", "Ω", "J", "Hz":
		return 0, 1e3, true
	case "V/A", "F", "H":
		return 1, 1e3, true
	}
	return 0, 0, false
}

func prefixExponent(value float64, unit string) int {
	smallest, greatest, ok := takesPrefix(unit)
	size := math.Abs(value)
	if !ok || size == 0 || size >= smallest && size < greatest {
		return 0
	}
	exponent := int(math.Floor(math.Log10(size)/3)) * 3
	return min(max(exponent, -12), 9)
}

func placesForThreeDigits(scaled float64) int {
	if math.Abs(scaled) >= 99.95 {
		return 1
	}
	return 2
}

// Unit writes a unit; under --ascii Ω is "ohm", ° is "deg" and µ is "u".
func (t Theme) Unit(unit string) string { return t.Plain(unit) }

// Plain writes a unit or a value's text without characters beyond ASCII where the theme asks for that.
func (t Theme) Plain(text string) string {
	if !t.ascii {
		return text
	}
	return asciiUnits.Replace(text)
}

var asciiUnits = strings.NewReplacer("Ω", "ohm", "°", "deg", "µ", "u", "μ", "u", "²", "2", "±", "+-", "−", "-", "⁄", "/",
	"·", ".", "…", "..", "≤", "<=", "≥", ">=", "–", "-", "×", "x", "Δ", "d", "τ", "tau", "→", "->", "\u2126", "ohm")
