package window

import (
	"fmt"
	"math"

	"chargehand/commission/corner"
	"chargehand/commission/finding"
	"chargehand/commission/remedy"
	"chargehand/commission/site"
)

// fullPowerFinding judges the least rest voltage at which the converter gives its rated power within the current limits of
// converter and source and without saturating a choke, against the bottom of the window.
func fullPowerFinding(s site.Site) finding.Finding {
	return remedy.Offer(s, fullPower, func(_ finding.Finding, passes func(site.Site) bool) (string, []finding.Change) {
		return easeBottom(s, passes)
	})
}

func fullPower(s site.Site) finding.Finding {
	f := finding.Finding{
		ID: "window.full-power", Title: "Least rest voltage with full power", Unit: "V",
		Basis: "E = P⁄(η·I) + R_i·I with I the least of the ratings, raised until no choke saturates at bus-high; " + circuitTheory,
	}
	d, axes, missing := chokeAxes(s)
	limit, who, more := currentLimit(s, false)
	missing.Add(more...)
	missing.Need("converter.choke_saturation", converter(s).ChokeSaturation.IsGiven())
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	d.charges = false
	saturation := float64(s.Converter.ChokeSaturation.Nominal)
	least := func(x []float64) float64 { return d.leastRest(limit, saturation, x[0], x[1]) }
	result := corner.Over(axes, least)
	permitted := finding.AtMost(float64(s.Source.LowestRest()))
	if math.IsNaN(result.Low) {
		f = f.Without(finding.Fail, "a choke saturates at full power at every rest voltage of the source below the bus")
		f.Limit = permitted
		return f
	}
	f = f.Judged(finding.ValueOf(result.Ends()), permitted, 0)
	f.Because = append(f.Because, d.governs(result.Nominal, axes, limit, who))
	if part, known := chargeAt(s, f.Value); known {
		f.Parts = append(f.Parts, part)
	}
	f.Explanation = d.fullPowerWorking(f, axes, limit, result)
	return f
}

// leastRest is the least rest voltage with full power; NaN where the choke saturates at every rest voltage up to the bus.
func (d chokeDuty) leastRest(limit, saturation, resistance, choke float64) float64 {
	e := d.restAtCurrent(limit, resistance)
	fits := func(e float64) bool {
		peak, _ := d.peak(e, resistance, choke)
		return peak <= saturation
	}
	if e >= d.bus || fits(e) { // a rest voltage above the bus is no operating point, and says so by its size
		return e
	}
	const steps = 200
	step := (d.bus - e) / steps
	for k := 1; k <= steps; k++ {
		if next := e + float64(k)*step; fits(next) {
			return firstFit(next-step, next, fits)
		}
	}
	return math.NaN()
}

// restAtCurrent is P ⁄ (η·I) + R_i·I; with a current beyond √(P ⁄ (η·R_i)) more of it would help no longer, and the least
// rest voltage with any operating point, 2·√(R_i·P ⁄ η), stands.
func (d chokeDuty) restAtCurrent(limit, resistance float64) float64 {
	power := d.power / d.efficiency
	if resistance*limit*limit > power {
		return 2 * math.Sqrt(resistance*power)
	}
	return power/limit + resistance*limit
}

func firstFit(fails, fit float64, fits func(float64) bool) float64 {
	for range 50 {
		middle := fails + (fit-fails)/2
		if fits(middle) {
			fit = middle
		} else {
			fails = middle
		}
	}
	return fit
}

func (d chokeDuty) governs(e float64, axes []corner.Axis, limit float64, who string) string {
	if e > d.restAtCurrent(limit, axes[0].Nominal)*(1+1e-12) {
		return "converter.choke_saturation governs"
	}
	return fmt.Sprintf("%s governs, %.4g A", who, limit)
}

func (d chokeDuty) fullPowerWorking(f finding.Finding, axes []corner.Axis, limit float64, result corner.Spread) *finding.Explanation {
	w := finding.Explain(f.Basis, circuitTheory, "efficiency at rated power; discharging")
	w.Given("P_rated", "rated power, on the bus", "W", d.power)
	w.Given("eta", "efficiency", "1", d.efficiency)
	w.Given("I", "least of the current ratings of converter and source", "A", limit)
	w.Given("R_i", "internal resistance of the source", "Ω", axes[0].Nominal)
	current := d.restAtCurrent(limit, axes[0].Nominal)
	if axes[0].Nominal*limit*limit > d.power/d.efficiency {
		w.Step("E_current", "2 * sqrt(R_i * P_rated / eta)", "V", current)
	} else {
		w.Step("E_current", "P_rated / (eta * I) + R_i * I", "V", current)
	}
	saturation := 0.0
	if result.Nominal > current {
		saturation = result.Nominal
	}
	w.Given("E_sat", "least rest voltage at which no choke saturates, by halving; 0 where it does not bind", "V", saturation)
	w.Step("E", "max(E_current, E_sat)", "V", result.Nominal)
	w.Spread(corner.DescribeEnds(axes, result), corner.Names(axes), result.Moves)
	return w.Done()
}

// chargeAt is the state of charge at which the source rests at v, clamped to the ends of its table.
func chargeAt(s site.Site, v finding.Value) (finding.Part, bool) {
	nominal, known := stateOfCharge(s, v.Nominal)
	if !known {
		return finding.Part{}, false
	}
	low, _ := stateOfCharge(s, v.Low)
	high, _ := stateOfCharge(s, v.High)
	return finding.Part{Name: "state of charge", Unit: "1", Value: finding.Value{Low: low, Nominal: nominal, High: high}}, true
}
