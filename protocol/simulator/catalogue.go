package simulator

import (
	"errors"
	"time"

	"chargehand/commission/signal"
	"chargehand/protocol/circuit"
)

// line makes an entry of the catalogue.
func line(name, group, meaning, sizeMeans string, size float64, unit string, least, most float64,
	apply func(*truth, float64) error) entry {
	return entry{DisturbanceInfo{name, group, meaning, sizeMeans, size, unit, least, most}, apply}
}

// sure is an effect that cannot fail.
func sure(apply func(t *truth, size float64)) func(*truth, float64) error {
	return func(t *truth, size float64) error {
		apply(t, size)
		return nil
	}
}

// phase changes one choke, counted from 1.
func phase(change func(*circuit.Choke)) func(*truth, float64) error {
	return func(t *truth, size float64) error {
		k := int(size) - 1
		if k < 0 || k >= len(t.plant.Chokes) {
			return errors.New("the converter has no such phase")
		}
		change(&t.plant.Chokes[k])
		return nil
	}
}

// series is the resistance that a charge runs through.
func (t *truth) series() float64 { return t.plant.Precharge.Resistor + t.plant.Source.Resistance }

// emf is the source's electromotive force at the start.
func (t *truth) emf() float64 {
	c, err := circuit.New(t.plant)
	if err != nil {
		return float64(t.site.Source.HighestRest())
	}
	c.SetDrawn(t.drawn)
	return c.Read().EMF
}

var catalogue = []entry{
	line("resistor-open", PrechargeGroup, "pre-charge resistor burnt out or not wired", "none", 1, "1", 1, 1,
		sure(func(t *truth, _ float64) { t.plant.Precharge.Resistor = 1e10 })),
	line("resistor-high", PrechargeGroup, "pre-charge resistor aged or of the wrong value", "part above its value", 0.3, "1", 0.02, 20,
		sure(func(t *truth, s float64) { t.plant.Precharge.Resistor *= 1 + s })),
	line("resistor-low", PrechargeGroup, "pre-charge resistor on the wrong tap, or two in parallel", "part below its value", 0.3, "1", 0.02, 0.95,
		sure(func(t *truth, s float64) { t.plant.Precharge.Resistor *= 1 - s })),
	line("resistor-drifts-hot", PrechargeGroup, "pre-charge resistor whose value rises as it warms", "part per kelvin of mean temperature", 0.08, "1/K", 0.001, 1,
		func(t *truth, s float64) error {
			if t.plant.Precharge.ThermalCapacity <= 0 {
				return errors.New("needs precharge.thermal in the site")
			}
			t.plant.Precharge.Drift = s
			return nil
		}),
	line("bank-missing", PrechargeGroup, "a capacitor bank is not connected", "number of the bank in the site file; 0 is the last", 0, "1", 0, 99,
		missBank),
	line("bank-added", PrechargeGroup, "a bank that should be isolated is on the bus", "part of the capacitance that should be there", 0.3, "1", 0.02, 10,
		sure(func(t *truth, s float64) { t.plant.Bus.Capacitance *= 1 + s })),
	line("load-left-on", PrechargeGroup, "a resistive load was left on the bus", "part of the source voltage that the bus ends below it", 0.06, "1", 0.002, 0.9,
		sure(func(t *truth, s float64) { t.plant.Bus.LeftOn = s / (1 - s) / t.series() })),
	line("auxiliary-stall", PrechargeGroup, "auxiliary supply takes more than the pre-charge can bring", "part of the source voltage that the bus ends below it", 0.08, "1", 0.01, 0.45,
		sure(func(t *truth, s float64) {
			e := t.emf()
			starts, stops := 0.45*e, 0.35*e
			if a := t.plant.Bus.Auxiliary; a != nil {
				starts, stops = a.StartsAt, a.StopsAt
			}
			t.plant.Bus.Auxiliary = &circuit.Auxiliary{Power: s * (1 - s) * e * e / t.series(), StartsAt: starts, StopsAt: stops}
		})),
	line("bus-shorted", PrechargeGroup, "short circuit on the bus, or a forgotten short-circuit bar", "ohms of the short", 0.02, "Ω", 0.001, 20,
		sure(func(t *truth, s float64) { t.plant.Bus.ShortConductance = 1 / s })),
	line("bus-shorted-late", PrechargeGroup, "something breaks down while the voltage rises", "part of the source voltage at which it does", 0.5, "1", 0.02, 0.98,
		sure(func(t *truth, s float64) {
			t.plant.Bus.ShortConductance, t.plant.Bus.ShortsAt = 50, s*t.emf()
		})),
	line("bypass-welded", PrechargeGroup, "main contact of the bypass welded", "none", 1, "1", 1, 1,
		sure(func(t *truth, _ float64) { t.plant.Bypass.Welded = true })),
	line("bypass-early", PrechargeGroup, "bypass closes on a timer or a wrong threshold", "part of the source voltage still missing when it closes", 0.35, "1", 0.05, 0.95,
		sure(func(t *truth, s float64) { t.earlyRelease, t.closingDifference = true, s*t.emf() })),
	line("bypass-never", PrechargeGroup, "bypass does not close: coil, wiring or permission missing", "none", 1, "1", 1, 1,
		sure(func(t *truth, _ float64) { t.plant.Bypass.Dead = true })),
	line("bypass-drops-out", PrechargeGroup, "bypass falls off by itself", "seconds after closing", 3, "s", 0.1, 3600,
		sure(func(t *truth, s float64) { t.bypassDropsAfter = s })),
	line("precharge-welded", PrechargeGroup, "pre-charge contactor does not open any more", "none", 1, "1", 1, 1,
		sure(func(t *truth, _ float64) { t.plant.Precharge.Welded = true })),
	line("bus-live", PrechargeGroup, "another infeed holds the bus while this one pre-charges", "part of its setpoint that the infeed holds", 1, "1", 0.3, 1.2,
		sure(liveBus)),
	line("bus-still-charged", PrechargeGroup, "the bus has not been discharged", "part of the source voltage that stands on it", 0.5, "1", 0.02, 1.3,
		sure(func(t *truth, s float64) { t.busAtStart = s * t.emf() })),
	line("load-returns-early", PrechargeGroup, "loads switch themselves on during the pre-charge", "part of the greatest power that the resistor lets through", 0.15, "1", 0.01, 5,
		sure(func(t *truth, s float64) {
			e := t.emf()
			t.plant.Bus.ReturningLoad, t.plant.Bus.ReturnsAt = s*e*e/(4*t.series()), 0.7*e
		})),
	line("fuse-open", PrechargeGroup, "source fuse blown or not fitted", "none", 1, "1", 1, 1,
		sure(func(t *truth, _ float64) { t.fuseOpen = true })),

	line("source-low", BridgeGroup, "source voltage lower than it reports by its charge: cells missing or bypassed", "part missing", 0.08, "1", 0.005, 0.9,
		sure(func(t *truth, s float64) { t.scaleEMF(1 - s) })),
	line("source-soft", BridgeGroup, "source's internal resistance too high: cold, aged, a bad joint", "times its value", 6, "1", 1.2, 100,
		sure(func(t *truth, s float64) { t.plant.Source.Resistance *= s })),
	line("source-reversed", BridgeGroup, "source connected the wrong way round", "none", 1, "1", 1, 1,
		sure(func(t *truth, _ float64) { t.scaleEMF(-1) })),
	line("source-opens", BridgeGroup, "the source's manager opens its contactor", "seconds after the pre-charge closes", 0.7, "s", 0.05, 3600,
		sure(func(t *truth, s float64) { t.sourceOpensAfter = s })),
	line("charger-refuses", BridgeGroup, "the source accepts no charge: full, cold or limited", "none", 1, "1", 1, 1,
		sure(func(t *truth, _ float64) { t.chargeLimit = 0 })),
	line("choke-open", BridgeGroup, "one choke or its diode path is interrupted", "number of the phase", 2, "1", 1, 8,
		phase(func(c *circuit.Choke) { c.Fault = circuit.Open })),
	line("choke-unequal", BridgeGroup, "one choke differs: wrong part or shorted turns", "part of inductance and resistance missing in phase 1", 0.5, "1", 0.05, 0.95,
		sure(func(t *truth, s float64) {
			t.plant.Chokes[0].Inductance *= 1 - s
			t.plant.Chokes[0].Resistance *= 1 - s
		})),
	line("filter-missing", BridgeGroup, "filter capacitor not connected", "none", 1, "1", 1, 1,
		func(t *truth, _ float64) error {
			if t.plant.Filter == nil {
				return errors.New("the converter has no filter")
			}
			t.plant.Filter = nil
			return nil
		}),
	line("upper-switch-shorted", BridgeGroup, "upper switch of one leg shorted", "number of the phase", 1, "1", 1, 8,
		phase(func(c *circuit.Choke) { c.Fault = circuit.UpperShorted })),
	line("lower-switch-shorted", BridgeGroup, "lower switch of one leg shorted", "number of the phase", 1, "1", 1, 8,
		phase(func(c *circuit.Choke) { c.Fault = circuit.LowerShorted })),
	line("bleeder-open", BridgeGroup, "discharge resistors interrupted", "none", 1, "1", 1, 1,
		func(t *truth, _ float64) error {
			if t.plant.Bus.Bleeder == 0 {
				return errors.New("the bus has no bleeder")
			}
			t.plant.Bus.Bleeder = 0
			return nil
		}),
	line("chopper-dead", BridgeGroup, "braking chopper does not switch on", "none", 1, "1", 1, 1,
		func(t *truth, _ float64) error {
			if t.plant.Bus.Chopper == nil {
				return errors.New("the bus has no chopper")
			}
			t.plant.Bus.Chopper = nil
			return nil
		}),
	line("earth-fault", BridgeGroup, "one pole has a path to earth", "ohms of the path", 20e3, "Ω", 10, 1e6,
		sure(func(t *truth, s float64) { t.insulation = t.insulation * s / (t.insulation + s) })),
	line("contact-report-false", BridgeGroup, "auxiliary contact of the bypass says one thing whatever the bypass does", "what it says: 1 closed, 0 open", 1, "1", 0, 1,
		sure(func(t *truth, s float64) { says := s != 0; t.bypassReport = &says })),

	line("droop-mismatch", DroopGroup, "droop entered on another base or of another unit", "times the droop that its register shows", 1.6, "1", 0.1, 20,
		sure(func(t *truth, s float64) { t.droopFactor = s })),
	line("droop-off", DroopGroup, "droop not active: the unit holds its voltage", "none", 1, "1", 1, 1,
		sure(func(t *truth, _ float64) { t.droopFactor = 0 })),
	line("setpoint-shifted", DroopGroup, "the unit's own voltage measurement is off", "part of the bus's nominal voltage that the setpoint is too high", 0.008, "1", -0.1, 0.1,
		sure(func(t *truth, s float64) { t.plant.Bridge.SetpointShift += s * float64(t.site.Bus.Nominal.Nominal) })),
	line("limit-too-low", DroopGroup, "a current limit that its register does not show", "part of the discharge limit that remains", 0.2, "1", 0, 0.95,
		sure(func(t *truth, s float64) { t.limitFactor = s })),
	line("infeed-lost", DroopGroup, "another infeed trips under load", "part of load.power at which it does", 0.4, "1", 0.01, 1,
		func(t *truth, s float64) error {
			if len(t.plant.Infeeds) == 0 || t.site.Load == nil || t.site.Load.Power.Nominal <= 0 {
				return errors.New("needs a second infeed and load.power in the site")
			}
			t.infeedLostAbove = s * float64(t.site.Load.Power.Nominal)
			return nil
		}),
	line("bus-hunts", DroopGroup, "the voltage regulator hunts", "part of the bus's nominal voltage, amplitude, at 1.7 Hz", 0.01, "1", 0.0005, 0.1,
		sure(func(t *truth, s float64) {
			t.plant.Bridge.Hunting, t.plant.Bridge.HuntingRate = s*float64(t.site.Bus.Nominal.Nominal), 1.7
		})),

	line("words-swapped", ReadingGroup, "words of wide values in the other order", "none", 1, "1", 1, 1,
		sure(func(t *truth, _ float64) { t.readings.swapWords = true })),
	line("address-shifted", ReadingGroup, "register list counts from 1, the wire from 0", "registers by which all values stand later", 1, "1", -5, 5,
		sure(func(t *truth, s float64) { t.readings.shift = int(s) })),
	line("scale-tenfold", ReadingGroup, "voltages come in another unit than the map says", "times the value", 0.1, "1", 0.001, 1000,
		sure(func(t *truth, s float64) { t.readings.scale = s })),
	line("sign-unsigned", ReadingGroup, "negative values lose their sign bit on the way", "none", 1, "1", 1, 1,
		sure(func(t *truth, _ float64) { t.readings.unsigned = true })),
	line("current-reversed", ReadingGroup, "current sensors turned round or their sign inverted", "none", 1, "1", 1, 1,
		sure(func(t *truth, _ float64) { t.readings.reverse = true })),
	line("missing-code-read", ReadingGroup, "a code for 'no value' that the map does not know, in the source current", "none", 1, "1", 1, 1,
		sure(func(t *truth, _ float64) { t.readings.missing = true })),
	line("torn-words", ReadingGroup, "wide values put together from two refreshes", "part of the replies", 0.3, "1", 0.001, 1,
		sure(func(t *truth, s float64) { t.readings.torn = s })),
	line("answers-one-behind", ReadingGroup, "every reply carries the answer to the question before", "none", 1, "1", 1, 1,
		sure(func(t *truth, _ float64) { t.readings.behind = true })),
	line("readings-frozen", ReadingGroup, "the bus voltage's register stops moving", "seconds after the pre-charge closes", 0.6, "s", 0.01, 3600,
		sure(func(t *truth, s float64) { t.readings.freezeAfter = s })),
	line("readings-slow", ReadingGroup, "registers are refreshed far too seldom", "seconds between refreshes", 0.8, "s", 0.05, 60,
		sure(func(t *truth, s float64) { t.readings.slow = time.Duration(s * float64(time.Second)) })),
	line("gateway-repeats-old", ReadingGroup, "a gateway goes on answering with old values when its device is silent", "seconds of silence in every 5 s", 1.5, "s", 0.05, 5,
		sure(func(t *truth, s float64) { t.readings.repeatPeriod, t.readings.repeatFor = 5, s })),
	line("sensor-gain", ReadingGroup, "scale error of the bus voltage's sensor", "part too high", 0.04, "1", -0.5, 0.5,
		sure(func(t *truth, s float64) { t.spoilBusSensor(1+s, 0) })),
	line("sensor-offset", ReadingGroup, "zero error of the bus voltage's sensor", "part of the bus's nominal voltage too high", 0.02, "1", -0.5, 0.5,
		sure(func(t *truth, s float64) { t.spoilBusSensor(1, s*float64(t.site.Bus.Nominal.Nominal)) })),
	line("link-drops", ReadingGroup, "the connection breaks again and again", "seconds of every 6 s without an answer", 0.7, "s", 0.05, 6,
		sure(func(t *truth, s float64) { t.readings.dropPeriod, t.readings.dropFor = 6, s })),
}

// missBank takes one bank off the bus. Its true value is its nominal one within what the others leave of the sum.
func missBank(t *truth, size float64) error {
	banks := t.site.Bus.Capacitances
	k := int(size) - 1
	if k < 0 {
		for k = len(banks) - 1; k > 0 && banks[k].Isolated; k-- {
		}
	}
	if k >= len(banks) || banks[k].Isolated {
		return errors.New("the bus has no such bank, or it is isolated")
	}
	sum := 0.0
	for _, b := range banks {
		if !b.Isolated {
			sum += float64(b.Value.Nominal)
		}
	}
	part := float64(banks[k].Value.Nominal) / sum
	if part > 0.999 {
		return errors.New("it is the only bank on the bus")
	}
	t.plant.Bus.Capacitance *= 1 - part
	return nil
}

// liveBus lets another infeed hold the bus from the start; a bus without one gets one.
func liveBus(t *truth, size float64) {
	if len(t.plant.Infeeds) == 0 {
		nominal := float64(t.site.Bus.Nominal.Nominal)
		t.plant.Infeeds = append(t.plant.Infeeds, circuit.Infeed{Setpoint: nominal, Resistance: nominal * 0.03 / 200, Lag: 1e-3,
			Limit: 200})
		t.cables = append(t.cables, 0)
		t.liveFromStart = append(t.liveFromStart, false)
	}
	t.plant.Infeeds[0].Setpoint *= size
	t.liveFromStart[0] = true
	t.busAtStart = t.plant.Infeeds[0].Setpoint
}

func (t *truth) scaleEMF(by float64) {
	points := append([]circuit.ChargePoint(nil), t.plant.Source.EMF...)
	for k := range points {
		points[k].EMF *= by
	}
	t.plant.Source.EMF = points
}

// spoilBusSensor changes what the converter measures of the bus, so also what it regulates to.
func (t *truth) spoilBusSensor(gain, offset float64) {
	s := t.sensors[signal.BusVoltage]
	s.gain *= gain
	s.offset += offset
	t.sensors[signal.BusVoltage] = s
	t.plant.Bridge.SetpointShift += -offset - (gain-1)*t.setpoint
}
