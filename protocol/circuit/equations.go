package circuit

import "math"

// leakAtZero is the current at which a diode is fully on, in amperes: below it the leg's voltage runs from one diode's
// drop to the other's, so that a blocked leg is a very large resistance and no case of its own.
const leakAtZero = 1e-6

// leg is a leg's voltage against bus minus with its derivatives.
type leg struct {
	v, byCurrent, byStar, byBus, byIntegral, byLagged, byRamp float64
	into                                                      float64 // A from this leg into the bus, blocked bridge
	intoByCurrent                                             float64
	region                                                    int8
}

// diodes is the leg of a blocked bridge.
func (c *Circuit) diodes(choke Choke, i, bus float64) leg {
	d := c.p.Diode
	switch choke.Fault {
	case UpperShorted:
		return leg{v: bus + d.Resistance*i, byCurrent: d.Resistance, byBus: 1, into: i, intoByCurrent: 1, region: 4}
	case LowerShorted:
		return leg{v: d.Resistance * i, byCurrent: d.Resistance, region: 5}
	}
	switch {
	case i > leakAtZero:
		return leg{v: bus + d.Drop + d.Resistance*(i-leakAtZero), byCurrent: d.Resistance, byBus: 1, into: i,
			intoByCurrent: 1, region: 1}
	case i < -leakAtZero:
		return leg{v: -d.Drop + d.Resistance*(i+leakAtZero), byCurrent: d.Resistance, region: -1}
	}
	half, byBus := bus/2+d.Drop, 0.5
	if half < 1e-3 {
		half, byBus = 1e-3, 0
	}
	s := i / leakAtZero
	l := leg{v: bus/2 + s*half, byCurrent: half / leakAtZero, byBus: 0.5 + s*byBus}
	if i > 0 {
		l.into, l.intoByCurrent = i, 1
	}
	return l
}

// reference is the current that the regulator asks of all phases together, with its derivatives.
type reference struct {
	i, byStar, byBus, byIntegral, byLagged, byRamp float64
	// the integrator's derivative but for the bus current in current mode
	x, xByStar, xByBus, xByIntegral, xByLagged, xByRamp float64
	region                                              int8
}

// antiWindup is how fast the integrator follows a limit, 1/s.
const antiWindup = 100

// regulate is the voltage regulator with droop, or the power regulator of current mode, with its limits.
func (c *Circuit) regulate(t float64, y []float64) reference {
	b := &c.p.Bridge
	bus := math.Max(y[vBus], 1)
	var u, uBus, uLagged, uRamp float64
	var r reference
	if c.mode == VoltageMode {
		shift := b.SetpointShift
		if b.Hunting != 0 {
			shift += b.Hunting * math.Sin(2*math.Pi*b.HuntingRate*t)
		}
		e := y[ramp] + shift - c.droop*y[lagged] - y[vBus]
		u = b.VoltageGain*e + y[integral]
		uBus, uLagged, uRamp = -b.VoltageGain, -b.VoltageGain*c.droop, b.VoltageGain
		r.x, r.xByBus, r.xByLagged, r.xByRamp = b.IntegralGain*e, -b.IntegralGain, -b.IntegralGain*c.droop, b.IntegralGain
	} else {
		u = y[ramp]/bus + y[integral]
		uBus, uRamp = -y[ramp]/(bus*bus), 1/bus
		r.x, r.xByBus, r.xByRamp = b.CurrentTrim*y[ramp]/bus, b.CurrentTrim*uBus, b.CurrentTrim*uRamp
	}
	star, byStar := y[vStar], 1.0
	if star < b.LeastStar {
		star, byStar = b.LeastStar, 0
	}
	limited := math.Max(-b.BusReturn, math.Min(b.BusLimit, u))
	raw := limited * bus / star
	r.i = math.Max(-c.chargeLimit, math.Min(c.discharge, raw))
	switch {
	case r.i != raw: // limited on the source side
		r.region = 2
		r.x += antiWindup * (r.i*star/bus - u)
		r.xByStar += antiWindup * r.i * byStar / bus
		r.xByBus -= antiWindup * (r.i*star/(bus*bus) + uBus)
	case limited != u:
		r.region = 1
		r.byBus, r.byStar = limited/star, -limited*bus/(star*star)*byStar
		r.x += antiWindup * (limited - u)
		r.xByBus -= antiWindup * uBus
	default:
		k := bus / star
		r.byBus, r.byStar = limited/star+uBus*k, -limited*bus/(star*star)*byStar
		r.byIntegral, r.byLagged, r.byRamp = k, uLagged*k, uRamp*k
		return r
	}
	r.xByIntegral -= antiWindup
	r.xByLagged -= antiWindup * uLagged
	r.xByRamp -= antiWindup * uRamp
	return r
}

// bridge is the leg of a pulsing bridge: the voltage that makes the phase current follow its reference with CurrentLag,
// as far as the bus voltage allows.
func (c *Circuit) bridge(choke Choke, i float64, y []float64, ref reference) leg {
	d := c.p.Diode
	switch choke.Fault {
	case UpperShorted:
		return leg{v: y[vBus] + d.Resistance*i, byCurrent: d.Resistance, byBus: 1, region: 4}
	case LowerShorted:
		return leg{v: d.Resistance * i, byCurrent: d.Resistance, region: 5}
	}
	k := choke.Inductance / c.p.Bridge.CurrentLag
	share := k / float64(len(c.p.Chokes))
	v := y[vStar] - c.chokeResistance(choke)*i - share*ref.i + k*i
	switch low := c.p.Bridge.LeastDuty * y[vBus]; {
	case v > y[vBus]:
		return leg{v: y[vBus], byBus: 1, region: 2}
	case v < low:
		return leg{v: low, byBus: c.p.Bridge.LeastDuty, region: 3}
	}
	return leg{v: v, byCurrent: k - c.chokeResistance(choke), byStar: 1 - share*ref.byStar, byBus: -share * ref.byBus,
		byIntegral: -share * ref.byIntegral, byLagged: -share * ref.byLagged, byRamp: -share * ref.byRamp}
}

// openChoke is the resistance of a phase that is interrupted.
const openChoke = 1e7

func (c *Circuit) chokeResistance(choke Choke) float64 {
	if choke.Fault == Open {
		return openChoke
	}
	return choke.Resistance
}

// openSource is the resistance of the source's loop when it is interrupted.
const openSource = 1e11

// electromotive is the source's electromotive force and its slope over the charge drawn.
func (c *Circuit) electromotive(q float64) (v, slope float64) {
	points := c.p.Source.EMF
	if len(points) == 1 || q <= points[0].Drawn {
		return points[0].EMF, 0
	}
	for k := 1; k < len(points); k++ {
		a, b := points[k-1], points[k]
		if q <= b.Drawn {
			slope = (b.EMF - a.EMF) / (b.Drawn - a.Drawn)
			return a.EMF + slope*(q-a.Drawn), slope
		}
	}
	return points[len(points)-1].EMF, 0
}

// blockingDrop is the voltage across the source's blocking diode.
func (c *Circuit) blockingDrop(i float64) (v, byCurrent float64, region int8) {
	if !c.p.Source.BlockingDiode {
		return 0, 0, 0
	}
	const reverse = 1e9 // Ω
	if i > 0 {
		return c.p.Diode.Drop, 0, 1
	}
	if limit := -c.p.Diode.Drop / reverse; i < limit {
		return i * reverse, reverse, 2
	}
	return c.p.Diode.Drop + i*reverse, reverse, 3
}

// paths are the conductances between node A and star point.
func (c *Circuit) paths(y []float64) (precharge, byRise, bypass float64) {
	p := &c.p.Precharge
	precharge = c.precharge.conductance(p.Contactor, p.Resistor*(1+p.Drift*y[rise]))
	byRise = -precharge * precharge * p.Resistor * p.Drift
	return precharge, byRise, c.bypass.conductance(c.p.Bypass, 0)
}

// busLoads are the conductance across the bus and the constant power taken from it, as they are switched now.
func (c *Circuit) busLoads() (conductance, power float64) {
	b := &c.p.Bus
	conductance = b.Bleeder + b.Leakage + b.LeftOn + c.loadConductance
	if c.shorted {
		conductance += b.ShortConductance
	}
	if c.chopperOn {
		conductance += 1 / b.Chopper.Resistance
	}
	if c.loadOn {
		power += c.loadPower
	}
	if c.auxiliaryOn {
		power += b.Auxiliary.Power
	}
	if c.returned {
		power += b.ReturningLoad
	}
	return conductance, power
}

// hardJoint is the conductance of the isolated banks' switch after they have joined.
const hardJoint = 1e4

// busCurrent is what the bridge gives to the bus.
func (c *Circuit) busCurrent(y []float64) float64 {
	sum := 0.0
	if !c.released {
		for k, choke := range c.p.Chokes {
			sum += c.diodes(choke, y[firstPhase+k], y[vBus]).into
		}
		return sum
	}
	ref := c.regulate(c.time, y)
	for k, choke := range c.p.Chokes {
		i := y[firstPhase+k]
		sum += c.bridge(choke, i, y, ref).v * i
	}
	return c.efficiency(sum) * sum / math.Max(y[vBus], 1)
}

func (c *Circuit) efficiency(legPower float64) float64 {
	if legPower >= 0 {
		return c.p.Bridge.Efficiency
	}
	return 1 / c.p.Bridge.Efficiency
}

// evaluate gives f of M·y' = f(y) and, when j is not nil, adds its derivatives to j. The result identifies the linear
// region of every diode, limit and clamp that y lies in.
func (c *Circuit) evaluate(t float64, y, f []float64, j *matrix) (region uint64) {
	p := &c.p
	mix := func(r int8) { region = region*31 + uint64(r+2) }
	add := func(row, column int, v float64) {
		if j != nil {
			j.add(row, column, v)
		}
	}

	emf, slope := c.electromotive(y[drawn])
	loop := p.Source.Resistance
	if !c.isolator.main || c.fuseOpen || c.sourceOpen {
		loop = openSource
	}
	drop, dropSlope, blocking := c.blockingDrop(y[iSource])
	mix(blocking)
	f[iSource] = emf - loop*y[iSource] - drop - y[vNode]
	add(iSource, iSource, -loop-dropSlope)
	add(iSource, vNode, -1)
	add(iSource, drawn, slope)

	pre, preByRise, bypass := c.paths(y)
	across := y[vNode] - y[vStar]
	through, g := (pre+bypass)*across, pre+bypass
	f[vNode] = y[iSource] - through - p.Bus.Leakage*y[vNode]
	add(vNode, iSource, 1)
	add(vNode, vNode, -g-p.Bus.Leakage)
	add(vNode, vStar, g)
	add(vNode, rise, -preByRise*across)
	f[vStar] = through - p.Bus.Leakage*y[vStar]
	add(vStar, vNode, g)
	add(vStar, vStar, -g-p.Bus.Leakage)
	add(vStar, rise, preByRise*across)

	if p.Filter == nil {
		f[iFilter], f[vFilter] = -y[iFilter], 0
		add(iFilter, iFilter, -1)
	} else {
		node := vStar
		if p.Filter.AtSource {
			node = vNode
		}
		f[node] -= y[iFilter]
		add(node, iFilter, -1)
		f[iFilter] = y[node] - p.Filter.Resistance*y[iFilter] - y[vFilter]
		add(iFilter, node, 1)
		add(iFilter, iFilter, -p.Filter.Resistance)
		add(iFilter, vFilter, -1)
		f[vFilter] = y[iFilter]
		add(vFilter, iFilter, 1)
	}

	current := pre * across
	resistor := p.Precharge.Resistor * (1 + p.Precharge.Drift*y[rise])
	if p.Precharge.ThermalCapacity > 0 {
		f[rise] = resistor*current*current - y[rise]/p.Precharge.ThermalResistance
		add(rise, vNode, 2*resistor*current*pre)
		add(rise, vStar, -2*resistor*current*pre)
		add(rise, rise, -1/p.Precharge.ThermalResistance)
	} else {
		f[rise] = -y[rise]
		add(rise, rise, -1)
	}
	f[drawn] = y[iSource]
	add(drawn, iSource, 1)

	conductance, power := c.busLoads()
	bus := math.Max(y[vBus], 1)
	f[vBus] = -conductance*y[vBus] - power/bus
	add(vBus, vBus, -conductance)
	if y[vBus] > 1 {
		add(vBus, vBus, power/(bus*bus))
	}
	f[vBanks] = 0
	if c.joined && p.Bus.Isolated > 0 {
		joint := 1 / p.Bus.JoiningResistor
		if c.joinedHard {
			joint = hardJoint
		}
		i := joint * (y[vBus] - y[vBanks])
		f[vBus] -= i
		f[vBanks] = i
		add(vBus, vBus, -joint)
		add(vBus, vBanks, joint)
		add(vBanks, vBus, joint)
		add(vBanks, vBanks, -joint)
	}
	for k, in := range p.Infeeds {
		at := c.infeedPlace(k)
		target, byBus := 0.0, 0.0
		if c.infeedOn[k] {
			free := (in.Setpoint - y[vBus]) / in.Resistance
			target = math.Max(-in.Return, math.Min(in.Limit, free))
			if target == free {
				byBus = -1 / in.Resistance
				mix(1)
			} else {
				mix(2)
			}
		}
		f[at] = target - y[at]
		add(at, at, -1)
		add(at, vBus, byBus)
		f[vBus] += y[at]
		add(vBus, at, 1)
	}

	if !c.released {
		f[integral], f[ramp] = 0, 0
		f[lagged] = -y[lagged] / p.Bridge.DroopLag
		add(lagged, lagged, -1/p.Bridge.DroopLag)
		for k, choke := range p.Chokes {
			at := firstPhase + k
			l := c.diodes(choke, y[at], y[vBus])
			mix(l.region)
			c.phase(at, choke, l, y, f, add)
			f[vBus] += l.into
			add(vBus, at, l.intoByCurrent)
		}
		return region
	}

	ref := c.regulate(t, y)
	mix(ref.region)
	var sum leg // of leg power
	legs := [8]leg{}
	for k, choke := range p.Chokes {
		at := firstPhase + k
		l := c.bridge(choke, y[at], y, ref)
		legs[k%len(legs)] = l
		mix(l.region)
		c.phase(at, choke, l, y, f, add)
		i := y[at]
		sum.v += l.v * i
		sum.byStar += l.byStar * i
		sum.byBus += l.byBus * i
		sum.byIntegral += l.byIntegral * i
		sum.byLagged += l.byLagged * i
		sum.byRamp += l.byRamp * i
	}
	eta := c.efficiency(sum.v)
	if sum.v >= 0 {
		mix(1)
	} else {
		mix(2)
	}
	k := eta / bus
	out := k * sum.v
	outByBus := k * sum.byBus
	if y[vBus] > 1 {
		outByBus -= out / bus
	}
	stamp := func(row int, w float64) {
		f[row] += w * out
		add(row, vBus, w*outByBus)
		add(row, vStar, w*k*sum.byStar)
		add(row, integral, w*k*sum.byIntegral)
		add(row, lagged, w*k*sum.byLagged)
		add(row, ramp, w*k*sum.byRamp)
		for n := range p.Chokes {
			l := legs[n%len(legs)]
			add(row, firstPhase+n, w*k*(l.v+l.byCurrent*y[firstPhase+n]))
		}
	}
	stamp(vBus, 1)
	f[lagged] = -y[lagged] / p.Bridge.DroopLag
	add(lagged, lagged, -1/p.Bridge.DroopLag)
	stamp(lagged, 1/p.Bridge.DroopLag)

	f[integral] = ref.x
	add(integral, vStar, ref.xByStar)
	add(integral, vBus, ref.xByBus)
	add(integral, integral, ref.xByIntegral)
	add(integral, lagged, ref.xByLagged)
	add(integral, ramp, ref.xByRamp)
	if c.mode == CurrentMode {
		stamp(integral, -p.Bridge.CurrentTrim)
	}

	target, rate := c.setpoint, p.Bridge.VoltageRamp
	if c.mode == CurrentMode {
		target, rate = c.power, p.Bridge.PowerRamp
	}
	free := (target - y[ramp]) / rampLag
	f[ramp] = math.Max(-rate, math.Min(rate, free))
	if f[ramp] == free {
		add(ramp, ramp, -1/rampLag)
		mix(1)
	} else {
		mix(2)
	}
	return region
}

// rampLag rounds the end of a ramp, in seconds.
const rampLag = 0.02

// phase is Kirchhoff's voltage law from star point to leg, and the phase's part at the star point.
func (c *Circuit) phase(at int, choke Choke, l leg, y, f []float64, add func(int, int, float64)) {
	r := c.chokeResistance(choke)
	f[at] = y[vStar] - r*y[at] - l.v
	add(at, vStar, 1-l.byStar)
	add(at, at, -r-l.byCurrent)
	add(at, vBus, -l.byBus)
	add(at, integral, -l.byIntegral)
	add(at, lagged, -l.byLagged)
	add(at, ramp, -l.byRamp)
	f[vStar] -= y[at]
	add(vStar, at, -1)
}
