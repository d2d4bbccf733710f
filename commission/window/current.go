package window

import (
	"fmt"
	"math"

	"chargehand/commission/corner"
	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/remedy"
	"chargehand/commission/site"
)

// SourceCurrent is the source current at the bottom of the window, at rated power, over the tolerance of the internal
// resistance; or the keys that are missing for it. It is NaN in a corner where the source cannot give that power.
func SourceCurrent(s site.Site) (quantity.Spread[quantity.Current], finding.Missing) {
	axes, missing := powerAxes(s)
	if len(missing) > 0 {
		return quantity.Spread[quantity.Current]{}, missing
	}
	v := corner.Over(axes, currentAtBottom(s))
	return quantity.Spread[quantity.Current]{Low: quantity.Current(v.Low), Nominal: quantity.Current(v.Nominal), High: quantity.Current(v.High)}, nil
}

// powerAxes are internal resistance, rated power and efficiency, in this order.
func powerAxes(s site.Site) ([]corner.Axis, finding.Missing) {
	var missing finding.Missing
	c := converter(s)
	missing.Need("source.internal_resistance", s.Source.InternalResistance.IsGiven())
	missing.Need("converter.rated_power", c.RatedPower.IsGiven())
	missing.Need("converter.efficiency", c.Efficiency.Nominal > 0)
	if s.Source.LowestRest() <= 0 {
		missing.Add(restKeys(s, -1)...)
	}
	return []corner.Axis{internal(s), corner.Of("converter.rated_power", c.RatedPower), corner.Of("converter.efficiency", c.Efficiency)}, missing
}

func currentAtBottom(s site.Site) func(x []float64) float64 {
	e := float64(s.Source.LowestRest())
	return func(x []float64) float64 {
		i, _ := currentAtPower(e, x[0], x[1]/x[2])
		return i
	}
}

// currentFinding judges the source current at the bottom of the window against converter, source and bypass.
func currentFinding(s site.Site) finding.Finding {
	return remedy.Offer(s, current, func(_ finding.Finding, passes func(site.Site) bool) (string, []finding.Change) {
		return easeBottom(s, passes)
	})
}

func current(s site.Site) finding.Finding {
	f := finding.Finding{
		ID: "window.current", Title: "Source current at the bottom of the window", Unit: "A", Guards: true,
		Basis: "I = 2P⁄(E_low + √(E_low² − 4·R_i·P)), P = rated_power⁄efficiency; " + circuitTheory,
	}
	axes, missing := powerAxes(s)
	limit, who, more := currentLimit(s, true)
	missing.Add(more...)
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	result := corner.Over(axes, currentAtBottom(s))
	if math.IsNaN(result.Low) {
		f = f.Without(finding.Fail, fmt.Sprintf("at %.5g V the source cannot give the rated power at all: it has no operating point", float64(s.Source.LowestRest())))
		f.Limit = finding.AtMost(limit)
		return f
	}
	f = f.Judged(finding.ValueOf(result.Ends()), finding.AtMost(limit), 0)
	f.Because = append(f.Because, who+" governs the limit")
	f.Explanation = currentWorking(f, s, axes, result)
	return f
}

// easeBottom offers both ways out at the bottom of the window: an earlier end of the discharge, else less power.
func easeBottom(s site.Site, passes func(site.Site) bool) (string, []finding.Change) {
	text, changes := liftSource(s, passes)
	less, lessChanges := lowerPower(s, passes)
	switch {
	case text == "":
		return less, lessChanges
	case less != "":
		text += "; or " + less
	}
	return text, changes
}

// currentLimit is the least of what converter, source and, with bypass, the bypass carry, and whose it is.
func currentLimit(s site.Site, withBypass bool) (limit float64, who string, missing finding.Missing) {
	limit = math.Inf(1)
	take := func(key string, e quantity.Entered[quantity.Current]) {
		missing.Need(key, e.IsGiven())
		if v := float64(e.Nominal); v < limit {
			limit, who = v, key
		}
	}
	take("converter.rated_current", converter(s).RatedCurrent)
	take("source.max_discharge_current", s.Source.MaxDischargeCurrent)
	if withBypass {
		var b site.Bypass
		if s.Bypass != nil {
			b = *s.Bypass
		}
		take("bypass.carrying_current", b.CarryingCurrent)
	}
	return limit, who, missing
}

func currentWorking(f finding.Finding, s site.Site, axes []corner.Axis, result corner.Spread) *finding.Explanation {
	w := finding.Explain(f.Basis, circuitTheory, "steady state; efficiency at rated power")
	w.Given("E_low", "rest voltage at the bottom", "V", float64(s.Source.LowestRest()))
	w.Given("R_i", "internal resistance of the source", "Ω", axes[0].Nominal)
	w.Given("P_rated", "rated power, on the bus", "W", axes[1].Nominal)
	w.Given("eta", "efficiency", "1", axes[2].Nominal)
	power := axes[1].Nominal / axes[2].Nominal
	w.Step("P", "P_rated / eta", "W", power)
	e := float64(s.Source.LowestRest())
	w.Step("root", "sqrt(E_low^2 - 4 * R_i * P)", "V", math.Sqrt(e*e-4*axes[0].Nominal*power))
	w.Step("I", "2 * P / (E_low + root)", "A", result.Nominal)
	w.Spread(corner.DescribeEnds(axes, result), corner.Names(axes), result.Moves)
	return w.Done()
}
