package precharge

import (
	"fmt"
	"math"

	"chargehand/commission/corner"
	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

// Factors between the time-out and what bounds it: 1.2 above the slowest charge, 1.25 below the least withstand.
const (
	aboveSlowestCharge  = 1.2
	belowLeastWithstand = 1.25
)

// assessment is one site worked through: every finding is a view on it.
type assessment struct {
	path
	charge    []corner.Spread
	closeAxes []corner.Axis
	closing   []corner.Spread

	other              *choice // of the resistor, where a finding asks for it
	workings, remedies bool    // findings carry their calculation, and what would make them pass
}

// Findings are the pre-charge findings of a site, in the order of the catalogue.
func Findings(s site.Site) []finding.Finding {
	a := assess(s)
	a.workings, a.remedies = true, true
	return a.findings()
}

// assess works the site through for the verdicts alone, as the search for a remedy does with many sites.
func assess(s site.Site) *assessment {
	a := &assessment{path: pathOf(s)}
	if a.missing(a.needsLoop) != nil {
		return a
	}
	a.charge = a.charges()
	a.closeAxes, a.closing = a.closes()
	return a
}

func (a *assessment) findings() []finding.Finding {
	return []finding.Finding{
		a.timeConstant(), a.finalVoltage(), a.stall(), a.timeToClose(), a.peakCurrent(), a.peakPower(), a.energy(),
		a.pulse(), a.repeat(), a.wait(), a.shortedBus(), a.timeOut(), a.breaking(),
	}
}

// stated is a finding without a limit: one result of the charge.
func (a *assessment) stated(f finding.Finding, result int, explain func() *finding.Explanation, needs ...func(*finding.Missing)) finding.Finding {
	if m := a.missing(needs...); m != nil {
		return f.Lacking(m...)
	}
	return a.explained(f.Stated(finding.ValueOf(a.charge[result].Ends())), explain)
}

func (a *assessment) explained(f finding.Finding, explain func() *finding.Explanation) finding.Finding {
	if a.workings {
		f.Explanation = explain()
	}
	return f
}

// mended adds what would help where the finding does not pass.
func (a *assessment) mended(f finding.Finding, remedy func(finding.Finding) finding.Finding) finding.Finding {
	if !a.remedies || f.Verdict == finding.Pass {
		return f
	}
	return remedy(f)
}

func say(v float64, unit string) string { return quantity.Engineering(v, unit, 4) }

func (a *assessment) timeConstant() finding.Finding {
	f := finding.Finding{ID: "precharge.time-constant", Title: "Time constant of the charge", Unit: "s", Basis: basisCharge}
	return a.stated(f, ofTau, a.explainTimeConstant, a.needsCircuit)
}

func (a *assessment) finalVoltage() finding.Finding {
	f := finding.Finding{ID: "precharge.final-voltage", Title: "Voltage at which the charge settles", Unit: "V", Basis: basisLoad}
	return a.stated(f, ofFinal, a.explainFinalVoltage, a.needsCircuit)
}

func (a *assessment) stall() finding.Finding {
	f := finding.Finding{ID: "precharge.stall", Title: "Difference that remains when the charge has settled", Unit: "V",
		Basis: basisLoad, Guards: true}
	if m := a.missing(a.needsCircuit, a.needsErrors); m != nil {
		return f.Lacking(m...)
	}
	gap := a.closing[ofGap]
	f = f.Judged(finding.ValueOf(gap.Ends()), finding.AtMost(float64(a.difference-a.errors)), 0)
	f = a.explained(f, a.explainStall)
	if net, ok := a.circuit(a.nominal()).LeastNetCurrent(a.site.Source.HighestRest() - a.difference); ok {
		f.Parts = append(f.Parts, finding.Part{Name: "least net charging current", Unit: "A", Value: finding.Exactly(float64(net))})
	}
	if f.Verdict != finding.Pass {
		f.Because = append(f.Because, fmt.Sprintf("up to %s remain, %s may: the charge can settle before the bypass is released", say(gap.High, "V"), say(*f.Limit.High, "V")))
	}
	if a.hiccups() {
		f.Verdict = finding.Fail
		f.Because = append(f.Because, "the auxiliary supply starts, pulls the bus down, stops, and again: the bus never comes up")
	}
	return a.mended(f, a.remedyStall)
}

func (a *assessment) hiccups() bool { return a.closing[ofHiccup].High > 0 }

func (a *assessment) timeToClose() finding.Finding {
	f := finding.Finding{ID: "precharge.time-to-close", Title: "Time until the bypass is released", Unit: "s", Basis: basisLoad}
	if m := a.missing(a.needsCircuit, a.needsErrors); m != nil {
		return f.Lacking(m...)
	}
	f = f.Stated(finding.ValueOf(a.closing[ofTimeToClose].Ends()))
	f = orNever(f)
	f = a.explained(f, a.explainTimeToClose)
	return f
}

// orUnlimited marks a ratio without a bound: nothing is permitted, or nothing is left of the rating.
func orUnlimited(f finding.Finding) finding.Finding {
	if math.IsInf(f.Value.High, 1) {
		f.State = finding.Unlimited
	}
	return f
}

// orNever marks a time that never comes in some corner.
func orNever(f finding.Finding) finding.Finding {
	if math.IsInf(f.Value.High, 1) {
		f.State = finding.Never
	}
	return f
}

func (a *assessment) peakCurrent() finding.Finding {
	f := finding.Finding{ID: "precharge.peak-current", Title: "Current at the first instant", Unit: "A", Basis: basisPeak}
	return a.stated(f, ofCurrent, a.explainPeakCurrent, a.needsLoop)
}

func (a *assessment) peakPower() finding.Finding {
	f := finding.Finding{ID: "precharge.peak-power", Title: "Power in the resistor at the first instant", Unit: "W", Basis: basisPeak}
	return a.stated(f, ofPower, a.explainPeakPower, a.needsLoop)
}

func (a *assessment) energy() finding.Finding {
	f := finding.Finding{ID: "precharge.energy", Title: "Energy in the resistor, one charge", Unit: "J", Basis: basisEnergy}
	return a.stated(f, ofEnergy, a.explainEnergy, a.needsCircuit, a.needsEnergy)
}

// needsEnergy asks for the time-out where a charge may never close.
func (a *assessment) needsEnergy(m *finding.Missing) {
	m.Need("precharge.timeout", a.charge == nil || !math.IsNaN(a.charge[ofEnergy].High))
}

func (a *assessment) pulse() finding.Finding {
	f := finding.Finding{ID: "precharge.pulse", Title: "Use of the resistor's permissible pulse", Unit: "1", Basis: basisPulse, Guards: true}
	if m := a.missing(a.needsCircuit, a.needsPulse, a.needsEnergy); m != nil {
		return f.Lacking(m...)
	}
	f = orUnlimited(f.Judged(finding.ValueOf(a.charge[ofPulse].Ends()), finding.AtMost(1), 0))
	f = a.explained(f, a.explainPulse)
	if f.Verdict != finding.Pass {
		f.Because = append(f.Because, fmt.Sprintf("the charge asks for %s times the pulse that the resistor may take", say(f.Value.High, "1")))
	}
	return a.mended(f, a.remedyResistor)
}

func (a *assessment) repeat() finding.Finding {
	f := finding.Finding{ID: "precharge.repeat", Title: "Hottest resistor over the permitted attempts", Unit: "°C", Basis: basisThermal, Guards: true}
	limit := finding.AtMost(float64(a.hottest))
	if !a.hasThermal() {
		f.Title, f.Unit, f.Basis, limit = "Mean power of the attempts over the derated rating", "1", basisMean, finding.AtMost(1)
	}
	if m := a.missing(a.needsRepeat, a.needsEnergy); m != nil {
		return f.Lacking(m...)
	}
	f = orUnlimited(f.Judged(finding.ValueOf(a.charge[ofRepeat].Ends()), limit, 0))
	f = a.explained(f, a.explainRepeat)
	if f.Verdict != finding.Pass {
		f.Because = append(f.Because, fmt.Sprintf("%d attempts every %s heat the resistor beyond what it may take", a.site.Precharge.Attempts, say(float64(a.interval()), "s")))
	}
	return a.mended(f, a.remedyRepeat)
}

func (a *assessment) wait() finding.Finding {
	f := finding.Finding{ID: "precharge.wait", Title: "Cool-down between attempts of an unlimited series", Unit: "s", Basis: basisWait}
	needs := []func(*finding.Missing){a.needsCircuit, a.needsErrors, a.needsRating, a.needsEnergy, func(m *finding.Missing) {
		m.Need("precharge.interval", a.site.Precharge.Interval.IsGiven())
		if a.hasThermal() {
			a.needsThermal(m)
		}
	}}
	if m := a.missing(needs...); m != nil {
		return f.Lacking(m...)
	}
	f = f.Judged(finding.ValueOf(a.closing[ofWait].Ends()), finding.AtMost(float64(a.interval())), 0)
	f = orNever(f)
	f = a.explained(f, a.explainWait)
	if f.Verdict != finding.Pass {
		f.Because = append(f.Because, "attempt after attempt at this interval the resistor warms beyond its limit, or the next begins before the last has ended")
	}
	return a.mended(f, a.remedyWait)
}

func (a *assessment) shortedBus() finding.Finding {
	f := finding.Finding{ID: "precharge.shorted-bus", Title: "How long the resistor stands a shorted bus", Unit: "s", Basis: basisShort, Guards: true}
	if m := a.missing(a.needsShortedBus); m != nil {
		return f.Lacking(m...)
	}
	timeout := float64(a.timeout())
	f = judgedTo(f, finding.ValueOf(a.charge[ofWithstand].Ends()), finding.AtLeast(belowLeastWithstand*timeout), finding.AtLeast(timeout))
	f = orUnlimited(f)
	f = a.explained(f, a.explainShortedBus)
	if f.Verdict != finding.Pass {
		f.Because = append(f.Because, fmt.Sprintf("a shorted bus may last until the time-out, %s; the resistor stands it %s", say(timeout, "s"), say(f.Value.Low, "s")))
	}
	return a.mended(f, a.remedyResistor)
}

func (a *assessment) needsShortedBus(m *finding.Missing) {
	a.needsCircuit(m)
	a.needsPulse(m)
	a.needsSeries(m)
	m.Need("precharge.timeout", a.site.Precharge.Timeout.IsGiven())
}

func (a *assessment) timeOut() finding.Finding {
	f := finding.Finding{ID: "precharge.timeout", Title: "Time-out of the pre-charge", Unit: "s", Basis: basisTimeout, Guards: true}
	if m := a.missing(a.needsShortedBus, a.needsErrors); m != nil {
		return f.Lacking(m...)
	}
	slowest, least := a.closing[ofTimeToClose].High, a.charge[ofWithstand].Low
	wanted := finding.AtLeast(aboveSlowestCharge * slowest)
	bare := finding.AtLeast(slowest)
	if !math.IsInf(least, 1) {
		wanted.High, bare.High = pointer(least/belowLeastWithstand), pointer(least)
	}
	f = judgedTo(f, finding.Exactly(float64(a.timeout())), wanted, bare)
	f.Parts = []finding.Part{
		{Name: "slowest charge", Unit: "s", Value: finding.Exactly(slowest)},
		{Name: "least withstand", Unit: "s", Value: finding.Exactly(least)},
	}
	f = a.explained(f, a.explainTimeout)
	if f.Verdict != finding.Pass {
		f.Because = a.timeoutReasons(slowest, least)
	}
	return a.mended(f, a.remedyResistor)
}

func pointer(v float64) *float64 { return &v }

func (a *assessment) timeoutReasons(slowest, least float64) []string {
	low, high := aboveSlowestCharge*slowest, least/belowLeastWithstand
	switch {
	case math.IsInf(slowest, 1):
		return []string{"the charge can stall, so no time-out is long enough"}
	case low > high:
		return []string{fmt.Sprintf("no setting can: the slowest charge wants at least %s, the shorted bus permits at most %s, they exclude each other by %s", say(low, "s"), say(high, "s"), say(low-high, "s"))}
	}
	return []string{fmt.Sprintf("%s lies outside %s … %s", say(float64(a.timeout()), "s"), say(low, "s"), say(high, "s"))}
}

func (a *assessment) breaking() finding.Finding {
	f := finding.Finding{ID: "precharge.breaking", Title: "Current that the pre-charge contactor breaks into a shorted bus", Unit: "A", Basis: basisPeak, Guards: true}
	contactor := a.site.Precharge.Contactor
	if m := a.missing(a.needsLoop, func(m *finding.Missing) {
		m.Need("precharge.contactor", contactor != nil)
		if contactor != nil {
			m.Need("precharge.contactor.breaking_current", contactor.BreakingCurrent.IsGiven())
			m.Need("precharge.contactor.voltage", contactor.Voltage.IsGiven())
		}
	}); m != nil {
		return f.Lacking(m...)
	}
	f = f.Judged(finding.ValueOf(a.charge[ofCurrent].Ends()), finding.AtMost(float64(contactor.BreakingCurrent.Nominal)), 0)
	f.Parts = []finding.Part{{Name: "contactor voltage", Unit: "V", Value: finding.Exactly(float64(contactor.Voltage.Nominal))}}
	f = a.explained(f, a.explainPeakCurrent)
	if f.Verdict != finding.Pass {
		f.Because = append(f.Because, fmt.Sprintf("it breaks up to %s and may break %s", say(f.Value.High, "A"), say(*f.Limit.High, "A")))
	}
	if highest := a.site.Source.HighestRest(); contactor.Voltage.Nominal < highest {
		f.Verdict = finding.Fail
		f.Because = append(f.Because, fmt.Sprintf("its voltage, %s, is below the source's highest, %s", say(float64(contactor.Voltage.Nominal), "V"), say(float64(highest), "V")))
	}
	return a.mended(f, a.remedyBreaking)
}

// missing asks each group of needs; nil when nothing is missing.
func (a *assessment) missing(needs ...func(*finding.Missing)) finding.Missing {
	var m finding.Missing
	for _, need := range needs {
		need(&m)
	}
	return m
}

// judgedTo is the rule of the two findings on the time-out: inside the wanted limit passes, between it and the bare limit
// is marginal, beyond the bare limit fails in any corner. Shown are the wanted limit and the distance to it.
func judgedTo(f finding.Finding, v finding.Value, wanted, bare finding.Limit) finding.Finding {
	atBare, _ := finding.Judge(v, bare, true, 0)
	f = f.Judged(v, wanted, 0)
	switch {
	case atBare == finding.Fail || atBare == finding.Undecided:
		f.Verdict = atBare
	case f.Verdict != finding.Pass:
		f.Verdict = finding.Marginal
	}
	return f
}

// Remaining is the difference between source and bus when the charge has settled, over all corners with the rest voltage
// lowest and highest, and whether the auxiliary supply hiccups in any of them.
func Remaining(s site.Site) (remaining quantity.Spread[quantity.Voltage], hiccups bool) {
	p := pathOf(s)
	highest := float64(s.Source.HighestRest())
	axes := p.axes
	axes[axisEMF] = corner.Axis{Name: "rest voltage", Low: float64(s.Source.LowestRest()), Nominal: highest, High: highest}
	gap := corner.Over(axes[:], func(x []float64) float64 {
		c := p.circuit(x)
		_, remaining, how := c.rest()
		hiccups = hiccups || how == Hiccups
		return float64(remaining)
	})
	return corner.As[quantity.Voltage](gap), hiccups
}
