package circuit

import (
	"errors"
	"fmt"
)

// Parameters are the true values of one plant, in SI units. They do not change while the circuit runs, except through the
// methods of [Circuit].
type Parameters struct {
	Source     Source
	Precharge  Precharge
	Bypass     Contactor
	Filter     *Filter
	Chokes     []Choke // one per phase, star point to leg
	Diode      Diode
	Bridge     Bridge
	Bus        Bus
	Infeeds    []Infeed // those beside the converter
	Protection Protection
}

// Source is what stores the energy, with its loop up to the isolator.
type Source struct {
	EMF             []ChargePoint // electromotive force over the charge drawn, ascending in Drawn; linear between and held outside
	Resistance      float64       // Ω, above 0
	Inductance      float64       // H
	BlockingDiode   bool          // no current into the source
	FuseRating      float64       // A; 0: no fuse
	FusePreArcing   float64       // A²s of current above the rating until the fuse opens
	IsolatorOpening float64       // s, travel time either way
}

// ChargePoint is one point of the electromotive force over the charge drawn from the source.
type ChargePoint struct {
	Drawn float64 // C
	EMF   float64 // V
}

// Contactor is the travel of a contactor and its auxiliary contact.
type Contactor struct {
	Closing, Opening float64 // s from command to main contact
	Auxiliary        float64 // s from main contact to auxiliary contact
	Resistance       float64 // Ω, closed
	Welded           bool    // stays closed whatever is commanded
	Dead             bool    // never closes
}

// Precharge is the pre-charge resistor in series with its contactor, heated as one node.
type Precharge struct {
	Contactor
	Resistor          float64 // Ω at ambient
	ThermalResistance float64 // K/W
	ThermalCapacity   float64 // J/K; 0: stays at ambient
	Ambient           float64 // °C
	Drift             float64 // relative change of resistance per kelvin above ambient
	Timeout           float64 // s until the contactor opens when the bypass has not closed; 0: never
}

// Filter is the capacitor that keeps the ripple from the source.
type Filter struct {
	Capacitance float64 // F
	Resistance  float64 // Ω, above 0
	Inductance  float64 // H
	AtSource    bool    // before the bypass instead of at the star point
}

// Choke is one phase's choke.
type Choke struct {
	Inductance float64 // H
	Resistance float64 // Ω
	Fault      Fault
}

// Fault is what is wrong with a phase.
type Fault int

// The faults of a phase.
const (
	Sound Fault = iota
	Open
	UpperShorted
	LowerShorted
)

// Diode is a freewheel diode: a constant drop and a resistance.
type Diode struct {
	Drop       float64 // V
	Resistance float64 // Ω
}

// Bridge is the averaged bridge with its regulators.
type Bridge struct {
	Efficiency    float64 // bus power over leg power when boosting, its inverse when charging; above 0, at most 1
	LeastDuty     float64 // least part of the bus voltage that a leg can be set to
	SourceLimit   float64 // A, both directions, all phases together
	BusLimit      float64 // A to the bus
	BusReturn     float64 // A from the bus, 0 or more
	CurrentLag    float64 // s, of the phase currents behind their reference
	DroopLag      float64 // s, of the current that the droop acts on
	VoltageGain   float64 // A/V
	IntegralGain  float64 // A/(V·s)
	CurrentTrim   float64 // 1/s, of power errors in current mode
	VoltageRamp   float64 // V/s
	PowerRamp     float64 // W/s
	LeastStar     float64 // V below which the star point voltage is not divided by
	SetpointShift float64 // V added to every voltage setpoint: the unit's own error
	Hunting       float64 // V, amplitude that the regulator adds to its setpoint
	HuntingRate   float64 // Hz
}

// Bus is the common DC bus.
type Bus struct {
	Capacitance      float64 // F, all banks that are not isolated, above 0
	Isolated         float64 // F, banks that join later through JoiningResistor; 0: none
	JoiningResistor  float64 // Ω
	Bleeder          float64 // S, all in parallel
	Leakage          float64 // S, at the bus and at every node that is measured; above 0
	Auxiliary        *Auxiliary
	Chopper          *Chopper
	LoadDropsAt      float64 // V below which loads of constant power let go
	LeftOn           float64 // S, a resistive load that nobody switched off
	ReturningLoad    float64 // W, a load of constant power that comes back by itself
	ReturnsAt        float64 // V
	ShortConductance float64 // S, of a short circuit; 0: none
	ShortsAt         float64 // V of bus voltage at which the short comes; 0: from the start
}

// Auxiliary is a constant-power supply fed from the bus.
type Auxiliary struct {
	Power             float64 // W
	StartsAt, StopsAt float64 // V
}

// Chopper is the braking chopper, a resistor that is switched in.
type Chopper struct {
	On, Off    float64 // V
	Resistance float64 // Ω
}

// Infeed is another unit on the bus under droop.
type Infeed struct {
	Setpoint   float64 // V at no load, its own error included
	Resistance float64 // V/A, droop and cable together, above 0
	Lag        float64 // s, above 0
	Limit      float64 // A
	Return     float64 // A, 0 or more
}

// Protection is what blocks the pulses by itself.
type Protection struct {
	OverVoltage  float64 // V; 0: none
	UnderVoltage float64 // V; 0: none; armed once the bus has been above it with pulses released
}

// validate says what cannot be integrated.
func (p Parameters) validate() error {
	var problems []error
	wrong := func(bad bool, what string) {
		if bad {
			problems = append(problems, errors.New(what))
		}
	}
	wrong(len(p.Source.EMF) == 0, "source without electromotive force")
	for i := 1; i < len(p.Source.EMF); i++ {
		wrong(p.Source.EMF[i].Drawn <= p.Source.EMF[i-1].Drawn, "electromotive force not ascending in charge drawn")
	}
	wrong(p.Source.Resistance <= 0, "source resistance not above 0")
	wrong(p.Precharge.Resistor <= 0, "pre-charge resistance not above 0")
	wrong(len(p.Chokes) == 0 || len(p.Chokes) > 8, "not 1 to 8 phases")
	for i, c := range p.Chokes {
		wrong(c.Inductance <= 0, fmt.Sprintf("inductance of choke %d not above 0", i+1))
	}
	wrong(p.Filter != nil && (p.Filter.Capacitance <= 0 || p.Filter.Resistance <= 0), "filter without capacitance or resistance")
	wrong(p.Bus.Capacitance <= 0, "bus without capacitance")
	wrong(p.Bus.Isolated > 0 && p.Bus.JoiningResistor <= 0, "isolated banks without joining resistor")
	wrong(p.Bus.Leakage <= 0, "leakage not above 0")
	wrong(p.Bridge.Efficiency <= 0 || p.Bridge.Efficiency > 1, "efficiency not in (0, 1]")
	wrong(p.Bridge.CurrentLag <= 0 || p.Bridge.DroopLag <= 0, "regulator lag not above 0")
	for i, f := range p.Infeeds {
		wrong(f.Resistance <= 0 || f.Lag <= 0, fmt.Sprintf("infeed %d without resistance or lag", i+1))
	}
	if len(problems) > 0 {
		return fmt.Errorf("circuit parameters: %w", errors.Join(problems...))
	}
	return nil
}
