package closing

import (
	"fmt"
	"math"

	"chargehand/commission/corner"
	"chargehand/commission/finding"
	"chargehand/commission/quantity"
)

const validLoop = "linear loop, prior current neglected; with a choke that saturates the current is higher, never above u/R"

// working writes one finding's calculation down with the nominal numbers of the site.
type working struct {
	*finding.Working
	a *assessment
	x []float64
}

func (a *assessment) explain(formula, source, validity string) working {
	x := make([]float64, axisCount)
	for i, axis := range a.axes {
		x[i] = axis.Nominal
	}
	return working{finding.Explain(formula, source, validity), a, x}
}

// over adds which corner governs and the share of each input, and ends the working.
func (w working) over(result int) *finding.Explanation {
	s := w.a.over[result]
	names, moves := corner.Shares(w.a.axes, w.a.members, s.Moves)
	w.Spread("greatest with "+corner.DescribeMoving(w.a.axes, s, s.AtHigh), names, moves)
	return w.Done()
}

// missing adds the voltage that is missing at closing, "u".
func (w working) missing() {
	w.Given("delta", "closing difference", "V", float64(w.a.site.Precharge.ClosingDifference.Nominal))
	w.Given("e_s", "measurement error of the source voltage", "V", float64(w.a.site.Source.Error()))
	w.Given("e_b", "measurement error of the bus voltage", "V", float64(w.a.site.Bus.Error()))
	w.Step("u", "delta + e_s + e_b", "V", float64(w.a.bypass.missing))
}

// whole adds the whole rest voltage as "u".
func (w working) whole() {
	w.Given("E", "rest voltage of the source, highest", "V", float64(w.a.emf))
	w.Step("u", "E", "V", float64(w.a.emf))
}

// main adds R, L and C of the loop through the chokes.
func (w working) main(l Loop) {
	w.Given("N", "phases", "1", w.a.phases)
	w.Given("R_i", "internal resistance of the source", "Ω", w.x[axisInternal])
	w.Given("R_ch", "resistance of one choke", "Ω", float64(w.a.site.Converter.ChokeResistance.Nominal))
	w.Given("L_ch", "inductance of one choke", "H", float64(w.a.site.Converter.Choke.Nominal))
	w.Given("L_s", "inductance of the source loop", "H", w.x[axisSourceInductance])
	w.Given("C_b", "banks on the bus that are not isolated", "F", w.x[axisBanks])
	w.Step("R", "R_i + R_ch/N", "Ω", float64(l.Resistance))
	w.Step("L", "L_ch/N + L_s", "H", float64(l.Inductance))
	link := "C_b"
	if w.a.filter != nil {
		w.Given("C_f", "filter at the star point", "F", w.x[axisFilter])
		link = "C_b + C_f"
	}
	w.Step("C_l", link, "F", w.a.link(w.x))
	w.series("C", "C_l", float64(l.Capacitance))
}

// series adds a capacitance behind a supercapacitor.
func (w working) series(name, alone string, c float64) {
	if w.x[axisSource] == 0 {
		w.Step(name, alone, "F", c)
		return
	}
	if name == "C" {
		w.Given("C_s", "capacitance of the source", "F", w.x[axisSource])
	}
	w.Step(name, fmt.Sprintf("%[1]s*C_s/(%[1]s + C_s)", alone), "F", c)
}

// symbols are the names of one loop's quantities in a working.
type symbols struct{ resistance, inductance, capacitance, damping, resonance, peakTime, peak string }

var (
	mainLoop   = symbols{"R", "L", "C", "alpha", "omega_0", "t_p", "i"}
	filterLoop = symbols{"R_f", "L_f", "C__f", "alpha_f", "omega_f", "t_f", "i_f"}
)

// peak adds the peak of a loop.
func (w working) peak(l Loop, n symbols) {
	if l.Inductance <= 0 {
		w.Step(n.peak, "u/"+n.resistance, "A", float64(l.PeakCurrent()))
		return
	}
	alpha, square := w.rates(l, n)
	w.Given(n.peakTime, peakTimeIn(math.Sqrt(math.Abs(square)), alpha, square), "s", float64(l.PeakTime()))
	w.Step(n.peak, fmt.Sprintf("u*sqrt(%s/%s)*exp(-%s*%s)", n.capacitance, n.inductance, n.damping, n.peakTime), "A", float64(l.PeakCurrent()))
}

// rates adds damping and resonance of a loop.
func (w working) rates(l Loop, n symbols) (alpha, square float64) {
	alpha, resonance2, square := l.rates()
	w.Step(n.damping, fmt.Sprintf("%s/(2*%s)", n.resistance, n.inductance), "1/s", alpha)
	w.Step(n.resonance, fmt.Sprintf("1/sqrt(%s*%s)", n.inductance, n.capacitance), "1/s", math.Sqrt(resonance2))
	return alpha, square
}

func peakTimeIn(omega, alpha, square float64) string {
	switch {
	case omega <= 1e-9*alpha:
		return "time of the peak, 1/alpha, critically damped"
	case square > 0:
		return "time of the peak, arctan(omega_d/alpha)/omega_d with omega_d = sqrt(omega_0^2 - alpha^2), underdamped"
	}
	return "time of the peak, ln((alpha + beta)/omega_0)/beta with beta = sqrt(alpha^2 - omega_0^2), overdamped"
}

// alone adds the loop of the filter by itself, its symbols ending in "_f".
func (w working) alone(l Loop, hasMain bool) {
	if !hasMain {
		w.Given("R_i", "internal resistance of the source", "Ω", w.x[axisInternal])
		w.Given("L_s", "inductance of the source loop", "H", w.x[axisSourceInductance])
		w.Given("C_f0", "filter", "F", w.x[axisFilter])
		if w.x[axisSource] > 0 {
			w.Given("C_s", "capacitance of the source", "F", w.x[axisSource])
		}
	}
	w.Given("ESR", "series resistance of the filter", "Ω", w.x[axisESR])
	w.Given("ESL", "series inductance of the filter", "H", w.x[axisESL])
	w.Step("R_f", "R_i + ESR", "Ω", float64(l.Resistance))
	w.Step("L_f", "L_s + ESL", "H", float64(l.Inductance))
	capacitance := "C_f0"
	if hasMain {
		capacitance = "C_f"
	}
	w.series(filterLoop.capacitance, capacitance, float64(l.Capacitance))
}

func (a *assessment) explainInrush() *finding.Explanation {
	w := a.explain("i = u*sqrt(C/L)*exp(-alpha*t_p)", basisLoop, validLoop)
	w.missing()
	w.loops(a.bypass.missing, a.over[ofInrush].Nominal)
	return w.over(ofInrush)
}

// loops adds the larger of the main loop and the filter alone, as the step "i_max".
func (w working) loops(u quantity.Voltage, larger float64) {
	main := w.a.main(w.x, u)
	w.main(main)
	w.peak(main, mainLoop)
	if w.a.filter == nil {
		return
	}
	alone := w.a.alone(w.x, u)
	w.alone(alone, true)
	w.peak(alone, filterLoop)
	w.Step("i_max", "max(i, i_f)", "A", larger)
}

func (a *assessment) explainFilterInrush() *finding.Explanation {
	w := a.explain("i = u*sqrt(C/L)*exp(-alpha*t_p)", basisLoop, "linear loop, filter empty; switched in by the source switch")
	w.whole()
	l := a.alone(w.x, a.emf)
	w.alone(l, false)
	w.peak(l, filterLoop)
	return w.over(ofFilterSwitched)
}

// swing adds k, by which the link ends above what was missing.
func (w working) swing(l Loop) {
	if _, _, square := l.rates(); l.Inductance <= 0 || square <= 0 {
		w.Step("k", "0", "1", 0)
		return
	}
	_, square := w.rates(l, mainLoop)
	w.Step("omega_d", "sqrt(omega_0^2 - alpha^2)", "1/s", math.Sqrt(square))
	w.Step("k", "exp(-alpha*pi/omega_d)", "1", float64(l.Beyond()/l.Voltage))
}

func (a *assessment) explainI2t() *finding.Explanation {
	w := a.explain("I2t = C*u^2*(1 - k^2)/(2*R)", basisI2t, validLoop)
	w.missing()
	w.integral(a.main(w.x, a.bypass.missing))
	return w.over(ofI2t)
}

// integral adds the main loop and its Joule integral.
func (w working) integral(l Loop) {
	w.main(l)
	w.swing(l)
	if l.Resistance == 0 {
		w.Step("I2t", "pi*u^2*C/(2*omega_0*L)", "A²s", float64(l.I2t()))
		return
	}
	w.Step("I2t", "C*u^2*(1 - k^2)/(2*R)", "A²s", float64(l.I2t()))
}

func (a *assessment) explainOvershoot() *finding.Explanation {
	w := a.explain("V = E - u + u*(1 + k)*C/C_l", basisBeyond, validLoop)
	w.missing()
	w.Given("E", "rest voltage of the source, highest", "V", float64(a.emf))
	l := a.main(w.x, a.bypass.missing)
	w.main(l)
	w.swing(l)
	w.Step("V", "E - u + u*(1 + k)*C/C_l", "V", a.over[ofReached].Nominal)
	return w.over(ofReached)
}

func (a *assessment) explainThreshold(low, high float64) *finding.Explanation {
	w := a.explain("u_r + e_s + e_b <= delta <= I_m/g - e_s - e_b", basisThreshold, "the narrowest of all corners; chokes not saturated")
	w.missing()
	errors := float64(a.site.Source.Error() + a.site.Bus.Error())
	w.Given("u_r", "greatest difference that remains when the charge has settled", "V", low-errors)
	w.Given("i_c", "greatest closing current", "A", a.over[ofInrush].High)
	w.Given("I_m", "making current of the bypass", "A", float64(a.site.Bypass.MakingCurrent.Nominal))
	w.Step("g", "i_c/u", "A/V", a.over[ofInrush].High/float64(a.bypass.missing))
	w.Step("delta_low", "u_r + e_s + e_b", "V", low)
	w.Step("delta_high", "I_m/g - e_s - e_b", "V", high)
	w.Step("delta_set", "delta", "V", float64(a.site.Precharge.ClosingDifference.Nominal))
	return w.over(ofInrush)
}

func (a *assessment) explainLiveBus() *finding.Explanation {
	w := a.explain("t = R*C_f*ln(E/delta)", basisDwell, "live bus above the source, diodes blocked, filter empty")
	w.Given("E", "rest voltage of the source, highest", "V", float64(a.emf))
	w.Given("delta", "closing difference", "V", float64(a.site.Precharge.ClosingDifference.Nominal))
	w.Given("R_i", "internal resistance of the source", "Ω", w.x[axisInternal])
	w.Given("R_p", "pre-charge resistor", "Ω", w.x[axisResistor])
	w.Given("C_f", "filter at the star point", "F", w.x[axisFilter])
	w.Step("R", "R_i + R_p", "Ω", w.x[axisInternal]+w.x[axisResistor])
	w.series("C", "C_f", a.behind(w.x, w.x[axisFilter]))
	w.Step("t", "R*C*ln(E/delta)", "s", a.over[ofLiveBus].Nominal)
	return w.over(ofLiveBus)
}

func (a *assessment) explainWithoutPrecharge() *finding.Explanation {
	w := a.explain("i = u*sqrt(C/L)*exp(-alpha*t_p)", basisLoop, validLoop+"; at these currents the chokes do saturate")
	w.whole()
	w.loops(a.emf, a.over[ofProspective].Nominal)
	return w.over(ofProspective)
}
