package precharge

import (
	"chargehand/commission/corner"
	"chargehand/commission/finding"
)

const (
	validCharge  = "constant resistances and capacitances, diode drop neglected; with a load on the bus the final voltage is lower"
	validCoupled = "found by integrating source and link together (Runge-Kutta, a twentieth of the time constant); no closed form"
	validRating  = "single pulses from the stated temperature; the maker's own conditions prevail"
	validThermal = "one node without a hot spot; for times far below its time constant the pulse rating governs"
)

// working writes one finding's calculation down with the nominal numbers of the site.
type working struct {
	*finding.Working
	a *assessment
	c Circuit
	s solution
}

func (a *assessment) explain(formula, source, validity string) working {
	c := a.circuit(a.nominal())
	w := working{finding.Explain(formula, source, validity), a, c, c.solve()}
	w.Given("E", "rest voltage of the source, highest", "V", w.s.e)
	w.Given("R_p", "pre-charge resistor", "Ω", w.s.rp)
	w.Given("R_i", "internal resistance of the source", "Ω", a.members[axisSeries][0].Nominal)
	w.Given("R_x", "choke resistance, phases in parallel", "Ω", w.s.r-w.s.rp-a.members[axisSeries][0].Nominal)
	w.Step("R", "R_p + R_i + R_x", "Ω", w.s.r)
	return w
}

// tau adds resistance, capacitance, time constant and final voltage without load.
func (w working) tau() {
	w.Given("C_l", "capacitance that is charged", "F", w.s.c)
	series := w.s.tau / w.s.re
	switch {
	case w.c.Source > 0:
		w.Given("C_s", "capacitance of the source", "F", float64(w.c.Source))
		w.Step("C", "C_l*C_s/(C_l + C_s)", "F", series)
	default:
		w.Step("C", "C_l", "F", series)
	}
	if w.c.Bleeder > 0 {
		w.Given("R_b", "bleeders in parallel", "Ω", float64(w.c.Bleeder))
		w.Step("R_e", "R*R_b/(R + R_b)", "Ω", w.s.re)
	} else {
		w.Step("R_e", "R", "Ω", w.s.re)
	}
	w.Step("tau", "R_e*C", "s", w.s.tau)
}

func (w working) final() {
	switch {
	case w.c.Bleeder > 0:
		w.Step("V_f", "E*R_b/(R + R_b)", "V", w.s.vf)
	case w.c.Source > 0:
		w.Step("V_f", "E*C/C_l", "V", w.s.vf)
	default:
		w.Step("V_f", "E", "V", w.s.vf)
	}
}

// load adds the auxiliary supply's equilibria; false where it has none, or there is no supply.
func (w working) load() bool {
	if w.s.load == 0 {
		return false
	}
	w.Given("P", "auxiliary supply", "W", w.s.load)
	w.Given("V_on", "where it starts", "V", w.s.vOn)
	w.Given("V_off", "where it stops", "V", w.s.vOff)
	if !w.s.balances {
		return false
	}
	w.Step("v_p", "(V_f + sqrt(V_f^2 - 4*R_e*P))/2", "V", w.s.vPlus)
	w.Step("v_m", "2*R_e*P/(V_f + sqrt(V_f^2 - 4*R_e*P))", "V", w.s.vMinus)
	return true
}

// over adds which corner governs and the share of each input, and ends the working.
func (w working) over(axes []corner.Axis, s corner.Spread, least bool) *finding.Explanation {
	at, which := s.AtHigh, "greatest"
	if least {
		at, which = s.AtLow, "least"
	}
	names, moves := corner.Shares(axes, w.a.members[:], s.Moves)
	w.Spread(which+" with "+corner.DescribeMoving(axes, s, at), names, moves)
	return w.Done()
}

func (w working) charged(result int, least bool) *finding.Explanation {
	return w.over(w.a.axes[:], w.a.charge[result], least)
}
