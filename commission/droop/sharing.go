package droop

import (
	"fmt"
	"math"

	"chargehand/commission/finding"
	"chargehand/commission/remedy"
	"chargehand/commission/site"
)

const sharingBasis = "|I_k − w_k·ΣI|⁄I_rated,k over setpoints ± error, own error against all others; " + circuitTheory

// sharingFinding judges the worst deviation of any infeed from its share by rating: at load.power among all, at full
// regeneration among those that regenerate.
func sharingFinding(s site.Site) finding.Finding {
	return remedy.Offer(s, sharing, func(f finding.Finding, passes func(site.Site) bool) (string, []finding.Change) {
		if f.State == finding.None {
			if text, changes := easeLoad(s, true, passes); changes != nil {
				return text, changes
			}
			return easeLoad(s, false, passes)
		}
		return moreDroop(s, passes)
	})
}

func sharing(s site.Site) finding.Finding {
	f := finding.Finding{ID: "droop.share", Title: "Worst deviation from the share by rating", Unit: "1",
		Basis: sharingBasis}
	p := plan(s)
	missing := p.missing
	missing.Need("load.power", loadOf(s).Power.IsGiven())
	missing.Need("load.regeneration", loadOf(s).Regeneration.IsGiven())
	missing.Need("load.share_tolerance", loadOf(s).ShareTolerance.IsGiven())
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	limit := finding.AtMost(float64(loadOf(s).ShareTolerance.Nominal))
	loaded := Load{Power: loadOf(s).Power.Nominal}
	forward := Share(p.sources, p.errors, loaded)
	back := regenerating(s, p, forward)
	for k, one := range []Sharing{forward, back} {
		if one.Status != Found {
			f = f.Without(finding.Fail, one.Status.why([]string{"at load.power", "at full regeneration"}[k]))
			f.Limit = limit
			return f
		}
	}
	there, here := forward.WorstDeviation(), back.WorstDeviation()
	f = f.Judged(finding.Value{Low: math.Max(there.Low, here.Low), Nominal: math.Max(there.Nominal, here.Nominal),
		High: math.Max(there.High, here.High)}, limit, 0)
	f.Parts = deviationParts(s, forward)
	f.Explanation = sharingWorking(s, p, forward, back)
	return f
}

// regenerating is the sharing at full regeneration among those that regenerate; where nobody does, or nothing comes back,
// there is none to judge, and the other one stands for it.
func regenerating(s site.Site, p planned, otherwise Sharing) Sharing {
	back := append([]Source(nil), p.sources...)
	any := false
	for k := range back {
		back[k].Offline = back[k].Least >= 0
		any = any || !back[k].Offline
	}
	if !any || loadOf(s).Regeneration.Nominal == 0 {
		return otherwise
	}
	return Share(back, p.errors, Load{Power: -loadOf(s).Regeneration.Nominal})
}

func deviationParts(s site.Site, sharing Sharing) []finding.Part {
	var parts []finding.Part
	for k, d := range sharing.Deviation {
		parts = append(parts, finding.Part{Name: "deviation of " + s.Infeeds[k].Name + " at load.power", Unit: "1",
			Value: finding.Value{Low: float64(d.Low), Nominal: float64(d.Nominal), High: float64(d.High)}})
	}
	return parts
}

// sharingWorking shows the nominal deviation of the infeed that is worst with exact setpoints.
func sharingWorking(s site.Site, p planned, forward, back Sharing) *finding.Explanation {
	w := finding.Explain(sharingBasis, circuitTheory, "steady state; equal errors of the setpoint in the adverse sense; cables included")
	worst, sources, l := 0, p.sources, Load{Power: loadOf(s).Power.Nominal}
	one := forward
	if back.WorstDeviation().Nominal > forward.WorstDeviation().Nominal {
		one, l = back, Load{Power: -loadOf(s).Regeneration.Nominal}
		sources = append([]Source(nil), p.sources...)
		for k := range sources {
			sources[k].Offline = sources[k].Least >= 0
		}
	}
	for k, d := range one.Deviation {
		if math.Abs(float64(d.Nominal)) > math.Abs(float64(one.Deviation[worst].Nominal)) || sources[worst].Offline {
			worst = k
		}
	}
	v := workings(w, sources, names(s), l, "W")
	n := worst + 1
	own := sources[worst]
	rated, current := float64(own.Rated), own.current(v)
	w.Given("I_rated", "rated current of "+s.Infeeds[worst].Name, "A", rated)
	w.Given("I_rated_all", "rated currents together", "A", float64(ratedSum(sources)))
	if own.stateAt(v) == Free {
		w.Step("I", fmt.Sprintf("(V0_%d - V) / r_%d", n, n), "A", current)
	} else {
		w.Step("I", fmt.Sprintf("I_%d", n), "A", current)
	}
	w.Step("I_all", "P / V", "A", float64(l.Power)/v)
	w.Step("deviation", "abs(I - I_rated / I_rated_all * I_all) / I_rated", "1", math.Abs(current-rated/float64(ratedSum(sources))*float64(l.Power)/v)/rated)
	p.spread(w, s, "greatest with one setpoint at its error against all others", func(changed []Source) float64 {
		moved := append([]Source(nil), changed...)
		for k := range moved {
			moved[k].Offline = sources[k].Offline
		}
		bus, _ := balance(moved, l)
		return deviationOf(moved, worst, bus)
	})
	return w.Done()
}

// deviationOf is how far an infeed stands from its share by rating at a bus voltage, in terms of its own rating.
func deviationOf(sources []Source, k int, bus float64) float64 {
	sum := 0.0
	for _, s := range sources {
		if !s.Offline {
			sum += s.current(bus)
		}
	}
	rated := float64(sources[k].Rated)
	return (sources[k].current(bus) - rated/float64(ratedSum(sources))*sum) / rated
}

// moreDroop is the remedy of more droop on every infeed alike: the least factor with which the sharing passes.
func moreDroop(s site.Site, passes func(site.Site) bool) (string, []finding.Change) {
	sources, _, missing := Sources(s)
	if len(missing) > 0 {
		return "", nil
	}
	scaled := func(factor float64) []finding.Change {
		var changes []finding.Change
		for k, infeed := range s.Infeeds {
			was := float64(sources[k].Droop)
			changes = append(changes, finding.Change{Key: "infeed.droop", Subject: infeed.Name, Unit: "V/A", Was: was, Value: was * factor})
		}
		return changes
	}
	enough := func(factor float64) bool {
		changed, err := remedy.Apply(s, scaled(factor)...)
		return err == nil && passes(changed)
	}
	limit := 1.0
	for limit < 1000 && !enough(limit) {
		limit *= 1.1
	}
	factor, ok := remedy.Least(1, limit, enough)
	if !ok {
		return "no droop shares that well: the cables, the setpoint errors or the limits of the infeeds stand against it", nil
	}
	changes := scaled(factor)
	text := "set " + remedy.Phrase(changes)
	changed, err := remedy.Apply(s, changes...)
	if err == nil {
		if r := busRange(changed); r.Verdict == finding.Fail {
			text += "; but then droop.bus-range fails"
			if r.State == finding.Finite {
				text += ", " + remedy.Figure(-r.Margin, "V") + " outside"
			}
		}
	}
	return text, changes
}
