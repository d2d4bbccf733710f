package circuit

import (
	"fmt"
	"math"
)

// Mode is what the bridge regulates.
type Mode int

// The modes.
const (
	VoltageMode Mode = iota
	CurrentMode
)

// Trip is what blocked the pulses by itself.
type Trip int

// The trips.
const (
	NoTrip Trip = iota
	OverVoltageTrip
	UnderVoltageTrip
	PrechargeTimeout
	BypassLost
)

// String names the trip.
func (t Trip) String() string {
	return [...]string{"none", "over-voltage", "under-voltage", "pre-charge time-out", "bypass lost"}[t]
}

// Places of the state vector; the currents of the phases and of the other infeeds follow.
const (
	iSource  = iota // A through the source's loop
	vNode           // V at node A, after fuse and isolator
	vFilter         // V of the filter capacitor
	iFilter         // A into the filter
	vStar           // V at the star point
	vBus            // V
	vBanks          // V of the isolated banks
	rise            // K of the resistor above ambient
	drawn           // C
	integral        // A, of the regulator
	lagged          // A, bus-side current that the droop acts on
	ramp            // V or W, the reference on its way
	firstPhase
)

// Circuit is one plant with the state of its switches.
type Circuit struct {
	p    Parameters
	time float64
	y    []float64
	mass []float64 // of each row; 0 for Kirchhoff's current law at a node

	isolator, precharge, bypass contact
	fuseOpen, sourceOpen        bool
	melted                      float64 // A²s above the fuse rating
	prechargeSince              float64 // when the pre-charge contactor closed last

	released, armed            bool
	trip                       Trip
	tripAt                     float64
	mode                       Mode
	setpoint, droop, power     float64
	chargeLimit, discharge     float64
	auxiliaryOn, chopperOn     bool
	loadOn                     bool
	loadPower, loadConductance float64
	returned, shorted          bool
	joined, joinedHard         bool
	infeedOn                   []bool
	report                     *bool // what the bypass's auxiliary contact says whatever its main contact does

	energy Energies
	step   stepper
}

// Energies are integrals over the whole run, for balances.
type Energies struct {
	Source      float64 // J given by the electromotive force
	Resistor    float64 // J turned to heat in the pre-charge resistor
	Joule       float64 // A²s of the source current
	BusCharge   float64 // C from the bridge into the bus
	Dissipation float64 // J turned to heat in source, chokes, diodes, contactors and at the nodes, blocked bridge only
}

// New builds a circuit with everything open, nothing charged and the pulses blocked.
func New(p Parameters) (*Circuit, error) {
	if err := p.validate(); err != nil {
		return nil, err
	}
	c := &Circuit{p: p}
	n := firstPhase + len(p.Chokes) + len(p.Infeeds)
	c.y, c.mass = make([]float64, n), make([]float64, n)
	c.infeedOn = make([]bool, len(p.Infeeds))
	c.chargeLimit, c.discharge = p.Bridge.SourceLimit, p.Bridge.SourceLimit
	for _, k := range []*contact{&c.isolator, &c.precharge, &c.bypass} {
		k.mainAt, k.auxAt = never, never
	}
	c.precharge.command(p.Precharge.Contactor, false, 0)
	c.bypass.command(p.Bypass, false, 0)
	c.shorted = p.Bus.ShortConductance > 0 && p.Bus.ShortsAt <= 0
	c.prechargeSince = never
	c.setMass()
	c.step.init(n)
	return c, nil
}

func (c *Circuit) setMass() {
	for i := range c.mass {
		c.mass[i] = 1
	}
	p := &c.p
	c.mass[iSource] = p.Source.Inductance
	c.mass[vNode], c.mass[vStar], c.mass[iFilter] = 0, 0, 0
	if p.Filter != nil {
		c.mass[vFilter], c.mass[iFilter] = p.Filter.Capacitance, p.Filter.Inductance
	}
	c.mass[vBus] = p.Bus.Capacitance
	if p.Bus.Isolated > 0 {
		c.mass[vBanks] = p.Bus.Isolated
	}
	if p.Precharge.ThermalCapacity > 0 {
		c.mass[rise] = p.Precharge.ThermalCapacity
	}
	for k, choke := range p.Chokes {
		c.mass[firstPhase+k] = choke.Inductance
	}
	for k, infeed := range p.Infeeds {
		c.mass[c.infeedPlace(k)] = infeed.Lag
	}
}

func (c *Circuit) infeedPlace(k int) int { return firstPhase + len(c.p.Chokes) + k }

// Parameters are the values of the plant as they stand now.
func (c *Circuit) Parameters() Parameters { return c.p }

// Time is the simulated time in seconds since New.
func (c *Circuit) Time() float64 { return c.time }

// SetBusVoltage puts a charge on the banks, isolated ones excepted.
func (c *Circuit) SetBusVoltage(v float64) { c.y[vBus] = v; c.changed() }

// SetDrawn puts the source at a state of charge.
func (c *Circuit) SetDrawn(coulombs float64) { c.y[drawn] = coulombs; c.changed() }

// Isolator commands the source isolator.
func (c *Circuit) Isolator(close bool) {
	c.isolator.command(c.isolatorContact(), close, c.time)
	c.changed()
}

func (c *Circuit) isolatorContact() Contactor {
	return Contactor{Closing: c.p.Source.IsolatorOpening, Opening: c.p.Source.IsolatorOpening}
}

// Precharge commands the pre-charge contactor.
func (c *Circuit) Precharge(close bool) {
	c.precharge.command(c.p.Precharge.Contactor, close, c.time)
	c.changed()
}

// Bypass commands the bypass contactor.
func (c *Circuit) Bypass(close bool) { c.bypass.command(c.p.Bypass, close, c.time); c.changed() }

// ForceReport makes the bypass's auxiliary contact say one thing whatever its main contact does; nil ends that.
func (c *Circuit) ForceReport(closed *bool) {
	c.report = closed
	c.checkReport()
}

// bypassReport is what the bypass's auxiliary contact says.
func (c *Circuit) bypassReport() bool {
	if c.report != nil {
		return *c.report
	}
	return c.bypass.auxiliary
}

// checkReport blocks the pulses when the bypass is not reported closed.
func (c *Circuit) checkReport() {
	if c.released && !c.bypassReport() {
		c.block(BypassLost)
	}
}

// DisconnectSource opens or closes the battery's own contactor.
func (c *Circuit) DisconnectSource(open bool) { c.sourceOpen = open; c.changed() }

// BlowFuse opens the source fuse.
func (c *Circuit) BlowFuse() { c.fuseOpen = true; c.changed() }

// Release lets the bridge pulse, with its reference starting at what the bus has now.
func (c *Circuit) Release(mode Mode) {
	if c.released && c.mode == mode {
		return
	}
	c.mode, c.trip = mode, NoTrip
	c.y[integral] = 0
	if mode == VoltageMode {
		c.y[ramp] = c.y[vBus]
		if c.released {
			c.y[integral] = c.busCurrent(c.y)
			c.y[ramp] += c.droop * c.y[lagged]
		}
	} else {
		c.y[ramp] = c.busCurrent(c.y) * c.y[vBus]
	}
	if !c.released {
		c.armed = c.y[vBus] > c.p.Protection.UnderVoltage
		c.y[lagged] = 0
	}
	c.released = true
	c.changed()
}

// Block stops the pulses; the diodes stay.
func (c *Circuit) Block() { c.released = false; c.changed() }

// SetVoltage sets the no-load setpoint in V and the droop in V/A of bus-side current.
func (c *Circuit) SetVoltage(setpoint, droop float64) {
	c.setpoint, c.droop = setpoint, droop
	c.changed()
}

// SetPower sets the reference of current mode in W at the bus, positive from source to bus.
func (c *Circuit) SetPower(w float64) { c.power = w; c.changed() }

// SetLimits sets the greatest currents into and out of the source, both 0 or more.
func (c *Circuit) SetLimits(charge, discharge float64) {
	c.chargeLimit = math.Min(charge, c.p.Bridge.SourceLimit)
	c.discharge = math.Min(discharge, c.p.Bridge.SourceLimit)
	c.changed()
}

// SetProtection changes the thresholds.
func (c *Circuit) SetProtection(p Protection) { c.p.Protection = p; c.changed() }

// SetLoad sets the load: constant power in W, negative when it regenerates, and a conductance in S. It lets go of the
// power below the bus voltage Bus.LoadDropsAt and takes it up again only when set anew.
func (c *Circuit) SetLoad(power, conductance float64) {
	c.loadPower, c.loadConductance = power, conductance
	c.loadOn = power != 0 && (power < 0 || c.y[vBus] > c.p.Bus.LoadDropsAt)
	c.changed()
}

// Infeed switches another infeed on or off.
func (c *Circuit) Infeed(k int, on bool) {
	c.infeedOn[k] = on
	if !on {
		c.y[c.infeedPlace(k)] = 0
	}
	c.changed()
}

// JoinBanks connects the isolated banks through their joining resistor, or takes them off.
func (c *Circuit) JoinBanks(on bool) { c.joined, c.joinedHard = on, false; c.changed() }

// ClearTrip forgets the last trip.
func (c *Circuit) ClearTrip() { c.trip = NoTrip }

// Trip is the last trip and the simulated time at which it came.
func (c *Circuit) Trip() (Trip, float64) { return c.trip, c.tripAt }

func (c *Circuit) block(why Trip) {
	c.released = false
	if c.trip == NoTrip {
		c.trip, c.tripAt = why, c.time
	}
	c.changed()
}

// changed tells the integration that a switch has moved.
func (c *Circuit) changed() { c.step.restart() }

// NotConverged is the error of a circuit whose equations could not be solved even with the smallest step.
type NotConverged struct{ Time float64 }

// Error says when.
func (e *NotConverged) Error() string {
	return fmt.Sprintf("integrate circuit at %.6f s: no solution with the smallest step", e.Time)
}

// InfeedOn tells whether another infeed is switched on.
func (c *Circuit) InfeedOn(k int) bool { return c.infeedOn[k] }
