package precharge

import (
	"fmt"
	"math"

	"chargehand/commission/finding"
)

func (a *assessment) explainTimeConstant() *finding.Explanation {
	w := a.explain("tau = R_e*C", basisCharge, validCharge)
	w.tau()
	return w.charged(ofTau, false)
}

func (a *assessment) explainFinalVoltage() *finding.Explanation {
	w := a.explain("v_p = (V_f + sqrt(V_f^2 - 4*R_e*P))/2", basisLoad, validCharge)
	w.settled()
	return w.charged(ofFinal, true)
}

// settled adds the voltage at which the charge stays as the step "V".
func (w working) settled() {
	w.tau()
	v, how := w.c.Settled()
	if w.c.isCoupled() {
		w.Given("v_r", "link voltage once it rises no more; "+validCoupled, "V", float64(v))
		w.Step("V", "v_r", "V", float64(v))
		return
	}
	w.final()
	w.load()
	from := map[Settling]string{AtFinal: "V_f", AtEquilibrium: "v_p", Hiccups: "V_on"}
	w.Step("V", from[how], "V", float64(v))
}

func (a *assessment) explainStall() *finding.Explanation {
	w := a.explain("u = E - V", basisLoad, validCharge)
	w.settled()
	gap := a.closing[ofGap]
	if w.c.Source > 0 {
		w.Given("v_s", "source voltage by then, sagged", "V", gap.Nominal+a.charge[ofFinal].Nominal)
		w.Step("u", "v_s - V", "V", gap.Nominal)
	} else {
		w.Step("u", "E - V", "V", gap.Nominal)
	}
	return w.over(a.closeAxes, gap, false)
}

func (a *assessment) explainTimeToClose() *finding.Explanation {
	w := a.explain("t = tau*ln(V_f/(V_f - V_t))", basisLoad, validCharge+"; a measurement error adds to or takes from the closing difference")
	w.tau()
	w.closing()
	return w.over(a.closeAxes, a.closing[ofTimeToClose], false)
}

// closing adds the way to the closing difference; its last step is the time "t".
func (w working) closing() {
	t := w.a.closing[ofTimeToClose].Nominal
	w.Given("delta", "closing difference", "V", float64(w.a.difference))
	switch {
	case w.c.isCoupled():
		w.Given("t_c", "time to the closing difference; "+validCoupled, "s", t)
		w.Step("t", "t_c", "s", t)
		return
	case w.c.Source > 0:
		w.Step("t", "tau*ln(E/delta)", "s", t)
		return
	}
	target := w.s.e - float64(w.a.difference)
	w.final()
	w.Step("V_t", "E - delta", "V", target)
	balances := w.load()
	switch {
	case math.IsInf(t, 1):
		w.Given("t_n", "never: the charge settles before it is there", "s", t)
		w.Step("t", "t_n", "s", t)
	case !w.s.isLoadedBelow(target):
		w.Step("t", "tau*ln(V_f/(V_f - V_t))", "s", t)
	case balances:
		first, second := w.s.unloadedTime(0, w.s.vOn), w.s.loadedTime(w.s.vOn, target)
		w.Step("t_1", "tau*ln(V_f/(V_f - V_on))", "s", first)
		w.Step("t_2", "tau/(v_p - v_m)*(v_p*ln((v_p - V_on)/(v_p - V_t)) + v_m*ln((V_t - v_m)/(V_on - v_m)))", "s", second)
		w.Step("t", "t_1 + t_2", "s", t)
	}
}

func (a *assessment) explainPeakCurrent() *finding.Explanation {
	w := a.explain("I = E/R", basisPeak, "empty bus at the highest rest voltage; the chokes delay it by microseconds")
	w.Step("I", "E/R", "A", w.s.current0)
	return w.charged(ofCurrent, false)
}

func (a *assessment) explainPeakPower() *finding.Explanation {
	w := a.explain("p = R_p*(E/R)^2", basisPeak, "empty bus at the highest rest voltage; a shorted bus draws the same")
	w.Step("I", "E/R", "A", w.s.current0)
	w.Step("p", "R_p*I^2", "W", a.charge[ofPower].Nominal)
	return w.charged(ofPower, false)
}

func (a *assessment) explainEnergy() *finding.Explanation {
	w := a.explain("W = integral of R_p*i^2", basisEnergy, validCharge)
	w.tau()
	w.energy()
	return w.charged(ofEnergy, false)
}

// energy adds the energy of one charge; its last step is "W".
func (w working) energy() {
	total := w.a.charge[ofEnergy].Nominal
	w.closing()
	t := w.a.closing[ofTimeToClose].Nominal
	closes := !math.IsInf(t, 1)
	target := w.s.e - float64(w.a.difference)
	if w.c.isCoupled() {
		w.Given("W_r", "energy in the resistor; "+validCoupled, "J", total)
		w.Step("W", "W_r", "J", total)
		return
	}
	end := "t"
	if !closes {
		t, end = float64(w.a.timeout()), "t_o"
		w.Given("t_o", "time-out, since the charge never closes", "s", t)
	}
	on := w.s.loadStarts()
	w.Step("I_inf", expressionFor(w.c.Bleeder > 0, "E/(R + R_b)", "0"), "A", w.s.steady)
	w.Step("D_I", "E/R - I_inf", "A", w.s.current0-w.s.steady)
	loaded := w.s.load > 0 && t > on && (!closes || w.s.isLoadedBelow(target))
	if !loaded {
		w.Step("W", unloadedEnergyIn(end), "J", total)
		return
	}
	if !closes {
		w.Step("t_1", "tau*ln(V_f/(V_f - V_on))", "s", on)
	}
	before := w.s.unloadedEnergy(on)
	w.Step("W_1", unloadedEnergyIn("t_1"), "J", before)
	w.loadedEnergy(t-on, target, closes)
	w.Step("W", "W_1 + W_2", "J", total)
}

// loadedEnergy adds "W_2", the energy from V_on on.
func (w working) loadedEnergy(t, target float64, closes bool) {
	if _, how := w.s.settle(); how == Hiccups {
		power := w.s.rp * math.Pow((w.s.es-w.s.vOff)/w.s.r, 2)
		w.Step("W_2", "R_p*((E - V_off)/R)^2*(t_o - t_1)", "J", power*t)
		return
	}
	y := 0.0
	if closes {
		y = w.s.approach(w.s.vOn, target)
		w.Step("y", "ln((v_p - V_on)/(v_p - V_t))", "1", y)
	} else {
		target, y = w.s.loadedVoltage(w.s.vOn, t)
		w.Given("V_o", "link voltage at the time-out, from the charge curve", "V", target)
		w.Given("y", "ln((v_p - V_on)/(v_p - V_o)) at the time-out", "1", y)
	}
	at := expressionFor(closes, "V_t", "V_o")
	product := w.s.re * w.s.load
	q := w.s.vf - 2*w.s.es
	b, d := w.s.es*w.s.es-product+q*w.s.vf, -q*product
	w.Step("a", "V_f - 2*E", "V", q)
	w.Step("b", "E^2 - R_e*P + a*V_f", "V²", b)
	w.Step("d", "-a*R_e*P", "V³", d)
	w.Step("A_p", "(b*v_p + d)/(v_p - v_m)", "V²", (b*w.s.vPlus+d)/(w.s.vPlus-w.s.vMinus))
	w.Step("A_m", "-(b*v_m + d)/(v_p - v_m)", "V²", -(b*w.s.vMinus+d)/(w.s.vPlus-w.s.vMinus))
	w.Step("W_2", fmt.Sprintf("-R_p*tau/R^2*((%[1]s^2 - V_on^2)/2 + a*(%[1]s - V_on) - A_p*y + A_m*ln((%[1]s - v_m)/(V_on - v_m)))", at),
		"J", w.s.loadedEnergy(w.s.vOn, target, y))
}

func unloadedEnergyIn(t string) string {
	return fmt.Sprintf("R_p*(I_inf^2*%[1]s + 2*I_inf*D_I*tau*(1 - exp(-%[1]s/tau)) + D_I^2*tau/2*(1 - exp(-2*%[1]s/tau)))", t)
}

func expressionFor(condition bool, yes, no string) string {
	if condition {
		return yes
	}
	return no
}
