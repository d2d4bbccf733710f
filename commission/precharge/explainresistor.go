package precharge

import (
	"fmt"
	"math"
	"strings"

	"chargehand/commission/corner"
	"chargehand/commission/finding"
	"chargehand/commission/quantity"
)

func (a *assessment) explainPulse() *finding.Explanation {
	w := a.explain("u = p/P_perm(max(tau/2, W/p))", basisPulse, validRating)
	w.tau()
	w.energy()
	p := a.charge[ofPower].Nominal
	w.Step("p", "R_p*(E/R)^2", "W", p)
	duration := pulseTime(quantity.Seconds(w.s.tau), quantity.Energy(a.charge[ofEnergy].Nominal), quantity.Power(p))
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
	w.Spread("slowest charge with "+corner.DescribeMoving(a.closeAxes, slowest, slowest.AtHigh)+"; least withstand with "+corner.DescribeMoving(a.axes[:], least, least.AtLow), nil, nil)
	return w.Done()
}
