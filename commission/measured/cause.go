package measured

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"chargehand/commission/finding"
	"chargehand/commission/fit"
	"chargehand/commission/signal"
)

// ranked orders causes by score; equal scores keep their order.
func ranked(causes []finding.Cause) []finding.Cause {
	slices.SortStableFunc(causes, func(a, b finding.Cause) int { return cmp.Compare(b.Score, a.Score) })
	return causes
}

// pictures looks for what is no charge of the predicted kind at all, or what stands beside a good one. broken tells that
// numbers of the curve would mean nothing.
func (f *charge) pictures() (causes []finding.Cause, broken bool) {
	for _, look := range []func() []finding.Cause{f.readings, f.sourceGone, f.beforeCommand, f.noRise, f.sourceLeft, f.standing, f.collapse, f.bridged} {
		found := look()
		if len(found) == 0 {
			continue
		}
		if found[0].ID == "link-drops" && f.unfit() == "" { // the rest of the record carries the curve
			return ranked(append(f.beside(), found...)), false
		}
		return ranked(found), true
	}
	return ranked(f.beside()), false
}

// sourceGone: the source is not there, or the wrong way round, or leaves during the charge.
func (f *charge) sourceGone() []finding.Cause {
	if !f.source.ok {
		return nil
	}
	level := fit.Median(f.source.v)
	lowest := float64(f.site.Source.LowestRest())
	if level < -0.1*lowest {
		return []finding.Cause{because("source-reversed", 0.97, fmt.Sprintf("source voltage %s, bus %s", number(level, "V"), number(f.v0, "V")))}
	}
	if i := f.during(); level < 0.1*lowest && f.rise < 0.1*lowest && f.current.ok && i < -0.2*lowest/f.r.nominal { // an unsigned register shows no negative voltage
		return []finding.Cause{because("source-reversed", 0.94, fmt.Sprintf("source current %s with the pre-charge closed, source voltage %s: it flows through the lower diodes", number(i, "A"), number(level, "V")))}
	}
	rest := f.source.between(math.Inf(-1), 0)
	if rest.ok && fit.Median(rest.v) < 0.2*lowest && f.source.greatest() < 0.3*lowest && f.rise < 0.1*lowest {
		return together(0.9, "the voltage before and after the fuse", []string{fmt.Sprintf("source voltage %s before the command and the bus does not rise", number(fit.Median(rest.v), "V"))}, "fuse-open")
	}
	return nil
}

// beforeCommand: the bus was not dead when the command came.
func (f *charge) beforeCommand() []finding.Cause {
	if found := f.closedFromTheStart(); found != nil {
		return found
	}
	scale := f.scale()
	before := f.bus.between(math.Inf(-1), 0)
	if !before.ok || f.v0 < math.Max(0.05*scale, f.busError) || f.isOffset() {
		return nil
	}
	slope, u := drift(before)
	falls := slope < -3*u && slope < -0.4*f.v0/(f.rb.high*f.c.high)
	evidence := []string{fmt.Sprintf("bus at %s before the command, source at %s", number(f.v0, "V"), number(f.emf, "V"))}
	if u > 0 {
		evidence = append(evidence, fmt.Sprintf("changing by %s ± %s per second", number(slope, "V"), number(2*u, "V")))
	}
	near := math.Abs(f.v0-f.emf) < 1.5*(f.busError+f.sourceError)+0.01*scale
	if found := f.reportedClosed(near, evidence); found != nil {
		return found
	}
	starBefore := f.star.between(math.Inf(-1), 0)
	if starBefore.ok {
		star := fit.Median(starBefore.v)
		atSource := math.Abs(star-f.emf) < f.sourceError+f.busError+0.02*scale
		atBus := math.Abs(star-f.v0) < f.busError+0.01*scale
		evidence = append(evidence, fmt.Sprintf("star point at %s", number(star, "V")))
		switch {
		case atBus && !atSource:
			return []finding.Cause{because("upper-switch-shorted", 0.93, evidence...)}
		case atSource && near:
			if f.emf-f.v0 > 0.3*f.settledDrop(f.emf).nominal && f.emf-f.v0 > 2 && f.currentBefore() > 0 {
				return []finding.Cause{because("precharge-welded", 0.85, evidence...), because("bypass-welded", 0.6, evidence...)}
			}
			return []finding.Cause{because("bypass-welded", 0.95, evidence...), because("precharge-welded", 0.5, evidence...)}
		case atSource:
			return []finding.Cause{because("bypass-welded", 0.85, evidence...)}
		}
	}
	switch {
	case near && !starBefore.ok:
		return together(0.7, "the star point against minus with both contactors open: at the source's voltage the bypass is welded; the bus over time: falling it is still charged, standing it is live",
			evidence, "bypass-welded", "bus-live", "bus-still-charged")
	case falls && f.v0 < scale*1.3:
		return []finding.Cause{because("bus-still-charged", 0.92, evidence...), because("bus-live", 0.3, evidence...)}
	case f.v0 > f.emf && !falls:
		return []finding.Cause{because("bus-live", 0.92, evidence...), because("bus-still-charged", 0.4, evidence...)}
	case f.v0 < f.emf-f.busError-f.sourceError:
		return []finding.Cause{because("bus-still-charged", 0.9, evidence...), because("bus-live", 0.4, evidence...)}
	}
	return together(0.7, "the bus over time with the source isolated: falling it is still charged, standing it is live", evidence, "bus-live", "bus-still-charged")
}

// closedFromTheStart: the record begins with a contact that reports closed, so nothing stands before it. The bus is farther
// than a charge begun just then could be.
func (f *charge) closedFromTheStart() []finding.Cause {
	reported := func(contact trace) bool { return contact.ok && contact.v[0] > 0.5 }
	if len(f.bus.v) == 0 || f.bus.t[0] < -0.02 || !f.source.ok {
		return nil
	}
	first := f.bus.v[0]
	errors := f.busError + f.sourceError + 0.01*f.scale()
	evidence := []string{fmt.Sprintf("bus at %s, source at %s in the first sample", number(first, "V"), number(f.source.v[0], "V"))}
	across := first
	if f.star.ok {
		across = f.star.v[0]
	}
	if reported(f.bypass) && first > 0.1*f.scale() && math.Abs(f.source.v[0]-across) < errors {
		return []finding.Cause{because("bypass-welded", 0.94, append(evidence, "the bypass reports closed from the first sample on")...), because("contact-report-false", 0.3, evidence...)}
	}
	const lately = 0.25 // s, at most since a command that the record missed
	tau := f.tau().low
	if f.fit.Status == fit.OK {
		tau = f.fit.Tau
	}
	started := f.scale() * (1 - math.Exp(-lately/tau))
	if reported(f.precharge) && math.IsNaN(f.opened(f.precharge)) && first > started+errors && first < f.emf+errors {
		return []finding.Cause{because("precharge-welded", 0.9, append(evidence, "the pre-charge contactor reports closed from the first sample to the last")...),
			because("bus-still-charged", 0.4, evidence...)}
	}
	return nil
}

// isOffset tells whether what the bus reads before the command is the zero error of its sensor: it stands still, and the
// settled voltage is above the source by about as much.
func (f *charge) isOffset() bool {
	if f.v0 > 0.15*f.scale() || f.fit.Status != fit.OK || !(f.emf > 0) {
		return false
	}
	above := f.fit.Final - f.emf + f.settledDrop(f.scale()).nominal
	return above > 0.5*f.v0-0.5*(f.busError+f.sourceError)
}

// reportedClosed: a contact's own report before the command says through which path the bus stands at the source.
func (f *charge) reportedClosed(near bool, evidence []string) []finding.Cause {
	before := func(contact trace) bool { return fit.Median(contact.between(math.Inf(-1), -0.02).v) > 0.5 }
	path := near || f.emf > f.v0 && f.emf-f.v0 < f.settledDrop(f.scale()).high+2*(f.busError+f.sourceError)
	switch {
	case path && before(f.precharge):
		return []finding.Cause{because("precharge-welded", 0.93, append(evidence, "the pre-charge contactor reports closed before the command")...), because("bypass-welded", 0.3, evidence...)}
	case path && before(f.bypass):
		return []finding.Cause{because("bypass-welded", 0.94, append(evidence, "the bypass reports closed before the command")...), because("contact-report-false", 0.4, evidence...)}
	}
	return nil
}

func (f *charge) currentBefore() float64 {
	return fit.Median(f.current.between(math.Inf(-1), 0).v)
}

// drift is the slope of a short record and its standard error; zero and zero where there are too few samples.
func drift(tr trace) (slope, u float64) {
	l := fit.Line(tr.t, tr.v, tr.resolution)
	if l.Status != fit.OK {
		return 0, 0
	}
	return l.Slope, l.SlopeSE
}

// noRise: the bus stays where it was although the pre-charge closed.
func (f *charge) noRise() []finding.Cause {
	scale := f.scale()
	early := 0.3 * f.tau().high
	expected := scale * (1 - math.Exp(-0.3))
	if f.bus.last() < early || f.v0 > 0.5*scale || f.rise > 0.25*expected && f.rise > 0.1*scale*math.Min(1, f.bus.last()/f.tau().high) {
		return nil
	}
	evidence := []string{fmt.Sprintf("bus rose by %s in %s, at least %s expected", number(f.rise, "V"), number(f.bus.last(), "s"), number(expected, "V"))}
	i, full := f.during(), scale/f.r.nominal
	if !f.current.ok {
		if f.precharge.ok && f.precharge.greatest() < 0.5 {
			return []finding.Cause{because("resistor-open", 0.6, append(evidence, "the pre-charge contactor never reported closed")...)}
		}
		if !f.source.ok {
			return together(0.6, "the source current: near E ⁄ R the bus is shorted, near zero the path is open", evidence, "bus-shorted", "resistor-open", "lower-switch-shorted", "fuse-open")
		}
		return together(0.6, "the source current: near E ⁄ R the bus is shorted, near zero the path is open", evidence, "bus-shorted", "resistor-open", "lower-switch-shorted")
	}
	evidence = append(evidence, fmt.Sprintf("current %s, E ⁄ R is %s", number(i, "A"), number(full, "A")))
	if math.Abs(i) < 0.1*full+2*f.current.resolution {
		if f.source.ok && f.during2(f.source) < 0.3*scale {
			return []finding.Cause{because("fuse-open", 0.93, append(evidence, "no voltage behind the source's fuse")...)}
		}
		return []finding.Cause{because("resistor-open", 0.93, evidence...), because("fuse-open", 0.3, evidence...)}
	}
	if i < 0 {
		return []finding.Cause{because("source-reversed", 0.9, evidence...), because("current-reversed", 0.5, evidence...)}
	}
	if len(f.phaseCurrents) == f.phases && f.phases > 1 {
		shares, greatest := f.shares()
		evidence = append(evidence, "phase shares "+shares)
		if greatest > 0.8 {
			return []finding.Cause{because("lower-switch-shorted", 0.94, evidence...), because("bus-shorted", 0.3, evidence...)}
		}
		return []finding.Cause{because("bus-shorted", 0.95, evidence...)}
	}
	return []finding.Cause{because("bus-shorted", 0.85, evidence...), because("lower-switch-shorted", 0.6, evidence...)}
}

// during is the median source current while the pre-charge was closed.
func (f *charge) during() float64 { return f.during2(f.current) }

func (f *charge) during2(tr trace) float64 {
	from, to := 0.05+f.refresh, math.Min(f.bus.last(), 0.5*f.tau().nominal+0.1)
	if opened := f.opened(f.precharge); opened < to {
		to = opened
	}
	return fit.Median(tr.between(from, to).v)
}

// shares of the phases in the current during the charge, and the greatest as a fraction of all.
func (f *charge) shares() (words string, greatest float64) {
	total, each := 0.0, make([]float64, len(f.phaseCurrents))
	for i, p := range f.phaseCurrents {
		each[i] = f.during2(p)
		total += each[i]
	}
	for i, a := range each {
		words += fmt.Sprintf("%.0f ", 100*a/total)
		greatest = math.Max(greatest, each[i]/total)
	}
	return words + "%", greatest
}

// collapse: the bus rose and came down again while the resistor carried it.
func (f *charge) collapse() []finding.Cause {
	part := f.bus.between(0, f.end)
	if !part.ok || f.rise < 0.05*f.scale() {
		return nil
	}
	top, topAt := math.Inf(-1), 0.0
	var turns int
	swing := math.Max(0.03*f.scale(), 12*f.noiseGuess())
	extreme, up, low := part.v[0], true, math.Inf(1)
	for i, v := range part.v {
		if v > top {
			top, topAt = v, part.t[i]
		}
		switch {
		case up && v > extreme, !up && v < extreme:
			extreme = v
		case math.Abs(v-extreme) > swing:
			turns++
			up, extreme = !up, v
		}
		if part.t[i] > topAt {
			low = math.Min(low, v)
		}
	}
	if turns == 0 {
		return nil
	}
	fallen := fmt.Sprintf("bus reached %s at %s, then fell to %s", number(top, "V"), number(topAt, "s"), number(low, "V"))
	if turns >= 3 {
		return []finding.Cause{because("auxiliary-stall", 0.92, fmt.Sprintf("bus swings %d times between about %s and %s", turns, number(low, "V"), number(top, "V")))}
	}
	if low < 0.1*f.scale() {
		return []finding.Cause{because("bus-shorted-late", 0.93, fallen), because("load-returns-early", 0.2, fallen)}
	}
	if f.source.ok && f.source.between(topAt, f.end).least() < 0.85*f.emf {
		return []finding.Cause{because("source-opens", 0.9, fallen, fmt.Sprintf("source voltage fell to %s", number(f.source.between(topAt, f.end).least(), "V")))}
	}
	return []finding.Cause{because("load-returns-early", 0.85, fallen), because("auxiliary-stall", 0.5, fallen)}
}

func (f *charge) noiseGuess() float64 { return math.Max(f.bus.resolution, 0.001*f.scale()) }

// bridged: the bypass did not close when it should, as it should.
func (f *charge) bridged() []finding.Cause {
	allowed := float64(f.site.Precharge.ClosingDifference.Nominal) + f.busError + f.sourceError
	if found := f.falseReport(); found != nil {
		return found
	}
	if f.step.found {
		difference := f.emf - f.step.before
		slack := 0.25*math.Max(0, f.scale()-f.step.before)*math.Min(1, f.refresh/f.tau().low) + 3*f.noiseGuess()
		if difference > allowed+slack {
			evidence := fmt.Sprintf("bus leapt from %s to %s at %s with %s still missing, %s allowed", number(f.step.before, "V"), number(f.step.after, "V"),
				number(f.step.at, "s"), number(difference, "V"), number(allowed, "V"))
			if f.step.before < f.v0+0.1*f.scale() && f.step.at < 0.15*f.tau().nominal {
				return []finding.Cause{because("bypass-welded", 0.9, evidence, "no exponential before it"), because("bypass-early", 0.5, evidence)}
			}
			return []finding.Cause{because("bypass-early", 0.95, evidence)}
		}
	}
	if f.step.found && f.bypass.ok && f.bypass.greatest() < 0.5 && f.bus.last() > f.step.at+0.3+3*f.refresh {
		return []finding.Cause{because("contact-report-false", 0.9, fmt.Sprintf("bus leapt by %s to the source at %s, and yet no bypass reported", number(f.step.after-f.step.before, "V"), number(f.step.at, "s")))}
	}
	if opened := f.opened(f.bypass); !math.IsNaN(opened) {
		return []finding.Cause{because("bypass-drops-out", 0.9, fmt.Sprintf("bypass reported closed and open again at %s", number(opened, "s")))}
	}
	return f.neverBridged()
}

// neverBridged: the difference was small enough for long enough and no bypass closed.
func (f *charge) neverBridged() []finding.Cause {
	if !f.bypass.ok || !math.IsNaN(f.bypass.firstAt(0.5, 0)) || f.step.found || !(f.emf > 0) || f.fit.Status != fit.OK {
		return nil
	}
	small := 0.9 * float64(f.site.Precharge.ClosingDifference.Nominal)
	if f.emf-f.fit.Final > small {
		return nil
	}
	due := math.Max(f.bus.firstAt(f.emf-small, 0), float64(f.site.Precharge.MinimumTime.Nominal))
	waited := f.bus.last() - due
	opened := f.opened(f.precharge)
	if math.IsNaN(due) || waited < 1+0.3*f.tau().nominal && !(opened > due) {
		return nil
	}
	evidence := fmt.Sprintf("difference below %s since %s, no bypass reported in the %s after it", number(small, "V"), number(due, "s"), number(waited, "s"))
	return []finding.Cause{because("bypass-never", 0.92, evidence)}
}

// falseReport: the bypass reports closed while the voltage across it is large.
func (f *charge) falseReport() []finding.Cause {
	at := f.bypass.firstAt(0.5, math.Inf(-1))
	if math.IsNaN(at) || !f.source.ok {
		return nil
	}
	across, what := f.star, "star point"
	if !across.ok {
		across, what = f.bus, "bus"
	}
	to := at + 2*f.refresh + 0.1 + 0.5*f.tau().nominal
	if opened := f.opened(f.bypass); opened < to+0.1 {
		to = opened - 0.1
	}
	part := across.between(at+2*f.refresh+0.1, to)
	if !part.ok {
		return nil
	}
	missing := f.scale() - fit.Median(part.v)
	if missing < 0.1*f.scale()+f.busError+f.sourceError {
		return nil
	}
	return []finding.Cause{because("contact-report-false", 0.93, fmt.Sprintf("bypass reports closed at %s, %s to source still %s", number(at, "s"), what, number(missing, "V")))}
}

// sourceLeft: the source's voltage breaks down in the middle of the charge.
func (f *charge) sourceLeft() []finding.Cause {
	if !f.source.ok || !(f.emf > 0) {
		return nil
	}
	const stays = 0.3 // s; the inrush of an early bypass is over before
	sag := 0.05*f.emf + 3*f.scale()/f.r.nominal*f.ri.high
	if f.cSource > 0 {
		sag += f.emf * f.c.high / f.cSource
	}
	for i, t := range f.source.t {
		if t < 0.02 || i+3 >= len(f.source.t) {
			continue
		}
		if fit.Median(f.source.v[i:i+4]) < f.emf-sag && fit.Median(f.source.between(t, t+stays).v) < f.emf-sag && f.bus.at(t) < 0.97*f.emf {
			return []finding.Cause{because("source-opens", 0.93, fmt.Sprintf("source voltage fell from %s to %s at %s, bus at %s", number(f.emf, "V"), number(f.source.v[i], "V"), number(t, "s"), number(f.bus.at(t), "V")))}
		}
	}
	return nil
}

// differences ranks what makes a smooth charge differ from its prediction.
func (f *charge) differences() []finding.Cause {
	var found []finding.Cause
	found = append(found, f.loads()...)
	if m, ok := f.ohmsOfResistor(); ok {
		haveLoad := len(found) > 0
		for _, c := range f.withCurrent(m) {
			if !haveLoad || c.ID == "resistor-high" || c.ID == "resistor-low" { // a load spoils the balance of charges
				found = append(found, c)
			}
		}
	} else if len(found) == 0 {
		found = append(found, f.withoutCurrent()...)
	}
	if len(found) == 0 {
		found = f.withinTolerances()
	}
	if len(found) == 0 {
		found = append(found, because(notKnown, 0.5, f.summary()))
	}
	return ranked(found)
}

func (f *charge) summary() string {
	return fmt.Sprintf("time constant %s against %s, settled %s below the source", number(f.fit.Tau, "s"), f.tau().words("s"), number(f.emf-f.fit.Final, "V"))
}

// loads: the charge settles too far below the source.
func (f *charge) loads() []finding.Cause {
	drop, ok := f.drop()
	if !ok {
		return nil
	}
	if low := f.dropBand().low; drop.value < low-drop.expanded() {
		return f.aboveSource(drop)
	}
	excess := drop.value - f.dropBand().high - (f.resistanceRatio()-1)*f.settledDrop(f.scale()).high
	if excess < drop.expanded() {
		return nil
	}
	excess = drop.value - f.settledDrop(f.scale()).nominal
	final := f.fit.Final
	extra := excess / f.r.nominal // A at the end, beyond bleeder and auxiliary supply
	ohms := final / extra
	evidence := []string{fmt.Sprintf("settles %s below the source, %s more than predicted", number(drop.value, "V"), number(excess, "V"))}
	short := 1 - f.fit.Tau/f.tau().nominal
	low := 1 - final/f.emf
	evidence = append(evidence, fmt.Sprintf("time constant %.1f %% short, final voltage %.1f %% low: a load of about %s was left on", 100*short, 100*low, number(ohms, "Ω")))
	if f.current.ok && len(f.rows) > 0 {
		end := f.endCurrent()
		evidence = append(evidence, fmt.Sprintf("%s still flow at the end, %s across the resistor asks for %s", number(end, "A"), number(drop.value, "V"), number(drop.value/f.r.nominal, "A")))
		if end < 0.4*drop.value/f.r.nominal && drop.value/f.r.nominal > 3*f.current.resolution {
			return append(together(0.85, "both voltages against an instrument at two levels: same ratio is a gain, same difference an offset", evidence, "sensor-gain", "sensor-offset"),
				because("load-left-on", 0.2, evidence...))
		}
	}
	return f.kindOfLoad(evidence)
}

// resistanceRatio is by how much the resistance exceeds its value on paper, at least 1: what the bus needs makes a larger
// drop in a larger resistance. Without a current it is taken from the time constant.
func (f *charge) resistanceRatio() float64 {
	if f.resistance.ok && f.resistance.value > f.rp.high {
		return f.resistance.value / f.rp.nominal
	}
	if r := f.unloadedTau() / f.tau().nominal; !f.resistance.ok && r > 1.15 {
		return r
	}
	return 1
}

// withCurrent tells resistance and capacitance apart.
func (f *charge) withCurrent(ohms measurement) []finding.Cause {
	farads, haveFarads := f.farads()
	r, c := outside(ohms, f.ohmsBand()), 0.0
	if haveFarads {
		c = outside(farads, f.faradsBand())
	}
	ratioR, ratioC := ohms.value/f.rp.nominal, farads.value/f.c.nominal
	evidence := []string{fmt.Sprintf("resistance %s, %s on paper", number(ohms.value, "Ω"), number(f.rp.nominal, "Ω"))}
	if haveFarads {
		evidence = append(evidence, fmt.Sprintf("capacitance %s, %s on paper", number(farads.value, "F"), number(f.c.nominal, "F")))
	}
	if haveFarads && r != 0 && math.Abs(ratioR*ratioC-1) < 0.12 && math.Abs(ratioC-1) > 0.08 && f.tau().holds(f.fit.Tau, 0) && f.current.ok && c*r <= 0 && !f.currentsAgree() {
		return []finding.Cause{because("sensor-gain", 0.85, append(evidence, fmt.Sprintf("time constant as predicted: the current reads %.2f of what flows", 1/ratioR))...)}
	}
	var found []finding.Cause
	switch {
	case r > 0:
		found = append(found, because("resistor-high", 0.93, evidence...))
	case r < 0:
		found = append(found, because("resistor-low", 0.93, evidence...))
	}
	switch {
	case c > 0:
		found = append(found, because("bank-added", 0.91, append(evidence, f.bankWords(farads.value))...))
	case c < 0:
		found = append(found, because("bank-missing", 0.91, append(evidence, f.bankWords(farads.value))...))
	}
	return found
}

// currentsAgree tells whether the phases' own transducers add up to the source current: then its gain is not what is wrong.
func (f *charge) currentsAgree() bool {
	if len(f.phaseCurrents) != f.phases || !traceOf(f.capture, signal.SourceCurrent).ok {
		return false
	}
	to := math.Min(f.end, f.start+f.tau().nominal)
	phases := fit.Average(sum(f.phaseCurrents).between(f.start, to).v).Mean
	source := fit.Average(f.current.between(f.start, to).v).Mean
	return math.Abs(phases/source-1) < 0.06
}

// withinTolerances: the time constant proves a fault, and resistance and capacitance, known less well, both lie within what
// they may be. The one that uses up its tolerance is named; where both do, both are.
func (f *charge) withinTolerances() []finding.Cause {
	ohms, haveOhms := f.ohmsOfResistor()
	farads, haveFarads := f.farads()
	tau := measurement{value: f.fit.Tau, u: f.fit.TauSE, freedom: f.fit.Freedom}
	off := outside(tau, f.tau())
	if !haveOhms || !haveFarads || off == 0 {
		return nil
	}
	used := func(v float64, b band) float64 {
		if off < 0 {
			return (b.nominal - v) / (b.nominal - b.low)
		}
		return (v - b.nominal) / (b.high - b.nominal)
	}
	r, c := used(ohms.value, f.rp), used(farads.value, f.c)
	resistor, bank := "resistor-low", "bank-missing"
	if off > 0 {
		resistor, bank = "resistor-high", "bank-added"
	}
	evidence := []string{fmt.Sprintf("time constant %+.0f %%, resistance %+.1f %%, capacitance %+.1f %%", 100*(f.fit.Tau/f.tau().nominal-1), 100*(ohms.value/f.rp.nominal-1),
		100*(farads.value/f.c.nominal-1)), f.bankWords(farads.value)}
	switch {
	case c > 0.8 && c > r+0.15:
		return []finding.Cause{because(bank, 0.8, evidence...), because(resistor, 0.4, evidence...)}
	case r > 0.8 && r > c+0.15:
		return []finding.Cause{because(resistor, 0.8, evidence...), because(bank, 0.4, evidence...)}
	case r > 0.5 && c > 0.5:
		return together(0.7, "the resistor cold, four-wire, and each bank's capacitance", evidence, bank, resistor)
	}
	return nil
}

// outside is how far a measurement lies beyond a band and its own uncertainty: negative below, positive above, 0 where it
// does not.
func outside(m measurement, b band) float64 {
	U := m.expanded()
	switch {
	case m.value > b.high+U:
		return m.value - b.high
	case m.value < b.low-U:
		return m.value - b.low
	}
	return 0
}

// withoutCurrent names resistance and capacitance together: a voltage record yields only their product.
func (f *charge) withoutCurrent() []finding.Cause {
	product := measurement{value: f.unloadedTau(), u: f.fit.TauSE, freedom: f.fit.Freedom, bound: 0.005 * f.fit.Tau}
	b := band{f.r.low * f.series(f.c.low), f.r.nominal * f.series(f.c.nominal), f.r.high * f.series(f.c.high)}
	off := outside(product, b)
	if off == 0 {
		return nil
	}
	ratio := product.value / b.nominal
	evidence := []string{fmt.Sprintf("R·C is %s, %s on paper: ratio %.2f", number(product.value, "s"), number(b.nominal, "s"), ratio), f.bankWords(f.c.nominal * ratio)}
	parted := "the current at the start of a charge gives the resistance, the discharge the capacitance"
	if off > 0 {
		return together(0.8, parted, evidence, "resistor-high", "bank-added")
	}
	return together(0.8, parted, evidence, "bank-missing", "resistor-low")
}

// bankWords compares a capacitance with the banks on paper.
func (f *charge) bankWords(farads float64) string {
	delta := farads - f.c.nominal
	for _, b := range f.site.Bus.Capacitances {
		value := float64(b.Value.Nominal)
		if b.Isolated == (delta > 0) && math.Abs(math.Abs(delta)/value-1) < 0.25 {
			return fmt.Sprintf("%s %s, about as much as %s", number(math.Abs(delta), "F"), more(delta), b.Name)
		}
	}
	return fmt.Sprintf("%s %s than on paper", number(math.Abs(delta), "F"), more(delta))
}

func more(delta float64) string {
	if delta > 0 {
		return "more"
	}
	return "less"
}
