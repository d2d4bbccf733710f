package walk

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/record"
	"chargehand/commission/signal"
)

// Assessment is what a point's readings and findings come to by themselves.
type Assessment struct {
	Result  Result   // Passed, Failed, or Open while something is missing
	Because []string // what is missing or outside
}

// Assess judges a point by its readings since it was opened: every origin it wants is there, every criterion holds, every
// finding that binds it is not failed, and every live reading comes from a signal that has been proved.
func (s State) Assess(p Point) Assessment {
	var missing, outside []string
	taken := s.latest(p.ID)
	for _, by := range p.By {
		if because := s.lacks(p, by, taken); because != "" {
			missing = append(missing, because)
		}
	}
	for _, c := range p.Accept {
		r, ok := taken.of(c.What)
		switch {
		case c.Low == nil && c.High == nil:
			missing = append(missing, "nothing limits "+c.What+": the site file lacks "+c.From)
		case !ok || r.Value == nil:
			missing = append(missing, "no reading of "+c.What)
		case !c.Holds(*r.Value):
			outside = append(outside, fmt.Sprintf("%s is %s, wanted %s (%s)", c.What, show(*r.Value, c.Unit), c.words(), c.From))
		}
	}
	if names := s.unproved(p, taken); len(names) > 0 {
		missing = append(missing, join(names)+" not proved yet: compare with a known value that is not zero")
	}
	for _, name := range p.Proves {
		if because := s.disagreement(name, taken); because != "" {
			outside = append(outside, because)
		}
	}
	for _, id := range p.Findings {
		m, o := s.bind(id)
		missing, outside = append(missing, m...), append(outside, o...)
	}
	switch {
	case len(outside) > 0:
		return Assessment{Failed, outside}
	case len(missing) > 0:
		return Assessment{Open, missing}
	}
	return Assessment{Passed, nil}
}

// disagreement says that the device and whatever else read the signal here do not agree.
func (s State) disagreement(name signal.Name, taken readings) string {
	device, seen := taken.from(record.FromDevice, string(name))
	known, held := taken.known(string(name))
	if !seen || !held || device.Value == nil || known.Value == nil {
		return ""
	}
	if off := math.Abs(*device.Value - *known.Value); off > s.proofTolerance(name, known) {
		return fmt.Sprintf("%s: the device reads %s, %s %s", name, show(*device.Value, name.Unit()), known.Source, show(*known.Value, name.Unit()))
	}
	return ""
}

func (s State) bind(id string) (missing, outside []string) {
	found := s.Measured(id)
	if !strings.HasPrefix(id, "measured.") {
		for _, f := range s.desk {
			if f.ID == id || strings.HasSuffix(id, ".") && strings.HasPrefix(f.ID, id) {
				found = append(found, f)
			}
		}
	}
	if len(found) == 0 {
		return []string{"no finding " + id}, nil
	}
	for _, f := range found {
		switch f.Verdict {
		case finding.Fail:
			outside = append(outside, f.ID+" fails: "+strings.Join(f.Because, ", "))
		case finding.Undecided:
			missing = append(missing, f.ID+" is undecided: "+strings.Join(f.Because, ", "))
		}
	}
	return missing, outside
}

// lacks says what a point still lacks of one origin.
func (s State) lacks(p Point, by By, taken readings) string {
	switch by {
	case Live:
		if p.Capture != "" || len(p.Signals) == 0 {
			return ""
		}
		return s.lacksLive(p, taken)
	case Instrument:
		for _, h := range p.Hand {
			if _, ok := taken.from(record.FromInstrument, h.What); !ok {
				return "no instrument reading of " + h.What
			}
		}
		if _, ok := taken.from(record.FromInstrument, ""); !ok && len(p.Hand) == 0 {
			return "no instrument reading"
		}
	case Observation, Document:
		if _, ok := taken.from(record.Observed, ""); !ok {
			return "nothing was entered as seen"
		}
	}
	return ""
}

func (s State) lacksLive(p Point, taken readings) string {
	seen := false
	for _, name := range p.Signals {
		if r, ok := taken.from(record.FromDevice, string(name)); ok && r.Value != nil {
			seen = true
		}
	}
	if !seen {
		return "no live reading of " + join(p.Signals)
	}
	return ""
}

// unproved are the signals on which the point's verdict rests and which nobody has compared with a known value yet.
func (s State) unproved(p Point, taken readings) []signal.Name {
	if p.Unproved {
		return nil
	}
	var names []signal.Name
	for _, name := range p.Signals {
		if !name.IsState() && !s.IsProved(name) && !slices.Contains(p.Proves, name) && p.restsOn(name, taken) {
			names = append(names, name)
		}
	}
	return names
}

// restsOn tells whether a verdict takes the device's word for the signal: a measured finding binds the point, or a
// criterion names the signal and no instrument read it.
func (p Point) restsOn(name signal.Name, taken readings) bool {
	for _, id := range p.Findings {
		if strings.HasPrefix(id, "measured.") {
			return true
		}
	}
	for _, c := range p.Accept {
		if _, byHand := taken.from(record.FromInstrument, c.What); c.What == string(name) && !byHand {
			return true
		}
	}
	return false
}

type readings []record.Reading

// latest are a point's readings since it was opened, the newest last.
func (s State) latest(point string) readings {
	var all readings
	for _, seq := range s.Status(point).Readings {
		all = append(all, s.readings[seq])
	}
	return all
}

// of is the newest reading of what, an instrument's before the device's.
func (rs readings) of(what string) (record.Reading, bool) {
	if r, ok := rs.from(record.FromInstrument, what); ok {
		return r, true
	}
	return rs.from("", what)
}

// known is the newest reading of what that did not come from the device.
func (rs readings) known(what string) (record.Reading, bool) {
	if r, ok := rs.from(record.FromInstrument, what); ok {
		return r, true
	}
	return rs.from(record.Observed, what)
}

// from is the newest reading from a source; an empty source or what stands for any.
func (rs readings) from(source, what string) (record.Reading, bool) {
	for i := len(rs) - 1; i >= 0; i-- {
		if (source == "" || rs[i].Source == source) && (what == "" || rs[i].Signal == what) {
			return rs[i], true
		}
	}
	return record.Reading{}, false
}

func (c Criterion) words() string {
	switch {
	case c.Low != nil && c.High != nil:
		return show(*c.Low, c.Unit) + " … " + show(*c.High, c.Unit)
	case c.Low != nil:
		return "at least " + show(*c.Low, c.Unit)
	case c.High != nil:
		return "at most " + show(*c.High, c.Unit)
	}
	return "a value"
}

func show(v float64, unit string) string { return quantity.Engineering(v, unit, 4) }

func join(names []signal.Name) string {
	texts := make([]string, len(names))
	for i, n := range names {
		texts[i] = string(n)
	}
	return strings.Join(texts, ", ")
}

func numbered(letter string, n int) string { return letter + strconv.Itoa(n) }

func stageName(number int) string { return StageTitles[number-1] }

func stageNumber(name string) int {
	for i, title := range StageTitles {
		if title == name {
			return i + 1
		}
	}
	return 0
}

func hashOf(text string) string {
	sum := sha256.Sum256([]byte(text))
	return hex.EncodeToString(sum[:])
}

func orEmpty(seqs []int64) []int64 {
	if seqs == nil {
		return []int64{}
	}
	return seqs
}
