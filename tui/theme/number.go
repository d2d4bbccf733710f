package theme

import (
	"math"
	"strconv"
	"strings"

	"chargehand/commission/quantity"
)

// Number writes a live value of a coherent SI unit: volts, amperes and degrees with one fixed place, so that a figure that
// changes does not jump about, everything else with three digits and the prefix that suits it. A value that is not finite
// reads "no value".
func (t Theme) Number(value float64, unit string) string {
	number, prefixed := t.Parts(value, unit)
	if prefixed == "" {
		return number
	}
	return number + " " + prefixed
}

// Signed is [Theme.Number] with a sign also on what is positive, for values whose direction matters.
func (t Theme) Signed(value float64, unit string) string {
	number := t.Number(value, unit)
	if value > 0 && !isZero(number) {
		return "+" + number
	}
	return number
}

// Parts gives the number and the prefixed unit of [Theme.Number] apart.
func (t Theme) Parts(value float64, unit string) (number, prefixed string) {
	switch size := math.Abs(value); {
	case math.IsNaN(value) || math.IsInf(value, 0):
		return "no value", ""
	case size >= 1e12: // no plant has such a value: show that it is absurd, but keep it short
		number, prefixed = strconv.FormatFloat(value, 'e', 2, 64), unit
	case unit == "":
		number = strconv.FormatFloat(value, 'f', 0, 64)
	case (unit == "V" || unit == "A" || unit == "°C") && size < 9999.95:
		number, prefixed = strconv.FormatFloat(value, 'f', 1, 64), unit
	default:
		number, prefixed, _ = strings.Cut(quantity.Engineering(value, unit, 3), " ")
	}
	if isZero(number) {
		number = strings.TrimPrefix(number, "-")
	}
	return t.Minus(number), t.Plain(prefixed)
}

// isZero tells whether a number's digits are all 0.
func isZero(number string) bool {
	digits, _, _ := strings.Cut(number, " ")
	return strings.Trim(digits, "-−0.") == ""
}

// Minus writes a number's leading hyphen as a minus sign where the theme may.
func (t Theme) Minus(number string) string {
	if strings.HasPrefix(number, "-") {
		return t.Pick("−", "-") + number[1:]
	}
	return number
}

// Plain writes a unit, or a text with units in it, without characters beyond ASCII where the theme asks for that: Ω is
// "ohm", ° is "deg", µ is "u".
func (t Theme) Plain(text string) string {
	if !t.ascii || isPlain(text) {
		return text
	}
	return asciiSigns.Replace(text)
}

var asciiSigns = strings.NewReplacer("Ω", "ohm", "\u2126", "ohm", "°", "deg", "µ", "u", "μ", "u", "²", "2", "±", "+-",
	"−", "-", "–", "-", "⁄", "/", "·", ".", "…", "..", "≤", "<=", "≥", ">=", "×", "x", "Δ", "d", "τ", "tau", "→", "->", "✓", "+", "✗", "X")
