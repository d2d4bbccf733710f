// Package signal holds the vocabulary of readings: what can be read, and what one reading is worth.
//
// Start at [Reading]. A [Batch] is what one poll of one device brought, with the state of its link.
package signal

import "time"

// Name is the name of a signal. Current and power are those of the converter being commissioned, positive from source to
// bus.
type Name string

// The signals of design 5.
const (
	BusVoltage           Name = "bus-voltage"
	SourceVoltage        Name = "source-voltage"
	StarPointVoltage     Name = "star-point-voltage"
	SourceCurrent        Name = "source-current"
	BusCurrent           Name = "bus-current"
	PhaseCurrent1        Name = "phase-current-1"
	PhaseCurrent2        Name = "phase-current-2"
	PhaseCurrent3        Name = "phase-current-3"
	Power                Name = "power"
	ResistorTemperature  Name = "resistor-temperature"
	HeatsinkTemperature  Name = "heatsink-temperature"
	InsulationResistance Name = "insulation-resistance"
	Ready                Name = "ready"
	Running              Name = "running"
	PrechargeClosed      Name = "precharge-closed"
	BypassClosed         Name = "bypass-closed"
	MainClosed           Name = "main-closed"
	ChopperActive        Name = "chopper-active"
	Fault                Name = "fault"
	FaultCode            Name = "fault-code"
	Mode                 Name = "mode"
	VoltageSetpoint      Name = "voltage-setpoint"
	DroopSetting         Name = "droop-setting"
	PowerReference       Name = "power-reference"
	ChargeLimit          Name = "charge-limit"
	DischargeLimit       Name = "discharge-limit"
	Heartbeat            Name = "heartbeat"
)

// Names are all signals in the order above.
var Names = []Name{BusVoltage, SourceVoltage, StarPointVoltage, SourceCurrent, BusCurrent, PhaseCurrent1, PhaseCurrent2,
	PhaseCurrent3, Power, ResistorTemperature, HeatsinkTemperature, InsulationResistance, Ready, Running, PrechargeClosed,
	BypassClosed, MainClosed, ChopperActive, Fault, FaultCode, Mode, VoltageSetpoint, DroopSetting, PowerReference,
	ChargeLimit, DischargeLimit, Heartbeat}

// Unit is the coherent SI unit of the signal's value: "V", "A", "W", "°C", "Ω", "V/A", or "" for a state, a code or a
// count. Every [Reading] carries its value in this unit, whatever unit the map states.
func (n Name) Unit() string {
	switch n {
	case BusVoltage, SourceVoltage, StarPointVoltage, VoltageSetpoint:
		return "V"
	case SourceCurrent, BusCurrent, PhaseCurrent1, PhaseCurrent2, PhaseCurrent3, ChargeLimit, DischargeLimit:
		return "A"
	case Power, PowerReference:
		return "W"
	case ResistorTemperature, HeatsinkTemperature:
		return "°C"
	case InsulationResistance:
		return "Ω"
	case DroopSetting:
		return "V/A"
	}
	return ""
}

// IsState tells whether the signal is a state bit, whose value is 0 or 1.
func (n Name) IsState() bool {
	switch n {
	case Ready, Running, PrechargeClosed, BypassClosed, MainClosed, ChopperActive, Fault:
		return true
	}
	return false
}

// IsKnown tells whether the name is one of [Names].
func (n Name) IsKnown() bool {
	for _, k := range Names {
		if k == n {
			return true
		}
	}
	return false
}

// Values of the signal [Mode].
const (
	ModeOff     = 0
	ModeVoltage = 1
	ModeCurrent = 2
)

// Quality says what a reading is worth.
type Quality string

// The qualities. Only a good or late reading has a value.
const (
	Good    Quality = "good"
	Late    Quality = "late"    // older than one and a half poll periods
	Stale   Quality = "stale"   // older than max_age: withdrawn
	Bad     Quality = "bad"     // an exception, a malformed reply, or an implausible value
	Never   Quality = "never"   // no answer yet
	Missing Quality = "missing" // the device sent its code for 'no value'
	Frozen  Quality = "frozen"  // bit-identical while others move
)

// HasValue tells whether a reading of this quality carries a value.
func (q Quality) HasValue() bool { return q == Good || q == Late }

// Reading is one value of one signal at one instant. A missing value is not 0: Quality and Why say why there is none.
type Reading struct {
	Name        Name
	Value       float64       // in Name.Unit(); meaningless unless Quality.HasValue
	At          time.Time     // midpoint between request and reply, by the plant's clock
	Uncertainty time.Duration // half the round trip
	Quality     Quality
	Why         string   // why there is no value
	Raw         []uint16 // the words as on the wire; nil where none came
}

// Age is how old the reading is at now.
func (r Reading) Age(now time.Time) time.Duration { return now.Sub(r.At) }

// Withdrawn gives the reading as it may be shown at now: one older than maxAge loses its value.
func (r Reading) Withdrawn(now time.Time, maxAge time.Duration) Reading {
	if r.Quality.HasValue() && r.Age(now) > maxAge {
		r.Quality, r.Why = Stale, "no newer answer"
	}
	return r
}

// Link is the state of the connection to one device.
type Link struct {
	Up         bool
	Peer       string
	Why        string        // why it is down, in words for the screen
	NextTry    time.Time     // zero while up
	RoundTrip  time.Duration // smoothed
	Rate       float64       // polls per second
	Reconnects int
}

// Batch is what one poll of one device brought: every signal of its map, in map order.
type Batch struct {
	Device   string // the infeed's name
	At       time.Time
	Readings []Reading
	Link     Link
}

// Find gives the batch's reading of a signal; one that the map lacks has quality Never.
func (b Batch) Find(n Name) Reading {
	for _, r := range b.Readings {
		if r.Name == n {
			return r
		}
	}
	return Reading{Name: n, Quality: Never, Why: "not in the map"}
}
