package quantity

import (
	"math"
	"strconv"
	"strings"
)

// unit is how a typed number becomes a value in the coherent unit: number · multiplier · 10^exponent. The power of ten is
// kept apart so that "62 mΩ" is exactly the floating-point number 0.062.
type unit struct {
	written    string // the spelling this program writes
	exponent   int
	multiplier float64
}

// dimension is one kind of quantity with the units it may be typed in.
type dimension struct {
	name     string // with its article, for messages
	coherent string // the SI unit without prefix; "1" for a ratio
	shown    string // the unit that a bare value is printed in; one of units
	example  string
	tolerant string // what a tolerance in a unit is typed in, where that is not the value's own units
	units    []unit
	spelled  map[string]unit // every accepted spelling
}

func (d *dimension) list() string {
	names := make([]string, len(d.units))
	for i, u := range d.units {
		names[i] = u.written
	}
	return strings.Join(names, " ")
}

// decimal is a unit that differs from the coherent one by a power of ten.
func decimal(written string, exponent int) unit { return unit{written, exponent, 1} }

func newDimension(name, coherent, shown, example string, units ...unit) *dimension {
	d := &dimension{name: name, coherent: coherent, shown: shown, example: example, units: units, spelled: map[string]unit{}}
	for _, u := range units {
		for _, s := range spellings(u.written) {
			d.spelled[s] = u
		}
	}
	return d
}

// variants are the other spellings of the symbols that keyboards lack or that Unicode has twice.
var variants = []struct {
	written string
	also    []string
}{
	{"µ", []string{"\u03bc", "u"}},
	{"Ω", []string{"\u2126", "ohm"}},
	{"°C", []string{"degC", "\u2103"}},
	{"mm²", []string{"mm2"}},
	{"A²s", []string{"A2s", "A^2s"}},
}

// spellings gives every accepted spelling of a unit, the written one first.
func spellings(written string) []string {
	all := []string{written}
	for _, v := range variants {
		for _, s := range all {
			if !strings.Contains(s, v.written) {
				continue
			}
			for _, also := range v.also {
				all = append(all, strings.Replace(s, v.written, also, 1))
			}
		}
	}
	return all
}

// The dimensions, with the units of the site file's grammar.
var (
	voltage = newDimension("a voltage", "V", "V", "750 V",
		decimal("µV", -6), decimal("mV", -3), decimal("V", 0), decimal("kV", 3))
	current = newDimension("a current", "A", "A", "260 A",
		decimal("mA", -3), decimal("A", 0), decimal("kA", 3))
	resistance = newDimension("a resistance", "Ω", "Ω", "33 Ω",
		decimal("µΩ", -6), decimal("mΩ", -3), decimal("Ω", 0), decimal("kΩ", 3), decimal("MΩ", 6), decimal("GΩ", 9))
	capacitance = newDimension("a capacitance", "F", "F", "4.7 mF",
		decimal("pF", -12), decimal("nF", -9), decimal("µF", -6), decimal("mF", -3), decimal("F", 0))
	inductance = newDimension("an inductance", "H", "H", "6 µH",
		decimal("nH", -9), decimal("µH", -6), decimal("mH", -3), decimal("H", 0))
	power = newDimension("a power", "W", "W", "220 kW",
		decimal("W", 0), decimal("kW", 3), decimal("MW", 6))
	energy = newDimension("an energy", "J", "J", "12 kJ",
		decimal("J", 0), decimal("kJ", 3), decimal("MJ", 6), unit{"Wh", 0, 3600}, unit{"kWh", 3, 3600})
	seconds = newDimension("a time", "s", "s", "10 s",
		decimal("ns", -9), decimal("µs", -6), decimal("ms", -3), decimal("s", 0), unit{"min", 0, 60}, unit{"h", 0, 3600})
	frequency = newDimension("a frequency", "Hz", "Hz", "5 kHz",
		decimal("Hz", 0), decimal("kHz", 3), decimal("MHz", 6))
	length = newDimension("a length", "m", "m", "18 m",
		decimal("mm", -3), decimal("m", 0))
	area        = newDimension("a section", "m²", "mm²", "120 mm²", decimal("mm²", -6))
	temperature = withTolerance("K", newDimension("a temperature", "°C", "°C", "35 °C", decimal("°C", 0)))
	difference  = newDimension("a temperature difference", "K", "K", "5 K", decimal("K", 0))
	thermal     = newDimension("a thermal resistance", "K/W", "K/W", "0.22 K/W", decimal("K/W", 0))
	droop       = newDimension("a droop", "V/A", "V/A", "136 mV/A", decimal("V/A", 0), decimal("mV/A", -3))
	ratio       = withTolerance("points", newDimension("a ratio", "1", "%", "3 %", decimal("%", -2)))
	charge      = newDimension("a charge", "C", "Ah", "280 Ah", unit{"Ah", 0, 3600})
	joule       = newDimension("a Joule integral", "A²s", "A²s", "90000 A²s", decimal("A²s", 0))

	dimensions = []*dimension{voltage, current, resistance, capacitance, inductance, power, energy, seconds, frequency,
		length, area, temperature, difference, thermal, droop, ratio, charge, joule}

	// The keys of two dimensions.
	errorBound = newDimension("an error, in volts or per cent", "V", "V", "0.5 %", append([]unit{decimal("%", -2)}, voltage.units...)...)
	droopUnits = newDimension("a droop, in per cent or volts per ampere", "V/A", "V/A", "3 %", append([]unit{decimal("%", -2)}, droop.units...)...)
)

func withTolerance(in string, d *dimension) *dimension { d.tolerant = in; return d }

// dimensionOf gives the dimension of a quantity's type.
func dimensionOf[Q Scalar]() *dimension {
	var zero Q
	switch any(zero).(type) {
	case Voltage:
		return voltage
	case Current:
		return current
	case Resistance:
		return resistance
	case Capacitance:
		return capacitance
	case Inductance:
		return inductance
	case Power:
		return power
	case Energy:
		return energy
	case Seconds:
		return seconds
	case Frequency:
		return frequency
	case Temperature:
		return temperature
	case Difference:
		return difference
	case Thermal:
		return thermal
	case Length:
		return length
	case Area:
		return area
	case Droop:
		return droop
	case Ratio:
		return ratio
	case Charge:
		return charge
	case CurrentTime2:
		return joule
	}
	panic("quantity: a type without a dimension")
}

// byCoherent gives the dimension whose coherent unit this is, or nil.
func byCoherent(coherent string) *dimension {
	for _, d := range dimensions {
		if d.coherent == coherent {
			return d
		}
	}
	return nil
}

// UnitFactor tells what a value in unit must be multiplied by to stand in the coherent unit: UnitFactor("kΩ", "Ω") is 1000.
// It accepts every spelling that a site file may use, and is false where unit is not one of that dimension.
func UnitFactor(unit, coherent string) (factor float64, ok bool) {
	d := byCoherent(coherent)
	if d == nil {
		return 0, false
	}
	u, ok := d.spelled[unit]
	if !ok {
		return 0, false
	}
	factor, _ = u.value("1")
	return factor, true
}

// UnitsOf lists the units, as this program writes them, that a value of the coherent unit may be given in; nil for an
// unknown one.
func UnitsOf(coherent string) []string {
	d := byCoherent(coherent)
	if d == nil {
		return nil
	}
	names := make([]string, len(d.units))
	for i, u := range d.units {
		names[i] = u.written
	}
	return names
}

// value gives the number in the coherent unit, and false where it is beyond what a floating-point number holds.
func (u unit) value(number string) (float64, bool) {
	mantissa, typed, _ := strings.Cut(strings.ReplaceAll(strings.ToLower(number), "−", "-"), "e")
	exponent := 0
	if typed != "" {
		var err error
		if exponent, err = strconv.Atoi(typed); err != nil || exponent > 999 || exponent < -999 {
			return 0, false
		}
	}
	v, err := strconv.ParseFloat(mantissa+"e"+strconv.Itoa(exponent+u.exponent), 64)
	if err != nil || math.IsInf(v*u.multiplier, 0) {
		return 0, false
	}
	if v == 0 && strings.ContainsAny(mantissa, "123456789") {
		return 0, false // smaller than any floating-point number, and not 0
	}
	return v * u.multiplier, true
}
