package measured

import (
	"fmt"
	"math"
	"strings"

	"chargehand/commission/capture"
	"chargehand/commission/finding"
	"chargehand/commission/fit"
	"chargehand/commission/signal"
	"chargehand/commission/site"
)

const prechargeBasis = "least squares of V = V∞ − (V∞ − V₀)·e^(−t⁄τ) on the capture; R from voltage over current, C from charge over voltage; guard band U = k·u (idea of JCGM 106)"

// Precharge judges a pre-charge capture: measured.precharge and, where the bypass closed in it, measured.closing.
func Precharge(s site.Site, c capture.Capture) []finding.Finding {
	f := verdictFinding("measured.precharge", "pre-charge as measured: time constant", "s", prechargeBasis)
	f.Captures = named(c)
	if why := unusable(c, signal.BusVoltage); why != "" {
		f = cannot(f, why)
		f.Cause = readingCauses(paperOf(s), c)
		return []finding.Finding{f}
	}
	k := chargeOf(paperOf(s), c)
	f = k.judged(f)
	all := []finding.Finding{f}
	if closing, ok := k.closing(); ok {
		if len(f.Cause) > 0 && spoilsClosing[f.Cause[0].ID] {
			closing = cannot(verdictFinding(closing.ID, closing.Title, closing.Unit, closing.Basis), f.Cause[0].ID+" makes the difference untrue")
			closing.Captures = named(c)
		}
		all = append(all, closing)
	}
	return all
}

func named(c capture.Capture) []string {
	if c.ID == "" {
		return nil
	}
	return []string{c.ID}
}

// judged holds the charge against the figures on paper.
func (f *charge) judged(out finding.Finding) finding.Finding {
	causes, broken := f.pictures()
	if broken { // no charge of the predicted kind: there is nothing to compare number by number
		out.Cause = causes
		if weight(causes) != finding.Fail {
			return cannot(out, strings.Join(causes[0].Evidence, "; "))
		}
		out.Verdict, out.Because = finding.Fail, append(out.Because, causes[0].Evidence...)
		return out
	}
	if why := f.unfit(); why != "" {
		out = cannot(out, why)
		out.Cause = causes
		return out
	}
	out = f.compared(out)
	failed := out.Verdict == finding.Fail
	if len(causes) > 0 && out.Verdict != finding.Fail {
		out.Verdict = finding.Worst(out.Verdict, weight(causes))
		out.Because = append(out.Because, causes[0].Evidence...)
	}
	if failed && (len(causes) == 0 || causes[0].ID == "link-drops") {
		causes = ranked(append(f.differences(), lowered(causes)...))
	}
	out.Cause = causes
	return out
}

// unfit says in words why the stretch before the bypass carries no verdict, "" where it does.
func (f *charge) unfit() string {
	switch {
	case f.fit.Status == fit.TooEarly:
		return "the capture ended too early: " + f.fit.Why
	case f.fit.Status != fit.OK && f.bus.span() < 3*f.bus.resolution:
		return fmt.Sprintf("the bus voltage does not move: it stays at %s", number(f.bus.v[0], "V"))
	case f.fit.Status != fit.OK:
		return fmt.Sprintf("the charge does not fit an exponential: %s", f.fit.Why)
	}
	if gap := f.capture.LongestGap(signal.BusVoltage, f.start, f.end); gap > 0.4*f.tau().nominal && gap > 4*f.refresh {
		return fmt.Sprintf("the capture has a gap of %s, more than 0.4 time constants", number(gap, "s"))
	}
	if f.fit.S > 0.05*f.scale() {
		return fmt.Sprintf("the samples scatter by %s about the best exponential", number(f.fit.S, "V"))
	}
	if f.fit.Final < f.fit.Start {
		return "the bus voltage falls instead of rising"
	}
	return ""
}

// compared judges time constant, settled voltage and, where there is a current, resistance and capacitance; the gravest
// verdict stands.
func (f *charge) compared(out finding.Finding) finding.Finding {
	tau := measurement{value: f.fit.Tau, u: f.fit.TauSE, freedom: f.fit.Freedom, bound: 0.002 * f.fit.Tau}
	verdict, text := judge(tau, f.tau(), "time constant", "s")
	out = withMeasurement(out, tau, f.tau())
	out.Because = append(out.Because, text)
	out.Verdict = verdict
	add := func(m measurement, b band, what, unit string) {
		v, words := judge(m, b, what, unit)
		if v == finding.Fail { // beside the time constant these only count where they prove something
			out.Verdict = finding.Fail
		}
		out.Because = append(out.Because, words)
		out.Parts = append(out.Parts, finding.Part{Name: what, Unit: unit, Value: m.asValue()})
	}
	out.Parts = append(out.Parts, finding.Part{Name: "settled voltage", Unit: "V", Value: f.settled().asValue()})
	if drop, ok := f.drop(); ok {
		add(drop, f.dropBand(), "settled difference to the source", "V")
	}
	if m, ok := f.ohmsOfResistor(); ok {
		add(m, f.ohmsBand(), "pre-charge resistance", "Ω")
	}
	if m, ok := f.farads(); ok {
		add(m, f.faradsBand(), "capacitance", "F")
	} else {
		m := measurement{value: f.faradsFromTau(), u: f.fit.TauSE / f.r.nominal, freedom: f.fit.Freedom, bound: f.faradsFromTau() * (f.r.high - f.r.low) / 2 / f.r.nominal}
		out.Parts = append(out.Parts, finding.Part{Name: "capacitance", Unit: "F", Value: m.asValue()})
	}
	return out
}

// faradsFromTau is C = τ·E ⁄ (R·V∞) with the resistance on paper: a visible bleeder shortens τ as it lowers V∞ (formulas H).
func (f *charge) faradsFromTau() float64 { return f.unloadedTau() / f.r.nominal }

// unloadedTau is R·C: the fitted time constant with what loads the bus taken out.
func (f *charge) unloadedTau() float64 {
	if f.emf > 0 && f.fit.Final > 0.2*f.emf && f.cSource == 0 {
		return f.fit.Tau * math.Max(1, f.emf/f.fit.Final)
	}
	return f.fit.Tau
}

// currentError is how far a current transducer of the plant may be off, as a fraction of its reading: common practice, no
// key of the site file states it.
const currentError = 0.02

func (f *charge) settled() measurement {
	return measurement{value: f.fit.Final, u: f.fit.FinalSE, freedom: f.fit.Freedom, bound: f.busError}
}

// drop is the difference to the source at which the charge settles.
func (f *charge) drop() (measurement, bool) {
	if !(f.emf > 0) {
		return measurement{}, false
	}
	emf := f.emf
	if f.cSource > 0 { // the source falls as it gives its charge
		emf = f.source.between(f.end-0.3, f.end+0.001).at(f.end)
	}
	return measurement{value: emf - f.fit.Final, u: f.fit.FinalSE, freedom: f.fit.Freedom}, !math.IsNaN(emf)
}

// diodeDrop is what the freewheel diodes may take at most at the end of a charge: common practice.
const diodeDrop = 1.5

// dropBand is the settled difference that the two signals may show: the errors that the site states for them are part of
// what is predicted, so that only the scatter is left for the guard band. The same holds for the currents below.
func (f *charge) dropBand() band {
	b := f.settledDrop(f.scale())
	errors := f.busError + f.sourceError
	return band{-errors, b.nominal, b.high + diodeDrop + errors}
}

func (f *charge) ohmsBand() band   { return f.rp.widened(currentError) }
func (f *charge) faradsBand() band { return f.c.widened(currentError + 0.005) }

func (f *charge) ohmsOfResistor() (measurement, bool) {
	if !f.resistance.ok {
		return measurement{}, false
	}
	choke := f.r.nominal - f.rp.nominal - f.ri.nominal
	return measurement{value: f.resistance.value - choke, u: f.resistance.u, freedom: f.resistance.n - 1}, true
}

func (f *charge) farads() (measurement, bool) {
	e := f.capacitance
	if !e.ok || e.u > 0.2*e.value {
		return measurement{}, false
	}
	return measurement{value: e.value, u: e.u, freedom: e.n - 3}, true
}

// closing judges the difference across the bypass at the instant it closed.
func (f *charge) closing() (finding.Finding, bool) {
	closed := f.bypass.firstAt(0.5, 0)
	at := closed
	if f.step.found && (math.IsNaN(at) || math.Abs(f.step.at-at) < 0.5) {
		at = f.step.at
	}
	if math.IsNaN(at) || f.bypass.ok && math.IsNaN(closed) && !f.step.found {
		return finding.Finding{}, false
	}
	out := verdictFinding("measured.closing", "difference across the bypass as it closed", "V",
		"source less bus voltage at the last samples before the closing, carried on to it by the fitted curve; guard band from both measuring errors")
	out.Captures = named(f.capture)
	if !(f.emf > 0) {
		return cannot(out, "the source voltage was not read"), true
	}
	difference := f.source.at(at-1e-9) - f.before(at)
	limit := float64(f.site.Precharge.ClosingDifference.Nominal)
	b := band{math.Inf(-1), limit, limit + f.busError + f.sourceError} // the device releases on what it measures
	m := measurement{value: difference, u: math.Hypot(f.lateScatter(), f.slewError(at)), freedom: max(f.fit.Freedom, 3)}
	verdict, text := judge(m, b, "difference at closing", "V")
	out = withMeasurement(out, m, b)
	out.Verdict, out.Because = verdict, append(out.Because, text)
	after := f.bus.between(at+0.1+2*f.refresh, at+2)
	if after.ok {
		rest := f.source.at(after.t[len(after.t)-1]) - fit.Median(after.v)
		out.Parts = append(out.Parts, finding.Part{Name: "difference after closing", Unit: "V", Value: finding.Exactly(rest)})
	}
	if verdict == finding.Fail {
		out.Cause = []finding.Cause{because("bypass-early", 0.95, text)}
	}
	return out, true
}

// before is the bus voltage just before an instant: the fitted curve's where it is good there, else the last sample's.
func (f *charge) before(at float64) float64 {
	last := f.bus.between(math.Inf(-1), f.end).at(f.end)
	if f.fit.Status == fit.OK && math.Abs(f.fit.At(f.end)-last) < 6*f.noise+3*f.bus.resolution {
		return math.Max(last, f.fit.At(at))
	}
	return last
}

// lateScatter is the standard deviation of the samples about the curve over the last third of the charge, where the voltage
// is slow and the polling's jitter does not count.
func (f *charge) lateScatter() float64 {
	floor := f.bus.resolution / math.Sqrt(12)
	if f.fit.Status != fit.OK {
		return math.Max(f.noise, floor)
	}
	var rest []float64
	for _, r := range f.rows[2*len(f.rows)/3:] {
		rest = append(rest, r.bus-f.fit.At(r.t))
	}
	if len(rest) < 4 {
		return math.Max(f.noise, floor)
	}
	return math.Max(fit.Average(rest).SD, floor)
}

// slewError is what one renewal of the register is worth where the voltage still rises.
func (f *charge) slewError(at float64) float64 {
	if f.fit.Status != fit.OK {
		return 0
	}
	slope := (f.fit.Final - f.fit.At(at)) / f.fit.Tau
	return math.Max(0, slope) * math.Max(f.refresh, 0.05) / math.Sqrt(3)
}
