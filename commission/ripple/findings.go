package ripple

import (
	"fmt"
	"math"

	"chargehand/commission/corner"
	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/remedy"
	"chargehand/commission/site"
)

const powerElectronics = "interleaved boost converter, any textbook of power electronics"

// Findings are the findings of the ripple, in the order of the catalogue.
func Findings(s site.Site) []finding.Finding {
	return []finding.Finding{phaseFinding(s), sumFinding(s), sourceFinding(s), resonanceFinding(s)}
}

// inputs are what every ripple figure needs.
type inputs struct {
	bus, switching    float64
	phases            int
	choke             corner.Axis
	from, to          float64 // duty of the lower switch over the window of rest voltages, within 0…1
	lowRest, highRest float64
}

func read(s site.Site) (inputs, finding.Missing) {
	var missing finding.Missing
	c := converter(s)
	missing.Need("bus.nominal", s.Bus.Nominal.Nominal > 0)
	missing.Need("converter.phases", c.Phases > 0)
	missing.Need("converter.choke", c.Choke.Low > 0)
	missing.Need("converter.switching_frequency", c.SwitchingFrequency.Nominal > 0)
	missing.Need("source.max_voltage", s.Source.HighestRest() > 0)
	missing.Need("source.min_voltage", s.Source.LowestRest() > 0)
	in := inputs{
		bus: float64(s.Bus.Nominal.Nominal), switching: float64(c.SwitchingFrequency.Nominal), phases: c.Phases,
		choke:   corner.Of("converter.choke", c.Choke),
		lowRest: float64(s.Source.LowestRest()), highRest: float64(s.Source.HighestRest()),
	}
	in.from, in.to = within(1-in.highRest/in.bus), within(1-in.lowRest/in.bus)
	return in, missing
}

func within(duty float64) float64 { return math.Min(1, math.Max(0, duty)) }

func converter(s site.Site) site.Converter {
	if s.Converter == nil {
		return site.Converter{}
	}
	return *s.Converter
}

func (in inputs) stage(duty, choke float64) Stage {
	return Stage{Bus: quantity.Voltage(in.bus), Duty: quantity.Ratio(duty), Choke: quantity.Inductance(choke),
		Switching: quantity.Frequency(in.switching), Phases: in.phases}
}

// worstDuty is the duty of the window where the ripple of `of` phases together is greatest: one of its ends, or a middle
// between two zeros, D = (m + ½) ⁄ of.
func (in inputs) worstDuty(of int) float64 {
	best, at := -1.0, in.from
	try := func(d float64) {
		x := fraction(float64(of) * d)
		if swing := x * (1 - x); swing > best {
			best, at = swing, d
		}
	}
	try(in.from)
	try(in.to)
	for m := 0; m < of; m++ {
		if d := (float64(m) + 0.5) / float64(of); d > in.from && d < in.to {
			try(d)
		}
	}
	return at
}

// phaseFinding states the ripple of one choke, peak to peak, worst over the window.
func phaseFinding(s site.Site) finding.Finding {
	f := finding.Finding{ID: "ripple.phase", Title: "Ripple of one choke, peak to peak", Unit: "A",
		Basis: "ΔI = V_bus·D·(1 − D)⁄(L·f_sw), worst over the window; " + powerElectronics}
	in, missing := read(s)
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	duty := in.worstDuty(1)
	axes := []corner.Axis{in.choke}
	result := corner.Over(axes, func(x []float64) float64 { return float64(in.stage(duty, x[0]).PhaseSwing()) })
	f = f.Stated(finding.ValueOf(result.Ends()))
	w := in.working(f.Basis, duty)
	w.Step("dI", "V_bus * D * (1 - D) / (L * f_sw)", "A", result.Nominal)
	w.Spread(corner.DescribeEnds(axes, result), corner.Names(axes), result.Moves)
	f.Explanation = w.Done()
	return f
}

// sumFinding states the ripple of all phases together, peak to peak, worst over the window.
func sumFinding(s site.Site) finding.Finding {
	f := finding.Finding{ID: "ripple.sum", Title: "Ripple of all phases together, peak to peak", Unit: "A",
		Basis: "ΔI = V_bus·x·(1 − x)⁄(N·L·f_sw), x = N·D less its whole number, zero at D = k⁄N, worst over the window; " + powerElectronics}
	in, missing := read(s)
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	duty := in.worstDuty(in.phases)
	axes := []corner.Axis{in.choke}
	result := corner.Over(axes, func(x []float64) float64 { return float64(in.stage(duty, x[0]).SumSwing()) })
	f = f.Stated(finding.ValueOf(result.Ends()))
	w := in.working(f.Basis, duty)
	whole := math.Round(float64(in.phases)*duty - fraction(float64(in.phases)*duty))
	w.Given("m", "whole number of N·D", "1", whole)
	w.Step("x", "N * D - m", "1", float64(in.phases)*duty-whole)
	w.Step("dI", "V_bus * x * (1 - x) / (N * L * f_sw)", "A", result.Nominal)
	w.Spread(corner.DescribeEnds(axes, result), corner.Names(axes), result.Moves)
	f.Explanation = w.Done()
	return f
}

func (in inputs) working(formula string, duty float64) *finding.Working {
	w := finding.Explain(formula, powerElectronics, "continuous current, equal chokes, not saturated")
	w.Given("V_bus", "nominal bus voltage", "V", in.bus)
	w.Given("D", "duty where it is worst, of those the window allows", "1", duty)
	w.Given("N", "phases", "1", float64(in.phases))
	w.Given("L", "inductance of one choke", "H", in.choke.Nominal)
	w.Given("f_sw", "switching frequency", "Hz", in.switching)
	return w
}

// branches are filter and source loop of a site, the filter nominal; without a filter nothing of it is needed.
func branches(s site.Site) (Branches, finding.Missing) {
	var missing finding.Missing
	filter := converter(s).Filter
	if filter == nil {
		return Branches{}, nil
	}
	missing.Need("converter.filter.capacitance", filter.Capacitance.Low > 0)
	missing.Need("converter.filter.esr", filter.ESR.IsGiven())
	missing.Need("converter.filter.esl", filter.ESL.IsGiven())
	missing.Need("source.inductance", s.Source.Inductance.IsGiven())
	missing.Need("source.internal_resistance", s.Source.InternalResistance.IsGiven())
	return Branches{Capacitance: filter.Capacitance.Nominal, ESR: filter.ESR.Nominal, ESL: filter.ESL.Nominal,
		Source: s.Source.InternalResistance.Nominal, SourceInductance: s.Source.Inductance.Nominal}, missing
}

// sourceFinding judges the ripple current that reaches the source, each choke at its own end of the tolerance. Low is with every
// choke at its greatest, high with the worst mixture of least and greatest: unequal chokes leave the switching frequency
// itself in the sum, where the filter does least.
func sourceFinding(s site.Site) finding.Finding {
	f := finding.Finding{ID: "ripple.source", Title: "Ripple current that reaches the source, rms", Unit: "A",
		Basis: "rms of harmonics 1…5 of f_sw, |Σ V_bus·sin(πhD)⁄(π²h²·f_sw·L_k)·e^(−j2πhk⁄N)|·|Z_c⁄(Z_c + Z_s)|, worst over the window; " + powerElectronics}
	in, missing := read(s)
	b, more := branches(s)
	missing.Add(more...)
	missing.Need("source.max_ripple_current", s.Source.MaxRippleCurrent.IsGiven())
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	share := func(h int) float64 { return b.SourceShare(quantity.Frequency(float64(h) * in.switching)) }
	r := newReaching(in.bus, in.switching, in.phases, in.from, in.to, share)
	low, _ := r.worst(r.equal(in.choke.High))
	nominal, duty := r.worst(r.equal(in.choke.Nominal))
	limit := float64(s.Source.MaxRippleCurrent.Nominal)
	f = f.Judged(finding.Value{Low: low, Nominal: nominal, High: r.greatest(in.choke.Low, in.choke.High)}, finding.AtMost(limit), 0)
	exact := newReaching(in.bus, in.switching, in.phases, in.from, in.to, func(h int) float64 {
		at := quantity.Frequency(float64(h) * in.switching)
		return b.SourceShare(at) * b.StarPoint(at, quantity.Inductance(in.choke.Nominal), in.phases)
	})
	exactLow, _ := exact.worst(exact.equal(in.choke.High))
	exactNominal, _ := exact.worst(exact.equal(in.choke.Nominal))
	f.Parts = []finding.Part{{Name: "with a real star point", Unit: "A",
		Value: finding.Value{Low: exactLow, Nominal: exactNominal, High: exact.greatest(in.choke.Low, in.choke.High)}}}
	if b.Capacitance == 0 {
		f.Because = append(f.Because, "no filter: all of the ripple reaches the source")
	}
	if in.phases > enumerated {
		f.Because = append(f.Because, fmt.Sprintf("high is an upper bound above %d phases", enumerated))
	}
	f.Explanation = in.sourceWorking(f, b, r, duty)
	if f.Verdict != finding.Pass {
		f.Remedy, f.Changes = widerChoke(s, in, f.Value.High/limit)
	}
	return f
}

func (in inputs) sourceWorking(f finding.Finding, b Branches, r reaching, duty float64) *finding.Explanation {
	w := in.working(f.Basis, duty)
	if b.Capacitance > 0 {
		w.Given("C_f", "filter capacitance", "F", float64(b.Capacitance))
		w.Given("ESR", "series resistance of the filter", "Ω", float64(b.ESR))
		w.Given("ESL", "series inductance of the filter", "H", float64(b.ESL))
		w.Given("R_i", "internal resistance of the source", "Ω", float64(b.Source))
		w.Given("L_s", "inductance of the source loop", "H", float64(b.SourceInductance))
	}
	sum := "0"
	for h := in.phases; h <= harmonics; h += in.phases {
		share := "1"
		if b.Capacitance > 0 {
			omega := fmt.Sprintf("omega_%d", h)
			w.Step(omega, fmt.Sprintf("2 * pi * %d * f_sw", h), "1/s", 2*math.Pi*float64(h)*in.switching)
			x := omega + " * ESL - 1 / (" + omega + " * C_f)"
			share = fmt.Sprintf("share_%d", h)
			w.Step(share, "sqrt(ESR^2 + ("+x+")^2) / sqrt((ESR + R_i)^2 + ("+x+" + "+omega+" * L_s)^2)", "1",
				b.SourceShare(quantity.Frequency(float64(h)*in.switching)))
		}
		name := fmt.Sprintf("I_%d", h)
		sin := math.Sin(math.Pi * float64(h) * duty)
		amplitude := math.Sqrt(2*r.weight[h-1]) * math.Abs(sin) * float64(in.phases) / in.choke.Nominal
		w.Step(name, fmt.Sprintf("%s * N * V_bus * abs(sin(pi * %d * D)) / (pi^2 * %d^2 * f_sw * L)", share, h, h), "A", amplitude)
		sum += " + " + name + "^2"
	}
	w.Step("I_rms", "sqrt(("+sum+") / 2)", "A", f.Value.Nominal)
	w.Spread("least with every converter.choke at its greatest; greatest with the chokes apart, some at their least and some at their greatest",
		[]string{"converter.choke"}, []float64{f.Value.High - f.Value.Low})
	return w.Done()
}

// widerChoke is the remedy of a larger choke: the ripple falls as 1 ⁄ L.
func widerChoke(s site.Site, in inputs, factor float64) (string, []finding.Change) {
	was := in.choke.Nominal
	changes := []finding.Change{{Key: "converter.choke", Unit: "H", Was: was, Value: remedy.AwayFrom(was, was*factor*(1+1e-9))}}
	text := "set " + remedy.Phrase(changes) + " with the same tolerance, or chokes matched more closely"
	if converter(s).Filter == nil {
		text += ", or a filter capacitor"
	}
	return text, changes
}

// clearance is how far each of the first `orders` switching harmonics must stay from the resonance, as a part of it.
const (
	clearance = 0.2
	orders    = 6
)

// resonanceFinding judges the resonance of filter and source loop: no harmonic k = 1…6 of the switching frequency within 20 % of
// it. The limit stated is the free range around it, or the nearest one.
func resonanceFinding(s site.Site) finding.Finding {
	f := finding.Finding{ID: "ripple.resonance", Title: "Resonance of filter and source loop", Unit: "Hz", Guards: true,
		Basis: "f_r = 1⁄(2π√(C_f·(L_s + ESL))); |k·f_sw⁄f_r − 1| > 0.2 for k = 1…6; circuit theory, the distance by convention"}
	filter := converter(s).Filter
	if filter == nil {
		return f.Without(finding.Info, "no filter")
	}
	b, missing := branches(s)
	missing.Need("converter.switching_frequency", converter(s).SwitchingFrequency.Nominal > 0)
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	if b.SourceInductance+b.ESL <= 0 {
		return f.Without(finding.Info, "no inductance in the loop: it does not resonate")
	}
	axes := []corner.Axis{corner.Of("converter.filter.capacitance", filter.Capacitance),
		corner.Of("source.inductance", s.Source.Inductance), corner.Of("converter.filter.esl", filter.ESL)}
	result := corner.Over(axes, func(x []float64) float64 { return float64(resonance(x[0], x[1]+x[2])) })
	switching := float64(s.Converter.SwitchingFrequency.Nominal)
	f = f.Judged(finding.ValueOf(result.Ends()), freeRange(result.Nominal, switching), 0)
	f.Because = append(f.Because, fmt.Sprintf("nearest is harmonic %d at %.5g Hz", nearest(result.Nominal, switching), float64(nearest(result.Nominal, switching))*switching))
	f.Explanation = resonanceWorking(f, axes, result, switching)
	if f.Verdict != finding.Pass {
		f.Remedy, f.Changes = retune(s, result, switching)
	}
	return f
}

// nearest is the harmonic of the switching frequency, 1…6, nearest to f as a part of it.
func nearest(f, switching float64) int {
	best := 1
	for k := 2; k <= orders; k++ {
		if math.Abs(float64(k)*switching/f-1) < math.Abs(float64(best)*switching/f-1) {
			best = k
		}
	}
	return best
}

// freeRange is the range free of harmonics around f: below k·f_sw⁄1.2, above k·f_sw⁄0.8. Where f stands within reach of a
// harmonic it is the free range nearest to it.
func freeRange(f, switching float64) finding.Limit {
	best, distance := finding.Limit{}, math.Inf(1)
	for _, l := range freeRanges(switching) {
		margin, _ := l.MarginOf(f)
		if away := math.Max(0, -margin); away < distance {
			best, distance = l, away
		}
	}
	return best
}

func freeRanges(switching float64) []finding.Limit {
	reach := func(k int) (low, high float64) {
		return float64(k) * switching / (1 + clearance), float64(k) * switching / (1 - clearance)
	}
	low, _ := reach(1)
	free := []finding.Limit{finding.AtMost(low)}
	for k := 1; k < orders; k++ {
		_, high := reach(k)
		if next, _ := reach(k + 1); high < next {
			free = append(free, finding.Between(high, next))
		}
	}
	_, high := reach(orders)
	return append(free, finding.AtLeast(high))
}

func resonanceWorking(f finding.Finding, axes []corner.Axis, result corner.Spread, switching float64) *finding.Explanation {
	w := finding.Explain(f.Basis, "circuit theory; the distance of 20 % by convention", "current-controlled converter; at a fixed duty the resonance lies higher")
	w.Given("C_f", "filter capacitance", "F", axes[0].Nominal)
	w.Given("L_s", "inductance of the source loop", "H", axes[1].Nominal)
	w.Given("ESL", "series inductance of the filter", "H", axes[2].Nominal)
	w.Given("f_sw", "switching frequency", "Hz", switching)
	k := nearest(result.Nominal, switching)
	w.Given("k", "nearest harmonic of the switching frequency", "1", float64(k))
	w.Step("L", "L_s + ESL", "H", axes[1].Nominal+axes[2].Nominal)
	w.Step("distance", "abs(k * f_sw * 2 * pi * sqrt(C_f * L) - 1)", "1", math.Abs(float64(k)*switching/result.Nominal-1))
	w.Step("f_r", "1 / (2 * pi * sqrt(C_f * L))", "Hz", result.Nominal)
	w.Spread(corner.DescribeEnds(axes, result), corner.Names(axes), result.Moves)
	return w.Done()
}

// retune is the remedy of another filter capacitor: the least change that brings every corner into a free range.
func retune(s site.Site, result corner.Spread, switching float64) (string, []finding.Change) {
	was := float64(s.Converter.Filter.Capacitance.Nominal)
	best := math.NaN()
	for _, l := range freeRanges(switching) {
		for _, factor := range []float64{edgeFactor(l.High, result.High), edgeFactor(l.Low, result.Low)} {
			// f_r goes as 1⁄√C.
			to := remedy.AwayFrom(was, was/(factor*factor))
			low, _ := l.MarginOf(result.Low * math.Sqrt(was/to))
			high, _ := l.MarginOf(result.High * math.Sqrt(was/to))
			if low >= 0 && high >= 0 && !(math.Abs(to-was) >= math.Abs(best-was)) {
				best = to
			}
		}
	}
	if math.IsNaN(best) {
		return "", nil
	}
	changes := []finding.Change{{Key: "converter.filter.capacitance", Unit: "F", Was: was, Value: best}}
	return "set " + remedy.Phrase(changes) + " with the same tolerance", changes
}

// edgeFactor is by how much a corner of the resonance must be multiplied to stand on an edge; NaN without that edge.
func edgeFactor(edge *float64, at float64) float64 {
	if edge == nil {
		return math.NaN()
	}
	return *edge / at
}
