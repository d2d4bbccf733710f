package site

import (
	"time"

	"chargehand/commission/quantity"
)

// Format is the first line of every site file.
const Format = "chargehand-site/1"

// Site is one converter between one source and one DC bus, with everything that is known about it on paper. Its fields
// are the keys of the site file; an absent table is a nil pointer or an empty slice, an absent value is not given.
type Site struct {
	Name, Reference, Location string

	Source      Source
	Bus         Bus
	Precharge   Precharge
	Bypass      *Bypass
	Converter   *Converter
	Load        *Load
	Infeeds     []Infeed // the first is the converter being commissioned
	Instruments []Instrument
	People      []Person
	Points      []OwnPoint
	Peers       []Peer
	Device      *Device
}

// SourceKind is what stores the energy.
type SourceKind string

// The kinds of source.
const (
	Battery        SourceKind = "battery"
	Supercapacitor SourceKind = "supercapacitor"
	FuelCell       SourceKind = "fuel-cell"
	OtherSource    SourceKind = "other"
)

// Source is the battery, supercapacitor or other source on the low-voltage side.
type Source struct {
	Kind                SourceKind
	CellsInSeries       int // 0: max_voltage and min_voltage were given directly
	CellMax, CellMin    quantity.Entered[quantity.Voltage]
	MaxVoltage          quantity.Entered[quantity.Voltage] // as typed; use HighestRest
	MinVoltage          quantity.Entered[quantity.Voltage] // as typed; use LowestRest
	LimitsUnderCurrent  bool
	Capacitance         quantity.Entered[quantity.Capacitance] // supercapacitor only
	BlockingDiode       bool
	Capacity            quantity.Entered[quantity.Charge]
	InternalResistance  quantity.Entered[quantity.Resistance]
	Inductance          quantity.Entered[quantity.Inductance] // source loop, cables included
	MaxChargeCurrent    quantity.Entered[quantity.Current]
	MaxDischargeCurrent quantity.Entered[quantity.Current]
	MaxRippleCurrent    quantity.Entered[quantity.Current] // RMS
	MeasurementError    quantity.ErrorBound                // per cent of the highest rest voltage
	Fuse                *Fuse
	Switch              *Switch
	StateOfCharge       []ChargePoint
}

// HighestRest is the rest voltage at the top of the window, E_high.
func (s Source) HighestRest() quantity.Voltage {
	if s.CellsInSeries > 0 {
		return quantity.Voltage(s.CellsInSeries) * s.CellMax.Nominal
	}
	return s.MaxVoltage.Nominal
}

// LowestRest is the rest voltage at the bottom of the window, E_low.
func (s Source) LowestRest() quantity.Voltage {
	if s.CellsInSeries > 0 {
		return quantity.Voltage(s.CellsInSeries) * s.CellMin.Nominal
	}
	return s.MinVoltage.Nominal
}

// Error is the source voltage's measurement error in volts.
func (s Source) Error() quantity.Voltage { return s.MeasurementError.Of(s.HighestRest()) }

// Fuse is the source fuse.
type Fuse struct {
	Rating           quantity.Entered[quantity.Current]
	PreArcingI2t     quantity.Entered[quantity.CurrentTime2]
	Voltage          quantity.Entered[quantity.Voltage]
	BreakingCapacity quantity.Entered[quantity.Current]
}

// Switch is the source isolator.
type Switch struct {
	Poles           int // 0: not given
	Voltage         quantity.Entered[quantity.Voltage]
	BreakingCurrent quantity.Entered[quantity.Current]
}

// ChargePoint is one point of the open-circuit voltage over the state of charge.
type ChargePoint struct {
	StateOfCharge quantity.Entered[quantity.Ratio]
	Cell          quantity.Entered[quantity.Voltage] // of one cell, or of the whole source where cells_in_series is absent
}

// Bus is the common DC bus.
type Bus struct {
	Nominal            quantity.Entered[quantity.Voltage]
	UnderVoltageTrip   quantity.Entered[quantity.Voltage]
	OverVoltageTrip    quantity.Entered[quantity.Voltage]
	Chopper            *Chopper
	CapacitorRating    quantity.Entered[quantity.Voltage]
	MeasurementError   quantity.ErrorBound                // per cent of nominal
	RegulationError    quantity.ErrorBound                // per cent of nominal
	Ripple             quantity.Entered[quantity.Voltage] // peak to peak
	WantedMargin       quantity.Entered[quantity.Voltage]
	MarginFail         quantity.Entered[quantity.Voltage] // as typed; use FailingMargin
	TouchSafe          *TouchSafe
	Earthing           Earthing
	Capacitances       []Bank
	Bleeders           []Bleeder
	Auxiliary          *Auxiliary
	InsulationMonitors []InsulationMonitor
}

// Error is the bus voltage's measurement error in volts.
func (b Bus) Error() quantity.Voltage { return b.MeasurementError.Of(b.Nominal.Nominal) }

// Regulation is the bus's regulation error in volts.
func (b Bus) Regulation() quantity.Voltage { return b.RegulationError.Of(b.Nominal.Nominal) }

// FailingMargin is margin_fail, by default two thirds of wanted_margin; ok is false where neither is given.
func (b Bus) FailingMargin() (margin quantity.Voltage, ok bool) {
	if b.MarginFail.IsGiven() {
		return b.MarginFail.Nominal, true
	}
	return b.WantedMargin.Nominal * 2 / 3, b.WantedMargin.IsGiven()
}

// Earthing is how the DC system stands to earth.
type Earthing string

// The ways of earthing; the empty Earthing is not stated.
const (
	Insulated     Earthing = "insulated"
	MidPoint      Earthing = "mid-point"
	NegativeEarth Earthing = "negative"
)

// Chopper is the braking chopper on the bus.
type Chopper struct {
	On, Off  quantity.Entered[quantity.Voltage]
	Power    quantity.Entered[quantity.Power]
	Duration quantity.Entered[quantity.Seconds]
}

// TouchSafe is the voltage below which the bus may be touched, and how soon it must be reached without a warning label.
type TouchSafe struct {
	Voltage quantity.Entered[quantity.Voltage]
	Within  quantity.Entered[quantity.Seconds]
}

// Bank is one capacitor bank on the bus.
type Bank struct {
	Name     string
	Value    quantity.Entered[quantity.Capacitance]
	Isolated bool // switched off the bus while it pre-charges
}

// Bleeder is one discharge resistor across the bus.
type Bleeder struct {
	Name  string
	Value quantity.Entered[quantity.Resistance]
	Power quantity.Entered[quantity.Power]
}

// Auxiliary is a constant-power supply fed from the bus itself.
type Auxiliary struct {
	Power    quantity.Entered[quantity.Power]
	StartsAt quantity.Entered[quantity.Voltage]
	StopsAt  quantity.Entered[quantity.Voltage]
}

// InsulationMonitor is one insulation monitoring device in the coupled system.
type InsulationMonitor struct {
	Where  string
	Active bool
}

// Comparison is what the device compares before it releases the bypass.
type Comparison string

// The two comparisons; the empty Comparison is not stated.
const (
	AcrossContactor  Comparison = "contactor"
	SourceAgainstBus Comparison = "source-bus"
)

// Precharge is the pre-charge resistor, its contactor and the device's pre-charge settings.
type Precharge struct {
	Resistance        quantity.Entered[quantity.Resistance]
	RatedPower        quantity.Entered[quantity.Power]
	Derating          *Derating
	Ambient           quantity.Entered[quantity.Temperature]
	Overload          *Overload
	Pulse             []PulsePoint // ascending in duration and energy
	Thermal           *ResistorThermal
	Attempts          int // 0: not given
	Interval          quantity.Entered[quantity.Seconds]
	ClosingDifference quantity.Entered[quantity.Voltage]
	Compares          Comparison
	MinimumTime       quantity.Entered[quantity.Seconds]
	Timeout           quantity.Entered[quantity.Seconds]
	Contactor         *Contactor
}

// Derating is the resistor's linear loss of rating with temperature.
type Derating struct {
	FullTo, ZeroAt quantity.Entered[quantity.Temperature]
}

// Overload is the resistor's short-time overload: a multiple of its rated power for a duration.
type Overload struct {
	Multiple float64
	Duration quantity.Entered[quantity.Seconds]
}

// PulsePoint is one point of the resistor's permissible single pulse.
type PulsePoint struct {
	Duration quantity.Entered[quantity.Seconds]
	Energy   quantity.Entered[quantity.Energy]
}

// ResistorThermal is the resistor's one-node thermal model.
type ResistorThermal struct {
	Resistance     quantity.Entered[quantity.Thermal]
	TimeConstant   quantity.Entered[quantity.Seconds]
	MaxTemperature quantity.Entered[quantity.Temperature]
}

// Contactor is the pre-charge contactor's breaking duty.
type Contactor struct {
	Voltage         quantity.Entered[quantity.Voltage]
	BreakingCurrent quantity.Entered[quantity.Current]
}

// Bypass is the contactor that bridges the pre-charge resistor.
type Bypass struct {
	MakingCurrent   quantity.Entered[quantity.Current]
	CarryingCurrent quantity.Entered[quantity.Current]
	Voltage         quantity.Entered[quantity.Voltage]
	Polarised       bool
}

// Converter is the bidirectional DC/DC converter.
type Converter struct {
	RatedPower         quantity.Entered[quantity.Power]
	RatedCurrent       quantity.Entered[quantity.Current] // source side, all phases together
	Efficiency         quantity.Entered[quantity.Ratio]
	Phases             int // 0: not given
	Choke              quantity.Entered[quantity.Inductance]
	ChokeResistance    quantity.Entered[quantity.Resistance]
	ChokeSaturation    quantity.Entered[quantity.Current] // per phase
	PhaseSharingError  quantity.Entered[quantity.Ratio]
	SwitchingFrequency quantity.Entered[quantity.Frequency]
	DeadTime           quantity.Entered[quantity.Seconds]
	MinimumPulse       quantity.Entered[quantity.Seconds]
	Filter             *Filter
}

// FilterPosition is which side of the bypass the filter capacitor stands on.
type FilterPosition string

// The two positions.
const (
	AtStar   FilterPosition = "star"   // star point to minus, after the bypass
	AtSource FilterPosition = "source" // before the bypass
)

// Filter is the capacitor that keeps the ripple from the source.
type Filter struct {
	Capacitance quantity.Entered[quantity.Capacitance]
	ESR         quantity.Entered[quantity.Resistance]
	ESL         quantity.Entered[quantity.Inductance]
	Position    FilterPosition
}

// Load is what the bus supplies.
type Load struct {
	Power          quantity.Entered[quantity.Power] // highest steady bus load
	Regeneration   quantity.Entered[quantity.Power]
	ShareTolerance quantity.Entered[quantity.Ratio] // of rating
}

// Infeed feeds the bus under droop.
type Infeed struct {
	Name          string
	RatedCurrent  quantity.Entered[quantity.Current] // bus side
	Setpoint      quantity.Entered[quantity.Voltage] // at no load
	Droop         quantity.DroopSetting
	SetpointError quantity.ErrorBound // per cent of its own setpoint
	Regenerates   bool
	Cable         *Cable
}

// StarFilter is the filter where it stands at the star point, behind the bypass; nil where there is none. Before the bypass the
// source switch charges it and the source keeps it.
func (s Site) StarFilter() *Filter {
	if s.Converter == nil || s.Converter.Filter == nil || s.Converter.Filter.Position != AtStar {
		return nil
	}
	return s.Converter.Filter
}

// Cable is an infeed's cable to the bus; both conductors carry the current.
type Cable struct {
	Length      quantity.Entered[quantity.Length] // one way
	Section     quantity.Entered[quantity.Area]
	Material    string // "copper"
	Class       int    // IEC 60228 class 2 or 5; 2 where not said
	Temperature quantity.Entered[quantity.Temperature]
}

// Instrument is a hand instrument with its calibration.
type Instrument struct {
	Name, Serial, Category string
	Calibrated, Due        time.Time // dates at midnight UTC; zero where not given
	OfReading              quantity.Ratio
	Plus                   quantity.Entered[quantity.Voltage]
	HasAccuracy            bool
	MaxVoltage             quantity.Entered[quantity.Voltage]
}

// ErrorAt is the instrument's error in volts at a reading.
func (i Instrument) ErrorAt(reading quantity.Voltage) quantity.Voltage {
	if reading < 0 {
		reading = -reading
	}
	return quantity.Voltage(i.OfReading)*reading + i.Plus.Nominal
}

// Person is somebody who takes part in the walk.
type Person struct{ Role, Name, Organisation, Key string }

// OwnPoint is an inspection point that the site adds to a stage.
type OwnPoint struct {
	ID, Stage, Kind, What, Accept, Caution, Basis string
}

// Peer is the device of another infeed, polled during sharing tests.
type Peer struct {
	Infeed, Address string
	UnitID          uint8
	Map             string
}

// Device is the converter's Modbus TCP server.
type Device struct {
	Address string // host:port
	UnitID  uint8
	Map     string // path of the map file, relative to the site file
	MaxAge  quantity.Entered[quantity.Seconds]
}
