package precharge

import (
	"fmt"
	"math"

	"chargehand/commission/corner"
	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

// The toleranced inputs of a pre-charge. Quantities that only ever enter as one sum share an axis.
const (
	axisSeries = iota
	axisResistor
	axisLink
	axisBleeder
	axisAuxiliary
	axisStartsAt
	axisStopsAt
	axisSource
	axisAmbient
	axisThermal
	axisThermalTime
	axisEMF
	axisError
	axisCount
)

// path is the pre-charge path of one site: its axes at the highest rest voltage, and what is set.
type path struct {
	site       site.Site
	axes       [axisCount]corner.Axis
	members    [axisCount][]corner.Axis // what an axis sums up
	difference quantity.Voltage
	errors     quantity.Voltage // source and bus measurement error together
	rating     Rating
	hottest    quantity.Temperature // max_temperature
	cool       map[[axisEMF]float64]float64
}

func pathOf(s site.Site) path {
	p := path{site: s, difference: s.Precharge.ClosingDifference.Nominal, errors: s.Source.Error() + s.Bus.Error(),
		cool: map[[axisEMF]float64]float64{}}
	p.members[axisSeries] = seriesMembers(s)
	p.axes[axisSeries] = corner.Sum("source.internal_resistance", p.members[axisSeries])
	p.axes[axisResistor] = corner.Of("precharge.resistance", s.Precharge.Resistance)
	p.members[axisLink] = linkMembers(s)
	p.axes[axisLink] = corner.Sum("bus.capacitance", p.members[axisLink])
	var bleeders []corner.Axis
	for _, b := range s.Bus.Bleeders {
		bleeders = append(bleeders, corner.Of(fmt.Sprintf("bus.bleeder %q", b.Name), b.Value))
	}
	p.axes[axisBleeder], p.members[axisBleeder] = corner.Parallel("bus.bleeder", bleeders)
	p.axes[axisAuxiliary] = corner.Exact("bus.auxiliary.power", 0)
	if a := s.Bus.Auxiliary; a != nil && a.Power.IsGiven() && a.StartsAt.IsGiven() && a.StopsAt.IsGiven() {
		p.axes[axisAuxiliary] = corner.Axis{Name: "bus.auxiliary.power", Nominal: float64(a.Power.Nominal), High: float64(a.Power.High)}
		p.axes[axisStartsAt] = corner.Of("bus.auxiliary.starts_at", a.StartsAt)
		p.axes[axisStopsAt] = corner.Of("bus.auxiliary.stops_at", a.StopsAt)
	}
	if s.Source.Kind == site.Supercapacitor {
		p.axes[axisSource] = corner.Of("source.capacitance", s.Source.Capacitance)
	}
	p.axes[axisAmbient] = corner.Of("precharge.ambient", s.Precharge.Ambient)
	p.axes[axisEMF] = corner.Exact("highest rest voltage", float64(s.Source.HighestRest()))
	p.axes[axisError] = corner.Exact("measurement errors", 0)
	p.rating = ratingOf(s.Precharge)
	if t := s.Precharge.Thermal; t != nil {
		p.axes[axisThermal] = corner.Of("precharge.thermal.resistance", t.Resistance)
		p.axes[axisThermalTime] = corner.Of("precharge.thermal.time_constant", t.TimeConstant)
		p.hottest = t.MaxTemperature.Nominal
	}
	return p
}

func seriesMembers(s site.Site) []corner.Axis {
	members := []corner.Axis{corner.Of("source.internal_resistance", s.Source.InternalResistance)}
	if c := s.Converter; c != nil && c.Phases > 0 {
		members = append(members, corner.Of("converter.choke_resistance", c.ChokeResistance).Scaled(1/float64(c.Phases)))
	}
	return members
}

// Banks are the banks that are charged, those that are not isolated, after an empty place for their sum: so a single one is
// named too.
func Banks(s site.Site) []corner.Axis {
	banks := []corner.Axis{corner.Exact("bus.capacitance", 0)}
	for _, b := range s.Bus.Capacitances {
		if !b.Isolated {
			banks = append(banks, corner.Of(fmt.Sprintf("bus.capacitance %q", b.Name), b.Value))
		}
	}
	return banks
}

func linkMembers(s site.Site) []corner.Axis {
	members := Banks(s)
	if f := s.StarFilter(); f != nil {
		members = append(members, corner.Of("converter.filter.capacitance", f.Capacitance))
	}
	return members
}

func ratingOf(s site.Precharge) Rating {
	r := Rating{Power: s.RatedPower.Nominal}
	if d := s.Derating; d != nil {
		r.FullTo, r.ZeroAt = d.FullTo.Nominal, d.ZeroAt.Nominal
	}
	if o := s.Overload; o != nil {
		r.Multiple, r.OverloadTime = o.Multiple, o.Duration.Nominal
	}
	for _, p := range s.Pulse {
		r.Pulses = append(r.Pulses, Pulse{p.Duration.Nominal, p.Energy.Nominal})
	}
	return r
}

// circuit is the path at one corner.
func (p *path) circuit(x []float64) Circuit {
	return Circuit{
		EMF: quantity.Voltage(x[axisEMF]), Resistor: quantity.Resistance(x[axisResistor]),
		Series: quantity.Resistance(x[axisSeries]), Capacitance: quantity.Capacitance(x[axisLink]),
		Bleeder: quantity.Resistance(x[axisBleeder]), Auxiliary: quantity.Power(x[axisAuxiliary]),
		StartsAt: quantity.Voltage(x[axisStartsAt]), StopsAt: quantity.Voltage(x[axisStopsAt]),
		Source: quantity.Capacitance(x[axisSource]),
	}
}

func (p *path) nominal() []float64 {
	x := make([]float64, axisCount)
	for i, a := range p.axes {
		x[i] = a.Nominal
	}
	return x
}

// The keys that groups of findings need.

func (p *path) needsLoop(m *finding.Missing) {
	c := p.site.Converter
	m.Need("source.internal_resistance", p.site.Source.InternalResistance.IsGiven())
	m.Need("precharge.resistance", p.axes[axisResistor].Nominal > 0)
	NeedHighest(p.site.Source, m)
	m.Need("converter.phases", c != nil && c.Phases > 0)
	m.Need("converter.choke_resistance", c != nil && c.ChokeResistance.IsGiven())
}

// NeedHighest notes the keys of the highest rest voltage where it is not known.
func NeedHighest(s site.Source, m *finding.Missing) {
	switch {
	case s.HighestRest() > 0:
	case s.CellsInSeries > 0:
		m.Add("source.cell_max")
	default:
		m.Add("source.cells_in_series", "source.max_voltage")
	}
}

func (p *path) needsCircuit(m *finding.Missing) {
	p.needsLoop(m)
	m.Need("bus.capacitance", p.axes[axisLink].Low > 0)
	m.Need("precharge.closing_difference", p.site.Precharge.ClosingDifference.IsGiven())
	if a := p.site.Bus.Auxiliary; a != nil {
		m.Need("bus.auxiliary.power", a.Power.IsGiven())
		m.Need("bus.auxiliary.starts_at", a.StartsAt.IsGiven())
		m.Need("bus.auxiliary.stops_at", a.StopsAt.IsGiven())
	}
	if p.site.Source.Kind == site.Supercapacitor {
		m.Need("source.capacitance", p.site.Source.Capacitance.IsGiven())
	}
	if f := p.site.StarFilter(); f != nil {
		m.Need("converter.filter.capacitance", f.Capacitance.IsGiven())
	}
}

func (p *path) needsErrors(m *finding.Missing) {
	m.Need("source.measurement_error", p.site.Source.MeasurementError.IsGiven())
	m.Need("bus.measurement_error", p.site.Bus.MeasurementError.IsGiven())
}

func (p *path) needsRating(m *finding.Missing) {
	r := p.site.Precharge
	m.Need("precharge.rated_power", r.RatedPower.IsGiven())
	m.Need("precharge.derating", r.Derating != nil && r.Derating.FullTo.IsGiven() && r.Derating.ZeroAt.IsGiven())
	m.Need("precharge.ambient", r.Ambient.IsGiven())
}

func (p *path) needsPulse(m *finding.Missing) {
	r := p.site.Precharge
	p.needsRating(m)
	if r.Overload == nil && len(r.Pulse) == 0 {
		m.Add("precharge.overload", "precharge.pulse")
	}
}

func (p *path) hasThermal() bool { return p.site.Precharge.Thermal != nil }

func (p *path) needsThermal(m *finding.Missing) {
	t := p.site.Precharge.Thermal
	m.Need("precharge.thermal", t != nil)
	if t != nil {
		m.Need("precharge.thermal.resistance", t.Resistance.IsGiven())
		m.Need("precharge.thermal.time_constant", t.TimeConstant.IsGiven())
		m.Need("precharge.thermal.max_temperature", t.MaxTemperature.IsGiven())
		m.Need("precharge.ambient", p.site.Precharge.Ambient.IsGiven())
	}
}

// needsSeries is what the temperature before the last permitted attempt needs; the first starts at ambient.
func (p *path) needsSeries(m *finding.Missing) {
	m.Need("precharge.attempts", p.site.Precharge.Attempts > 0)
	if p.site.Precharge.Attempts > 1 {
		m.Need("precharge.interval", p.site.Precharge.Interval.IsGiven())
		p.needsThermal(m)
	}
}

func (p *path) needsRepeat(m *finding.Missing) {
	p.needsCircuit(m)
	m.Need("precharge.interval", p.site.Precharge.Interval.IsGiven())
	if !p.hasThermal() {
		p.needsRating(m)
		return
	}
	m.Need("precharge.attempts", p.site.Precharge.Attempts > 0)
	p.needsThermal(m)
}

func (p *path) interval() quantity.Seconds { return p.site.Precharge.Interval.Nominal }

func (p *path) timeout() quantity.Seconds {
	if !p.site.Precharge.Timeout.IsGiven() {
		return quantity.Seconds(math.NaN())
	}
	return p.site.Precharge.Timeout.Nominal
}
