package precharge

import (
	"math"

	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/remedy"
	"chargehand/commission/site"
)

// hardest are the figures of one resistance that pulse, shorted bus and time-out hang on, each in its worst corner.
type hardest struct{ pulse, withstand, slowest float64 }

// choice looks for another resistance: of the same rating and tolerance, between a hundredth and a hundredfold of the one
// that is there.
type choice struct {
	a                         *assessment
	judgesShort, judgesCharge bool                // withstand and slowest charge are known
	tried                     map[float64]hardest // pulse, shorted bus and time-out ask for the same resistances
}

// choice is made once for all findings that ask for it.
func (a *assessment) choice() *choice {
	if a.other == nil {
		c := &choice{a: a, tried: map[float64]hardest{}}
		c.judgesShort = a.missing(a.needsShortedBus) == nil
		c.judgesCharge = c.judgesShort && a.missing(a.needsErrors) == nil
		a.other = c
	}
	return a.other
}

// at is what one resistance is up against.
func (c *choice) at(r float64) hardest {
	h, known := c.tried[r]
	switch {
	case known:
		return h
	case c.isCertain():
		h = c.inCorners(r)
	default:
		h = c.overAll(r)
	}
	c.tried[r] = h
	return h
}

// inCorners takes the corners that are worst with the present resistance: which corner is worst does not change with it, as
// every figure is monotone in every input. A remedy is checked over all corners before it is given.
func (c *choice) inCorners(r float64) hardest {
	scale := r / c.a.axes[axisResistor].Nominal
	with := func(x []float64) []float64 {
		y := append([]float64(nil), x...)
		y[axisResistor] *= scale
		return y
	}
	pulse, withstand := with(c.a.charge[ofPulse].AtHigh), with(c.a.charge[ofWithstand].AtLow)
	slowest := with(c.a.closing[ofTimeToClose].AtHigh)
	atPulse, atWithstand := c.a.circuit(pulse), c.a.circuit(withstand)
	return hardest{
		pulse:     c.a.utilisation(atPulse.PeakPower(), c.a.heat(atPulse), quantity.Temperature(pulse[axisAmbient])),
		withstand: c.a.withstand(atWithstand.PeakPower(), c.a.heat(atWithstand), withstand),
		slowest:   float64(c.a.circuit(slowest).TimeToClose(c.a.difference + quantity.Voltage(slowest[axisError]))),
	}
}

// isCertain tells whether the worst corners are known: among corners that never close, or stand nothing or everything,
// none is worse than another.
func (c *choice) isCertain() bool {
	withstand := c.a.charge[ofWithstand].Low
	return !math.IsInf(c.a.closing[ofTimeToClose].High, 1) && withstand > 0 && !math.IsInf(withstand, 1)
}

// overAll takes all corners again.
func (c *choice) overAll(r float64) hardest {
	b := assess(withResistance(c.a.site, r))
	return hardest{b.charge[ofPulse].High, b.charge[ofWithstand].Low, b.closing[ofTimeToClose].High}
}

// withResistance is the site with another resistor of the same tolerance.
func withResistance(s site.Site, r float64) site.Site {
	was := s.Precharge.Resistance
	scale := quantity.Resistance(r) / was.Nominal
	s.Precharge.Resistance.Spread = quantity.Spread[quantity.Resistance]{Low: was.Low * scale, Nominal: quantity.Resistance(r), High: was.High * scale}
	return s
}

func (c *choice) present() float64 { return c.a.axes[axisResistor].Nominal }

// standsPulse and the others are the three conditions; one that cannot be judged does not stand in the way.
func (h hardest) standsPulse() bool { return h.pulse <= 1 }

func (c *choice) standsShort(h hardest, timeout float64) bool {
	return !c.judgesShort || h.withstand >= belowLeastWithstand*timeout
}

func (c *choice) closesInTime(h hardest, timeout float64) bool {
	return !c.judgesCharge || aboveSlowestCharge*h.slowest <= timeout
}

// window is the admissible time-out at one resistance.
func (c *choice) window(r float64) (low, high float64) {
	h := c.at(r)
	return aboveSlowestCharge * h.slowest, h.withstand / belowLeastWithstand
}

// edge finds where holds turns true between two resistances, as a ratio, by halving; it gives the side on which it holds.
func edge(fails, holds float64, condition func(r float64) bool) float64 {
	for range 40 {
		middle := math.Sqrt(fails * holds)
		if condition(middle) {
			holds = middle
		} else {
			fails = middle
		}
		if math.Abs(holds/fails-1) < 1e-7 {
			break
		}
	}
	return holds
}

const reach = 100 // how far from the present resistance, as a factor

// admissible is the range of resistances that meet pulse, shorted bus and time-out together with the time-out as set:
// larger ones ease pulse and shorted bus, smaller ones charge faster.
func (c *choice) admissible(timeout float64) (least, greatest float64, ok bool) {
	from, to := c.present()/reach, c.present()*reach
	strong := func(r float64) bool { h := c.at(r); return h.standsPulse() && c.standsShort(h, timeout) }
	fast := func(r float64) bool { return c.closesInTime(c.at(r), timeout) }
	if !strong(to) || !fast(from) {
		return 0, 0, false
	}
	least, greatest = from, to
	if !strong(from) {
		least = edge(from, to, strong)
	}
	if !fast(to) {
		greatest = edge(to, from, fast)
	}
	return least, greatest, least <= greatest
}

// leastWithWindow is the least resistance that stands the pulse and leaves room for some time-out.
func (c *choice) leastWithWindow() (float64, bool) {
	fits := func(r float64) bool {
		h := c.at(r)
		return h.standsPulse() && aboveSlowestCharge*h.slowest < h.withstand/belowLeastWithstand
	}
	last := 0.0
	r := c.present() / reach
	for range 97 { // 1.1⁹⁷ is just above reach²
		if fits(r) {
			if last == 0 {
				return r, true
			}
			return edge(last, r, fits), true
		}
		last = r
		r *= 1.1
	}
	return 0, false
}

// between is the time-out to choose in a window: the geometric mean, or twice the lower bound where there is no upper.
func between(low, high float64) float64 {
	if math.IsInf(high, 1) {
		return 2 * low
	}
	return math.Sqrt(low * high)
}

// remedyResistor says what makes pulse, shorted bus and time-out pass together: another time-out, else another resistor,
// else both; or which of them exclude each other and by how much.
func (a *assessment) remedyResistor(f finding.Finding) finding.Finding {
	c := a.choice()
	for _, way := range []func(finding.Finding) (finding.Finding, bool){c.otherTimeout, c.otherResistor, c.both} {
		if g, ok := way(f); ok && a.passesWith(f.ID, g.Changes) {
			return g
		}
	}
	f.Remedy = c.exclusion()
	return f
}

// passesWith judges the finding again with the changes in place.
func (a *assessment) passesWith(id string, changes []finding.Change) bool {
	s, err := remedy.Apply(a.site, changes...)
	if err != nil {
		return false
	}
	for _, f := range assess(s).findings() {
		if f.ID == id {
			return f.Verdict == finding.Pass
		}
	}
	return false
}

const (
	keyResistance = "precharge.resistance"
	keyTimeout    = "precharge.timeout"
)

// otherTimeout keeps the resistor.
func (c *choice) otherTimeout(f finding.Finding) (finding.Finding, bool) {
	h := c.at(c.present())
	low, high := c.window(c.present())
	if !c.judgesCharge || !h.standsPulse() || low > high {
		return f, false
	}
	set := float64(c.a.timeout())
	nearest, words := high, "lower "
	if set < low {
		nearest, words = low, "raise "
	}
	f.Changes = []finding.Change{{Key: keyTimeout, Unit: "s", Was: set, Value: remedy.AwayFrom(set, nearest)}}
	f.Remedy = words + remedy.Phrase(f.Changes) + "; a good choice is " + say(between(low, high), "s")
	return f, true
}

// otherResistor keeps the time-out.
func (c *choice) otherResistor(f finding.Finding) (finding.Finding, bool) {
	least, greatest, ok := c.admissible(float64(c.a.timeout()))
	if !ok {
		return f, false
	}
	present := c.present()
	switch {
	case present < least:
		f.Changes = []finding.Change{{Key: keyResistance, Unit: "Ω", Was: present, Value: remedy.AwayFrom(present, least)}}
		f.Remedy = "raise " + remedy.Phrase(f.Changes)
	case present > greatest:
		f.Changes = []finding.Change{{Key: keyResistance, Unit: "Ω", Was: present, Value: remedy.AwayFrom(present, greatest)}}
		f.Remedy = "lower " + remedy.Phrase(f.Changes)
	default:
		return f, false
	}
	f.Remedy += ": pulse, shorted bus and time-out allow " + say(least, "Ω") + " … " + say(greatest, "Ω")
	f.Remedy += c.preferred(least, greatest)
	return f, true
}

// preferred names the preferred value of a range.
func (c *choice) preferred(least, greatest float64) string {
	was := c.a.site.Precharge.Resistance
	tolerance := quantity.Ratio(max(was.High-was.Nominal, was.Nominal-was.Low) / was.Nominal)
	series := seriesOf(tolerance)
	v, ok := preferred(quantity.Resistance(least), quantity.Resistance(greatest), series)
	if !ok {
		return "; no preferred value of " + seriesName(series) + " lies in it"
	}
	return "; preferred value " + say(float64(v), "Ω") + " (" + seriesName(series) + ")"
}

// both changes resistor and time-out.
func (c *choice) both(f finding.Finding) (finding.Finding, bool) {
	if !c.judgesCharge {
		return f, false
	}
	least, ok := c.leastWithWindow()
	if !ok {
		return f, false
	}
	present, set := c.present(), float64(c.a.timeout())
	r := remedy.AwayFrom(present, least)
	if least < present { // any resistance between has room too; stay as near as possible to the least
		r = least
	}
	low, high := c.window(r)
	f.Changes = []finding.Change{{Key: keyResistance, Unit: "Ω", Was: present, Value: r},
		{Key: keyTimeout, Unit: "s", Was: set, Value: between(low, high)}}
	f.Remedy = "raise " + remedy.Phrase(f.Changes[:1]) + " together with " + remedy.Phrase(f.Changes[1:])
	f.Remedy += c.preferred(r, math.Inf(1))
	return f, true
}

// exclusion says which conditions exclude each other, and what a resistor of the same value must stand instead.
func (c *choice) exclusion() string {
	h := c.at(c.present())
	switch {
	case !h.standsPulse() && !c.judgesCharge:
		return "no resistance of this rating stands the pulse: it must permit " + say(h.pulse, "1") + " times as much"
	case math.IsInf(h.slowest, 1):
		return "the charge can stall, which no time-out mends: see precharge.stall"
	}
	low, high := c.window(c.present())
	needed := aboveSlowestCharge * belowLeastWithstand * h.slowest
	text := "no resistance of this rating meets all: the slowest charge wants a time-out of at least " + say(low, "s") +
		", the shorted bus permits at most " + say(high, "s") + ", they exclude each other by " + say(low-high, "s")
	return text + "; a resistor of this value must stand " + say(c.a.charge[ofPower].High, "W") + " for " + say(needed, "s")
}
