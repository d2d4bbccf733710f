package simulator

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"

	"chargehand/commission/quantity"
	"chargehand/commission/signal"
	"chargehand/commission/site"
	"chargehand/protocol/circuit"
)

// Travel times of contactors in seconds, and other values that no site file states: common practice for contactors of
// this size.
const (
	prechargeCloses = 0.025
	bypassCloses    = 0.045
	contactorOpens  = 0.020
	auxiliaryLag    = 0.004
	isolatorTravel  = 0.080
	contactResist   = 50e-6 // Ω
	nodeLeakage     = 1e-6  // S: the voltage dividers of the measuring inputs
	diodeDrop       = 0.8   // V
	diodeResistance = 1e-3  // Ω
	insulation      = 600e3 // Ω of a sound plant
	earthAlarm      = 50e3  // Ω
)

// sensor is the error of one measuring channel.
type sensor struct {
	gain, offset, noise float64
}

// truth is the plant as it really is.
type truth struct {
	site  site.Site
	plant circuit.Parameters
	drawn float64 // C at the start

	cable         float64   // Ω of the converter's own cable
	cables        []float64 // Ω of the others'
	busAtStart    float64
	fuseOpen      bool
	liveFromStart []bool
	sensors       map[signal.Name]sensor

	// the device
	closingDifference float64
	earlyRelease      bool // released with its own closing difference only
	setpoint, droop   float64
	droopFactor       float64
	chargeLimit       float64
	dischargeLimit    float64
	limitFactor       float64 // of the discharge limit that really holds
	insulation        float64
	bypassDropsAfter  float64 // s after closing; 0: never
	sourceOpensAfter  float64 // s after pre-charge closing; 0: never
	infeedLostAbove   float64 // W of load; 0: never
	bypassReport      *bool

	readings readingFaults
}

// draw gives a value within its tolerance.
func draw[Q quantity.Scalar](r *rand.Rand, e quantity.Entered[Q]) float64 {
	u := 2*r.Float64() - 1
	u *= 0.95
	if u < 0 {
		return float64(e.Nominal + Q(u)*(e.Nominal-e.Low))
	}
	return float64(e.Nominal + Q(u)*(e.High-e.Nominal))
}

// given is a drawn value, or another where the site does not state it.
func given[Q quantity.Scalar](r *rand.Rand, e quantity.Entered[Q], otherwise float64) float64 {
	v := draw(r, e) // always drawn, so that one key more does not move all other values
	if !e.IsGiven() {
		return otherwise
	}
	return v
}

func newTruth(o Options) (truth, error) {
	s := o.Site
	r := rand.New(rand.NewPCG(uint64(o.Seed), 0x7472757468))
	if s.Source.HighestRest() <= 0 || !s.Bus.Nominal.IsGiven() || len(s.Bus.Capacitances) == 0 || !s.Precharge.Resistance.IsGiven() ||
		!s.Source.InternalResistance.IsGiven() {
		return truth{}, errors.New("needs the source's voltages and internal resistance, bus.nominal, one bus capacitance and precharge.resistance")
	}
	t := truth{site: s, droopFactor: 1, limitFactor: 1, sensors: map[signal.Name]sensor{}}
	t.drawSource(r)
	t.drawPrecharge(r)
	t.drawConverter(r)
	t.drawBus(r)
	t.drawInfeeds(r)
	t.drawSensors(r)
	t.tuneRegulator()
	t.readings.random = r.Uint64()
	for _, d := range o.Disturb {
		e, known := find(d.Name)
		if !known {
			return truth{}, fmt.Errorf("disturbance %q is not known", d.Name)
		}
		if err := e.apply(&t, d.Size); err != nil {
			return truth{}, fmt.Errorf("disturbance %s: %w", d, err)
		}
	}
	return t, nil
}

func (t *truth) drawSource(r *rand.Rand) {
	src := t.site.Source
	p := &t.plant.Source
	p.Resistance = math.Max(1e-4, draw(r, src.InternalResistance))
	p.Inductance = given(r, src.Inductance, 5e-6)
	p.BlockingDiode = src.BlockingDiode
	p.IsolatorOpening = isolatorTravel
	if src.Fuse != nil {
		p.FuseRating, p.FusePreArcing = float64(src.Fuse.Rating.Nominal), float64(src.Fuse.PreArcingI2t.Nominal)
	}
	high, low := float64(src.HighestRest()), float64(src.LowestRest())
	level := 0.60 + 0.30*r.Float64() // state of charge at the start
	if src.Kind == site.Supercapacitor && src.Capacitance.IsGiven() {
		c := draw(r, src.Capacitance)
		p.EMF = []circuit.ChargePoint{{Drawn: 0, EMF: high}, {Drawn: c * high, EMF: 0}}
		t.drawn = c * (high - low) * (1 - level)
		return
	}
	capacity := given(r, src.Capacity, 100*3600)
	cells := math.Max(1, float64(src.CellsInSeries))
	points := src.StateOfCharge
	for k := len(points) - 1; k >= 0; k-- {
		p.EMF = append(p.EMF, circuit.ChargePoint{Drawn: capacity * (1 - float64(points[k].StateOfCharge.Nominal)),
			EMF: cells * float64(points[k].Cell.Nominal)})
	}
	if len(p.EMF) < 2 {
		p.EMF = []circuit.ChargePoint{{Drawn: 0, EMF: high}, {Drawn: capacity, EMF: low}}
	}
	t.drawn = capacity * (1 - level)
}

func (t *truth) drawPrecharge(r *rand.Rand) {
	pre := t.site.Precharge
	p := &t.plant.Precharge
	p.Contactor = circuit.Contactor{Closing: prechargeCloses, Opening: contactorOpens, Auxiliary: auxiliaryLag,
		Resistance: contactResist}
	p.Resistor = draw(r, pre.Resistance)
	p.Ambient = given(r, pre.Ambient, 25) - 3*r.Float64()
	if h := pre.Thermal; h != nil && h.Resistance.Nominal > 0 {
		p.ThermalResistance = float64(h.Resistance.Nominal)
		p.ThermalCapacity = float64(h.TimeConstant.Nominal) / p.ThermalResistance
	}
	p.Timeout = float64(pre.Timeout.Nominal)
	t.plant.Bypass = circuit.Contactor{Closing: bypassCloses, Opening: contactorOpens, Auxiliary: auxiliaryLag,
		Resistance: contactResist}
	t.closingDifference = float64(pre.ClosingDifference.Nominal)
}

func (t *truth) drawConverter(r *rand.Rand) {
	c := site.Converter{}
	if t.site.Converter != nil {
		c = *t.site.Converter
	}
	phases := c.Phases
	if phases == 0 {
		phases = 3
	}
	for range phases {
		t.plant.Chokes = append(t.plant.Chokes, circuit.Choke{
			Inductance: math.Max(1e-6, given(r, c.Choke, 0.4e-3)),
			Resistance: given(r, c.ChokeResistance, 3e-3) * (1 + 0.04*(r.Float64()-0.5))})
	}
	t.plant.Diode = circuit.Diode{Drop: diodeDrop, Resistance: diodeResistance}
	power := given(r, c.RatedPower, 0.2*float64(t.site.Bus.Nominal.Nominal*t.site.Bus.Nominal.Nominal))
	current := given(r, c.RatedCurrent, 1.1*power/float64(t.site.Source.LowestRest()))
	b := &t.plant.Bridge
	b.SourceLimit = current
	b.LeastDuty = 0.02
	chokeLoss := t.plant.Chokes[0].Resistance * current * current / float64(phases) / power
	b.Efficiency = math.Min(1, given(r, c.Efficiency, 0.975)+math.Min(chokeLoss, 0.01))
	b.CurrentLag, b.DroopLag = 1e-3, 5e-3
	b.CurrentTrim, b.PowerRamp = 20, power/2
	b.LeastStar = 0.2 * float64(t.site.Source.LowestRest())
	if f := c.Filter; f != nil && f.Capacitance.IsGiven() {
		t.plant.Filter = &circuit.Filter{Capacitance: draw(r, f.Capacitance), Resistance: math.Max(1e-5, given(r, f.ESR, 2e-3)),
			Inductance: given(r, f.ESL, 40e-9), AtSource: f.Position == site.AtSource}
	}
	src := t.site.Source
	t.chargeLimit = math.Min(current, given(r, src.MaxChargeCurrent, current))
	if src.BlockingDiode {
		t.chargeLimit = 0
	}
	t.dischargeLimit = math.Min(current, given(r, src.MaxDischargeCurrent, current))
}

func (t *truth) drawBus(r *rand.Rand) {
	bus := t.site.Bus
	b := &t.plant.Bus
	b.Leakage = nodeLeakage
	for _, bank := range bus.Capacitances {
		if bank.Isolated {
			b.Isolated += draw(r, bank.Value)
		} else {
			b.Capacitance += draw(r, bank.Value)
		}
	}
	if b.Capacitance == 0 { // every bank isolated: the converter's own link remains
		b.Capacitance = 1e-4
	}
	b.JoiningResistor = 20
	for _, bleeder := range bus.Bleeders {
		b.Bleeder += 1 / draw(r, bleeder.Value)
	}
	if a := bus.Auxiliary; a != nil && a.Power.Nominal > 0 {
		b.Auxiliary = &circuit.Auxiliary{Power: draw(r, a.Power), StartsAt: float64(a.StartsAt.Nominal),
			StopsAt: float64(a.StopsAt.Nominal)}
	}
	if c := bus.Chopper; c != nil && c.Power.Nominal > 0 {
		on := float64(c.On.Nominal)
		b.Chopper = &circuit.Chopper{On: on, Off: float64(c.Off.Nominal), Resistance: on * on / float64(c.Power.Nominal)}
	}
	b.LoadDropsAt = 0.5 * float64(bus.Nominal.Nominal)
	t.plant.Protection = circuit.Protection{OverVoltage: float64(bus.OverVoltageTrip.Nominal),
		UnderVoltage: float64(bus.UnderVoltageTrip.Nominal)}
	t.insulation = insulation * (0.8 + 0.4*r.Float64())
}

// cableResistance of both conductors; specific resistance of annealed copper strand at 20 °C and its temperature
// coefficient from memory of IEC 60228 and IEC 60287.
func cableResistance(c *site.Cable) float64 {
	if c == nil || c.Section.Nominal <= 0 {
		return 0
	}
	const specific, coefficient = 0.0187, 0.00393 // Ω·mm²/m, 1/K
	square := float64(c.Section.Nominal) * 1e6
	hot := 1.0
	if c.Temperature.IsGiven() {
		hot += coefficient * (float64(c.Temperature.Nominal) - 20)
	}
	return 2 * specific * float64(c.Length.Nominal) / square * hot
}

func (t *truth) drawInfeeds(r *rand.Rand) {
	nominal := t.site.Bus.Nominal.Nominal
	t.plant.Bridge.BusLimit, t.plant.Bridge.BusReturn = math.Inf(1), math.Inf(1)
	t.setpoint = float64(nominal)
	for k, in := range t.site.Infeeds {
		setpoint := float64(in.Setpoint.Nominal)
		shift := float64(in.SetpointError.Of(in.Setpoint.Nominal)) * (2*r.Float64() - 1) * 0.9
		rated := float64(in.RatedCurrent.Nominal)
		droop := float64(in.Droop.At(nominal, in.RatedCurrent.Nominal))
		cable := cableResistance(in.Cable)
		returns := 0.0
		if in.Regenerates {
			returns = rated
		}
		if k == 0 {
			t.setpoint, t.droop, t.cable = setpoint, droop, cable
			t.plant.Bridge.SetpointShift = shift
			if rated > 0 {
				t.plant.Bridge.BusLimit, t.plant.Bridge.BusReturn = rated, returns
			}
			continue
		}
		t.cables = append(t.cables, cable)
		t.plant.Infeeds = append(t.plant.Infeeds, circuit.Infeed{Setpoint: setpoint + shift,
			Resistance: math.Max(1e-3, droop+cable), Lag: 1e-3, Limit: rated, Return: returns})
	}
	t.liveFromStart = make([]bool, len(t.plant.Infeeds))
}

func (t *truth) drawSensors(r *rand.Rand) {
	src, bus := float64(t.site.Source.Error()), float64(t.site.Bus.Error())
	nominal := float64(t.site.Bus.Nominal.Nominal)
	rated := t.plant.Bridge.SourceLimit
	voltage := func(bound, full float64) sensor {
		return sensor{gain: 1 + 0.4*bound/full*(2*r.Float64()-1), offset: 0.4 * bound * (2*r.Float64() - 1), noise: 1.5e-4 * nominal}
	}
	t.sensors[signal.SourceVoltage] = voltage(src, float64(t.site.Source.HighestRest()))
	t.sensors[signal.StarPointVoltage] = voltage(src, float64(t.site.Source.HighestRest()))
	t.sensors[signal.BusVoltage] = voltage(bus, nominal)
	for _, n := range []signal.Name{signal.SourceCurrent, signal.BusCurrent, signal.PhaseCurrent1, signal.PhaseCurrent2,
		signal.PhaseCurrent3} {
		t.sensors[n] = sensor{gain: 1 + 0.004*(2*r.Float64()-1), offset: 2e-4 * rated * (2*r.Float64() - 1), noise: 1e-4 * rated}
	}
	t.sensors[signal.ResistorTemperature] = sensor{gain: 1, offset: r.Float64() - 0.5, noise: 0.1}
	t.sensors[signal.HeatsinkTemperature] = sensor{gain: 1, offset: r.Float64() - 0.5, noise: 0.1}
}

// tuneRegulator sets gains fit for the bus: its crossover stays above what a constant-power load asks for.
func (t *truth) tuneRegulator() {
	b, bus := &t.plant.Bridge, t.plant.Bus
	nominal := float64(t.site.Bus.Nominal.Nominal)
	c := bus.Capacitance + bus.Isolated
	load := 0.0
	if t.site.Load != nil {
		load = float64(t.site.Load.Power.Nominal)
	}
	crossover := math.Min(400, math.Max(200, 3*load/(nominal*nominal*c)))
	b.VoltageGain = c * crossover
	b.IntegralGain = b.VoltageGain * crossover / 3
	b.VoltageRamp = nominal / 5
}

// values are the true values under the names of the site's keys.
func (t *truth) values(c *circuit.Circuit) map[string]float64 {
	p, now := c.Parameters(), c.Read()
	v := map[string]float64{
		"source.emf": now.EMF, "source.internal_resistance": p.Source.Resistance, "source.inductance": p.Source.Inductance,
		"precharge.resistance": p.Precharge.Resistor, "precharge.ambient": p.Precharge.Ambient,
		"bus.capacitance": p.Bus.Capacitance, "bus.isolated": p.Bus.Isolated, "bus.bleeder": 1 / p.Bus.Bleeder,
		"bus.voltage": now.BusVoltage, "droop": t.droop*t.droopFactor + t.cable, "setpoint": t.setpoint + p.Bridge.SetpointShift,
		"cable": t.cable, "efficiency": p.Bridge.Efficiency, "insulation": t.insulation,
	}
	if p.Filter != nil {
		v["filter.capacitance"] = p.Filter.Capacitance
	}
	for k, choke := range p.Chokes {
		v[fmt.Sprintf("choke.%d", k+1)] = choke.Inductance
	}
	for n, s := range t.sensors {
		v["sensor."+string(n)+".gain"], v["sensor."+string(n)+".offset"] = s.gain, s.offset
	}
	return v
}
