package quantity

import "math"

// Each quantity is a type of its own, in the coherent SI unit named here, so that a current cannot stand where a voltage
// is wanted. Products of quantities are named functions: volts times volts compiles and is no voltage.
type (
	Voltage      float64 // volts
	Current      float64 // amperes
	Resistance   float64 // ohms
	Capacitance  float64 // farads
	Inductance   float64 // henries
	Power        float64 // watts
	Energy       float64 // joules
	Seconds      float64 // seconds, as typed in a file; elapsed time in the program is a time.Duration
	Frequency    float64 // hertz
	Temperature  float64 // degrees Celsius
	Difference   float64 // kelvins, a difference of two temperatures
	Thermal      float64 // kelvins per watt
	Length       float64 // metres
	Area         float64 // square metres
	Droop        float64 // volts per ampere
	Ratio        float64 // a fraction of 1
	Charge       float64 // coulombs
	CurrentTime2 float64 // ampere squared seconds, the Joule integral of a fuse
)

// One of each coherent unit, so that a value is written as 565*Volt.
const (
	Volt   Voltage     = 1
	Ampere Current     = 1
	Ohm    Resistance  = 1
	Farad  Capacitance = 1
	Henry  Inductance  = 1
	Watt   Power       = 1
	Joule  Energy      = 1
	Second Seconds     = 1
	Hertz  Frequency   = 1
)

// Scalar is any of the quantities of this package.
type Scalar interface{ ~float64 }

// Spread is the least, nominal and greatest value of one quantity over all corners of the tolerances behind it.
// The zero Spread is the exact value 0.
type Spread[Q Scalar] struct {
	Low, Nominal, High Q
}

// Exactly is a Spread without width.
func Exactly[Q Scalar](value Q) Spread[Q] { return Spread[Q]{value, value, value} }

// IsOrdered tells whether low ≤ nominal ≤ high and all three are finite.
func (s Spread[Q]) IsOrdered() bool {
	for _, v := range []Q{s.Low, s.Nominal, s.High} {
		if math.IsNaN(float64(v)) || math.IsInf(float64(v), 0) {
			return false
		}
	}
	return s.Low <= s.Nominal && s.Nominal <= s.High
}

// Width is the distance from the least to the greatest value.
func (s Spread[Q]) Width() Q { return s.High - s.Low }

// Entered is a value as a person typed it: the Spread it means and the text that was typed. The zero Entered is an
// absent value, which is a fact of its own and not 0.
type Entered[Q Scalar] struct {
	Spread[Q]
	Text string
}

// IsGiven tells whether the value was typed at all.
func (e Entered[Q]) IsGiven() bool { return e.Text != "" }

// ErrorBound is the greatest error of a measurement or a setting, typed in volts or in per cent of a reference that the
// key names. It has no tolerance of its own: it enters every calculation in full and in the adverse sense.
type ErrorBound struct {
	Absolute Voltage // used when Relative is 0
	Relative Ratio
	Text     string
}

// IsGiven tells whether the bound was typed at all.
func (e ErrorBound) IsGiven() bool { return e.Text != "" }

// Of gives the bound in volts for the reference that per cent refer to.
func (e ErrorBound) Of(reference Voltage) Voltage {
	if e.Relative != 0 {
		return Voltage(e.Relative) * Voltage(math.Abs(float64(reference)))
	}
	return e.Absolute
}

// DroopSetting is a droop typed in volts per ampere, or in per cent of the bus's nominal voltage at the infeed's own
// rated current on the bus side.
type DroopSetting struct {
	PerAmpere Droop // used when Percent is 0
	Percent   Ratio // a fraction of 1
	Text      string
}

// IsGiven tells whether the droop was typed at all.
func (d DroopSetting) IsGiven() bool { return d.Text != "" }

// At gives the droop in volts per ampere: (per cent ⁄ 100)·nominal ⁄ rated (formulas G).
func (d DroopSetting) At(nominal Voltage, rated Current) Droop {
	if d.Percent != 0 {
		return Droop(float64(d.Percent) * float64(nominal) / float64(rated))
	}
	return d.PerAmpere
}
