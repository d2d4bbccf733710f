package closing

import (
	"math"

	"chargehand/commission/corner"
	"chargehand/commission/finding"
	"chargehand/commission/precharge"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

// The toleranced inputs of a closing. The filter's capacitance stands in the main loop and in its own; a corner has one
// value of it in both.
const (
	axisInternal = iota
	axisChokeResistance
	axisResistor
	axisChoke
	axisSourceInductance
	axisBanks
	axisFilter
	axisESR
	axisESL
	axisSource
	axisCount
)

const (
	ofInrush = iota
	ofJudged // the inrush, or its upper bound where a choke saturates
	ofI2t
	ofReached
	ofLiveBus
	ofProspective
	ofProspectiveI2t
	ofFilterSwitched
	results
)

// bypass is the closing of one site's bypass contactor.
type bypass struct {
	site    site.Site
	axes    []corner.Axis
	members [][]corner.Axis // what an axis stands for
	filter  *site.Filter    // at the star point
	phases  float64
	missing quantity.Voltage // u: closing difference and both errors
	emf     quantity.Voltage // E_high
}

func bypassOf(s site.Site) bypass {
	b := bypass{site: s, axes: make([]corner.Axis, axisCount), members: make([][]corner.Axis, axisCount), filter: s.StarFilter(), phases: 1,
		emf: s.Source.HighestRest(), missing: step(s).High}
	b.axes[axisInternal] = corner.Of("source.internal_resistance", s.Source.InternalResistance)
	b.axes[axisResistor] = corner.Of("precharge.resistance", s.Precharge.Resistance)
	b.axes[axisSourceInductance] = corner.Of("source.inductance", s.Source.Inductance)
	if c := s.Converter; c != nil {
		if c.Phases > 0 {
			b.phases = float64(c.Phases)
		}
		b.axes[axisChokeResistance] = corner.Of("converter.choke_resistance", c.ChokeResistance).Scaled(1 / b.phases)
		b.axes[axisChoke] = corner.Of("converter.choke", c.Choke).Scaled(1 / b.phases)
		if f := c.Filter; f != nil {
			b.axes[axisFilter] = corner.Of("converter.filter.capacitance", f.Capacitance)
			b.axes[axisESR] = corner.Of("converter.filter.esr", f.ESR)
			b.axes[axisESL] = corner.Of("converter.filter.esl", f.ESL)
		}
	}
	b.members[axisBanks] = precharge.Banks(s)
	b.axes[axisBanks] = corner.Sum("bus.capacitance", b.members[axisBanks])
	if s.Source.Kind == site.Supercapacitor {
		b.axes[axisSource] = corner.Of("source.capacitance", s.Source.Capacitance)
	}
	return b
}

// main is the loop through the chokes.
func (b *bypass) main(x []float64, u quantity.Voltage) Loop {
	return Loop{Voltage: u, Resistance: quantity.Resistance(x[axisInternal] + x[axisChokeResistance]),
		Inductance: quantity.Inductance(x[axisChoke] + x[axisSourceInductance]), Capacitance: quantity.Capacitance(b.behind(x, b.link(x)))}
}

// link is what the main loop charges: the banks, and a filter at the star point.
func (b *bypass) link(x []float64) float64 {
	if b.filter == nil {
		return x[axisBanks]
	}
	return x[axisBanks] + x[axisFilter]
}

// behind puts a supercapacitor source in series.
func (b *bypass) behind(x []float64, c float64) float64 {
	if cs := x[axisSource]; cs > 0 {
		return c * cs / (c + cs)
	}
	return c
}

// alone is the loop of a filter capacitor without a choke.
func (b *bypass) alone(x []float64, u quantity.Voltage) Loop {
	return Loop{Voltage: u, Resistance: quantity.Resistance(x[axisInternal] + x[axisESR]),
		Inductance:  quantity.Inductance(x[axisSourceInductance] + x[axisESL]),
		Capacitance: quantity.Capacitance(b.behind(x, x[axisFilter]))}
}

// saturated is the main loop with nothing left of the chokes' inductance: the upper bound of its current.
func (b *bypass) saturated(x []float64, u quantity.Voltage) Loop {
	l := b.main(x, u)
	l.Inductance = quantity.Inductance(x[axisSourceInductance])
	return l
}

func (b *bypass) work(x, out []float64) {
	main := b.main(x, b.missing)
	peak := float64(main.PeakCurrent())
	out[ofInrush], out[ofJudged] = peak, peak
	if b.saturates(peak) {
		out[ofJudged] = float64(b.saturated(x, b.missing).PeakCurrent())
	}
	out[ofI2t] = float64(main.I2t())
	c := b.link(x)
	out[ofReached] = float64(b.emf-b.missing) + float64(main.Charge())/c
	prospective := b.main(x, b.emf)
	out[ofProspective], out[ofProspectiveI2t] = float64(prospective.PeakCurrent()), float64(prospective.I2t())
	if b.filter != nil {
		alone := float64(b.alone(x, b.missing).PeakCurrent())
		out[ofInrush], out[ofJudged] = math.Max(out[ofInrush], alone), math.Max(out[ofJudged], alone)
		out[ofProspective] = math.Max(out[ofProspective], float64(b.alone(x, b.emf).PeakCurrent()))
		out[ofLiveBus] = float64(b.dwell(x))
	}
	if b.switched() {
		out[ofFilterSwitched] = float64(b.alone(x, b.emf).PeakCurrent())
	}
}

// saturates tells whether the current of one phase exceeds the choke's saturation.
func (b *bypass) saturates(peak float64) bool {
	c := b.site.Converter
	return c != nil && c.ChokeSaturation.IsGiven() && peak/b.phases > float64(c.ChokeSaturation.Nominal)
}

// switched tells whether a filter stands before the bypass, where the source switch charges it.
func (b *bypass) switched() bool {
	return b.site.Converter != nil && b.site.Converter.Filter != nil && b.site.Converter.Filter.Position == site.AtSource
}

// dwell is how long the filter takes through the pre-charge resistor when the bus is live and the diodes block:
// R·C_f·ln(E ⁄ closing difference).
func (b *bypass) dwell(x []float64) quantity.Seconds {
	r := x[axisInternal] + x[axisResistor]
	return dwell(quantity.Resistance(r), quantity.Capacitance(b.behind(x, x[axisFilter])), b.emf, b.site.Precharge.ClosingDifference.Nominal)
}

// dwell is the time in which a filter capacitor comes within difference of the source: R·C_f·ln(E⁄difference).
func dwell(r quantity.Resistance, filter quantity.Capacitance, emf, difference quantity.Voltage) quantity.Seconds {
	if difference >= emf {
		return 0
	}
	return quantity.Seconds(float64(r) * float64(filter) * math.Log(float64(emf/difference)))
}

func (b *bypass) needsLoop(m *finding.Missing) {
	c := b.site.Converter
	precharge.NeedHighest(b.site.Source, m)
	m.Need("bus.capacitance", b.axes[axisBanks].Low > 0)
	m.Need("source.internal_resistance", b.site.Source.InternalResistance.IsGiven())
	m.Need("source.inductance", b.site.Source.Inductance.IsGiven())
	m.Need("converter.phases", c != nil && c.Phases > 0)
	m.Need("converter.choke", c != nil && c.Choke.IsGiven())
	m.Need("converter.choke_resistance", c != nil && c.ChokeResistance.IsGiven())
	if b.filter != nil {
		m.Need("converter.filter.capacitance", b.filter.Capacitance.IsGiven())
	}
	if b.site.Source.Kind == site.Supercapacitor {
		m.Need("source.capacitance", b.site.Source.Capacitance.IsGiven())
	}
}

func (b *bypass) needsFilter(m *finding.Missing) {
	if b.site.Converter == nil || b.site.Converter.Filter == nil {
		return
	}
	f := b.site.Converter.Filter
	m.Need("converter.filter.capacitance", f.Capacitance.IsGiven())
	m.Need("converter.filter.esr", f.ESR.IsGiven())
	m.Need("converter.filter.esl", f.ESL.IsGiven())
}

func (b *bypass) needsErrors(m *finding.Missing) {
	m.Need("precharge.closing_difference", b.site.Precharge.ClosingDifference.IsGiven())
	m.Need("source.measurement_error", b.site.Source.MeasurementError.IsGiven())
	m.Need("bus.measurement_error", b.site.Bus.MeasurementError.IsGiven())
}
