package droop

import (
	"fmt"
	"math"

	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/remedy"
	"chargehand/commission/site"
)

// lostInfeeds judge the bus at load.power after the loss of each infeed in turn: inside the thresholds, and none of the
// others at its limit.
func lostInfeeds(s site.Site) []finding.Finding {
	if len(s.Infeeds) == 0 {
		return []finding.Finding{lostInfeed(s, plan(s), -1)}
	}
	var all []finding.Finding
	for k := range s.Infeeds {
		all = append(all, lostInfeedFinding(s, k))
	}
	return all
}

// lostInfeedFinding is the finding for the infeed with index lost.
func lostInfeedFinding(s site.Site, lost int) finding.Finding {
	judge := func(s site.Site) finding.Finding { return lostInfeed(s, plan(s), lost) }
	return remedy.Offer(s, judge, func(f finding.Finding, passes func(site.Site) bool) (string, []finding.Change) {
		sources := append([]Source(nil), plan(s).sources...)
		sources[lost].Offline = true
		return afterLoss(s, sources, f.Limit, passes)
	})
}

func lostInfeed(s site.Site, p planned, lost int) finding.Finding {
	f := finding.Finding{ID: "droop.lost-infeed", Title: "Bus after losing an infeed", Unit: "V", Guards: true,
		Basis: "highest root of ΣI_k(V) = P⁄V without it, setpoints ± error; nobody at a limit; " + circuitTheory}
	if lost >= 0 {
		f.Subject = s.Infeeds[lost].Name
	}
	limit, more := thresholds(s)
	missing := p.missing
	missing.Add(more...)
	missing.Need("load.power", loadOf(s).Power.IsGiven())
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	sources := append([]Source(nil), p.sources...)
	sources[lost].Offline = true
	b := bandOf(sources, p.errors, Load{Power: loadOf(s).Power.High})
	if b.status != Found {
		f = f.Without(finding.Fail, b.status.why("at load.power without "+f.Subject))
		f.Limit = limit
		most, _ := GreatestPower(sources, Load{})
		f.Because = append(f.Because, "the others carry at most "+quantity.Engineering(float64(most), "W", 4))
		return f
	}
	b.value.Nominal = bandOf(sources, p.errors, Load{Power: loadOf(s).Power.Nominal}).value.Nominal
	f = f.Judged(b.value, limit, 0)
	f = withLoading(s, p, f, sources)
	w := finding.Explain(f.Basis, circuitTheory, "steady state after the loss; the step itself is not judged")
	workings(w, sources, names(s), Load{Power: loadOf(s).Power.Nominal}, "W")
	p.spread(w, s, errorsGovern, busAt(Load{Power: loadOf(s).Power.Nominal}, lost))
	f.Explanation = w.Done()
	return f
}

// withLoading adds the highest loading of those that remain, and fails the finding where one stands at its limit in any
// corner. An infeed carries most with its own setpoint high against all others low, and least the other way round.
func withLoading(s site.Site, p planned, f finding.Finding, sources []Source) finding.Finding {
	var loading finding.Value
	work := make([]Source, 0, len(sources))
	l := Load{Power: loadOf(s).Power.High}
	for k := range sources {
		if sources[k].Offline {
			continue
		}
		carried := func(own quantity.Voltage) float64 {
			work = shifted(work, sources, p.errors, -own)
			work[k].NoLoad = sources[k].NoLoad + own*p.errors[k]
			bus, status := balance(work, l)
			if status != Found {
				return math.Inf(1)
			}
			return work[k].current(bus) / float64(sources[k].Rated)
		}
		high := carried(+1)
		loading.Low, loading.Nominal = math.Max(loading.Low, carried(-1)), math.Max(loading.Nominal, carried(0))
		loading.High = math.Max(loading.High, high)
		if high >= 1 {
			f.Verdict = finding.Fail
			f.Because = append(f.Because, s.Infeeds[k].Name+" stands at its limit")
		}
	}
	f.Parts = append(f.Parts, finding.Part{Name: "highest loading of the others", Unit: "1", Value: loading})
	return f
}

// afterLoss is the remedy of shedding load: the greatest load.power that passes without the lost infeed, and the rating
// that the others would need instead.
func afterLoss(s site.Site, sources []Source, limit finding.Limit, passes func(site.Site) bool) (string, []finding.Change) {
	text, changes := easeLoad(s, false, passes)
	if text == "" {
		text = "no load passes without it: the setpoints of the others, or another infeed, are needed"
	} else {
		text = "shed load when it is lost, " + text
	}
	if ratedSum(sources) == 0 {
		return "a second infeed is needed: without this one the bus goes dead", nil
	}
	if limit.Low != nil && *limit.Low > 0 {
		need := quantity.Current(float64(loadOf(s).Power.High) / *limit.Low)
		if short := need - ratedSum(sources); short > 0 {
			text += fmt.Sprintf("; the others lack up to %s of rated current", quantity.Engineering(float64(short), "A", 4))
		}
	}
	return text, changes
}

// regenerationFinding judges the bus at full regeneration. With the source refusing charge the commissioned converter takes
// nothing back; what the bus does then is a part, and no reason to fail: the chopper is there for it, or the load must
// not regenerate.
func regenerationFinding(s site.Site) finding.Finding {
	return remedy.Offer(s, regeneration, func(f finding.Finding, passes func(site.Site) bool) (string, []finding.Change) {
		if f.State == finding.Finite {
			if text, changes := shiftSetpoints(s, f, passes); changes != nil {
				return text, changes
			}
		}
		return easeLoad(s, true, passes)
	})
}

func regeneration(s site.Site) finding.Finding {
	f := finding.Finding{ID: "droop.regeneration", Title: "Bus at full regeneration", Unit: "V", Guards: true,
		Basis: "highest root of ΣI_k(V) = −P_regen⁄V, setpoints ± error; " + circuitTheory}
	p := plan(s)
	upper, _, more := upperLimit(s)
	missing := p.missing
	missing.Add(more...)
	missing.Need("load.regeneration", loadOf(s).Regeneration.IsGiven())
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	limit := finding.AtMost(upper)
	back := Load{Power: -loadOf(s).Regeneration.High}
	b := bandOf(p.sources, p.errors, back)
	refused, why := refusingCharge(s, p, back)
	if b.status != Found {
		f = f.Without(finding.Fail, b.status.why("at full regeneration"))
		f.Limit, f.Parts = limit, refused
		return f
	}
	b.value.Nominal = bandOf(p.sources, p.errors, Load{Power: -loadOf(s).Regeneration.Nominal}).value.Nominal
	f = f.Judged(b.value, limit, 0)
	f.Parts = refused
	f.Because = append(f.Because, why)
	w := finding.Explain(f.Basis, circuitTheory, "steady state; nobody switches off")
	workings(w, p.sources, names(s), Load{Power: -loadOf(s).Regeneration.Nominal}, "W")
	p.spread(w, s, errorsGovern, busAt(Load{Power: -loadOf(s).Regeneration.Nominal}, -1))
	f.Explanation = w.Done()
	return f
}

// refusingCharge is the bus with the commissioned converter taking nothing back: held by others, by the chopper, or by
// nobody.
func refusingCharge(s site.Site, p planned, back Load) ([]finding.Part, string) {
	part := finding.Part{Name: "with the source refusing charge", Unit: "V", Value: finding.NoValue()}
	sources := append([]Source(nil), p.sources...)
	sources[0].Least = 0
	b := bandOf(sources, p.errors, back)
	upper, name, _ := upperLimit(s)
	if b.status == Found && b.value.High <= upper {
		part.Value = b.value
		return []finding.Part{part}, "with the source refusing charge the other infeeds absorb it"
	}
	c, power := s.Bus.Chopper, float64(loadOf(s).Regeneration.High)
	switch {
	case c == nil || !c.Power.IsGiven():
		return []finding.Part{part}, "with the source refusing charge nobody absorbs it below " + name
	case float64(c.Power.Nominal) < power:
		return []finding.Part{part}, fmt.Sprintf("with the source refusing charge the chopper must take %s and takes %s", remedy.Figure(power, "W"), remedy.Figure(float64(c.Power.Nominal), "W"))
	}
	part.Value = finding.Exactly(float64(c.On.Nominal))
	why := "with the source refusing charge the chopper takes " + remedy.Figure(power, "W")
	if c.Duration.IsGiven() {
		why += ", for " + remedy.Figure(float64(c.Duration.Nominal), "s")
	}
	return []finding.Part{part}, why
}
