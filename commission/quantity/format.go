package quantity

import (
	"fmt"
	"strconv"
	"strings"
)

// Format prints the value with its unit, so that fmt.Sprintf("%.1f", 565*Volt) is "565.0 V": the caller picks the digits.
// %v prints the fewest digits that read back as the same value.
func (v Voltage) Format(s fmt.State, verb rune) { format(s, verb, float64(v), voltage) }

// Format prints the value in amperes; see [Voltage.Format].
func (v Current) Format(s fmt.State, verb rune) { format(s, verb, float64(v), current) }

// Format prints the value in ohms; see [Voltage.Format].
func (v Resistance) Format(s fmt.State, verb rune) { format(s, verb, float64(v), resistance) }

// Format prints the value in farads; see [Voltage.Format].
func (v Capacitance) Format(s fmt.State, verb rune) { format(s, verb, float64(v), capacitance) }

// Format prints the value in henries; see [Voltage.Format].
func (v Inductance) Format(s fmt.State, verb rune) { format(s, verb, float64(v), inductance) }

// Format prints the value in watts; see [Voltage.Format].
func (v Power) Format(s fmt.State, verb rune) { format(s, verb, float64(v), power) }

// Format prints the value in joules; see [Voltage.Format].
func (v Energy) Format(s fmt.State, verb rune) { format(s, verb, float64(v), energy) }

// Format prints the value in seconds; see [Voltage.Format].
func (v Seconds) Format(s fmt.State, verb rune) { format(s, verb, float64(v), seconds) }

// Format prints the value in hertz; see [Voltage.Format].
func (v Frequency) Format(s fmt.State, verb rune) { format(s, verb, float64(v), frequency) }

// Format prints the value in degrees Celsius; see [Voltage.Format].
func (v Temperature) Format(s fmt.State, verb rune) { format(s, verb, float64(v), temperature) }

// Format prints the value in kelvins; see [Voltage.Format].
func (v Difference) Format(s fmt.State, verb rune) { format(s, verb, float64(v), difference) }

// Format prints the value in kelvins per watt; see [Voltage.Format].
func (v Thermal) Format(s fmt.State, verb rune) { format(s, verb, float64(v), thermal) }

// Format prints the value in metres; see [Voltage.Format].
func (v Length) Format(s fmt.State, verb rune) { format(s, verb, float64(v), length) }

// Format prints the value in square millimetres; see [Voltage.Format].
func (v Area) Format(s fmt.State, verb rune) { format(s, verb, float64(v), area) }

// Format prints the value in volts per ampere; see [Voltage.Format].
func (v Droop) Format(s fmt.State, verb rune) { format(s, verb, float64(v), droop) }

// Format prints the value in per cent; see [Voltage.Format].
func (v Ratio) Format(s fmt.State, verb rune) { format(s, verb, float64(v), ratio) }

// Format prints the value in ampere hours; see [Voltage.Format].
func (v Charge) Format(s fmt.State, verb rune) { format(s, verb, float64(v), charge) }

// Format prints the value in ampere squared seconds; see [Voltage.Format].
func (v CurrentTime2) Format(s fmt.State, verb rune) { format(s, verb, float64(v), joule) }

func format(s fmt.State, verb rune, value float64, d *dimension) {
	precision, limited := s.Precision()
	var number string
	switch verb {
	case 'f', 'F', 'e', 'E', 'g', 'G':
		if !limited {
			precision = -1
			if verb == 'f' || verb == 'F' || verb == 'e' || verb == 'E' {
				precision = 6
			}
		}
		number = d.inShown(value, byte(verb), precision)
	case 'v', 's':
		number = d.inShown(value, 'g', -1)
	default:
		fmt.Fprintf(s, "%%!%c(%s %s)", verb, d.inShown(value, 'g', -1), d.shown)
		return
	}
	if verb != 'v' && s.Flag('+') && !strings.HasPrefix(number, "-") {
		number = "+" + number
	}
	text := number + " " + d.shown
	if width, ok := s.Width(); ok {
		fill := strings.Repeat(" ", max(0, width-len([]rune(text))))
		if s.Flag('-') {
			text += fill
		} else {
			text = fill + text
		}
	}
	_, _ = s.Write([]byte(text)) // a fmt.State has nowhere to report to
}

// inShown is the number in the shown unit. Powers of ten are shifted in the digits, so that no rounding creeps in and what is
// printed in full reads back as the same value.
func (d *dimension) inShown(value float64, verb byte, precision int) string {
	u := d.spelled[d.shown]
	value /= u.multiplier
	if u.exponent == 0 {
		return plain(value, verb, precision)
	}
	digits := strconv.FormatFloat(value, 'e', -1, 64)
	mantissa, exponent, found := strings.Cut(digits, "e")
	if !found {
		return digits // NaN or infinite
	}
	e, _ := strconv.Atoi(exponent)
	if precision < 0 {
		return shiftPoint(mantissa, e-u.exponent)
	}
	shifted, _ := strconv.ParseFloat(mantissa+"e"+strconv.Itoa(e-u.exponent), 64)
	return plain(shifted, verb, precision)
}

// shiftPoint is mantissa · 10^exponent without an exponent, for a mantissa with one digit before the point.
func shiftPoint(mantissa string, exponent int) string {
	sign := ""
	if strings.HasPrefix(mantissa, "-") {
		sign, mantissa = "-", mantissa[1:]
	}
	digits := strings.Replace(mantissa, ".", "", 1)
	if exponent < 0 {
		digits, exponent = strings.Repeat("0", -exponent)+digits, 0
	}
	if missing := exponent + 1 - len(digits); missing > 0 {
		digits += strings.Repeat("0", missing)
	}
	whole, decimals := strings.TrimLeft(digits[:exponent+1], "0"), strings.TrimRight(digits[exponent+1:], "0")
	if whole == "" {
		whole = "0"
	}
	if decimals == "" {
		return sign + whole
	}
	return sign + whole + "." + decimals
}

// plain avoids the exponent where a person would.
func plain(value float64, verb byte, precision int) string {
	if (verb == 'g' || verb == 'G') && precision < 0 && (value == 0 || value > 1e-5 && value < 1e9 || value < -1e-5 && value > -1e9) {
		verb = 'f'
	}
	return strconv.FormatFloat(value, verb, precision, 64)
}
