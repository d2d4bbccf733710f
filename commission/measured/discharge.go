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

// fall is a discharge capture taken apart. With V² = W the bleeder and a constant power make W fall exponentially towards
// −P·R_b (formulas D): dW⁄dt = −2·(W⁄R_b + P)⁄C while the auxiliary supply runs, −2·W⁄(R_b·C) once it has stopped; below
// the star point's voltage the filter's capacitance joins.
type fall struct {
	paper
	capture           capture.Capture
	bus, source, star trace
	t, v              []float64 // from the start of the fall, once per renewal
	link              band      // F, all banks, without the filter

	first     float64 // V at the start
	tau       measurement
	power     float64 // W that the auxiliary supply seems to take
	filter    measurement
	hasFilter bool
	scatter   float64 // V, of the samples about the curve
	shelf     shelf
}

// shelf is a voltage at which the bus stops falling.
type shelf struct {
	found    bool
	at       float64 // V
	from, to float64 // seconds
}

// Discharge judges a discharge capture: measured.discharge.
func Discharge(s site.Site, c capture.Capture) []finding.Finding {
	out := verdictFinding("measured.discharge", "discharge as measured: time constant of bleeders and banks", "s",
		"least squares of V² over time, bleeder and auxiliary supply apart: V²(t) = (V₁² + P·R_b)·e^(−2t⁄τ) − P·R_b; guard band U = k·u (idea of JCGM 106)")
	out.Captures = named(c)
	p := paperOf(s)
	if why := unusable(c, signal.BusVoltage); why != "" {
		out = cannot(out, why)
		out.Cause = readingCauses(p, c)
		return []finding.Finding{out}
	}
	return []finding.Finding{fallOf(p, c).judged(out)}
}

func fallOf(p paper, c capture.Capture) *fall {
	f := &fall{paper: p, capture: c, bus: traceOf(c, signal.BusVoltage), source: traceOf(c, signal.SourceVoltage), star: traceOf(c, signal.StarPointVoltage)}
	for _, b := range p.site.Bus.Capacitances {
		value := bandOf(b.Value.Spread)
		if b.Isolated { // on the bus or not: the plant's switching decides
			value.low = 0
		}
		f.link = f.link.plus(value)
	}
	part := f.bus.between(-1e-9, math.Inf(1))
	f.t, f.v = fit.OncePerRefresh(part.t, part.v, fit.Refresh(part.t, part.v, part.resolution))
	if len(f.v) > 0 {
		f.first = f.v[0]
	}
	f.findShelf()
	f.fitFall()
	return f
}

// findShelf looks for a last stretch, at least a fifth of the record, in which the bus falls by less than a quarter of what
// the slowest bleeder on paper asks for.
func (f *fall) findShelf() {
	n := len(f.v)
	if n < 12 || math.IsInf(f.rb.high, 1) {
		return
	}
	from := f.t[n-1] - (f.t[n-1]-f.t[0])/5
	last := trace{t: f.t, v: f.v, resolution: f.bus.resolution, ok: true}.between(from, math.Inf(1))
	slope, u := drift(last)
	asked := fit.Median(last.v) / (f.rb.high * (f.link.high + f.filter.value + f.paper.filter.high))
	if len(last.t) < 8 || fit.Median(last.v) < 0.05*f.first || asked < 6*u || -slope > 0.25*asked {
		return
	}
	f.shelf = shelf{found: true, at: fit.Median(last.v), from: from, to: f.t[n-1]}
	for i := range f.v { // back to where the shelf begins
		if f.v[i] < f.shelf.at+math.Max(6*f.bus.resolution, 0.004*f.first) {
			f.shelf.from = f.t[i]
			break
		}
	}
}

// usable is the part of the record that the fall carries: above a shelf and above 2 % of the start.
func (f *fall) usable() (t, v []float64) {
	for i := range f.t {
		if f.shelf.found && f.t[i] >= f.shelf.from || f.v[i] < 0.02*f.first {
			break
		}
		t, v = append(t, f.t[i]), append(v, f.v[i])
	}
	return t, v
}

// fitFall finds τ, the auxiliary power and, where the record passes the star point's voltage, the filter's share.
func (f *fall) fitFall() {
	t, v := f.usable()
	if len(t) < 8 || !(v[len(v)-1] < v[0]) {
		return
	}
	n := len(t)
	tau0 := f.guess(t, v)
	joins := f.joinsAt()
	filterKnown := f.paper.filter.nominal / f.link.nominal
	withPower := f.p > 0 && f.first > f.vOff && v[n-1] < f.first*0.9
	f.hasFilter = joins > 0 && v[n-1] < 0.6*joins && v[0] > 1.02*joins && f.paper.filter.nominal > 0
	model := func(x []float64) fallModel {
		m := fallModel{first: x[0] * f.first, tau: math.Exp(x[1]), vOff: f.vOff, joins: joins, join: filterKnown}
		if withPower {
			m.powerOverC = x[2] * f.p / f.link.nominal
		}
		if f.hasFilter {
			m.join = x[len(x)-1]
		}
		return m
	}
	x0 := []float64{1, math.Log(tau0)}
	if withPower {
		x0 = append(x0, 1)
	}
	if f.hasFilter {
		x0 = append(x0, filterKnown)
	}
	solution := fit.Marquardt(x0, n, func(x, r []float64) bool {
		m := model(x)
		if m.tau > 1e7 || m.tau < 1e-4 || m.powerOverC < -f.first*f.first || m.join < -0.5 {
			return false
		}
		m.at(t, r)
		for i := range r {
			r[i] -= v[i]
		}
		return true
	})
	if !solution.Converged {
		return
	}
	freedom := n - len(x0)
	f.scatter = math.Sqrt(solution.SSR / float64(freedom))
	tau := math.Exp(solution.X[1])
	floor := f.bus.resolution / math.Sqrt(12) / math.Max(f.scatter, 1e-12)
	f.tau = measurement{value: tau, u: tau * solution.SE[1] * math.Max(1, floor), freedom: freedom, bound: 0.002 * tau}
	if withPower {
		f.power = solution.X[2] * f.p
	}
	if f.hasFilter {
		last := len(x0) - 1
		f.filter = measurement{value: solution.X[last], u: solution.SE[last], freedom: freedom}
	}
}

// guess is τ from the first and last sample of the record.
func (f *fall) guess(t, v []float64) float64 {
	last := len(t) - 1
	return (t[last] - t[0]) / math.Max(1e-3, math.Log(v[0]/math.Max(v[last], 1e-3*v[0])))
}

// joinsAt is the voltage at which the filter joins: the star point's at the start, else the source's.
func (f *fall) joinsAt() float64 {
	if f.paper.filter.nominal == 0 {
		return 0
	}
	for _, tr := range []trace{f.star, f.source} {
		if part := tr.between(math.Inf(-1), 1); part.ok {
			if level := fit.Median(part.v); level > 0.05*f.first && level < f.first {
				return level
			}
		}
	}
	return 0
}

// fallModel gives the bus voltage over time in closed form, segment by segment.
type fallModel struct {
	first, tau, powerOverC float64 // V, s, W⁄F
	vOff                   float64 // the power stops below it
	joins, join            float64 // below joins the capacitance is larger by the fraction join
}

func (m fallModel) at(times, out []float64) {
	v, now := m.first, times[0]
	for i, t := range times {
		for now < t {
			tau, power, floor := m.tau, m.powerOverC, 0.0
			if v <= m.joins*(1+1e-12) {
				tau, power = tau*(1+m.join), power/(1+m.join)
			} else {
				floor = m.joins
			}
			if v <= m.vOff*(1+1e-12) {
				power = 0
			} else {
				floor = math.Max(floor, m.vOff)
			}
			w, offset := v*v, power*tau
			next := (w+offset)*math.Exp(-2*(t-now)/tau) - offset
			if next >= floor*floor {
				v, now = math.Sqrt(math.Max(next, 0)), t
				break
			}
			now += tau / 2 * math.Log((w+offset)/(floor*floor+offset))
			v = floor
			if floor == 0 {
				v, now = 0, t
			}
		}
		out[i] = v
	}
}

// predictedTau is R_b·C of all bleeders and banks.
func (f *fall) predictedTau() band {
	return band{f.rb.low * f.link.low, f.rb.nominal * f.link.nominal, f.rb.high * f.link.high}
}

func (f *fall) judged(out finding.Finding) finding.Finding {
	read := readingCauses(f.paper, f.capture)
	dropped := len(read) > 0 && read[0].ID == "link-drops"
	if len(read) > 0 && !dropped {
		out.Cause = read
		return cannot(out, strings.Join(read[0].Evidence, "; "))
	}
	f.touchSafe(&out)
	if f.shelf.found {
		out.Verdict, out.Cause = finding.Fail, f.shelfCauses()
		out.Because = append(out.Because, out.Cause[0].Evidence...)
		return out
	}
	if math.IsInf(f.rb.nominal, 1) {
		return cannot(out, "the site has no bleeder to discharge the bus")
	}
	if why := f.unfit(); why != "" {
		out = cannot(out, why)
		out.Cause = read
		if f.stays() {
			out.Cause = f.stayCauses()
			out.Verdict = finding.Fail
		}
		return out
	}
	verdict, text := judge(f.tau, f.predictedTau(), "time constant", "s")
	out = withMeasurement(out, f.tau, f.predictedTau())
	out.Verdict, out.Because = verdict, append(out.Because, text)
	if f.p > 0 {
		out.Parts = append(out.Parts, finding.Part{Name: "auxiliary power", Unit: "W", Value: finding.Exactly(f.power)})
	}
	if words := f.starFalls(); words != "" || f.filterGone() {
		if words == "" {
			words = f.filterWords()
		}
		out.Verdict = finding.Worst(out.Verdict, finding.Fail)
		out.Cause = []finding.Cause{because("filter-missing", 0.85, words)}
		out.Because = append(out.Because, words)
	}
	if verdict == finding.Fail {
		out.Cause = ranked(append(out.Cause, f.slopeCauses()...))
	}
	if dropped {
		if len(out.Cause) > 0 {
			read = lowered(read)
		}
		out.Verdict, out.Cause = finding.Worst(out.Verdict, weight(read)), ranked(append(out.Cause, read...))
		out.Because = append(out.Because, read[0].Evidence...)
	}
	return out
}

func (f *fall) unfit() string {
	switch {
	case f.stays():
		return fmt.Sprintf("the bus does not fall: %s after %s", number(f.v[len(f.v)-1], "V"), number(f.t[len(f.t)-1], "s"))
	case f.tau.value == 0:
		return "the fall does not fit bleeders and banks"
	case f.scatter > 0.03*f.first:
		return fmt.Sprintf("the samples scatter by %s about the best curve", number(f.scatter, "V"))
	case f.v[len(f.v)-1] > 0.8*f.first && f.tau.expanded() > 0.2*f.tau.value:
		return fmt.Sprintf("the capture ended too early: the bus had fallen by %.0f %% only", 100*(1-f.v[len(f.v)-1]/f.first))
	}
	if gap := f.capture.LongestGap(signal.BusVoltage, 0, f.t[len(f.t)-1]); gap > 0.5*f.predictedTau().nominal {
		return fmt.Sprintf("the capture has a gap of %s", number(gap, "s"))
	}
	return ""
}

// stays tells whether the bus stands where at least a tenth of its voltage should have gone.
func (f *fall) stays() bool {
	n := len(f.v)
	if n < 5 {
		return false
	}
	fallen := 1 - f.v[n-1]/f.first
	return fallen < 0.3*(1-math.Exp(-f.t[n-1]/f.predictedTau().high)) && f.t[n-1] > 0.05*f.predictedTau().high
}

func (f *fall) stayCauses() []finding.Cause {
	evidence := []string{fmt.Sprintf("bus at %s for %s, bleeders should have taken it to %s", number(f.v[len(f.v)-1], "V"), number(f.t[len(f.t)-1], "s"),
		number(f.first*math.Exp(-f.t[len(f.t)-1]/f.predictedTau().high), "V"))}
	if level := f.sourceLevel(); level > 0 && math.Abs(f.first-level) < 0.02*level+f.busError+f.sourceError {
		return f.shelfCauses()
	}
	slope, u := drift(trace{t: f.t, v: f.v, resolution: f.bus.resolution, ok: true})
	if slope < -4*u {
		return []finding.Cause{because("bleeder-open", 0.9, evidence...)}
	}
	return together(0.85, "isolate every other infeed: a bus without bleeder still stands", evidence, "bleeder-open", "bus-live")
}

func (f *fall) sourceLevel() float64 {
	if !f.source.ok {
		return 0
	}
	return fit.Median(f.source.v)
}

// touchSafe tells when the touch-safe voltage was reached, where it was.
func (f *fall) touchSafe(out *finding.Finding) {
	limit := 60.0
	if t := f.site.Bus.TouchSafe; t != nil {
		limit = float64(t.Voltage.Nominal)
	}
	for i, v := range f.v {
		if v < limit {
			out.Parts = append(out.Parts, finding.Part{Name: "time to touch-safe", Unit: "s", Value: finding.Exactly(f.t[i])})
			return
		}
	}
	out.Because = append(out.Because, fmt.Sprintf("the record ends before the touch-safe voltage of %s", number(limit, "V")))
}

// shelfCauses: a path to the source is closed, or another infeed holds the bus.
func (f *fall) shelfCauses() []finding.Cause {
	level := f.sourceLevel()
	at := f.shelf.at
	if !f.shelf.found {
		at = f.first
	}
	evidence := []string{fmt.Sprintf("bus stands at %s, source at %s", number(at, "V"), number(level, "V"))}
	near := f.busError + f.sourceError + 0.01*level + f.settledDrop(level).high
	pre, by := traceOf(f.capture, signal.PrechargeClosed), traceOf(f.capture, signal.BypassClosed)
	switch {
	case level > 0 && at < level+near-f.settledDrop(level).high && at > level-near:
		if pre.ok && pre.last() > 0 && pre.at(math.Inf(1)) > 0.5 {
			return []finding.Cause{because("precharge-welded", 0.92, append(evidence, "the pre-charge contactor reports closed")...), because("bypass-welded", 0.4, evidence...)}
		}
		if by.ok && by.at(math.Inf(1)) > 0.5 {
			return []finding.Cause{because("bypass-welded", 0.92, append(evidence, "the bypass reports closed")...), because("precharge-welded", 0.4, evidence...)}
		}
		drop := f.settledDrop(level).nominal
		if drop > 2*(f.busError+f.sourceError) && math.Abs(level-at-drop) < 0.5*drop {
			return []finding.Cause{because("precharge-welded", 0.85, evidence...), because("bypass-welded", 0.5, evidence...)}
		}
		return together(0.8, "resistance across each open contact; the difference across the bypass under the bleeder's current", evidence, "precharge-welded", "bypass-welded")
	case at > 0.85*f.first:
		return together(0.85, "isolate every other infeed: a bus without bleeder still stands", evidence, "bleeder-open", "bus-live")
	case f.p > 0 && math.Abs(at-f.vOff) < 0.04*f.first+f.busError:
		return []finding.Cause{because("bleeder-open", 0.9, append(evidence, fmt.Sprintf("it fell until the auxiliary supply stopped at %s", number(f.vOff, "V")))...)}
	case level > 0 && at > level+near:
		return []finding.Cause{because("bus-live", 0.9, evidence...)}
	}
	return []finding.Cause{because(notKnown, 0.5, evidence...)}
}

// slopeCauses: the fall is smooth but too slow or too fast.
func (f *fall) slopeCauses() []finding.Cause {
	predicted := f.predictedTau()
	ratio := f.tau.value / predicted.nominal
	evidence := []string{fmt.Sprintf("time constant %s, %s on paper: ratio %.2f", number(f.tau.value, "s"), number(predicted.nominal, "s"), ratio)}
	if f.p > 0 {
		evidence = append(evidence, fmt.Sprintf("auxiliary supply seems to take %s, %s on paper", number(f.power, "W"), number(f.p, "W")))
	}
	bleeders := f.site.Bus.Bleeders
	if ratio > 1 {
		if ratio > 5 {
			return []finding.Cause{because("bleeder-open", 0.92, evidence...)}
		}
		for _, b := range bleeders {
			if len(bleeders) > 1 {
				rest := 1 / (1/f.rb.nominal - 1/float64(b.Value.Nominal))
				if math.Abs(ratio*f.rb.nominal/rest-1) < 0.15 {
					return []finding.Cause{because("bleeder-open", 0.88, append(evidence, "as much as without "+b.Name)...), because("bank-added", 0.5, evidence...)}
				}
			}
		}
		return together(0.7, "the capacitance from a pre-charge with current, or each bleeder's resistance", evidence, "bank-added", "bleeder-open")
	}
	load := 1 / (1/(f.rb.nominal*ratio) - 1/f.rb.nominal)
	evidence = append(evidence, fmt.Sprintf("as a load of %s would make it", number(load, "Ω")))
	return together(0.7, "the capacitance from a pre-charge with current", evidence, "load-left-on", "bank-missing")
}

// filterGone tells whether the fall below the star point's voltage lacks the filter's share.
func (f *fall) filterGone() bool {
	if !f.hasFilter {
		return false
	}
	wanted := f.paper.filter.low / f.link.high
	const zeroError = 0.015 // what the bus sensor's offset may make of the share
	U := fit.Coverage(f.filter.freedom)*f.filter.u + zeroError
	return wanted > 0.04 && U < 0.5*wanted && math.Abs(f.filter.value) < 0.6*wanted && f.filter.value+U < 0.7*wanted
}

// starFalls says so where the star point loses its voltage at once when the contactors have opened, although a filter there
// would hold it until the bus has come down to it; "" where it does not.
func (f *fall) starFalls() string {
	if f.paper.filter.nominal == 0 || !f.star.ok {
		return ""
	}
	held := f.star.between(math.Inf(-1), math.Inf(1)).v[0]
	after := f.star.between(0.02*f.predictedTau().nominal, 0.12*f.predictedTau().nominal)
	if held < 0.3*f.first || !after.ok || fit.Median(after.v) > 0.3*held {
		return ""
	}
	return fmt.Sprintf("the star point fell from %s to %s at once, a filter would hold it", number(held, "V"), number(fit.Median(after.v), "V"))
}

func (f *fall) filterWords() string {
	return fmt.Sprintf("below the star point's voltage the capacitance grows by %.1f ± %.1f %%, the filter asks for %.1f %%", 100*f.filter.value,
		100*fit.Coverage(f.filter.freedom)*f.filter.u, 100*f.paper.filter.nominal/f.link.nominal)
}
