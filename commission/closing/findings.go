package closing

import (
	"fmt"

	"chargehand/commission/corner"
	"chargehand/commission/finding"
	"chargehand/commission/precharge"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

// assessment is one site's closing over all corners.
type assessment struct {
	bypass
	over []corner.Spread
}

// Findings are the closing findings of a site, in the order of the catalogue. A filter before the bypass adds a second
// closing.inrush with the subject "filter".
func Findings(s site.Site) []finding.Finding {
	a := assess(s)
	list := []finding.Finding{a.inrush()}
	if a.switched() {
		list = append(list, a.filterInrush())
	}
	return append(list, a.i2t(), a.overshoot(), a.threshold(), a.liveBus(), a.withoutPrecharge())
}

func assess(s site.Site) *assessment {
	a := &assessment{bypass: bypassOf(s)}
	a.over = corner.OverAll(a.axes, results, a.work)
	return a
}

func say(v float64, unit string) string { return quantity.Engineering(v, unit, 4) }

func missing(needs ...func(*finding.Missing)) finding.Missing {
	var m finding.Missing
	for _, need := range needs {
		need(&m)
	}
	return m
}

func (a *assessment) needsBypass(m *finding.Missing) {
	m.Need("bypass.making_current", a.site.Bypass != nil && a.site.Bypass.MakingCurrent.IsGiven())
}

func (a *assessment) inrush() finding.Finding {
	f := finding.Finding{ID: "closing.inrush", Title: "Bypass closing on the difference that remains", Unit: "A", Basis: basisLoop, Guards: true}
	needs := []func(*finding.Missing){a.needsLoop, a.needsErrors, a.needsBypass, func(m *finding.Missing) {
		m.Need("converter.choke_saturation", a.site.Converter != nil && a.site.Converter.ChokeSaturation.IsGiven())
	}}
	if a.filter != nil {
		needs = append(needs, a.needsFilter)
	}
	if m := missing(needs...); m != nil {
		return f.Lacking(m...)
	}
	making := float64(a.site.Bypass.MakingCurrent.Nominal)
	f = f.Judged(finding.ValueOf(a.over[ofJudged].Ends()), finding.AtMost(making), 0)
	f.Value = finding.ValueOf(a.over[ofInrush].Ends())
	if a.saturates(float64(a.main(a.over[ofInrush].AtHigh, a.missing).PeakCurrent())) {
		f.Parts = append(f.Parts, finding.Part{Name: "upper bound with the chokes saturated", Unit: "A", Value: finding.ValueOf(a.over[ofJudged].Ends())})
		f.Because = append(f.Because, "the chokes saturate, so the verdict uses the upper bound with the source inductance alone")
	}
	f.Explanation = a.explainInrush()
	if f.Verdict != finding.Pass {
		f.Because = append(f.Because, fmt.Sprintf("up to %s flow, the bypass may make %s", say(a.over[ofJudged].High, "A"), say(making, "A")))
		f = a.remedyInrush(f)
	}
	return f
}

func (a *assessment) filterInrush() finding.Finding {
	f := finding.Finding{ID: "closing.inrush", Subject: "filter", Title: "Source switch closing on the empty filter", Unit: "A", Basis: basisLoop}
	if m := missing(a.needsFilter, func(m *finding.Missing) {
		precharge.NeedHighest(a.site.Source, m)
		m.Need("source.internal_resistance", a.site.Source.InternalResistance.IsGiven())
		m.Need("source.inductance", a.site.Source.Inductance.IsGiven())
	}); m != nil {
		return f.Lacking(m...)
	}
	f = f.Stated(finding.ValueOf(a.over[ofFilterSwitched].Ends()))
	f.Explanation = a.explainFilterInrush()
	return f
}

func (a *assessment) i2t() finding.Finding {
	f := finding.Finding{ID: "closing.i2t", Title: "Joule integral of the closing", Unit: "A²s", Basis: basisI2t, Guards: true}
	fuse := a.site.Source.Fuse
	if m := missing(a.needsLoop, a.needsErrors, func(m *finding.Missing) {
		m.Need("source.fuse.pre_arcing_i2t", fuse != nil && fuse.PreArcingI2t.IsGiven())
	}); m != nil {
		return f.Lacking(m...)
	}
	f = f.Judged(finding.ValueOf(a.over[ofI2t].Ends()), finding.AtMost(float64(fuse.PreArcingI2t.Nominal)), 0)
	f.Explanation = a.explainI2t()
	if f.Verdict != finding.Pass {
		f.Because = append(f.Because, fmt.Sprintf("closing puts up to %s through the fuse, which pre-arcs at %s", say(f.Value.High, "A²s"), say(*f.Limit.High, "A²s")))
		f = a.remedyI2t(f)
	}
	return f
}

func (a *assessment) overshoot() finding.Finding {
	f := finding.Finding{ID: "closing.overshoot", Title: "Link voltage reached by closing", Unit: "V", Basis: basisBeyond}
	if m := missing(a.needsLoop, a.needsErrors); m != nil {
		return f.Lacking(m...)
	}
	f = f.Stated(finding.ValueOf(a.over[ofReached].Ends()))
	f.Explanation = a.explainOvershoot()
	return f
}

func (a *assessment) threshold() finding.Finding {
	f := finding.Finding{ID: "closing.threshold", Title: "Closing difference as set", Unit: "V", Basis: basisThreshold}
	needs := []func(*finding.Missing){a.needsLoop, a.needsErrors, a.needsBypass, a.needsAuxiliary}
	if a.filter != nil {
		needs = append(needs, a.needsFilter)
	}
	if m := missing(needs...); m != nil {
		return f.Lacking(m...)
	}
	low, high, hiccups := a.window()
	f = f.Judged(finding.Exactly(float64(a.site.Precharge.ClosingDifference.Nominal)), finding.Between(low, high), 0)
	f.Explanation = a.explainThreshold(low, high)
	if hiccups {
		f.Verdict = finding.Fail
		f.Because = append(f.Because, "the auxiliary supply hiccups, so no closing difference is reached for certain")
	}
	switch {
	case low > high:
		f.Because = append(f.Because, fmt.Sprintf("no setting can: what remains wants at least %s, the bypass permits at most %s, they exclude each other by %s", say(low, "V"), say(high, "V"), say(low-high, "V")))
	case f.Verdict != finding.Pass:
		f.Because = append(f.Because, fmt.Sprintf("%s lies outside %s … %s", say(f.Value.Nominal, "V"), say(low, "V"), say(high, "V")))
	}
	if f.Verdict != finding.Pass {
		f = a.remedyThreshold(f, low, high)
	}
	return f
}

func (a *assessment) needsAuxiliary(m *finding.Missing) {
	m.Need("precharge.resistance", a.site.Precharge.Resistance.IsGiven())
	if x := a.site.Bus.Auxiliary; x != nil {
		m.Need("bus.auxiliary.power", x.Power.IsGiven())
		m.Need("bus.auxiliary.starts_at", x.StartsAt.IsGiven())
		m.Need("bus.auxiliary.stops_at", x.StopsAt.IsGiven())
	}
}

// window is the admissible setting of the closing difference: above what remains when the charge has settled and both
// errors, below what the bypass may make, both errors taken off. The narrowest of all corners counts.
func (a *assessment) window() (low, high float64, hiccups bool) {
	remaining, hiccups := precharge.Remaining(a.site)
	errors := float64(a.site.Source.Error() + a.site.Bus.Error())
	perVolt := a.over[ofInrush].High / float64(a.missing)
	return float64(remaining.High) + errors, float64(a.site.Bypass.MakingCurrent.Nominal)/perVolt - errors, hiccups
}

func (a *assessment) liveBus() finding.Finding {
	f := finding.Finding{ID: "closing.live-bus", Title: "Dwell that charges the filter when the bus is live", Unit: "s", Basis: basisDwell, Guards: true}
	if a.filter == nil {
		return f.Without(finding.Info, "there is no filter at the star point to charge")
	}
	p := a.site.Precharge
	if m := missing(func(m *finding.Missing) {
		precharge.NeedHighest(a.site.Source, m)
		m.Need("source.internal_resistance", a.site.Source.InternalResistance.IsGiven())
		m.Need("precharge.resistance", p.Resistance.IsGiven())
		m.Need("precharge.closing_difference", p.ClosingDifference.IsGiven())
		m.Need("converter.filter.capacitance", a.filter.Capacitance.IsGiven())
		m.Need("precharge.compares", p.Compares != "")
		m.Need("precharge.minimum_time", p.MinimumTime.IsGiven())
	}); m != nil {
		return f.Lacking(m...)
	}
	f = f.Judged(finding.ValueOf(a.over[ofLiveBus].Ends()), finding.AtMost(float64(p.MinimumTime.Nominal)), 0)
	f.Explanation = a.explainLiveBus()
	if f.Verdict != finding.Pass {
		f.Because = append(f.Because, fmt.Sprintf("the filter takes up to %s, the pre-charge stays in for at least %s", say(f.Value.High, "s"), say(*f.Limit.High, "s")))
	}
	if p.Compares == site.SourceAgainstBus {
		f.Verdict = finding.Fail
		f.Because = append(f.Because, "on a live bus source and bus agree while the filter behind the bypass is still empty: the device must compare across the contactor")
	}
	if f.Verdict != finding.Pass {
		f = a.remedyLiveBus(f)
	}
	return f
}

func (a *assessment) withoutPrecharge() finding.Finding {
	f := finding.Finding{ID: "closing.without-precharge", Title: "What would flow with no pre-charge", Unit: "A", Basis: basisLoop}
	needs := []func(*finding.Missing){a.needsLoop}
	if a.filter != nil {
		needs = append(needs, a.needsFilter)
	}
	if m := missing(needs...); m != nil {
		return f.Lacking(m...)
	}
	f = f.Stated(finding.ValueOf(a.over[ofProspective].Ends()))
	i2t := finding.ValueOf(a.over[ofProspectiveI2t].Ends())
	f.Parts = []finding.Part{{Name: "I²t", Unit: "A²s", Value: i2t}}
	if fuse := a.site.Source.Fuse; fuse != nil && fuse.PreArcingI2t.IsGiven() {
		melts := func(v float64) float64 {
			if v >= float64(fuse.PreArcingI2t.Nominal) {
				return 1
			}
			return 0
		}
		f.Parts = append(f.Parts, finding.Part{Name: "fuse clears it", Unit: "1",
			Value: finding.Value{Low: melts(i2t.Low), Nominal: melts(i2t.Nominal), High: melts(i2t.High)}})
		f.Because = append(f.Because, clears(i2t, float64(fuse.PreArcingI2t.Nominal)))
	}
	f.Explanation = a.explainWithoutPrecharge()
	return f
}

func clears(i2t finding.Value, preArcing float64) string {
	switch {
	case i2t.Low >= preArcing:
		return fmt.Sprintf("the source fuse clears it: at least %s against %s", say(i2t.Low, "A²s"), say(preArcing, "A²s"))
	case i2t.High < preArcing:
		return fmt.Sprintf("the source fuse does not clear it: at most %s against %s", say(i2t.High, "A²s"), say(preArcing, "A²s"))
	}
	return fmt.Sprintf("whether the source fuse clears it hangs on the tolerances: %s … %s against %s", say(i2t.Low, "A²s"), say(i2t.High, "A²s"), say(preArcing, "A²s"))
}
