package circuit

import "math"

// nextEvent is when a contact moves or a time runs out.
func (c *Circuit) nextEvent() float64 {
	t := math.Min(math.Min(c.isolator.next(), c.precharge.next()), c.bypass.next())
	return math.Min(t, c.timeout())
}

// timeout is when the pre-charge has lasted too long without a report that the bypass has closed.
func (c *Circuit) timeout() float64 {
	if c.p.Precharge.Timeout <= 0 || !c.precharge.main || !c.precharge.commanded || c.bypassReport() {
		return never
	}
	return c.prechargeSince + c.p.Precharge.Timeout
}

// arrive does what is due.
func (c *Circuit) arrive() {
	if c.timeout() <= c.time {
		c.Precharge(false)
		c.block(PrechargeTimeout)
	}
	moved := c.isolator.arrive(c.isolatorContact(), c.time)
	if c.precharge.arrive(c.p.Precharge.Contactor, c.time) {
		moved = true
		if c.precharge.main {
			c.prechargeSince = c.time
		}
	}
	if c.bypass.arrive(c.p.Bypass, c.time) {
		moved = true
	}
	c.checkReport()
	if moved {
		c.changed()
	}
}

// threshold is a value of the bus voltage at which something switches.
type threshold struct {
	at     float64
	rising bool
	apply  func(*Circuit)
}

// crossing is the first threshold between two bus voltages, nil for none.
func (c *Circuit) crossing(from, to float64) *threshold {
	var first *threshold
	check := func(active, rising bool, at float64, apply func(*Circuit)) {
		if !active || at <= 0 || rising && (to < at) || !rising && (to > at) {
			return
		}
		if first == nil || math.Abs(at-from) < math.Abs(first.at-from) {
			first = &threshold{at, rising, apply}
		}
	}
	b, p := &c.p.Bus, &c.p.Protection
	if a := b.Auxiliary; a != nil {
		check(!c.auxiliaryOn, true, a.StartsAt, func(c *Circuit) { c.auxiliaryOn = true })
		check(c.auxiliaryOn, false, a.StopsAt, func(c *Circuit) { c.auxiliaryOn = false })
	}
	if h := b.Chopper; h != nil {
		check(!c.chopperOn, true, h.On, func(c *Circuit) { c.chopperOn = true })
		check(c.chopperOn, false, h.Off, func(c *Circuit) { c.chopperOn = false })
	}
	check(c.loadOn && c.loadPower > 0, false, b.LoadDropsAt, func(c *Circuit) { c.loadOn = false })
	check(!c.returned && b.ReturningLoad != 0, true, b.ReturnsAt, func(c *Circuit) { c.returned = true })
	check(c.returned, false, b.ReturnsAt/2, func(c *Circuit) { c.returned = false })
	check(!c.shorted && b.ShortConductance > 0, true, b.ShortsAt, func(c *Circuit) { c.shorted = true })
	check(c.released && !c.armed, true, p.UnderVoltage, func(c *Circuit) { c.armed = true })
	check(c.released && c.armed, false, p.UnderVoltage, func(c *Circuit) { c.block(UnderVoltageTrip) })
	check(c.released, true, p.OverVoltage, func(c *Circuit) { c.block(OverVoltageTrip) })
	return first
}

// locate shortens the step h, over which the bus voltage crosses a threshold, until it ends on the threshold.
func (c *Circuit) locate(h float64, at threshold) float64 {
	const near = 1e-5 // V
	low, high := 0.0, h
	vLow, vHigh := c.y[vBus]-at.at, c.step.stage[2][vBus]-at.at
	if vLow == 0 || at.rising == (vLow > 0) {
		return h // it lay beyond from the start: a changed setting
	}
	for round := 0; round < 40 && math.Abs(vHigh) > near && high-low > smallestStep; round++ {
		middle := low + (high-low)*math.Max(0.02, math.Min(0.98, vLow/(vLow-vHigh)))
		if round%4 == 3 {
			middle = (low + high) / 2
		}
		if _, solved := c.try(middle); !solved {
			break
		}
		v := c.step.stage[2][vBus] - at.at
		if (v > 0) == at.rising || v == 0 {
			high, vHigh = middle, v
		} else {
			low, vLow = middle, v
		}
	}
	c.try(high)
	return high
}
