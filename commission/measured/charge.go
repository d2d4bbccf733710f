package measured

import (
	"math"

	"chargehand/commission/capture"
	"chargehand/commission/fit"
	"chargehand/commission/signal"
)

// charge is a pre-charge capture taken apart: what stood before the command, the stretch that carries the fit, the step of
// the bypass, and what follows from the currents.
type charge struct {
	paper
	capture capture.Capture

	bus, source, star, current  trace
	phaseCurrents               []trace
	bypass, precharge, resistor trace

	refresh float64 // of the device's registers where polling is faster, else 0
	noise   float64 // standard deviation of the bus voltage about the fit, at least a rectangle of its resolution
	emf     float64 // V, of the source at rest; NaN where it was not read
	v0      float64 // V, of the bus before the command
	start   float64 // seconds, when the bus began to rise
	end     float64 // seconds, end of the stretch that the resistor alone carries
	step    jump    // of the bus voltage at which the resistor was bridged
	rise    float64 // greatest bus voltage less v0 in the record after the command
	fit     fit.Curve
	rows    []row

	resistance, capacitance, conductance estimate // from the currents
}

// row is all signals at one renewal by the device.
type row struct{ t, bus, source, current float64 }

// estimate is a value found from the currents.
type estimate struct {
	value, u float64
	n        int
	ok       bool
}

// jump is a step of the bus voltage that no resistor lets through.
type jump struct {
	found         bool
	at            float64 // seconds, between the two samples
	before, after float64 // V
}

func chargeOf(p paper, c capture.Capture) *charge {
	f := &charge{paper: p, capture: c, bus: traceOf(c, signal.BusVoltage), source: traceOf(c, signal.SourceVoltage),
		star: traceOf(c, signal.StarPointVoltage), bypass: traceOf(c, signal.BypassClosed), precharge: traceOf(c, signal.PrechargeClosed),
		resistor: traceOf(c, signal.ResistorTemperature)}
	f.current = traceOf(c, signal.SourceCurrent)
	for _, n := range []signal.Name{signal.PhaseCurrent1, signal.PhaseCurrent2, signal.PhaseCurrent3}[:min(3, p.phases)] {
		if tr := traceOf(c, n); tr.ok {
			f.phaseCurrents = append(f.phaseCurrents, tr)
		}
	}
	if !f.current.ok && len(f.phaseCurrents) == p.phases {
		f.current = sum(f.phaseCurrents)
	}
	f.refresh = fit.Refresh(f.bus.t, f.bus.v, f.bus.resolution)
	f.levels()
	f.findStep()
	f.window()
	f.fitCurve()
	f.fromCurrents()
	return f
}

// sum adds signals that were sampled together.
func sum(all []trace) trace {
	total := trace{ok: true, t: all[0].t, resolution: all[0].resolution * math.Sqrt(float64(len(all)))}
	for _, t := range total.t {
		v := 0.0
		for _, tr := range all {
			v += tr.at(t)
		}
		total.v = append(total.v, v)
	}
	return total
}

// levels finds what stood before the command and the source's voltage at rest: before the command, else at the end of the
// charge where the current is small.
func (f *charge) levels() {
	before := f.bus.between(math.Inf(-1), 0)
	f.v0 = fit.Median(before.v)
	if !before.ok {
		f.v0 = 0
		if len(f.bus.v) > 0 {
			f.v0 = math.Min(f.bus.v[0], f.bus.least())
		}
	}
	f.emf = math.NaN()
	if rest := f.source.between(math.Inf(-1), 0); rest.ok && fit.Median(rest.v) > 0.5*f.source.greatest() {
		f.emf = fit.Median(rest.v)
	} else if f.source.ok {
		late := f.source.between(f.source.last()*0.6, math.Inf(1))
		f.emf = fit.Median(late.v)
	}
	f.rise = f.bus.between(0, math.Inf(1)).greatest() - f.v0
}

// scale is the voltage that the charge is heading for: the source's, or the highest on paper where it was not read.
func (f *charge) scale() float64 {
	if f.emf > 0 {
		return f.emf
	}
	return float64(f.site.Source.HighestRest())
}

// findStep looks for the first rise between two renewals that is more than three times what the resistor lets through
// (formulas J) and that ends near the source.
func (f *charge) findStep() {
	t, v := fit.OncePerRefresh(f.bus.t, f.bus.v, f.refresh)
	least := f.tau().low
	for i := 1; i < len(t); i++ {
		if t[i] < 0 {
			continue
		}
		dt := math.Max(t[i]-t[i-1], f.refresh) + 0.02
		through := math.Max(0, f.scale()-v[i-1]) * (1 - math.Exp(-dt/least))
		risen := v[i] - v[i-1]
		if risen > 1.6*through+8*f.bus.resolution+0.004*f.scale() && v[i] > 0.97*f.scale()-f.busError-f.sourceError {
			f.step = jump{found: true, at: (t[i] + t[i-1]) / 2, before: v[i-1], after: v[i]}
			return
		}
	}
}

// contactLead is how long before its report, or before the step it makes, a closing contact may already have let its inrush
// through: auxiliary contacts follow by some milliseconds (common practice), and registers come in whole images.
const contactLead = 0.1 // s

// window is the stretch that the fit may use: from the first sample off the start level to the last before the step, the
// bypass's report or the opening of the pre-charge.
func (f *charge) window() {
	f.start, f.end = 0, f.bus.last()
	off := f.v0 + math.Max(6*f.bus.resolution, 0.01*f.scale())
	if at := f.bus.firstAt(off, 0); !math.IsNaN(at) {
		f.start = at
	}
	closing := math.Inf(1)
	if f.step.found {
		closing = f.step.at
	}
	if at := f.bypass.firstAt(0.5, 0); !math.IsNaN(at) && !f.reportsBefore() {
		closing = math.Min(closing, at)
	}
	if last := f.bus.between(math.Inf(-1), closing); last.ok && !math.IsInf(closing, 1) {
		f.end = math.Min(last.last(), closing-math.Max(contactLead, 1.5*f.refresh))
	}
	if opened := f.opened(f.precharge); !math.IsNaN(opened) {
		f.end = math.Min(f.end, opened-f.refresh)
	}
}

// reportsBefore tells whether the bypass reported closed before the command.
func (f *charge) reportsBefore() bool {
	return fit.Median(f.bypass.between(math.Inf(-1), -0.02).v) > 0.5
}

// opened is the instant at which a contact was first reported open after it had been reported closed; NaN if never.
func (f *charge) opened(contact trace) float64 {
	closed := false
	for i, v := range contact.v {
		if contact.t[i] < 0 {
			continue
		}
		if closed && v < 0.5 {
			return contact.t[i]
		}
		closed = closed || v > 0.5
	}
	return math.NaN()
}

func (f *charge) fitCurve() {
	part := f.bus.between(f.start, f.end)
	t, v := fit.OncePerRefresh(part.t, part.v, f.refresh)
	f.fit = fit.Exponential(t, v, fit.Options{Resolution: f.bus.resolution})
	f.noise = math.Max(f.fit.S, f.bus.resolution/math.Sqrt(12))
	for i := range t {
		f.rows = append(f.rows, row{t[i], v[i], f.source.at(t[i]), f.current.at(t[i])})
	}
}

// fromCurrents finds the resistance from voltage across over current through, and capacitance with conductance from the
// charge that went in: ∫i·dt = C·ΔV + g·∫V·dt (formulas H, with the bus's loads kept apart).
func (f *charge) fromCurrents() {
	if !f.current.ok || len(f.rows) < 8 {
		return
	}
	greatest := 0.0
	for _, r := range f.rows {
		greatest = math.Max(greatest, math.Abs(r.current))
	}
	if greatest < 8*f.current.resolution || greatest == 0 {
		return
	}
	f.resistance = f.ohms(0.12 * greatest)
	n := len(f.rows)
	ones, rise, area, charge := make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
	for i, r := range f.rows {
		ones[i], rise[i] = 1, r.bus-f.rows[0].bus
		if i > 0 {
			dt, last := r.t-f.rows[i-1].t, f.rows[i-1]
			area[i] = area[i-1] + dt*(r.bus+last.bus)/2
			charge[i] = charge[i-1] + dt*(r.current+last.current)/2
		}
	}
	if x, se, ok := fit.Linear([][]float64{ones, rise, area}, charge); ok {
		f.capacitance = estimate{x[1], se[1], n, true}
		f.conductance = estimate{x[2], se[2], n, true}
	}
}

// ohms regresses the voltage across resistor and chokes on the current, over the rows with at least so much of it. The
// offset of the line takes up the diodes' drop and the zero errors of both voltages.
func (f *charge) ohms(least float64) estimate {
	if !f.source.ok {
		return estimate{}
	}
	var x, y []float64
	for _, r := range f.rows {
		if math.Abs(r.current) >= least {
			x, y = append(x, r.current), append(y, r.source-r.bus)
		}
	}
	l := fit.Line(x, y, 0)
	if l.Status != fit.OK || l.N < 6 {
		return estimate{}
	}
	return estimate{l.Slope, l.SlopeSE, l.N, true}
}

// growth is by what fraction the resistance at the end of the charge exceeds that at its start, and its standard error: the
// voltage across it goes as a + R·i·(1 + growth·h), h the part of the heat that has gone in so far.
func (f *charge) growth() (growth, u float64) {
	heat := make([]float64, len(f.rows))
	for i, r := range f.rows {
		if i > 0 {
			last := f.rows[i-1]
			heat[i] = heat[i-1] + (r.t-last.t)*(r.current*r.current+last.current*last.current)/2
		}
	}
	var ones, x, xh, y []float64
	floor := math.Max(6*f.current.resolution, 0.04*f.greatestCurrent())
	for i, r := range f.rows {
		if r.current > floor {
			ones, x, xh, y = append(ones, 1), append(x, r.current), append(xh, r.current*heat[i]/heat[len(heat)-1]), append(y, r.source-r.bus)
		}
	}
	k, se, ok := fit.Linear([][]float64{ones, x, xh}, y)
	if !ok || !(k[1] > 0) {
		return 0, math.Inf(1)
	}
	return k[2] / k[1], se[2] / k[1]
}

// endCurrent is the current at the end of the charge, the median of the last rows.
func (f *charge) endCurrent() float64 {
	var last []float64
	for _, r := range f.rows[max(0, len(f.rows)-7):] {
		last = append(last, r.current)
	}
	return fit.Median(last)
}
