package walk

import (
	"chargehand/commission/capture"
	"chargehand/commission/signal"
)

func chargePoints(n numbers) []Point {
	bus, source := string(signal.BusVoltage), string(signal.SourceVoltage)
	return []Point{
		{ID: "charge.source", Kind: Hold, By: []By{Live, Instrument}, Title: "Voltage at the open bypass",
			Caution:   "Live from here. Negative: the source is reversed, open the isolator, go no further. The bus follows: a contactor is closed or welded.",
			Do:        "Isolator closed, pre-charge and bypass open. Measure the source at the open bypass, polarity first. Take the live readings.",
			Expect:    "Positive, {window.source-low:low} … {window.source-high:high}, signal and instrument within {key:source.measurement_error}; the bus stays below {key:touch_safe.voltage} and does not creep.",
			Otherwise: "open the isolator; find the cause", Basis: "window.source-low, window.source-high",
			Signals: []signal.Name{signal.SourceVoltage, signal.BusVoltage}, Proves: []signal.Name{signal.SourceVoltage, signal.BusVoltage},
			Hand: []HandReading{{source, "V"}},
			Accept: []Criterion{within(source, "V", n.corner("window.source-low", "low"), n.corner("window.source-high", "high"),
				"window.source-low, window.source-high")}},
		{ID: "charge.bus-state", Kind: Hold, By: []By{Live, Observation}, Title: "Bus dead, still charged or live",
			Caution:   "A live bus: charge.live-bus stands in for charge.rise, charge.curve and charge.difference. 'Welded' is only said after the bus has been seen to fall.",
			Do:        "Decide and enter which it is. Still charged falls with the bleeders' time constant; live stands still or has an infeed's voltage. Loads off, isolated banks off, infeeds open.",
			Expect:    "Decided.",
			Otherwise: "wait until it can be decided", Basis: "circuit of the bus", Unproved: true,
			Signals: []signal.Name{signal.BusVoltage, signal.StarPointVoltage}},
		{ID: "charge.insulation", Kind: Check, By: []By{Live, Observation}, Title: "Insulation with the source on",
			Do:        "Read the insulation with the source connected; press the monitor's own test. Again with the bypass closed.",
			Expect:    "No alarm; the test alarms.",
			Otherwise: "find the first earth fault before there is a second", Basis: "IEC 61557-8", MayOmit: true, Unproved: true,
			Signals: []signal.Name{signal.InsulationResistance}},
		{ID: "charge.clear", Kind: Hold, By: []By{Observation}, Title: "Clear to charge",
			Caution:   "{precharge.energy} goes into the resistor and as much stands on the bus. Nobody inside the boundary.",
			Do:        "Prediction drawn, resistor cold or cooled, attempt counted (of {key:precharge.attempts}, every {key:precharge.interval}), abort hand ready.",
			Expect:    "Everybody has answered.",
			Otherwise: "attempts used up or cooling not over: wait, or a reason in the log", Basis: "precharge.repeat, precharge.wait"},
		{ID: "charge.rise", Kind: Hold, By: []By{Live}, Title: "First rise",
			Caution:   "No rise: open at once. A shorted bus draws the same current as a good charge; the resistor stands it for {precharge.shorted-bus}. A hand is a slow abort.",
			Do:        "Arm the capture, then have the pre-charge closed, with the bypass locked out where the plant can.",
			Expect:    "At 0.3 time constants at least half of the predicted rise.",
			Otherwise: "the cause is known before any second attempt", Basis: "formulas of the pre-charge circuit", Unproved: true,
			Signals: []signal.Name{signal.BusVoltage}, Capture: capture.Precharge, Attempt: true, MayOmit: true, OmitWhen: BusLive,
			Accept: []Criterion{within("rise", "1", number(1), nil, "half of the predicted rise at 0.3 time constants")}},
		{ID: "charge.difference", Kind: Witness, By: []By{Live, Instrument}, Title: "Settled difference",
			Caution:   "Live work: the leads were put on dead.",
			Do:        "While the charge has settled and the bypass is open: measure bus and difference across the open bypass with the instrument; take the live readings. This proves the bus voltage's signal.",
			Expect:    "Below {key:precharge.closing_difference} less both measuring errors.",
			Otherwise: "larger: load on, bleeder, sensor; see the causes at charge.curve", Basis: "precharge.stall",
			Signals: []signal.Name{signal.BusVoltage, signal.SourceVoltage, signal.StarPointVoltage}, Proves: []signal.Name{signal.BusVoltage, signal.StarPointVoltage},
			Hand:    []HandReading{{bus, "V"}, {"difference across the bypass", "V"}},
			Accept:  []Criterion{within("difference across the bypass", "V", nil, n.closingLimit(), "precharge.closing_difference less both errors")},
			MayOmit: true, OmitWhen: BusLive},
		{ID: "charge.curve", Kind: Witness, By: []By{Live}, Title: "Time constant and final voltage",
			Do:        "Compare the measured curve with the band.",
			Expect:    "Time constant {precharge.time-constant:low} … {precharge.time-constant:high}, final voltage in the predicted band.",
			Otherwise: "look into the ranked causes; enter the one that is found", Basis: "precharge.time-constant, precharge.final-voltage",
			Signals: []signal.Name{signal.BusVoltage}, Findings: []string{"measured.precharge"}, MayOmit: true, OmitWhen: BusLive},
		{ID: "charge.live-bus", Kind: Hold, By: []By{Live, Instrument}, Title: "Closing on a live bus",
			Caution:   "Source below bus is no proof of a charged filter capacitor: closing at once makes {closing.without-precharge}. Star point at bus voltage: an upper switch is shorted, go no further.",
			Do:        "Where the bus can be live: the pre-charge stays in for at least {closing.live-bus}; measure star point against source across the open bypass before it closes. Not applicable where the bus cannot be live yet: say why.",
			Expect:    "Difference below {key:precharge.closing_difference}; no current after closing.",
			Otherwise: "do not close", Basis: "closing.live-bus", MayOmit: true, OmitWhen: BusDead,
			Signals: []signal.Name{signal.StarPointVoltage, signal.SourceVoltage}, Proves: []signal.Name{signal.StarPointVoltage, signal.SourceVoltage},
			Hand:   []HandReading{{"difference across the bypass", "V"}},
			Accept: []Criterion{within("difference across the bypass", "V", nil, n.closingLimit(), "precharge.closing_difference less both errors")}},
		{ID: "charge.close", Kind: Hold, By: []By{Live}, Title: "Bypass closes",
			Caution:   "A step larger than foretold, or an early closing: do not open under current; stop, inspect the contacts.",
			Do:        "Have the bypass closed. Command, auxiliary contact and voltage across the contact are three facts.",
			Expect:    "Step at most {key:precharge.closing_difference} and both errors; the bus ends at the source or a little above ({closing.overshoot}).",
			Otherwise: "stop, inspect the contacts", Basis: "closing.inrush, closing.overshoot",
			Signals: []signal.Name{signal.BypassClosed, signal.BusVoltage, signal.SourceVoltage}, Findings: []string{"measured.closing"}},
		{ID: "charge.after", Kind: Check, By: []By{Live}, Title: "Resistor free of current",
			Do:        "Take the live readings with the bypass closed.",
			Expect:    "Pre-charge contactor open again; difference across the bypass zero.",
			Otherwise: "a resistor that stays warm carries current", Basis: "circuit", Unproved: true,
			Signals: []signal.Name{signal.PrechargeClosed, signal.BypassClosed, signal.BusVoltage, signal.SourceVoltage, signal.ResistorTemperature},
			Accept:  []Criterion{within(string(signal.PrechargeClosed), "", nil, number(0), "circuit"), within(string(signal.BypassClosed), "", number(1), nil, "circuit")}},
	}
}

// closingLimit is the greatest settled difference: closing_difference less both measuring errors.
func (n numbers) closingLimit() *float64 {
	s := n.site
	if !s.Precharge.ClosingDifference.IsGiven() {
		return nil
	}
	return number(float64(s.Precharge.ClosingDifference.Nominal - s.Source.Error() - s.Bus.Error()))
}

func number(v float64) *float64 { return &v }

func restPoints(n numbers) []Point {
	bus, source := string(signal.BusVoltage), string(signal.SourceVoltage)
	return []Point{
		{ID: "rest.sensors", Kind: Witness, By: []By{Live, Instrument}, Title: "Both sensors against one instrument",
			Caution:   "Live reading: rated instrument, second person, leads on dead.",
			Do:        "At rest, bypass closed: measure source and bus with the same instrument; take the live readings.",
			Expect:    "Source within {key:source.measurement_error}, bus within {key:bus.measurement_error}, both equal.",
			Otherwise: "correct the sensor or its scaling, then repeat what rests on it", Basis: "source.measurement_error, bus.measurement_error",
			Signals: []signal.Name{signal.SourceVoltage, signal.BusVoltage}, Proves: []signal.Name{signal.SourceVoltage, signal.BusVoltage},
			Hand: []HandReading{{source, "V"}, {bus, "V"}}, Findings: []string{"measured.sensor"},
			Reopens: []string{"boost.setpoint", "share.droop", "share.share", "power.accuracy"}},
		{ID: "rest.margin", Kind: Witness, By: []By{Live}, Title: "Margin at rest",
			Do:        "Take the rest voltage now and at the top of the window against the lowest bus any infeed may hold.",
			Expect:    "Margin at least {window.margin} on paper; source below the under-voltage trip {key:bus.under_voltage_trip}.",
			Otherwise: "margin gone: the diodes conduct, blocking pulses stops nothing", Basis: "window.margin, window.thresholds",
			Signals: []signal.Name{signal.SourceVoltage}, Findings: []string{"measured.window", "window.margin", "window.thresholds"}},
		{ID: "rest.limits", Kind: Check, By: []By{Live, Document}, Title: "Limits of the battery manager",
			Do:        "Read the charge and discharge limits that the battery manager gives now.",
			Expect:    "At least {key:source.max_charge_current} and {key:source.max_discharge_current}, or the reason.",
			Otherwise: "full source: regeneration has nowhere to go but the chopper", Basis: "source limits", Unproved: true, MayOmit: true,
			Signals: []signal.Name{signal.ChargeLimit, signal.DischargeLimit}},
	}
}

func boostPoints(n numbers) []Point {
	bus, current := string(signal.BusVoltage), string(signal.BusCurrent)
	return []Point{
		{ID: "boost.clear", Kind: Check, By: []By{Observation}, Title: "Turned down for the first run",
			Do:        "Turn current and power limits down for the first run and note them for leave.settings. Loads off; abort hand ready.",
			Expect:    "Limits noted.",
			Otherwise: "no first boost at full limits", Basis: "common practice", Reopens: []string{"leave.settings"}},
		{ID: "boost.first", Kind: Hold, By: []By{Live}, Title: "First boost",
			Caution:   "First energy from the bridge: nobody near open doors. Hunting or noise: block, look at chokes, phase order, gains.",
			Do:        "Have the pulses released at no load; take the live readings when it has settled.",
			Expect:    "The bus rises smoothly to {key:infeed.setpoint}, no trip, stays below {key:chopper.on}; source current near zero after.",
			Otherwise: "block the pulses", Basis: "window.bus-low, window.bus-high",
			Signals: []signal.Name{signal.BusVoltage, signal.Running, signal.Fault},
			Accept: []Criterion{within(bus, "V", n.corner("window.bus-low", "low"), n.corner("window.bus-high", "high"),
				"window.bus-low, window.bus-high"), within(string(signal.Fault), "", nil, number(0), "no trip")}},
		{ID: "boost.setpoint", Kind: Witness, By: []By{Live, Instrument}, Title: "No-load setpoint",
			Caution:   "Live reading: rated instrument, leads on dead.",
			Do:        "Measure the bus at no load; take the live readings.",
			Expect:    "{key:infeed.setpoint} within {key:infeed.setpoint_error} and the guard band.",
			Otherwise: "correct the setpoint, then share.keyed", Basis: "infeed.setpoint",
			Signals: []signal.Name{signal.BusVoltage, signal.VoltageSetpoint}, Hand: []HandReading{{bus, "V"}}, Findings: []string{"measured.setpoint"}},
		{ID: "boost.ripple", Kind: Check, By: []By{Observation}, Title: "Ripple by oscilloscope",
			Caution:   "Differential probe rated for the bus; no earthed probe clip on either pole. Flat top or spike: saturation.",
			Do:        "Look at the phase currents, the source current and the bus. Enter what is seen.",
			Expect:    "Phase currents alike, choke ripple at most {ripple.phase} peak to peak, source at most {key:source.max_ripple_current} rms, bus at most {key:bus.ripple}; nothing grows near {ripple.resonance}.",
			Otherwise: "block; look at chokes and filter", Basis: "ripple.phase, ripple.source, ripple.resonance", MayOmit: true},
		{ID: "boost.step", Kind: Check, By: []By{Live, Instrument}, Title: "Small load step",
			Caution:   "The clamp meter goes around an insulated conductor only.",
			Do:        "Apply a small load; read the converter's bus current with a clamp meter and take the live readings: this proves the current's signal. Take the load off.",
			Expect:    "The dip stays above {window.source-high}, the rise below {key:chopper.on}.",
			Otherwise: "look at gains and bus capacitance", Basis: "window.source-high, chopper",
			Signals: []signal.Name{signal.BusVoltage, signal.BusCurrent}, Proves: []signal.Name{signal.BusCurrent},
			Hand:   []HandReading{{current, "A"}},
			Accept: []Criterion{within(bus, "V", n.corner("window.source-high", "high"), n.chopperOn(), "window.source-high, bus.chopper.on")}},
	}
}

func (n numbers) chopperOn() *float64 {
	if c := n.site.Bus.Chopper; c != nil {
		return known(c.On, c.On.Nominal)
	}
	return known(n.site.Bus.OverVoltageTrip, n.site.Bus.OverVoltageTrip.Nominal)
}

func sharePoints(n numbers) []Point {
	return []Point{
		{ID: "share.couple", Kind: Hold, By: []By{Observation}, Title: "Joining another infeed",
			Caution:   "Two charged buses with a difference are a closing of their own.",
			Do:        "Before another section or infeed is joined: measure polarity and difference across the open tie; the insulation monitors have settled. Enter what was measured.",
			Expect:    "Same polarity, difference small enough for the tie.",
			Otherwise: "do not join", Basis: "common practice", MayOmit: true},
		{ID: "share.stairs", Kind: Witness, By: []By{Live}, Title: "Load stairs",
			Caution:   "The load changes in steps: whoever stands at it knows.",
			Do:        "Arm the capture. At least four load steps up and down, each settled, none at a limit. Stop the capture.",
			Expect:    "Four or more settled steps.",
			Otherwise: "add steps until the line can be judged", Basis: "droop.bus-range",
			Signals: []signal.Name{signal.BusVoltage, signal.BusCurrent}, Capture: capture.Droop,
			Accept: []Criterion{within("settled steps", "1", number(4), nil, "at least four load steps")}},
		{ID: "share.droop", Kind: Witness, By: []By{Live}, Title: "Slope and no-load value",
			Do:        "Compare the fitted line with the setting.",
			Expect:    "Droop {key:infeed.droop} and no-load voltage {key:infeed.setpoint}, with guard band; the cable's share is told apart.",
			Otherwise: "key the value that the finding names, then repeat the stairs", Basis: "droop.bus-range, cable.drop",
			Signals: []signal.Name{signal.BusVoltage, signal.BusCurrent}, Findings: []string{"measured.droop"}},
		{ID: "share.share", Kind: Witness, By: []By{Live}, Title: "Share of each infeed",
			Do:        "Compare each infeed's part by rating at every step.",
			Expect:    "Within {key:load.share_tolerance}; the finding says whether the instruments can prove it.",
			Otherwise: "move the setpoint that the finding names", Basis: "droop.share, droop.instrument", MayOmit: true,
			Signals: []signal.Name{signal.BusCurrent}, Findings: []string{"measured.share"}},
		{ID: "share.keyed", Kind: Witness, By: []By{Live, Observation}, Title: "New settings keyed and read back",
			Do:        "Whoever the owner authorises keys a new setpoint and droop with the plant's own controls; read them back here. Enter who and what, or that nothing was changed.",
			Expect:    "Read back as keyed; as-found kept.",
			Otherwise: "key again", Basis: "droop.registers", Unproved: true,
			Signals: []signal.Name{signal.VoltageSetpoint, signal.DroopSetting}, Accept: n.keyed(),
			Reopens: []string{"boost.setpoint", "rest.margin", "share.stairs", "share.droop", "share.share", "share.lost", "share.regeneration", "trip.voltage"}},
		{ID: "share.lost", Kind: Witness, By: []By{Live}, Title: "Loss of an infeed",
			Caution:   "With the owner's consent: it may black out the bus.",
			Do:        "At an agreed load each infeed is tripped in turn; take the live readings after each.",
			Expect:    "Bus inside its thresholds, nobody at a limit ({droop.lost-infeed:low} at the least).",
			Otherwise: "less load, or more droop headroom", Basis: "droop.lost-infeed", MayOmit: true,
			Signals: []signal.Name{signal.BusVoltage, signal.BusCurrent},
			Accept: []Criterion{within(string(signal.BusVoltage), "V", known(n.site.Bus.UnderVoltageTrip, n.site.Bus.UnderVoltageTrip.Nominal), n.chopperOn(),
				"bus.under_voltage_trip, bus.chopper.on")}},
		{ID: "share.regeneration", Kind: Witness, By: []By{Live}, Title: "Power back into the bus",
			Caution:   "With nobody to take it the bus runs up in milliseconds.",
			Do:        "Have power fed back into the bus; take the live readings. Once with the source refusing charge, where a chopper is to hold the bus.",
			Expect:    "Absorbed; bus at most {droop.regeneration}, below {key:chopper.on}.",
			Otherwise: "limit the regeneration", Basis: "droop.regeneration", MayOmit: true,
			Signals: []signal.Name{signal.BusVoltage, signal.BusCurrent},
			Accept:  []Criterion{within(string(signal.BusVoltage), "V", nil, n.chopperOn(), "bus.chopper.on")}},
	}
}

func powerPoints(n numbers) []Point {
	current := string(signal.SourceCurrent)
	return []Point{
		{ID: "power.keyed", Kind: Check, By: []By{Live, Observation}, Title: "Power reference keyed",
			Caution:   "The source's current follows at once.",
			Do:        "Whoever operates the plant goes over to current mode with the smallest power from source to bus. Take the live readings; enter the reference as the device's own display shows it.",
			Expect:    "Display and signal agree, and are not zero.",
			Otherwise: "correct the map line that `chargehand link` names", Basis: "common practice", Unproved: true,
			Signals: []signal.Name{signal.PowerReference}, Proves: []signal.Name{signal.PowerReference}},
		{ID: "power.sign", Kind: Hold, By: []By{Live, Instrument}, Title: "Direction of power",
			Caution:   "A wrong sign turns charging into discharging: stop.",
			Do:        "Smallest power setpoint from source to bus; read the source current with a clamp meter, plus towards the bus, and take the live readings; then the other way.",
			Expect:    "Signal, clamp meter and battery manager agree on the direction in words.",
			Otherwise: "stop; correct sign_reversed in the map or the wiring of the sensor", Basis: "design of the plant",
			Signals: []signal.Name{signal.SourceCurrent, signal.Power, signal.BusVoltage, signal.BusCurrent},
			Proves:  []signal.Name{signal.SourceCurrent, signal.Power},
			Hand:    []HandReading{{current, "A"}}, Unproved: true},
		{ID: "power.accuracy", Kind: Witness, By: []By{Live}, Title: "Power and current against the setpoint",
			Do:        "Three levels each way; take the live readings at each.",
			Expect:    "Power as set; losses plausible against {key:converter.efficiency}.",
			Otherwise: "look at sensors and calibration", Basis: "converter.efficiency", MayOmit: true,
			Signals:  []signal.Name{signal.Power, signal.SourceCurrent, signal.SourceVoltage, signal.PowerReference, signal.BusVoltage, signal.BusCurrent},
			Findings: []string{"measured.current-mode"}},
		{ID: "power.window", Kind: Witness, By: []By{Live}, Title: "Source under current",
			Do:        "Take source voltage and current at the highest level allowed today.",
			Expect:    "Terminal voltage inside {window.source-low:low} … {window.source-high:high}; current at the bottom of the window {window.current}.",
			Otherwise: "internal resistance differs: change the site file", Basis: "window.source-low, window.current",
			Signals: []signal.Name{signal.SourceVoltage, signal.SourceCurrent},
			Accept: []Criterion{within(string(signal.SourceVoltage), "V", n.corner("window.source-low", "low"), n.corner("window.source-high", "high"),
				"window.source-low, window.source-high")}},
		{ID: "power.limits", Kind: Witness, By: []By{Live, Observation}, Title: "Limits hold both ways",
			Do:        "Ask for more than the limits of converter and battery manager, both ways; enter what was seen, ramp included.",
			Expect:    "The limits hold; the ramp is as set.",
			Otherwise: "block; correct the limits", Basis: "source limits", Unproved: true, MayOmit: true,
			Signals: []signal.Name{signal.SourceCurrent, signal.ChargeLimit, signal.DischargeLimit}},
		{ID: "power.heat", Kind: Check, By: []By{Observation}, Title: "After the soak",
			Do:        "After the agreed soak: chokes, bridge, joints by thermal camera, and the pre-charge resistor.",
			Expect:    "Within the makers' limits; the resistor at room temperature.",
			Otherwise: "a warm resistor: the bypass does not carry", Basis: "makers' data", MayOmit: true},
	}
}

func tripPoints(n numbers) []Point {
	trip := func(id, title string, findings []string, caution, do, expect, basis string, signals ...signal.Name) Point {
		return Point{ID: id, Kind: Witness, By: []By{Live, Observation}, Title: title, Caution: caution,
			Do: "Arm the capture, then: " + do + " Enter what was seen; where the map lacks the signals, the response time by stopwatch.", Expect: expect,
			Otherwise: "a trip that does not act forbids operation: correct it, then repeat", Basis: basis, Unproved: true, MayOmit: true,
			Signals: signals, Capture: capture.Step, Findings: findings, Reopens: []string{"leave.settings"}}
	}
	// The contactors stay closed up to the emergency stop; the time-out then needs them open anyway.
	return []Point{
		trip("trip.earth", "Earth fault alarm", tripFindings(EarthFault),
			"Test resistor rated for the bus voltage.",
			"test resistor or test button on each pole.", "Alarm at the set value, the right pole.",
			"IEC 61557-8", signal.InsulationResistance, signal.Fault),
		trip("trip.voltage", "Over- and under-voltage", tripFindings(OverVoltage, UnderVoltage),
			"Move the threshold, not the bus; note the change for leave.settings.",
			"move the over-voltage threshold to the bus; then, with a capture of its own, the under-voltage threshold. Put both back and read them back.",
			"Chopper {key:chopper.on} before over-voltage {key:bus.over_voltage_trip}; under-voltage {key:bus.under_voltage_trip}.",
			"window.thresholds", signal.BusVoltage, signal.ChopperActive, signal.Fault, signal.FaultCode),
		trip("trip.source", "Battery manager withdraws", tripFindings(SourceWithdrawn),
			"At small power only.",
			"have the battery manager withdraw its permission.", "Power to zero before its contactor opens.",
			"maker's data of the source", signal.SourceCurrent, signal.Running, signal.BypassClosed),
		trip("trip.bypass-lost", "Bypass report lost", tripFindings(BypassLost),
			"At small power only.",
			"take the bypass report away.", "Pulses blocked at once; the resistor is not loaded.",
			"circuit diagrams of the plant", signal.Running, signal.BypassClosed, signal.ResistorTemperature),
		{ID: "trip.control-loss", Kind: Check, By: []By{Observation}, Title: "Control link and supply lost",
			Caution:   "One at a time, at small power.",
			Do:        "Take the control link away, then the control supply. Enter what was seen.",
			Expect:    "Safe state; no bypass opening under current.",
			Otherwise: "a loss that is not safe forbids operation", Basis: "circuit diagrams of the plant", MayOmit: true},
		trip("trip.stop", "Emergency stop, live", tripFindings(EmergencyStop),
			"Full-load opening only if the contactor's DC breaking rating allows it.",
			"press the emergency stop at small power.", "Pulses, then contactors; state shown; no restart on reset.",
			"IEC 60204-1, 9.2", signal.Running, signal.BypassClosed, signal.BusVoltage),
		trip("trip.time-out", "Pre-charge time-out", tripFindings(TimeOut),
			"On a healthy bus only, never provoked with a short. It counts as an attempt.",
			"withhold the bypass and close the pre-charge.", "The pre-charge opens within {key:precharge.timeout}.",
			"precharge.timeout", signal.PrechargeClosed, signal.Fault, signal.FaultCode).asAttempt(),
	}
}

// asAttempt makes a point's capture count as a pre-charge attempt.
func (p Point) asAttempt() Point {
	p.Attempt = true
	return p
}

func downPoints(n numbers) []Point {
	return []Point{
		{ID: "down.order", Kind: Check, By: []By{Live, Observation}, Title: "Order of shut-down",
			Caution:   "With the bypass or the pre-charge path closed, or another infeed on, the bus never falls.",
			Do:        "Arm the discharge capture first. Power to zero, pulses blocked, bypass opened at no current, pre-charge open, every other infeed off, isolators open and locked.",
			Expect:    "In this order.",
			Otherwise: "find what still feeds the bus", Basis: "EN 50110-1", Unproved: true,
			Signals: []signal.Name{signal.Running, signal.BypassClosed, signal.PrechargeClosed, signal.BusVoltage}},
		{ID: "down.discharge", Kind: Witness, By: []By{Live}, Title: "Discharge",
			Caution:   "A shown voltage is no proof of absence of voltage.",
			Do:        "The fall is captured to {key:touch_safe.voltage}.",
			Expect:    "Touch-safe after {discharge.touch-safe:low} … {discharge.touch-safe:high}; no shelf.",
			Otherwise: "a shelf at source voltage: a contactor did not open; slower: a bleeder is open", Basis: "discharge.touch-safe",
			Signals: []signal.Name{signal.BusVoltage}, Capture: capture.Discharge, Findings: []string{"measured.discharge"}},
		{ID: "down.label", Kind: Check, By: []By{Observation}, Title: "Waiting time on the doors",
			Do:        "Look at every door behind which the bus can be touched.",
			Expect:    "The label says to wait at least {discharge.touch-safe}.",
			Otherwise: "no handover without the label", Basis: "IEC 60204-1, 6.2.4"},
		{ID: "down.dead", Kind: Hold, By: []By{Instrument, Observation}, Title: "Absence of voltage again",
			Caution:   "As safe.dead; the source side stays live.",
			Do:        "Same places as safe.dead, tester proved before and after. Enter the highest reading and what the tester was proved on.",
			Expect:    "Every reading below {key:touch_safe.voltage}.",
			Otherwise: "voltage left: wait, then again; find what feeds the bus", Basis: "EN 50110-1, rule 3",
			Hand:   []HandReading{{"highest voltage found", "V"}},
			Accept: []Criterion{within("highest voltage found", "V", nil, n.touchSafe(), "bus.touch_safe.voltage")}},
	}
}

func leavePoints(n numbers) []Point {
	return []Point{
		{ID: "leave.settings", Kind: Hold, By: []By{Document}, Title: "Settings as left",
			Do:        "Record and save the as-left settings of every device; every temporary limit, threshold, lock-out and test link is put back.",
			Expect:    "Each differs from as-found only where the log says so.",
			Otherwise: "put it back, or log why not", Basis: "common practice; as-found before as-left"},
		{ID: "leave.plant", Kind: Check, By: []By{Observation}, Title: "Plant as left",
			Do:        "Test leads, locks, earths and tools counted out; covers and barriers on.",
			Expect:    "Count agrees; insulation monitors as the owner runs them.",
			Otherwise: "find what is missing", Basis: "common practice"},
		{ID: "leave.punch", Kind: Check, By: []By{Document}, Title: "Punch list read",
			Do:        "Read the open items: severity, owner, date.",
			Expect:    "None that forbids operation.",
			Otherwise: "severity A stays: no handover", Basis: "ISO 10005"},
		{ID: "leave.handover", Kind: Hold, By: []By{Document}, Title: "Handover",
			Do:        "Explain findings, deviations and cautions to the operator. Then seal the log.",
			Expect:    "Operator named; log sealed and verified.",
			Otherwise: "list what is open", Basis: "ISO 10005"},
	}
}
