package discharge

import (
	"math"

	"chargehand/commission/corner"
	"chargehand/commission/finding"
)

const (
	formulaTime = "t = R_b*(C_l*ln(V_1/E) + (C_l + C_f)*ln(E/V_2))"
	validEnergy = "all banks, isolated ones included, at the highest steady bus voltage"
	validTime   = "no load, every bleeder whole, converter stopped and every infeed off; a calculated time never stands for absence of voltage"
)

func (a *assessment) explain(formula, source, validity string) *finding.Working {
	w := finding.Explain(formula, source, validity)
	w.Given("V_1", "highest steady bus voltage", "V", float64(a.from))
	w.Given("C_l", "all banks", "F", a.axes[axisLink].Nominal)
	w.Given("C_f", "filter at the star point", "F", a.axes[axisFilter].Nominal)
	w.Given("E", "rest voltage of the source, highest, where the filter stands", "V", float64(a.site.Source.HighestRest()))
	return w
}

func (a *assessment) over(w *finding.Working, s corner.Spread) *finding.Explanation {
	names, moves := corner.Shares(a.axes, a.members, s.Moves)
	w.Spread("greatest with "+corner.Describe(a.axes, s.AtHigh), names, moves)
	return w.Done()
}

func (a *assessment) explainEnergy() *finding.Explanation {
	w := a.explain("W = C_l*V_1^2/2 + C_f*E^2/2", basisEnergy, validEnergy)
	w.Step("W", "C_l*V_1^2/2 + C_f*E^2/2", "J", a.spreads[ofEnergy].Nominal)
	return a.over(w, a.spreads[ofEnergy])
}

func (a *assessment) explainTime() *finding.Explanation {
	if a.from <= a.touch() {
		return a.explainNoTime()
	}
	w := a.explain(formulaTime, basisTime, validTime)
	w.Given("V_2", "touch-safe voltage", "V", float64(a.touch()))
	conductance := 0.0
	if r := a.axes[axisBleeder].Nominal; r > 0 {
		conductance = 1 / r
	}
	w.Given("G_b", "conductance of all bleeders in parallel", "1/Ω", conductance)
	joint, level := "V_1", float64(a.from)
	if a.axes[axisFilter].Nominal > 0 {
		joint = "min(V_1, max(E, V_2))"
		level = math.Min(level, math.Max(float64(a.site.Source.HighestRest()), float64(a.touch())))
	}
	w.Step("V_j", joint, "V", level)
	w.Step("t", "(C_l*ln(V_1/V_j) + (C_l + C_f)*ln(V_j/V_2))/G_b", "s", a.spreads[ofTime].Nominal)
	return a.over(w, a.spreads[ofTime])
}

// explainNoTime is the working where the bus never stands above the touch-safe voltage: the formula, which is that of a
// fall, would give a time below 0.
func (a *assessment) explainNoTime() *finding.Explanation {
	w := a.explain(formulaTime, basisTime, "V_1 does not stand above V_2, so there is nothing to wait for; "+validTime)
	w.Given("V_2", "touch-safe voltage", "V", float64(a.touch()))
	w.Step("t", "0", "s", a.spreads[ofTime].Nominal)
	return a.over(w, a.spreads[ofTime])
}
