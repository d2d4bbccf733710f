package simulator

import (
	"math"
	"time"

	"chargehand/commission/signal"
	"chargehand/commission/site"
	"chargehand/protocol/circuit"
)

// The fault codes of the simulated device.
const (
	noFault = iota
	faultPrechargeTimeout
	faultBypassLost
	faultOverVoltage
	faultUnderVoltage
	faultEmergencyStop
	faultEarth
	faultSource
)

// Habits of the simulated device.
const (
	releaseFilter    = 20 * time.Millisecond  // the difference must stay small this long
	prechargeOverlap = 500 * time.Millisecond // pre-charge contactor opens this long after the bypass reports closed
	banksJoinAfter   = time.Second            // isolated banks join this long after pulses were released
)

// device is the firmware: it looks at the plant every tick and decides.
type device struct {
	now time.Duration

	mode                   circuit.Mode
	setpoint, droop, power float64
	charge, discharge      float64 // limits as set
	protection             circuit.Protection
	fault                  int

	bypassWithheld bool
	manualBypass   bool // the operator has opened or closed the bypass by hand
	smallSince     time.Duration
	small          bool
	prechargeAt    time.Duration // of its main contact; below 0: open
	bypassAt       time.Duration
	releasedAt     time.Duration
	banksJoined    bool
	dropped        bool    // the disturbance has struck
	frozen         bool    // the bus voltage register has stopped moving
	load, loadNow  float64 // W of constant power, wanted and on its way
	loadStep       float64 // W a tick
	earthTest      float64 // Ω of a test resistor to earth; 0: none
	heatsink       float64
	pending        []pending
}

// pending is something that the device does later.
type pending struct {
	at time.Duration
	do func(*circuit.Circuit)
}

const notYet = time.Duration(-1)

func newDevice(t *truth) device {
	return device{setpoint: t.setpoint, droop: t.droop, charge: t.chargeLimit, discharge: t.dischargeLimit,
		protection: t.plant.Protection, prechargeAt: notYet, bypassAt: notYet, releasedAt: notYet,
		heatsink: t.plant.Precharge.Ambient}
}

// apply hands all settings to the plant, with what is wrong with them.
func (d *device) apply(c *circuit.Circuit, t *truth) {
	c.SetVoltage(d.setpoint, d.droop*t.droopFactor+t.cable)
	c.SetPower(d.power)
	c.SetLimits(d.charge, d.discharge*t.limitFactor)
	c.SetProtection(d.protection)
	c.ForceReport(t.bypassReport)
}

func (d *device) later(after time.Duration, do func(*circuit.Circuit)) {
	d.pending = append(d.pending, pending{d.now + after, do})
}

// measured is what the device's sensors say, without noise.
func (t *truth) measured(n signal.Name, v float64) float64 {
	s, known := t.sensors[n]
	if !known {
		return v
	}
	return v*s.gain + s.offset
}

// difference is what the device compares before it releases the bypass.
func (t *truth) difference(r circuit.Reading) float64 {
	source := t.measured(signal.SourceVoltage, r.SourceVoltage)
	if t.site.Precharge.Compares == site.SourceAgainstBus {
		return source - t.measured(signal.BusVoltage, r.BusVoltage)
	}
	return math.Abs(source - t.measured(signal.StarPointVoltage, r.StarVoltage))
}

// look is one turn of the device's program.
func (d *device) look(c *circuit.Circuit, t *truth, now time.Duration) {
	d.now = now
	for k := 0; k < len(d.pending); {
		if p := d.pending[k]; p.at <= now {
			d.pending = append(d.pending[:k], d.pending[k+1:]...)
			p.do(c)
			continue
		}
		k++
	}
	r := c.Read()
	d.note(r)
	d.takeTrips(c)
	d.sequence(c, t, r)
	if d.loadNow != 0 && !r.LoadOn { // the drives have let go of a bus that was too low
		d.load, d.loadNow = 0, 0
	}
	d.rampLoad(c)
	d.strike(c, t, r)
	if d.releasedAt >= 0 && !d.banksJoined && now-d.releasedAt >= banksJoinAfter {
		d.banksJoined = true
		c.JoinBanks(true)
	}
	if low := d.insulation(t) < earthAlarm; low && d.fault == noFault {
		d.fault = faultEarth
	} else if !low && d.fault == faultEarth {
		d.fault = noFault
	}
	load := math.Abs(r.Power) / math.Max(1, t.plant.Bridge.SourceLimit*float64(t.site.Source.LowestRest()))
	d.heatsink += (t.plant.Precharge.Ambient + 30*load - d.heatsink) * tick.Seconds() / 90
}

// note keeps the times at which contacts moved and pulses were released.
func (d *device) note(r circuit.Reading) {
	keep := func(at *time.Duration, is bool) {
		if !is {
			*at = notYet
		} else if *at < 0 {
			*at = d.now
		}
	}
	keep(&d.prechargeAt, r.PrechargeMain && r.PrechargeCommand)
	keep(&d.bypassAt, r.BypassReported && r.BypassCommanded)
	keep(&d.releasedAt, r.Released)
}

// takeTrips latches what the hardware has done by itself.
func (d *device) takeTrips(c *circuit.Circuit) {
	trip, _ := c.Trip()
	if trip == circuit.NoTrip || d.fault != noFault && d.fault != faultEarth {
		return
	}
	d.fault = map[circuit.Trip]int{circuit.OverVoltageTrip: faultOverVoltage, circuit.UnderVoltageTrip: faultUnderVoltage,
		circuit.PrechargeTimeout: faultPrechargeTimeout, circuit.BypassLost: faultBypassLost}[trip]
}

// sequence closes the bypass when the pre-charge is done, and takes the pre-charge out after it.
func (d *device) sequence(c *circuit.Circuit, t *truth, r circuit.Reading) {
	if d.prechargeAt < 0 || d.fault != noFault && d.fault != faultEarth {
		d.small = false
		return
	}
	if r.BypassReported && r.BypassCommanded {
		if d.bypassAt >= 0 && d.now-d.bypassAt >= prechargeOverlap {
			c.Precharge(false)
		}
		return
	}
	difference := t.difference(r)
	small := difference <= t.closingDifference
	if t.earlyRelease { // the least time is not kept either
		small = math.Abs(r.SourceVoltage-r.StarVoltage) <= t.closingDifference
	}
	if !small {
		d.small = false
		return
	}
	if !d.small {
		d.small, d.smallSince = true, d.now
	}
	least := time.Duration(float64(t.site.Precharge.MinimumTime.Nominal) * float64(time.Second))
	if t.earlyRelease {
		least = 0
	}
	if d.now-d.smallSince < releaseFilter || d.now-d.prechargeAt < least || d.bypassWithheld || d.manualBypass ||
		r.BypassCommanded {
		return
	}
	c.Bypass(true)
}

// strike lets those disturbances happen that wait for a moment.
func (d *device) strike(c *circuit.Circuit, t *truth, r circuit.Reading) {
	if d.dropped {
		return
	}
	after := func(since time.Duration, seconds float64) bool {
		return seconds > 0 && since >= 0 && d.now-since >= time.Duration(seconds*float64(time.Second))
	}
	switch {
	case after(d.bypassAt, t.bypassDropsAfter):
		d.dropped, d.manualBypass, d.fault = true, true, faultBypassLost
		c.Bypass(false)
	case after(d.prechargeAt, t.sourceOpensAfter):
		d.dropped = true
		c.DisconnectSource(true)
	case t.infeedLostAbove > 0 && r.LoadPower >= t.infeedLostAbove && len(t.plant.Infeeds) > 0:
		d.dropped = true
		c.Infeed(0, false)
	}
}

// loadRamp is how long a drive takes to its rated power.
const loadRamp = 40 * time.Millisecond

// rampLoad moves the load towards what is wanted.
func (d *device) rampLoad(c *circuit.Circuit) {
	if d.loadNow == d.load {
		return
	}
	d.loadNow += math.Max(-d.loadStep, math.Min(d.loadStep, d.load-d.loadNow))
	c.SetLoad(d.loadNow, 0)
}

// dropLoad switches all loads off at once.
func (d *device) dropLoad(c *circuit.Circuit) {
	d.load, d.loadNow = 0, 0
	c.SetLoad(0, 0)
}

// insulation is the insulation resistance with a test resistor in place.
func (d *device) insulation(t *truth) float64 {
	if d.earthTest <= 0 {
		return t.insulation
	}
	return t.insulation * d.earthTest / (t.insulation + d.earthTest)
}

// ready tells whether pulses may be released.
func (d *device) ready(r circuit.Reading) bool {
	return r.BypassReported && (d.fault == noFault || d.fault == faultEarth)
}
