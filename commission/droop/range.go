package droop

import (
	"math"

	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/remedy"
	"chargehand/commission/site"
)

// busRangeFinding judges the operating voltages of the bus: the lowest, the one at load.power with exact setpoints, and the highest
// of load.power, no load and full regeneration, setpoints at their errors.
func busRangeFinding(s site.Site) finding.Finding {
	return remedy.Offer(s, busRange, func(f finding.Finding, passes func(site.Site) bool) (string, []finding.Change) {
		if f.State == finding.None {
			if text, changes := easeLoad(s, true, passes); changes != nil {
				return text, changes
			}
			return easeLoad(s, false, passes)
		}
		return shiftSetpoints(s, f, passes)
	})
}

func busRange(s site.Site) finding.Finding {
	f := finding.Finding{ID: "droop.bus-range", Title: "Operating voltage of the bus", Unit: "V", Guards: true,
		Basis: "highest root of ΣI_k(V) = P⁄V at load.power, no load and −load.regeneration, setpoints ± error; " + circuitTheory}
	p := plan(s)
	limit, more := thresholds(s)
	missing := p.missing
	missing.Add(more...)
	missing.Need("load.power", loadOf(s).Power.IsGiven())
	missing.Need("load.regeneration", loadOf(s).Regeneration.IsGiven())
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	loads := []Load{{Power: loadOf(s).Power.High}, {}, {Power: -loadOf(s).Regeneration.High}}
	what := []string{"at load.power", "without load", "at full regeneration"}
	value := finding.Value{Low: math.Inf(1), High: math.Inf(-1)}
	for k, l := range loads {
		b := bandOf(p.sources, p.errors, l)
		if b.status != Found {
			f = f.Without(finding.Fail, b.status.why(what[k]))
			f.Limit = limit
			return f
		}
		value.Low, value.High = math.Min(value.Low, b.value.Low), math.Max(value.High, b.value.High)
	}
	nominal := Load{Power: loadOf(s).Power.Nominal}
	value.Nominal = bandOf(p.sources, p.errors, nominal).value.Nominal
	f = f.Judged(value, limit, 0)
	w := finding.Explain(f.Basis, circuitTheory, "steady state; bleeders and auxiliary supply neglected; cables at their temperature")
	workings(w, p.sources, names(s), nominal, "W")
	p.spread(w, s, errorsGovern, busAt(nominal, -1))
	f.Explanation = w.Done()
	return f
}

// shiftSetpoints is the remedy of moving every setpoint by the same voltage until the finding passes; where the limits on
// both sides exclude each other it says by how much.
func shiftSetpoints(s site.Site, f finding.Finding, passes func(site.Site) bool) (string, []finding.Change) {
	shift := func(by float64) []finding.Change {
		var changes []finding.Change
		for _, k := range s.Infeeds {
			was := float64(k.Setpoint.Nominal)
			changes = append(changes, finding.Change{Key: "infeed.setpoint", Subject: k.Name, Unit: "V", Was: was, Value: was + by})
		}
		return changes
	}
	try := func(by float64) bool {
		changed, err := remedy.Apply(s, shift(by)...)
		return err == nil && passes(changed)
	}
	by, ok := remedy.Least(0, firstPassing(f, try), try)
	if !ok {
		return excluded(f), nil
	}
	changes := shift(by)
	return "move every setpoint: set " + remedy.Phrase(changes), changes
}

// firstPassing looks for a shift that passes in steps of a hundredth of the room, towards the side that helps.
func firstPassing(f finding.Finding, try func(float64) bool) float64 {
	room := 0.2 * math.Abs(f.Value.Nominal)
	if f.Limit.High != nil && f.Value.High > *f.Limit.High {
		room = -room
	}
	for k := 1; k <= 100; k++ {
		if by := room * float64(k) / 100; try(by) {
			return by
		}
	}
	return 0
}

func excluded(f finding.Finding) string {
	if f.Limit.Low == nil || f.Limit.High == nil {
		return "no setpoint passes: less load or another droop is needed"
	}
	over := (f.Value.High - f.Value.Low) - (*f.Limit.High - *f.Limit.Low)
	if over <= 0 {
		return "no common shift of the setpoints passes: less load or another droop is needed"
	}
	return "the lower and the upper limit exclude each other: the bus moves over " + quantity.Engineering(f.Value.High-f.Value.Low, "V", 4) +
		", " + quantity.Engineering(over, "V", 4) + " more than lies between them; less droop is needed"
}

// easeLoad is the remedy of less load, or of less regeneration: the greatest power with which the finding passes.
func easeLoad(s site.Site, regeneration bool, passes func(site.Site) bool) (string, []finding.Change) {
	change := finding.Change{Key: "load.power", Unit: "W", Was: float64(loadOf(s).Power.Nominal)}
	if regeneration {
		change.Key, change.Was = "load.regeneration", float64(loadOf(s).Regeneration.Nominal)
	}
	change, ok := remedy.LeastChange(s, change, 0, passes)
	if !ok {
		return "", nil
	}
	changes := []finding.Change{change}
	return "limit the load: set " + remedy.Phrase(changes), changes
}

// ratedSum is the sum of the rated currents of those online.
func ratedSum(sources []Source) quantity.Current {
	var sum quantity.Current
	for _, s := range sources {
		if !s.Offline {
			sum += s.Rated
		}
	}
	return sum
}
