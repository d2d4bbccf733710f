package precharge

import (
	"fmt"
	"math"
	"strings"

	"chargehand/commission/corner"
	"chargehand/commission/finding"
	"chargehand/commission/quantity"
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
	names, moves := w.a.shares(axes, s)
	w.Spread(which+" with "+governing(axes, s, at), names, moves)
	return w.Done()
}

func (w working) charged(result int, least bool) *finding.Explanation {
	return w.over(w.a.axes[:], w.a.charge[result], least)
}

// shares splits what a sum of inputs moves among its members by their widths.
func (a *assessment) shares(axes []corner.Axis, s corner.Spread) (names []string, moves []float64) {
	for i, axis := range axes {
		members := a.members[i]
		width := axis.High - axis.Low
		if i == axisBleeder && len(members) > 0 {
			width = 1/axis.Low - 1/axis.High
		}
		if len(members) < 2 || width == 0 {
			names, moves = append(names, axis.Name), append(moves, s.Moves[i])
			continue
		}
		for _, m := range members {
			names, moves = append(names, m.Name), append(moves, s.Moves[i]*(m.High-m.Low)/width)
		}
	}
	return names, moves
}

// governing says where the inputs that matter stand in a corner.
func governing(axes []corner.Axis, s corner.Spread, at []float64) string {
	var words []string
	for i, a := range axes {
		if a.Low == a.High || s.Moves[i] == 0 {
			continue
		}
		end := "highest"
		if at[i] == a.Low {
			end = "lowest"
		}
		words = append(words, a.Name+" "+end)
	}
	if len(words) == 0 {
		return "every corner alike"
	}
	return strings.Join(words, ", ")
}

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

func (a *assessment) explainPulse() *finding.Explanation {
	w := a.explain("u = p/P_perm(max(tau/2, W/p))", basisPulse, validRating)
	w.tau()
	w.energy()
	p := a.charge[ofPower].Nominal
	w.Step("p", "R_p*(E/R)^2", "W", p)
	duration := PulseTime(quantity.Seconds(w.s.tau), quantity.Energy(a.charge[ofEnergy].Nominal), quantity.Power(p))
	w.Step("t_eq", "max(tau/2, W/p)", "s", float64(duration))
	ambient := a.site.Precharge.Ambient.Nominal
	w.factor(ambient)
	w.permissible(duration, ambient)
	w.Step("u", "p/P_perm", "1", a.charge[ofPulse].Nominal)
	return w.charged(ofPulse, false)
}

// factor adds the derating "f" at a temperature.
func (w working) factor(at quantity.Temperature) {
	r := w.a.rating
	w.Given("T", "temperature of the resistor", "°C", float64(at))
	w.Given("T_1", "full rating up to", "°C", float64(r.FullTo))
	w.Given("T_2", "no rating from", "°C", float64(r.ZeroAt))
	w.Step("f", "min(1, max(0, (T_2 - T)/(T_2 - T_1)))", "1", float64(r.Factor(at)))
}

// permissible adds "P_perm" for a pulse of duration t_eq.
func (w working) permissible(duration quantity.Seconds, at quantity.Temperature) {
	r := w.a.rating
	w.Given("P_r", "rated power", "W", float64(r.Power))
	terms := []string{"P_r"}
	n := len(r.Pulses)
	inside := n > 0 && duration >= r.Pulses[0].Duration && duration <= r.Pulses[n-1].Duration
	switch {
	case inside:
		a, b := around(r.Pulses, duration)
		w.point("1", a)
		w.point("2", b)
		if a == b {
			terms = append(terms, "W_1p/t_1p")
			break
		}
		terms = append(terms, "W_1p/t_1p*exp(ln(t_eq/t_1p)/ln(t_2p/t_1p)*ln(W_2p/t_2p/(W_1p/t_1p)))")
	case n > 0 && duration < r.Pulses[0].Duration:
		w.point("1", r.Pulses[0])
		terms = append(terms, "W_1p/t_1p")
	case n > 0:
		w.point("1", r.Pulses[n-1])
		terms = append(terms, "W_1p/t_eq")
	}
	if !inside && r.Multiple > 0 {
		w.Given("k", "short-time overload, multiple of the rated power", "1", r.Multiple)
		w.Given("t_k", "duration of the overload", "s", float64(r.OverloadTime))
		terms = append(terms, "k*P_r*min(1, t_k/t_eq)")
	}
	w.Step("P_perm", "f*max("+strings.Join(terms, ", ")+")", "W", float64(r.Permissible(duration, at)))
}

func (w working) point(number string, p Pulse) {
	w.Given("t_"+number+"p", "duration of a permissible pulse", "s", float64(p.Duration))
	w.Given("W_"+number+"p", "energy of that pulse", "J", float64(p.Energy))
}

// around are the two points of the curve about t.
func around(curve []Pulse, t quantity.Seconds) (a, b Pulse) {
	for i := 1; i < len(curve); i++ {
		if t <= curve[i].Duration {
			return curve[i-1], curve[i]
		}
	}
	return curve[0], curve[0]
}

func (a *assessment) explainRepeat() *finding.Explanation {
	if !a.hasThermal() {
		w := a.explain("u = W/(T_n*f*P_r)", basisMean, "no thermal model given: the mean power only")
		w.tau()
		w.energy()
		w.factor(a.site.Precharge.Ambient.Nominal)
		w.Given("P_r", "rated power", "W", float64(a.rating.Power))
		w.Given("T_n", "interval", "s", float64(a.interval()))
		w.Step("u", "W/(T_n*f*P_r)", "1", a.charge[ofRepeat].Nominal)
		return w.charged(ofRepeat, false)
	}
	w := a.explain("theta = theta_0*exp(-t_p/tau_th) + g(t_p)", basisThermal, validThermal)
	w.tau()
	w.energy()
	heat := w.heat()
	start := w.before(heat)
	body := a.bodyAt(a.nominal())
	at := float64(body.peakTime(heat, start))
	w.Given("t_p", "time of the peak, where P*R_th = theta", "s", at)
	w.Step("g_p", w.response("t_p"), "K", float64(body.Rise(heat, 0, quantity.Seconds(at))))
	w.Step("theta", "theta_0*exp(-t_p/tau_th) + g_p", "K", float64(body.Peak(heat, start)))
	w.Given("T_a", "ambient", "°C", float64(a.site.Precharge.Ambient.Nominal))
	w.Step("T_hot", "T_a + theta", "°C", a.charge[ofRepeat].Nominal)
	return w.charged(ofRepeat, false)
}

// heat adds the shape of the heating, scaled to the energy, and the thermal body.
func (w working) heat() Heat {
	heat := w.a.heat(w.c)
	body := w.a.bodyAt(w.a.nominal())
	w.Given("R_th", "thermal resistance", "K/W", float64(body.Thermal))
	w.Given("tau_th", "thermal time constant", "s", float64(body.TimeConstant))
	w.Given("s", "energy of the charge over that of the same current without the auxiliary supply", "1", heat.Scale)
	if w.c.isCoupled() {
		w.Step("I_inf", expressionFor(w.c.Bleeder > 0, "E/(R + R_b)", "0"), "A", w.s.steady)
		w.Step("D_I", "E/R - I_inf", "A", w.s.current0-w.s.steady)
	}
	return heat
}

// response is the rise after t from ambient: a sum of one exponential for each power of the current.
func (w working) response(t string) string {
	one := func(amplitude, rate string) string {
		return fmt.Sprintf("%[1]s*(exp(-%[2]s*%[3]s) - exp(-%[3]s/tau_th))/(1 - %[2]s*tau_th)", amplitude, rate, t)
	}
	terms := []string{one("D_I^2", "2/tau")}
	if w.s.steady > 0 {
		terms = append(terms, one("2*I_inf*D_I", "1/tau"), fmt.Sprintf("I_inf^2*(1 - exp(-%s/tau_th))", t))
	}
	return "s*R_p*R_th*(" + strings.Join(terms, " + ") + ")"
}

// before adds "theta_0", the rise before the last permitted attempt.
func (w working) before(heat Heat) quantity.Difference {
	body := w.a.bodyAt(w.a.nominal())
	n, period := w.a.site.Precharge.Attempts, w.a.period(heat)
	w.Given("n", "permitted attempts", "1", float64(n))
	start := body.Before(heat, n, period)
	if n <= 1 {
		w.Step("theta_0", "0", "K", 0)
		return start
	}
	w.Given("T_n", "interval", "s", float64(w.a.interval()))
	w.Given("t_h", "heated for", "s", float64(heat.On))
	w.Step("T_s", "max(T_n, t_h)", "s", float64(period))
	w.Step("g_h", w.response("t_h"), "K", float64(body.Rise(heat, 0, heat.On)))
	w.Step("g_s", "g_h*exp(-(T_s - t_h)/tau_th)", "K", float64(body.After(heat, 0, period)))
	w.Step("theta_0", "g_s*(1 - exp(-(n - 1)*T_s/tau_th))/(1 - exp(-T_s/tau_th))", "K", float64(start))
	return start
}

func (a *assessment) explainWait() *finding.Explanation {
	w := a.explain("T = max(t, T_th, W/(f*P_r))", basisWait, validThermal)
	w.tau()
	w.energy()
	w.factor(a.site.Precharge.Ambient.Nominal)
	w.Given("P_r", "rated power", "W", float64(a.rating.Power))
	w.Given("t_close", "time until the bypass is released", "s", a.closing[ofTimeToClose].Nominal)
	terms := "t_close, W/(f*P_r)"
	if a.hasThermal() {
		heat, x := a.heat(w.c), a.nominal()
		period := a.bodyAt(x).LeastPeriod(heat, quantity.Difference(float64(a.hottest)-x[axisAmbient]))
		w.Given("T_th", "least period whose steady peak stays at the highest temperature", "s", float64(period))
		terms = "t_close, T_th, W/(f*P_r)"
	}
	w.Step("T_w", "max("+terms+")", "s", a.closing[ofWait].Nominal)
	return w.over(a.closeAxes, a.closing[ofWait], false)
}

func (a *assessment) explainShortedBus() *finding.Explanation {
	w := a.explain("t_w = min(t_pulse, t_thermal)", basisShort, validRating+"; "+validThermal)
	w.tau()
	w.energy()
	ambient := a.site.Precharge.Ambient.Nominal
	start := quantity.Difference(0)
	if a.hasThermal() {
		start = w.before(w.heat())
	}
	p := quantity.Power(a.charge[ofPower].Nominal)
	w.Step("p", "R_p*(E/R)^2", "W", float64(p))
	at := ambient + quantity.Temperature(start)
	w.factor(at)
	w.Given("P_r", "rated power", "W", float64(a.rating.Power))
	w.Given("t_pulse", "longest pulse of p/f within the rating", "s", float64(a.rating.Withstand(p, at)))
	terms := "t_pulse"
	if a.hasThermal() {
		body, allowed := a.bodyAt(a.nominal()), quantity.Difference(a.hottest-ambient)
		w.Given("theta_max", "permitted rise", "K", float64(allowed))
		if t := body.Withstand(p, start, allowed); t > 0 && !math.IsInf(float64(t), 1) {
			w.Step("t_thermal", "tau_th*ln((p*R_th - theta_0)/(p*R_th - theta_max))", "s", float64(t))
		} else {
			w.Given("t_thermal", "time to the permitted rise", "s", float64(t))
		}
		terms = "t_pulse, t_thermal"
	}
	w.Step("t_w", "min("+terms+")", "s", a.charge[ofWithstand].Nominal)
	return w.charged(ofWithstand, true)
}

func (a *assessment) explainTimeout() *finding.Explanation {
	w := working{Working: finding.Explain("1.2*t_slow <= t_out <= t_w/1.25", basisTimeout, "the slowest charge and the least withstand of all corners"), a: a}
	slowest, least := a.closing[ofTimeToClose], a.charge[ofWithstand]
	w.Given("t_out", "time-out as set", "s", float64(a.timeout()))
	if !math.IsInf(slowest.High, 1) {
		w.Given("t_slow", "slowest charge", "s", slowest.High)
		w.Step("t_least", "1.2*t_slow", "s", aboveSlowestCharge*slowest.High)
	}
	if !math.IsInf(least.Low, 1) {
		w.Given("t_w", "least withstand", "s", least.Low)
		w.Step("t_most", "t_w/1.25", "s", least.Low/belowLeastWithstand)
	}
	w.Step("t_set", "t_out", "s", float64(a.timeout()))
	w.Spread("slowest charge with "+governing(a.closeAxes, slowest, slowest.AtHigh)+"; least withstand with "+governing(a.axes[:], least, least.AtLow), nil, nil)
	return w.Done()
}
