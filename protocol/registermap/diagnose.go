package registermap

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strconv"

	"chargehand/commission/signal"
)

// Verdict says how a signal's map entry stands against what was expected.
type Verdict string

// The verdicts.
const (
	Unasked     Verdict = "not compared" // nothing was expected of it
	NotRead     Verdict = "not read"     // the device gave none of its registers
	Agrees      Verdict = "agrees"
	Explained   Verdict = "differs"              // and other readings of the neighbourhood agree
	Unexplained Verdict = "differs, unexplained" // no reading of the neighbourhood agrees: rather the sensor or the reference
)

// SignalDiagnosis is what is to be thought of one signal's map entry.
type SignalDiagnosis struct {
	Point      Point
	Verdict    Verdict
	Expected   Expected // of the last sample
	Value      float64  // of the last sample as the map has it; NaN where that gives none
	Hypotheses []Hypothesis
	Certain    []Change // what all of them change alike
	Enough     bool     // three samples or more, over a tenth of the value: below that, anything is a suspicion only
	Advice     string   // the reading that would tell more; "" where there is nothing left to tell
}

// Explanation is one change to the whole map that mends every signal which differs.
type Explanation struct {
	Line    string // the map's line, or what to do to every signal's
	Signals []signal.Name
}

// Diagnosis is what is to be thought of a map.
type Diagnosis struct {
	Whole   []Explanation // rivals among themselves
	Signals []SignalDiagnosis
}

// Samples and levels that a single answer asks for.
const (
	enoughSamples = 3
	enoughSpread  = 0.1
	mostListed    = 12
)

// Diagnose compares every signal with what was expected over all samples together. A signal that agrees as the map has it is
// never doubted. One that differs gets every reading of its neighbourhood that agrees in all samples, the simplest first;
// readings that cannot be told apart all stand there.
func Diagnose(m Map, own uint8, samples []Sample) Diagnosis {
	var d Diagnosis
	for _, p := range m.Points {
		d.Signals = append(d.Signals, diagnose(p, own, samples))
	}
	d.Whole = m.whole(d.Signals, own, samples)
	return d
}

func diagnose(p Point, own uint8, samples []Sample) SignalDiagnosis {
	s := SignalDiagnosis{Point: p, Verdict: Unasked, Value: math.NaN()}
	samples = slices.DeleteFunc(slices.Clone(samples), func(x Sample) bool { _, asked := x.Expected[p.Name]; return !asked })
	if len(samples) == 0 {
		return s
	}
	last := samples[len(samples)-1]
	s.Expected = last.Expected[p.Name]
	s.Enough = enough(p.Name, samples)
	fit, read := fits(p, own, samples)
	if words, ok := last.Words.Of(p, own); ok {
		if r := p.Decode(words); r.Quality.HasValue() {
			s.Value = r.Value
		}
	}
	if fit {
		s.Verdict = Agrees
		return s
	}
	for _, h := range hypotheses(p)[1:] {
		if ok, _ := fits(h.Point, own, samples); ok {
			s.add(h, own, last)
		}
	}
	if missing, ok := missingCode(p, own, samples); ok {
		s.add(missing, own, last)
	}
	switch {
	case len(s.Hypotheses) > 0:
		s.Verdict = Explained
		s.rank()
	case !read:
		s.Verdict = NotRead
	default:
		s.Verdict = Unexplained
	}
	s.Advice = s.advice(samples)
	return s
}

func enough(n signal.Name, samples []Sample) bool {
	if n.IsState() {
		return len(samples) >= enoughSamples && changes(n, samples)
	}
	low, high := math.Inf(1), math.Inf(-1)
	for _, x := range samples {
		low, high = min(low, x.Expected[n].Value), max(high, x.Expected[n].Value)
	}
	return len(samples) >= enoughSamples && high-low >= enoughSpread*max(math.Abs(high), math.Abs(low)) && high != low
}

// changes tells whether a state was expected in both its values.
func changes(n signal.Name, samples []Sample) bool {
	for _, x := range samples {
		if x.Expected[n].Value != samples[0].Expected[n].Value {
			return true
		}
	}
	return false
}

// fits tells whether a point reads as expected in every sample that has its registers, and in one at least. read: the
// device gave them at all. A sample without the registers speaks neither way unless it is the map's own address.
func fits(p Point, own uint8, samples []Sample) (fit, read bool) {
	for _, x := range samples {
		words, ok := x.Words.Of(p, own)
		if !ok {
			return false, read
		}
		read = true
		r := p.Decode(words)
		if !r.Quality.HasValue() || !x.Expected[p.Name].agrees(p, r.Value) {
			return false, true
		}
	}
	return read, read
}

func (s *SignalDiagnosis) add(h Hypothesis, own uint8, last Sample) {
	if words, ok := last.Words.Of(h.Point, own); ok {
		h.Value = h.Point.Decode(words).Value
	}
	s.Hypotheses = append(s.Hypotheses, h)
}

// missingCode is the hypothesis that some samples held the device's code for 'no value', which the map does not list, and all
// others agree.
func missingCode(p Point, own uint8, samples []Sample) (Hypothesis, bool) {
	for _, code := range usualMissing(p.Type) {
		q := p
		q.Missing = append(slices.Clone(p.Missing), code)
		seen := false
		fit := true
		for _, x := range samples {
			words, ok := x.Words.Of(q, own)
			if ok && slices.Equal(words, code) {
				seen = true
				continue
			}
			r := q.Decode(words)
			fit = fit && ok && r.Quality.HasValue() && x.Expected[p.Name].agrees(q, r.Value)
		}
		if seen && fit {
			return Hypothesis{Point: q, Changes: []Change{{"missing", "", strconv.Quote(Hex(code))}}}, true
		}
	}
	return Hypothesis{}, false
}

// rank puts the simplest first and finds what all have in common.
func (s *SignalDiagnosis) rank() {
	slices.SortStableFunc(s.Hypotheses, func(a, b Hypothesis) int { return cmp.Compare(len(a.Changes), len(b.Changes)) })
	for _, c := range s.Hypotheses[0].Changes {
		if !slices.ContainsFunc(s.Hypotheses, func(h Hypothesis) bool { return !h.has(c) }) {
			s.Certain = append(s.Certain, c)
		}
	}
	if len(s.Hypotheses) > mostListed {
		s.Hypotheses = s.Hypotheses[:mostListed]
	}
}

// advice names the reading that would part what is left.
func (s *SignalDiagnosis) advice(samples []Sample) string {
	n := s.Point.Name
	switch {
	case s.Verdict == NotRead:
		return "the device refuses these registers: compare the address with its list"
	case s.Verdict == Unexplained && !math.IsNaN(s.Value) && s.Expected.Value != 0 && math.Abs(s.Value/s.Expected.Value-1) < 0.1:
		return fmt.Sprintf("reads %.4g times what is expected: rather the sensor or the reference than the map", s.Value/s.Expected.Value)
	case s.Verdict == Unexplained:
		return "no register within three of it agrees: compare the map with the device's list"
	case !s.Enough && n.IsState():
		return fmt.Sprintf("take samples with %s both on and off", n)
	case !s.Enough:
		return fmt.Sprintf("take %d samples or more, with %s at levels a tenth apart", enoughSamples, n)
	case len(s.Hypotheses) < 2:
		return ""
	}
	return parting(s.Hypotheses[0].Point, s.Hypotheses[1].Point)
}

// parting names the reading by which two ways to read a signal can be told apart.
func parting(a, b Point) string {
	signedness := func(p Point) bool { return p.Type == I16 || p.Type == I32 || p.Type == I64 }
	switch {
	case a.Address == b.Address && a.Table == b.Table && a.Type.Words() == b.Type.Words() && signedness(a) != signedness(b):
		_, high := Type("i16").limits()
		if a.Type.Words() > 1 {
			high = math.Ldexp(1, 16*a.Type.Words()-1)
		}
		edge := a.scaled(high) * orOne(a.UnitFactor)
		return fmt.Sprintf("a value below 0 or above %.4g %s would part %s from %s", math.Abs(edge), a.Name.Unit(), a.Type, b.Type)
	case a.Address != b.Address || a.Table != b.Table:
		return fmt.Sprintf("move %s alone, so that the register beside it stands still: %s %d or %s %d", a.Name, a.Table, a.Address,
			b.Table, b.Address)
	}
	return fmt.Sprintf("take %s at a level that differs by a tenth or more", a.Name)
}

// whole looks for one change to all signals that explains every signal which differs and breaks none that agrees.
func (m Map) whole(signals []SignalDiagnosis, own uint8, samples []Sample) []Explanation {
	var list []Explanation
	for _, c := range m.wholeChanges() {
		e := Explanation{Line: c.line}
		broken := false
		for _, s := range signals {
			if s.Verdict == Unasked || s.Point.Name.IsState() && !changes(s.Point.Name, expectedOf(s.Point.Name, samples)) {
				continue
			}
			h, affected := c.of(s.Point)
			switch {
			case !affected && s.Verdict == Agrees:
			case !affected:
				continue
			case s.Verdict == Agrees:
				still, _ := fits(h.Point, own, expectedOf(s.Point.Name, samples))
				broken = broken || !still
			case slices.ContainsFunc(s.Hypotheses, func(x Hypothesis) bool { return x.has(h.Changes[0]) }):
				e.Signals = append(e.Signals, s.Point.Name)
			case s.Verdict == Explained:
				broken = true
			}
		}
		if !broken && len(e.Signals) > 1 {
			list = append(list, e)
		}
	}
	slices.SortStableFunc(list, func(a, b Explanation) int { return cmp.Compare(len(b.Signals), len(a.Signals)) })
	return list
}

func expectedOf(n signal.Name, samples []Sample) []Sample {
	return slices.DeleteFunc(slices.Clone(samples), func(x Sample) bool { _, asked := x.Expected[n]; return !asked })
}

// wholeChange is a change made to every signal alike.
type wholeChange struct {
	key  string
	line string
	set  func(Point) (to string, from string, q Point)
}

func (c wholeChange) of(p Point) (h Hypothesis, affected bool) {
	to, from, q := c.set(p)
	if to == from {
		return Hypothesis{}, false
	}
	return Hypothesis{Point: q, Changes: []Change{{c.key, from, to}}}, true
}

// wholeChanges are the mistakes that are made once and hit every line.
func (m Map) wholeChanges() []wholeChange {
	var list []wholeChange
	for _, off := range []int{-1, 1} {
		list = append(list, wholeChange{"address", fmt.Sprintf("every address %+d", off), func(p Point) (string, string, Point) {
			q := p
			if a := int(p.Address) + off; a >= 0 && a <= 65535 {
				q.Address = Address(a)
			}
			return strconv.Itoa(int(q.Address)), strconv.Itoa(int(p.Address)), q
		}})
	}
	other := LowFirst
	if m.WordOrder == LowFirst {
		other = HighFirst
	}
	list = append(list, wholeChange{"word_order", "word_order = " + quoted(other), func(p Point) (string, string, Point) {
		q := p
		if p.Type.Words() > 1 {
			q.WordOrder = other
		}
		return quoted(orHigh(q.WordOrder)), quoted(orHigh(p.WordOrder)), q
	}})
	list = append(list, wholeChange{"table", "every table: its sister (holding for input, input for holding)", func(p Point) (string, string, Point) {
		q := p
		q.Table = p.Table.sister()
		return quoted(q.Table), quoted(p.Table), q
	}})
	list = append(list, wholeChange{"byte_order", "every signal: byte_order = " + quoted(LowFirst), func(p Point) (string, string, Point) {
		q := p
		if !p.Table.HasBits() {
			q.ByteOrder = LowFirst
		}
		return quoted(orHigh(q.ByteOrder)), quoted(orHigh(p.ByteOrder)), q
	}})
	return list
}
