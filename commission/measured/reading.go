package measured

import (
	"fmt"
	"math"
	"slices"

	"chargehand/commission/capture"
	"chargehand/commission/finding"
	"chargehand/commission/fit"
	"chargehand/commission/signal"
)

// readings looks for faults of map, link and transducers that make the capture's numbers untrue.
func (f *charge) readings() []finding.Cause {
	return readingCauses(f.paper, f.capture)
}

// readingCauses needs no curve: the faults show in any capture.
func readingCauses(p paper, c capture.Capture) []finding.Cause {
	for _, look := range []func(paper, capture.Capture) []finding.Cause{codesRead, unsignedRead, tornOrSwapped, wrongDecade, shifted, repeated, slow, dropped, reversed} {
		if found := look(p, c); len(found) > 0 {
			return ranked(found)
		}
	}
	return nil
}

// codes that devices send for 'no value' (common practice): the ends of the signed and unsigned ranges.
var codes = []uint16{0x7FFF, 0x8000, 0xFFFF}

// codesRead: one analogue signal is such a code in every sample.
func codesRead(p paper, c capture.Capture) []finding.Cause {
	for i, ch := range c.Channels {
		if ch.Unit == "" || ch.Name.IsState() {
			continue
		}
		n, all := 0, 0
		var code uint16
		for _, s := range c.Samples {
			if i >= len(s.Values) || !s.Values[i].OK {
				continue
			}
			all++
			raw := s.Values[i].Raw
			if len(raw) == 0 || ch.Type[0] == 'i' && raw[0] == 0xFFFF { // −1 is a value like any other
				continue
			}
			if slices.Contains(codes, raw[0]) && (len(raw) == 1 || raw[1] == raw[0] || raw[1] == 0) {
				n, code = n+1, raw[0]
			}
		}
		if ch.Name == signal.SourceVoltage && code == 0xFFFF && traceOf(c, signal.BusVoltage).greatest() > 5*float64(p.site.Source.HighestRest()) {
			continue // the bus reads far too high as well: a register at the end of its range
		}
		if all >= 5 && n > all*9/10 && constant(c, i) {
			return []finding.Cause{because("missing-code-read", 0.93, fmt.Sprintf("%s is the word %04X in %d of %d samples: %s", ch.Name, code, n, all, number(c.Samples[0].Values[i].V, ch.Unit)))}
		}
	}
	return nil
}

func constant(c capture.Capture, i int) bool {
	first, have := 0.0, false
	for _, s := range c.Samples {
		if i >= len(s.Values) || !s.Values[i].OK {
			continue
		}
		if have && s.Values[i].V != first {
			return false
		}
		first, have = s.Values[i].V, true
	}
	return have
}

// unsignedRead: a signal that lies about zero leaps to the end of its word's range.
func unsignedRead(_ paper, c capture.Capture) []finding.Cause {
	for _, ch := range c.Channels {
		if ch.Unit != "A" && ch.Unit != "W" && ch.Unit != "°C" {
			continue
		}
		top := 0.0
		switch {
		case len(ch.Type) >= 3 && ch.Type[1:3] == "16":
			top = 32768
		case len(ch.Type) >= 3 && ch.Type[1:3] == "32":
			top = 65536
		default:
			continue
		}
		tops := []float64{top, 65536}
		n, all, sane := 0, 0, 0
		example := 0.0
		_, v := c.Series(ch.Name)
		for _, x := range v {
			all++
			count := (x - ch.Offset) / ch.Scale
			near := false
			for _, edge := range tops {
				near = near || count > 0.9*edge && count < edge
			}
			if near {
				n, example = n+1, x
			} else if math.Abs(count) < 0.35*top {
				sane++
			}
		}
		if all >= 5 && n >= 2 && n+sane > all*95/100 && !constantValues(v) {
			return []finding.Cause{because("sign-unsigned", 0.92, fmt.Sprintf("%s leaps to %s in %d of %d samples, as a small negative value read without its sign", ch.Name, number(example, ch.Unit), n, all))}
		}
	}
	return nil
}

func constantValues(v []float64) bool {
	for _, x := range v {
		if x != v[0] {
			return false
		}
	}
	return true
}

// tornOrSwapped: a value of two words is far off what voltage and current make of it.
func tornOrSwapped(_ paper, c capture.Capture) []finding.Cause {
	i := c.Index(signal.Power)
	if i < 0 || len(c.Channels[i].Type) < 3 || c.Channels[i].Type[1:3] != "32" {
		return nil
	}
	current, bus := traceOf(c, signal.BusCurrent), traceOf(c, signal.BusVoltage)
	swappedFits, off, all := 0, 0, 0
	scale := math.Abs(c.Channels[i].Scale)
	for _, s := range c.Samples {
		if i >= len(s.Values) || !s.Values[i].OK || len(s.Values[i].Raw) != 2 {
			continue
		}
		all++
		t := s.At.Seconds()
		expected := 0.0
		if current.ok && bus.ok {
			expected = current.at(t) * bus.at(t)
		}
		near := 0.1*math.Abs(expected) + 0.2*65536*scale
		raw := s.Values[i].Raw
		if math.Abs(s.Values[i].V-expected) < near {
			continue
		}
		off++
		if math.Abs(float64(int32(uint32(raw[1])<<16|uint32(raw[0])))*scale-expected) < near {
			swappedFits++
		}
	}
	switch {
	case all < 5 || off < 2:
		return nil
	case swappedFits > all*6/10 && swappedFits > off*9/10:
		return []finding.Cause{because("words-swapped", 0.93, fmt.Sprintf("power is far from voltage times current in %d of %d samples, with the words changed round it fits in %d", off, all, swappedFits))}
	case off < all*8/10:
		return []finding.Cause{because("torn-words", 0.85, fmt.Sprintf("power leaps by multiples of 65536 counts in %d of %d samples", off, all)), because("words-swapped", 0.3)}
	}
	return nil
}

// wrongDecade: voltages stand a power of ten off the site's window, or off each other.
func wrongDecade(p paper, c capture.Capture) []finding.Cause {
	source, bus := traceOf(c, signal.SourceVoltage), traceOf(c, signal.BusVoltage)
	low, high := 0.75*float64(p.site.Source.LowestRest()), 1.2*float64(p.site.Source.HighestRest())
	if source.ok {
		level := fit.Median(source.v)
		for _, factor := range []float64{10, 100, 1000} {
			for _, by := range []float64{factor, 1 / factor} {
				if v := level / by; (level < low || level > high) && v > low && v < high && level > 20*source.resolution {
					return []finding.Cause{because("scale-tenfold", 0.94, fmt.Sprintf("source voltage reads %s, %s … %s on paper: a factor of %g", number(level, "V"), number(float64(p.site.Source.LowestRest()), "V"),
						number(float64(p.site.Source.HighestRest()), "V"), by))}
				}
			}
		}
		if bus.ok && c.Kind == capture.Precharge && level > low {
			ratio := bus.greatest() / level
			for _, by := range []float64{10, 0.1, 100, 0.01} {
				if math.Abs(ratio/by-1) < 0.12 && bus.span() > 0.5*bus.greatest() && rises(bus) {
					return []finding.Cause{because("scale-tenfold", 0.9, fmt.Sprintf("bus voltage settles at %.3f of the source voltage", ratio))}
				}
			}
		}
	}
	return nil
}

// rises tells whether a record climbs steadily through several levels.
func rises(tr trace) bool {
	levels := 0
	for k := 1; k < 5; k++ {
		at := tr.firstAt(tr.least()+float64(k)/5*tr.span(), 0)
		if !math.IsNaN(at) && at > 0 {
			levels++
		}
	}
	return levels == 4
}

// shifted: the neighbour's signal stands where another is expected. In the order of the map, the one that is constant in the
// source's window is the source and the one that climbs to it is the bus.
func shifted(p paper, c capture.Capture) []finding.Cause {
	if c.Kind != capture.Precharge {
		return nil
	}
	b, s := c.Index(signal.BusVoltage), c.Index(signal.SourceVoltage)
	if b < 0 || s < 0 {
		return nil
	}
	fits := func(by int) bool {
		if b+by < 0 || s+by < 0 || b+by >= len(c.Channels) || s+by >= len(c.Channels) || c.Channels[s+by].Name.IsState() || c.Channels[b+by].Name.IsState() {
			return false
		}
		bus, source := traceOf(c, c.Channels[b+by].Name), traceOf(c, c.Channels[s+by].Name)
		factor := scaleOf(c, b) / scaleOf(c, b+by)
		factorS := scaleOf(c, s) / scaleOf(c, s+by)
		if !bus.ok || !source.ok {
			return false
		}
		level := fit.Median(source.v) * factorS
		steady := source.span() < 0.05*math.Abs(fit.Median(source.v))
		before := fit.Median(bus.between(math.Inf(-1), 0).v)
		return steady && level > 0.85*float64(p.site.Source.LowestRest()) && level < 1.1*float64(p.site.Source.HighestRest()) &&
			math.Abs(bus.greatest()*factor/level-1) < 0.2 && bus.span() > 0.8*bus.greatest() && (math.IsNaN(before) || math.Abs(before) < 0.1*bus.greatest()) && rises(bus)
	}
	if fits(0) {
		return nil
	}
	for _, by := range []int{1, -1, 2, -2} {
		if fits(by) {
			return []finding.Cause{because("address-shifted", 0.92, fmt.Sprintf("%s climbs to a steady %s: the picture of bus and source, %d register off", c.Channels[b+by].Name, c.Channels[s+by].Name, by))}
		}
	}
	bus, source := traceOf(c, signal.BusVoltage), traceOf(c, signal.SourceVoltage)
	level := fit.Median(bus.v)
	if bus.span() < 0.05*level && level > 0.85*float64(p.site.Source.LowestRest()) && level < 1.1*float64(p.site.Source.HighestRest()) &&
		math.Abs(source.greatest()/level-1) < 0.2 && source.span() > 0.8*source.greatest() && rises(source) {
		return []finding.Cause{because("address-shifted", 0.92, fmt.Sprintf("bus voltage stands at %s from the beginning and source voltage climbs to it: each shows its neighbour", number(level, "V")))}
	}
	return nil
}

func scaleOf(c capture.Capture, i int) float64 {
	if c.Channels[i].Scale == 0 {
		return 1
	}
	return c.Channels[i].Scale
}

// repeated: every signal, noise and counter included, stands still at once while the plant moves, and leaps on later. A
// device without noise stands still by right wherever nothing moves: before the event, when all has settled, once it is over.
func repeated(p paper, c capture.Capture) []finding.Cause {
	analogue := 0
	for _, ch := range c.Channels {
		if !ch.Name.IsState() {
			analogue++
		}
	}
	if analogue < 3 || len(c.Samples) < 20 {
		return nil
	}
	moves := movement(p, c)
	var stands, moved, long []float64 // lengths of the stretches in which all samples are the same, what moves in them
	from := c.Samples[0]
	last := from
	alike := 1 // samples in the stretch
	var many []int
	for _, s := range c.Samples[1:] {
		if !carries(s) {
			continue
		}
		if same(s, last) {
			alike++
		} else {
			stands, many = append(stands, (last.At-from.At).Seconds()), append(many, alike)
			moved = append(moved, moves(from.At.Seconds(), last.At.Seconds()))
			from, alike = s, 1
		}
		last = s
	}
	lastStand := (last.At - from.At).Seconds()
	usual := fit.Median(stands)
	if len(stands) < 5 {
		return nil
	}
	most := 0
	for i, d := range stands {
		if moved[i] >= 1 && many[i] >= 5 && d > 0.35 && d > 6*math.Max(usual, 0.02) {
			long, most = append(long, d), max(most, many[i])
		}
	}
	if len(long) == 1 && most < 10 { // one stall of the polling is a gap, not a cause
		long = nil
	}
	if moves(from.At.Seconds(), last.At.Seconds()) >= 1 && alike >= 8 && lastStand > 0.6 && lastStand > 8*math.Max(usual, 0.02) && lastStand > 0.15*(last.At-c.Samples[0].At).Seconds() && len(long) == 0 {
		return []finding.Cause{because("readings-frozen", 0.9, fmt.Sprintf("all %d signals stand still for the last %s, noise included", analogue, number(lastStand, "s"))), because("gateway-repeats-old", 0.5)}
	}
	if len(long) == 0 {
		return nil
	}
	return []finding.Cause{because("gateway-repeats-old", 0.9, fmt.Sprintf("all %d signals stand still %d times for up to %s and then leap on, %s is usual", analogue, len(long), number(slices.Max(long), "s"), number(usual, "s"))),
		because("readings-slow", 0.4)}
}

// worthSeeing is how much of the source's voltage the bus must be expected to move by before standing still is odd.
const worthSeeing = 0.01

// movement tells how far the plant is expected to move between two instants of a capture, in units of what would be seen: 1
// and more is seen by any register. For loads that anybody may switch nothing is expected, and stillness is judged by the
// noise alone.
func movement(p paper, c capture.Capture) func(from, to float64) float64 {
	bus := traceOf(c, signal.BusVoltage)
	seen := math.Max(5*bus.resolution, worthSeeing*float64(p.site.Source.HighestRest()))
	switch c.Kind {
	case capture.Precharge:
		end := math.Inf(1)
		if at := traceOf(c, signal.BypassClosed).firstAt(0.5, 0); !math.IsNaN(at) {
			end = at
		}
		if at := openedAt(c); at < end {
			end = at
		}
		emf := float64(p.site.Source.LowestRest())
		if source := traceOf(c, signal.SourceVoltage); source.ok {
			emf = fit.Median(source.v)
		}
		tau := p.tau().high
		return func(from, to float64) float64 {
			from, to = math.Max(from, 0), math.Min(to, end)
			if to <= from {
				return 0
			}
			return math.Abs(emf-p.settledDrop(emf).high-bus.at(from)) * (1 - math.Exp(-(to-from)/tau)) / seen
		}
	case capture.Discharge:
		tau := p.rb.high * p.c.high
		return func(from, to float64) float64 {
			if to <= math.Max(from, 0) {
				return 0
			}
			return bus.at(from) * (1 - math.Exp(-(to-math.Max(from, 0))/tau)) / seen
		}
	}
	return func(float64, float64) float64 { return 1 }
}

// openedAt is when the pre-charge contactor was first seen to open after it had closed; +Inf if never.
func openedAt(c capture.Capture) float64 {
	contact := traceOf(c, signal.PrechargeClosed)
	closed := contact.firstAt(0.5, math.Inf(-1))
	for i, t := range contact.t {
		if !math.IsNaN(closed) && t > closed && contact.v[i] < 0.5 {
			return t
		}
	}
	return math.Inf(1)
}

// carries tells whether a sample has any value: where the link is down none has, and that is no standing still.
func carries(s capture.Sample) bool {
	return slices.ContainsFunc(s.Values, func(v capture.Value) bool { return v.OK })
}

func same(a, b capture.Sample) bool {
	if len(a.Values) != len(b.Values) {
		return false
	}
	for i := range a.Values {
		if a.Values[i].OK != b.Values[i].OK || a.Values[i].OK && a.Values[i].V != b.Values[i].V {
			return false
		}
	}
	return true
}

// slow: the device renews a moving value less often than the site's max_age allows.
func slow(p paper, c capture.Capture) []finding.Cause {
	longest := 0.5 // s, where the site states no max_age: common practice
	if d := p.site.Device; d != nil && d.MaxAge.IsGiven() {
		longest = float64(d.MaxAge.Nominal)
	}
	if c.Kind == capture.Discharge { // before the fall it may have been polled at another pace
		c.Samples = c.Samples[slices.IndexFunc(c.Samples, func(s capture.Sample) bool { return s.At >= 0 }):]
	}
	refresh := math.Max(renewal(traceOf(c, signal.BusVoltage)), standstill(c))
	if refresh <= math.Max(math.Max(longest, 0.2), 2.5*spacing(c)) { // where polling is the slower, nothing can be said
		return nil
	}
	return []finding.Cause{because("readings-slow", 0.9, fmt.Sprintf("bus voltage is renewed every %s, %s allowed", number(refresh, "s"), number(longest, "s")))}
}

// spacing is the usual time from sample to sample.
func spacing(c capture.Capture) float64 {
	var steps []float64
	for i := 1; i < len(c.Samples); i++ {
		steps = append(steps, (c.Samples[i].At - c.Samples[i-1].At).Seconds())
	}
	if len(steps) == 0 {
		return 0
	}
	return fit.Median(steps)
}

// standstill is the usual time for which all signals together stay as they are, noise included; 0 where there are too few
// signals to say.
func standstill(c capture.Capture) float64 {
	if len(c.Channels) < 4 || len(c.Samples) < 20 {
		return 0
	}
	var stands []float64
	from := c.Samples[0]
	for _, s := range c.Samples[1:] {
		if carries(s) && !same(s, from) {
			stands, from = append(stands, (s.At-from.At).Seconds()), s
		}
	}
	if len(stands) < 2 {
		return 0
	}
	return fit.Median(stands)
}

// renewal is the usual time between two changes while a value moves in leaps, 0 where it moves smoothly.
func renewal(tr trace) float64 {
	if tr.span() < 0.2*tr.greatest() || tr.span() < 100*tr.resolution {
		return 0
	}
	var distances []float64
	last := math.NaN()
	for i := 1; i < len(tr.t); i++ {
		if math.Abs(tr.v[i]-tr.v[i-1]) > 0.004*tr.span()+3*tr.resolution {
			if !math.IsNaN(last) {
				distances = append(distances, tr.t[i]-last)
			}
			last = tr.t[i]
		}
	}
	if len(distances) < 3 {
		return 0
	}
	// While it moves, nothing moves in between: the shortest distances count, the plateau's do not.
	slices.Sort(distances)
	return distances[len(distances)/4]
}

// dropped: stretches without any sample.
func dropped(_ paper, c capture.Capture) []finding.Cause {
	total, n, longest := 0.0, 0, 0.0
	t, _ := c.Series(signal.BusVoltage)
	if len(t) < 10 {
		return nil
	}
	var steps []float64
	for i := 1; i < len(t); i++ {
		steps = append(steps, t[i]-t[i-1])
	}
	usual := fit.Median(steps)
	least := 0.35
	if c.Kind == capture.Discharge { // slow: a gap counts where the curve goes on meanwhile
		least = 0.02 * (t[len(t)-1] - t[0])
	}
	for _, d := range steps {
		if d > least && d > 5*usual {
			total, n, longest = total+d, n+1, math.Max(longest, d)
		}
	}
	single := 0.6 // s; one stall of the polling is a gap, not a cause
	if c.Kind == capture.Discharge {
		single = 3 * least
	}
	if runs, empty := silences(c); runs >= 3 {
		return []finding.Cause{because("link-drops", 0.88, fmt.Sprintf("no answer to %d of %d questions, %d times in a row", empty, len(c.Samples), runs))}
	}
	if n == 0 || n == 1 && longest < single {
		return nil
	}
	return []finding.Cause{because("link-drops", 0.88, fmt.Sprintf("no answer %d times, up to %s, together %s", n, number(longest, "s"), number(total, "s")))}
}

// silences counts the samples without any value, and how many times they began.
func silences(c capture.Capture) (runs, empty int) {
	silent := false
	for _, s := range c.Samples {
		was := silent
		if silent = !carries(s); silent {
			empty++
		}
		if silent && !was {
			runs++
		}
	}
	return runs, empty
}

// reversed: the bus charges although the current reads as flowing from it.
func reversed(p paper, c capture.Capture) []finding.Cause {
	if c.Kind != capture.Precharge {
		return nil
	}
	bus, current := traceOf(c, signal.BusVoltage), traceOf(c, signal.SourceCurrent)
	if !bus.ok || !current.ok || bus.span() < 0.2*float64(p.site.Source.LowestRest()) {
		return nil
	}
	half := bus.firstAt(bus.least()+0.4*bus.span(), 0)
	early := current.between(0.05, half)
	if level := fit.Median(early.v); early.ok && level < -10*current.resolution && level < 0.5*early.least() {
		return []finding.Cause{because("current-reversed", 0.93, fmt.Sprintf("source current %s while the bus rises", number(level, "A")))}
	}
	return nil
}

// standing: the bus voltage alone stops bit for bit in the middle of its rise.
func (f *charge) standing() []finding.Cause {
	tr := f.bus
	n := len(tr.v)
	if n < 10 {
		return nil
	}
	// the longest stretch after the command in which the word never changed
	best, from, bestFrom := 0.0, 0, 0
	for i := 1; i < n; i++ {
		if tr.v[i] != tr.v[i-1] || tr.t[from] < 0 {
			from = i
		}
		if d := tr.t[i] - tr.t[from]; d > best {
			best, bestFrom = d, from
		}
	}
	level := tr.v[bestFrom]
	since := math.Min(tr.t[bestFrom]-0.25*f.tau().nominal-2*f.refresh, tr.t[max(bestFrom-2, 0)])
	before := tr.between(since, tr.t[bestFrom])
	if best < 0.5*f.tau().nominal || !before.ok || level-f.v0 < 0.03*f.scale() {
		return nil
	}
	approach := level - before.v[0] // an exponential that settles comes slowly; this one stops in full motion
	missing := f.scale() - level
	if approach < 0.02*f.scale() || missing < 0.03*f.scale() {
		return nil
	}
	return []finding.Cause{because("readings-frozen", 0.9, fmt.Sprintf("bus voltage stands at exactly %s for %s after it rose by %s just before", number(level, "V"), number(best, "s"), number(approach, "V")))}
}
