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
	members [][]corner.Axis  // what an axis stands for
	from    quantity.Voltage // V₁, the highest bus voltage
	spreads []corner.Spread
}

// Findings are the discharge findings of a site, in the order of the catalogue.
func Findings(s site.Site) []finding.Finding {
	a := assess(s)
	return []finding.Finding{a.energy(), a.touchSafe()}
}

func assess(s site.Site) *assessment {
	a := &assessment{site: s, from: highest(s)}
	a.axes, a.members = axesOf(s)
	touch := a.touch()
	a.spreads = corner.OverAll(a.axes, results, func(x, out []float64) {
		bus := a.bus(x)
		out[ofEnergy] = float64(bus.Stored(a.from))
		out[ofTime] = float64(bus.Time(a.from, touch))
	})
	return a
}

func axesOf(s site.Site) (axes []corner.Axis, members [][]corner.Axis) {
	axes, members = make([]corner.Axis, axisCount), make([][]corner.Axis, axisCount)
	for _, b := range s.Bus.Capacitances {
		members[axisLink] = append(members[axisLink], corner.Of(fmt.Sprintf("bus.capacitance %q", b.Name), b.Value))
	}
	axes[axisLink] = corner.Sum("bus.capacitance", members[axisLink])
	if f := s.StarFilter(); f != nil {
		axes[axisFilter] = corner.Of("converter.filter.capacitance", f.Capacitance)
	}
	var bleeders []corner.Axis
	for _, b := range s.Bus.Bleeders {
		bleeders = append(bleeders, corner.Of(fmt.Sprintf("bus.bleeder %q", b.Name), b.Value))
	}
	axes[axisBleeder], members[axisBleeder] = corner.Parallel("bus.bleeder", bleeders)
	return axes, members
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

// highest is where a discharge starts in the worst case: the highest steady bus voltage, or the nominal voltage where a key
// for that is missing.
func highest(s site.Site) quantity.Voltage {
	if highest, missing := window.BusHigh(s); len(missing) == 0 {
		return highest.High
	}
	return s.Bus.Nominal.Nominal
}

func (a *assessment) needsBus(m *finding.Missing) {
	m.Need("bus.nominal", highest(a.site) > 0)
	for _, b := range a.site.Bus.Capacitances {
		m.Need("bus.capacitance", b.Value.IsGiven())
	}
	m.Need("bus.capacitance", len(a.site.Bus.Capacitances) > 0)
	for _, b := range a.site.Bus.Bleeders {
		m.Need("bus.bleeder", b.Value.IsGiven())
	}
	if f := a.site.StarFilter(); f != nil {
		m.Need("converter.filter.capacitance", f.Capacitance.IsGiven())
	}
}

func (a *assessment) energy() finding.Finding {
	f := finding.Finding{ID: "discharge.energy", Title: "Energy stored in the bus", Unit: "J", Basis: basisEnergy}
	var m finding.Missing
	if a.needsBus(&m); m != nil {
		return f.Lacking(m...)
	}
	f = f.Stated(finding.ValueOf(a.spreads[ofEnergy].Ends()))
	f.Explanation = a.explainEnergy()
	return f
}

func (a *assessment) touchSafe() finding.Finding {
	f := finding.Finding{ID: "discharge.touch-safe", Title: "Time to the touch-safe voltage", Unit: "s", Basis: basisTime}
	t := a.site.Bus.TouchSafe
	var m finding.Missing
	a.needsBus(&m)
	if a.site.StarFilter() != nil && a.site.Source.HighestRest() <= 0 {
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
	f = f.Judged(finding.ValueOf(a.spreads[ofTime].Ends()), finding.AtMost(float64(t.Within.Nominal)), 0)
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
