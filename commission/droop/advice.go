package droop

import (
	"fmt"
	"math"
	"slices"

	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/remedy"
	"chargehand/commission/site"
	"chargehand/commission/window"
)

// wish is the site's wish, or the keys that are missing for it. Fractions of load and regeneration are 1: the window must
// hold up to rated current both ways.
func wish(s site.Site, p planned) (Wish, finding.Missing) {
	missing := append(finding.Missing(nil), p.missing...)
	source, more := window.SourceHigh(s)
	missing.Add(more...)
	upper, _, more := upperLimit(s)
	missing.Add(more...)
	missing.Need("bus.wanted_margin", s.Bus.WantedMargin.IsGiven())
	missing.Need("bus.under_voltage_trip", s.Bus.UnderVoltageTrip.IsGiven())
	missing.Need("bus.measurement_error", s.Bus.MeasurementError.IsGiven())
	missing.Need("bus.ripple", s.Bus.Ripple.IsGiven())
	missing.Need("load.share_tolerance", loadOf(s).ShareTolerance.IsGiven())
	w := Wish{
		SourceHigh: source.High, LowerMargin: s.Bus.WantedMargin.Nominal,
		LowestBus:  s.Bus.UnderVoltageTrip.Nominal + s.Bus.Error(),
		UpperLimit: quantity.Voltage(upper), UpperMargin: s.Bus.Error(),
		ShareTolerance: loadOf(s).ShareTolerance.Nominal, Ripple: s.Bus.Ripple.Nominal, LoadFraction: 1, RegenerationShare: 1,
	}
	for k, source := range p.sources {
		w.Rated = append(w.Rated, source.Rated)
		w.SetpointError = max(w.SetpointError, p.errors[k])
	}
	return w, missing
}

// adviceFinding gives the least droop voltage at rated current that meets all limits, with the setpoint interval and the
// droop of each infeed, and judges whether the settings of the site lie inside.
func adviceFinding(s site.Site, p planned) finding.Finding {
	f := adviceJudged(s)
	if f.Verdict != finding.Fail {
		return f
	}
	if w, missing := wish(s, p); len(missing) == 0 && f.Value.Nominal > *f.Limit.High {
		f.Remedy, f.Changes = relax(s, w, Advise(w))
	} else {
		f.Remedy, f.Changes = settle(s)
	}
	return f
}

func adviceJudged(s site.Site) finding.Finding {
	p := plan(s)
	f := finding.Finding{ID: "droop.advice", Title: "Least droop voltage at rated current that meets all limits", Unit: "V",
		Basis: "ΔV_min = 2e·(1 − w_min)⁄share_tolerance; V_lo + ΔV ≤ V_set ≤ V_hi − ΔV; " + ownDerivation}
	w, missing := wish(s, p)
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	a := Advise(w)
	if w.ShareTolerance == 0 && len(w.Rated) > 1 {
		f.Limit = finding.AtMost(float64(a.Greatest))
		return f.Without(finding.Fail, "load.share_tolerance 0 % asks for a droop without bounds")
	}
	f = f.Judged(finding.Exactly(float64(a.Least)), finding.AtMost(float64(a.Greatest)), 0)
	f.Parts = adviceParts(s, p, a)
	f.Explanation = adviceWorking(s, p, w, a)
	if !a.Feasible {
		f.Verdict = finding.Fail
		f.Because = append(f.Because, fmt.Sprintf("load.share_tolerance %s and the window exclude each other: sharing needs %.5g V of droop, the window leaves %.5g V, %.5g V too little",
			remedy.Figure(float64(w.ShareTolerance), "1"), float64(a.Least), float64(a.Greatest), float64(a.Least-a.Greatest)))
		return f
	}
	outside := outsiders(s, p, a)
	if len(outside) > 0 {
		f.Verdict = finding.Fail
		f.Because = append(f.Because, outside...)
	}
	return f
}

func adviceParts(s site.Site, p planned, a Advice) []finding.Part {
	if !a.Feasible {
		return nil
	}
	parts := []finding.Part{{Name: "setpoint interval", Unit: "V", Value: finding.Value{Low: float64(a.SetpointLow),
		Nominal: float64(a.SetpointLow+a.SetpointHigh) / 2, High: float64(a.SetpointHigh)}}}
	for k, d := range a.Droop {
		parts = append(parts, finding.Part{Name: "droop " + s.Infeeds[k].Name, Unit: "V/A",
			Value: finding.Exactly(float64(d) - float64(p.sources[k].Cable))})
	}
	return parts
}

// outsiders says which infeed's own pair of setpoint and droop lies outside, and by how much. Rounding of a part in 10⁹ is
// no reason.
func outsiders(s site.Site, p planned, a Advice) []string {
	var because []string
	for k := range p.sources {
		if why := outside(p, k, a); why != "" {
			because = append(because, s.Infeeds[k].Name+": "+why)
		}
	}
	return because
}

// outside says why the pair of one infeed lies outside; "" where it lies inside.
func outside(p planned, k int, a Advice) string {
	source := p.sources[k]
	dV, slack := quantity.Voltage(source.slope()*float64(source.Rated)), 1e-9*source.NoLoad
	low, high := a.Lowest+dV, a.Highest-dV
	switch {
	case dV < a.Least-slack:
		return fmt.Sprintf("droop of %.5g V at rated current, %.5g V needed for sharing", float64(dV), float64(a.Least))
	case source.NoLoad < low-slack:
		return fmt.Sprintf("setpoint %.5g V is %.4g V too low for its droop", float64(source.NoLoad), float64(low-source.NoLoad))
	case source.NoLoad > high+slack:
		return fmt.Sprintf("setpoint %.5g V is %.4g V too high for its droop", float64(source.NoLoad), float64(source.NoLoad-high))
	}
	return ""
}

func adviceWorking(s site.Site, p planned, w Wish, a Advice) *finding.Explanation {
	e := finding.Explain("ΔV_min = 2e·(1 − w_min)⁄x", ownDerivation, "constant load current, equal droop voltage at rated current, no infeed at a limit")
	smallest, sum := math.Inf(1), "0"
	total := 0.0
	for k, i := range w.Rated {
		name := fmt.Sprintf("I_%d", k+1)
		e.Given(name, "rated current of "+s.Infeeds[k].Name, "A", float64(i))
		sum += " + " + name
		smallest, total = math.Min(smallest, float64(i)), total+float64(i)
	}
	e.Given("I_least", "the least of them", "A", smallest)
	e.Given("e", "largest setpoint error", "V", float64(w.SetpointError))
	e.Given("x", "load.share_tolerance", "1", float64(w.ShareTolerance))
	e.Given("V_source_high", "highest source voltage over tolerances", "V", float64(w.SourceHigh))
	e.Given("m", "bus.wanted_margin", "V", float64(w.LowerMargin))
	e.Given("V_least", "under-voltage trip and measurement error", "V", float64(w.LowestBus))
	e.Given("V_upper", "chopper, else over-voltage trip", "V", float64(w.UpperLimit))
	e.Given("e_bus", "measurement error of the bus voltage", "V", float64(w.UpperMargin))
	e.Given("V_pp", "ripple, peak to peak", "V", float64(w.Ripple))
	e.Step("w_min", "I_least / ("+sum+")", "1", smallest/total)
	e.Step("V_lo", "max(V_source_high + m, V_least) + e + V_pp / 2", "V", float64(a.Lowest))
	e.Step("V_hi", "V_upper - e_bus - e - V_pp / 2", "V", float64(a.Highest))
	e.Step("dV_max", "(V_hi - V_lo) / 2", "V", float64(a.Greatest))
	e.Step("dV_min", "2 * e * (1 - w_min) / x", "V", float64(a.Least))
	e.Spread("the largest setpoint error and the smallest infeed govern", nil, nil)
	return e.Done()
}

// settle is the advice as a remedy: where only setpoints lie outside, the nearest ones that lie inside; else a common
// setpoint in the middle of its interval and the least droop of each infeed.
func settle(s site.Site) (string, []finding.Change) {
	changes := nearestSetpoints(s)
	if changes == nil {
		changes = settled(s)
	}
	if changes == nil {
		return "", nil
	}
	return "set " + remedy.Phrase(changes), changes
}

// nearestSetpoints moves each setpoint that lies outside to the nearest end of its interval, where that settles it.
func nearestSetpoints(s site.Site) []finding.Change {
	var changes []finding.Change
	for k, infeed := range s.Infeeds {
		change := finding.Change{Key: "infeed.setpoint", Subject: infeed.Name, Unit: "V", Was: float64(infeed.Setpoint.Nominal)}
		settles := func(v float64) bool {
			change.Value = v
			changed, err := remedy.Apply(s, append(changes[:len(changes):len(changes)], change)...)
			if err != nil {
				return false
			}
			p := plan(changed)
			w, missing := wish(changed, p)
			return len(missing) == 0 && outside(p, k, Advise(w)) == ""
		}
		if settles(change.Was) {
			continue
		}
		w, _ := wish(s, plan(s))
		a := Advise(w)
		value, ok := remedy.Least(change.Was, float64(a.Lowest+a.Highest)/2, settles)
		if !ok {
			return nil
		}
		change.Value = value
		changes = append(changes, change)
	}
	if changed, err := remedy.Apply(s, changes...); err != nil || adviceJudged(changed).Verdict != finding.Pass {
		return nil
	}
	return changes
}

// settled takes the advice until it stands: a setpoint error in per cent grows with the setpoint.
func settled(s site.Site) []finding.Change {
	var changes []finding.Change
	original, _, _ := Sources(s)
	for range 30 {
		changed, err := remedy.Apply(s, changes...)
		if err != nil {
			return nil
		}
		p := plan(changed)
		w, missing := wish(changed, p)
		if len(missing) > 0 {
			return nil
		}
		a := Advise(w)
		before := changes
		changes = nil
		setpoint := math.Round(float64(a.SetpointLow+a.SetpointHigh)/2*10) / 10
		for k, infeed := range s.Infeeds {
			droop := math.Ceil((float64(a.Droop[k])-float64(p.sources[k].Cable))*1e6) / 1e6
			if droop < 0 {
				return nil // the cable alone drops more than the advice
			}
			changes = append(changes,
				finding.Change{Key: "infeed.setpoint", Subject: infeed.Name, Unit: "V", Was: float64(infeed.Setpoint.Nominal), Value: setpoint},
				finding.Change{Key: "infeed.droop", Subject: infeed.Name, Unit: "V/A", Was: float64(original[k].Droop), Value: droop})
		}
		if slices.Equal(before, changes) {
			if a.Feasible && len(outsiders(changed, p, a)) == 0 {
				return changes
			}
			return nil
		}
	}
	return nil
}

// relax is the remedy where no droop shares well enough inside the window: the least share tolerance that leaves room, with
// the settings for it, or the setpoint error that would.
func relax(s site.Site, w Wish, a Advice) (string, []finding.Change) {
	if a.Greatest <= 0 {
		return fmt.Sprintf("no droop fits: the source with its margin (%.5g V) and the upper limit (%.5g V) leave no room for errors and ripple, %.4g V short",
			float64(a.Lowest), float64(a.Highest), float64(a.Lowest-a.Highest)), nil
	}
	tolerance := finding.Change{Key: "load.share_tolerance", Unit: "1", Was: float64(w.ShareTolerance)}
	exact, exactChanges := exacter(s, w)
	settles := func(x float64) bool {
		tolerance.Value = x
		changed, err := remedy.Apply(s, tolerance)
		return err == nil && settled(changed) != nil
	}
	limit := math.Max(tolerance.Was, 1e-3)
	for limit < 1 && !settles(limit) { // not at once to 100 %: there the cables alone may drop more than the advice
		limit = math.Min(1, limit*1.1)
	}
	value, ok := remedy.Least(tolerance.Was, limit, settles)
	if !ok {
		return exact, exactChanges
	}
	tolerance.Value = value
	changed, err := remedy.Apply(s, tolerance)
	if err != nil {
		return "", nil
	}
	changes := append([]finding.Change{tolerance}, settled(changed)...)
	text := "accept less exact sharing: set " + remedy.Phrase(changes)
	if exact != "" {
		text += "; or " + exact
	}
	return text, changes
}

// exacter is the remedy of setpoints that are more exact: the greatest error, the same in volts for all, for which the
// advice has room, with the settings for it.
func exacter(s site.Site, w Wish) (string, []finding.Change) {
	errors := func(e float64) []finding.Change {
		var changes []finding.Change
		for _, k := range s.Infeeds {
			was := float64(k.SetpointError.Of(k.Setpoint.Nominal))
			changes = append(changes, finding.Change{Key: "infeed.setpoint_error", Subject: k.Name, Unit: "V", Was: was, Value: math.Min(was, e)})
		}
		return changes
	}
	settles := func(e float64) bool {
		changed, err := remedy.Apply(s, errors(e)...)
		return err == nil && settled(changed) != nil
	}
	limit := float64(w.SetpointError)
	for limit > 1e-3*float64(w.SetpointError) && !settles(limit) {
		limit *= 0.9
	}
	e, ok := remedy.Least(float64(w.SetpointError), limit, settles)
	if !ok {
		return "", nil
	}
	changes := errors(e)
	changed, err := remedy.Apply(s, changes...)
	if err != nil {
		return "", nil
	}
	changes = append(changes, settled(changed)...)
	return "make the setpoints more exact: set " + remedy.Phrase(changes), changes
}
