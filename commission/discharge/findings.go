package discharge

import (
	"fmt"
	"math"

	"chargehand/commission/corner"
	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
	"chargehand/commission/window"
)

// The toleranced inputs of a discharge.
const (
	axisLink = iota
	axisFilter
	axisBleeder
	axisCount
)

const (
	ofEnergy = iota
	ofTime
	results
)

// assessment is one site's discharge over all corners.
type assessment struct {
	site    site.Site
	axes    []corner.Axis
	members [axisCount][]corner.Axis
	from    quantity.Voltage // V₁, the highest bus voltage
	spreads []corner.Spread
}

// Findings are the discharge findings of a site, in the order of the catalogue.
func Findings(s site.Site) []finding.Finding {
	a := assess(s)
	return []finding.Finding{a.energy(), a.touchSafe()}
}

func assess(s site.Site) *assessment {
	a := &assessment{site: s, from: Highest(s)}
	a.axes, a.members = axesOf(s)
	touch := a.touch()
	a.spreads = corner.OverAll(a.axes, results, func(x, out []float64) {
		bus := a.bus(x)
		out[ofEnergy] = float64(bus.Stored(a.from))
		out[ofTime] = float64(bus.Time(a.from, touch))
	})
	return a
}

func axesOf(s site.Site) (axes []corner.Axis, members [axisCount][]corner.Axis) {
	axes = make([]corner.Axis, axisCount)
	axes[axisLink].Name = "bus.capacitance"
	for _, b := range s.Bus.Capacitances {
		bank := corner.Of(fmt.Sprintf("bus.capacitance %q", b.Name), b.Value)
		axes[axisLink] = corner.Axis{Name: "bus.capacitance", Low: axes[axisLink].Low + bank.Low,
			Nominal: axes[axisLink].Nominal + bank.Nominal, High: axes[axisLink].High + bank.High}
		members[axisLink] = append(members[axisLink], bank)
	}
	if f := starFilter(s); f != nil {
		axes[axisFilter] = corner.Of("converter.filter.capacitance", f.Capacitance)
	}
	axes[axisBleeder], members[axisBleeder] = bleeders(s.Bus.Bleeders)
	return axes, members
}

// bleeders in parallel are one resistance; 0 where there are none. Its members are conductances, for their shares.
func bleeders(list []site.Bleeder) (corner.Axis, []corner.Axis) {
	if len(list) == 0 {
		return corner.Exact("bus.bleeder", 0), nil
	}
	var g corner.Axis
	var members []corner.Axis
	for _, b := range list {
		m := corner.Axis{Name: fmt.Sprintf("bus.bleeder %q", b.Name),
			Low: 1 / float64(b.Value.High), Nominal: 1 / float64(b.Value.Nominal), High: 1 / float64(b.Value.Low)}
		g.Low, g.Nominal, g.High = g.Low+m.Low, g.Nominal+m.Nominal, g.High+m.High
		members = append(members, m)
	}
	return corner.Axis{Name: "bus.bleeder", Low: 1 / g.High, Nominal: 1 / g.Nominal, High: 1 / g.Low}, members
}

// starFilter is the filter where it stands behind the bypass; before it, the source keeps it.
func starFilter(s site.Site) *site.Filter {
	if s.Converter == nil || s.Converter.Filter == nil || s.Converter.Filter.Position != site.AtStar {
		return nil
	}
	return s.Converter.Filter
}

// bus is the discharging bus at one corner, without load: the worst case excludes it.
func (a *assessment) bus(x []float64) Bus {
	return Bus{Link: quantity.Capacitance(x[axisLink]), Filter: quantity.Capacitance(x[axisFilter]),
		Held: a.site.Source.HighestRest(), Bleeder: quantity.Resistance(x[axisBleeder])}
}

func (a *assessment) touch() quantity.Voltage {
	if t := a.site.Bus.TouchSafe; t != nil {
		return t.Voltage.Nominal
	}
	return 0
}

// Highest is where a discharge starts in the worst case: the highest steady bus voltage, or the nominal voltage where a key
// for that is missing.
func Highest(s site.Site) quantity.Voltage {
	if highest, missing := window.BusHigh(s); len(missing) == 0 {
		return highest.High
	}
	return s.Bus.Nominal.Nominal
}

func (a *assessment) needsBus(m *finding.Missing) {
	m.Need("bus.nominal", Highest(a.site) > 0)
	for _, b := range a.site.Bus.Capacitances {
		m.Need("bus.capacitance", b.Value.IsGiven())
	}
	m.Need("bus.capacitance", len(a.site.Bus.Capacitances) > 0)
	for _, b := range a.site.Bus.Bleeders {
		m.Need("bus.bleeder", b.Value.IsGiven())
	}
	if f := starFilter(a.site); f != nil {
		m.Need("converter.filter.capacitance", f.Capacitance.IsGiven())
	}
}

func valueOf(s corner.Spread) finding.Value {
	return finding.Value{Low: s.Low, Nominal: s.Nominal, High: s.High}
}

func (a *assessment) energy() finding.Finding {
	f := finding.Finding{ID: "discharge.energy", Title: "Energy stored in the bus", Unit: "J", Basis: basisEnergy}
	var m finding.Missing
	if a.needsBus(&m); m != nil {
		return f.Lacking(m...)
	}
	f = f.Stated(valueOf(a.spreads[ofEnergy]))
	f.Explanation = a.explainEnergy()
	return f
}

func (a *assessment) touchSafe() finding.Finding {
	f := finding.Finding{ID: "discharge.touch-safe", Title: "Time to the touch-safe voltage", Unit: "s", Basis: basisTime}
	t := a.site.Bus.TouchSafe
	var m finding.Missing
	a.needsBus(&m)
	if starFilter(a.site) != nil && a.site.Source.HighestRest() <= 0 {
		m.Add("source.max_voltage")
	}
	m.Need("bus.touch_safe", t != nil)
	if t != nil {
		m.Need("bus.touch_safe.voltage", t.Voltage.IsGiven())
		m.Need("bus.touch_safe.within", t.Within.IsGiven())
	}
	if m != nil {
		return f.Lacking(m...)
	}
	f = f.Judged(valueOf(a.spreads[ofTime]), finding.AtMost(float64(t.Within.Nominal)), 0)
	f.Explanation = a.explainTime()
	return a.labelled(f)
}

// labelled is the rule of this finding: within the time asked for passes, a longer time is marginal with the waiting time
// on a label, and no path at all fails.
func (a *assessment) labelled(f finding.Finding) finding.Finding {
	switch {
	case math.IsInf(f.Value.High, 1):
		f.State, f.Verdict = finding.Never, finding.Fail
		f.Because = append(f.Because, "there is no path: nothing takes the charge off the bus")
	case f.Verdict == finding.Pass:
		return f
	default:
		f.Verdict = finding.Marginal
		f.Because = append(f.Because, fmt.Sprintf("it takes up to %s, %s is wanted without a label", quantity.Engineering(f.Value.High, "s", 4), quantity.Engineering(*f.Limit.High, "s", 4)))
	}
	return a.remedyTime(f)
}
