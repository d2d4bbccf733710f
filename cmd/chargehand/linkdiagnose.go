package main

import (
	"fmt"
	"math"
	"path/filepath"
	"slices"
	"strings"

	"chargehand/commission/signal"
	"chargehand/protocol/link"
	"chargehand/protocol/poll"
	"chargehand/protocol/registermap"
)

// linkSample is one reading of a map's neighbourhood with what its signals ought to read then.
type linkSample struct {
	words  registermap.Words
	site   map[signal.Name]expectation
	meters map[signal.Name]expectation
}

// compared are the samples as the diagnosis wants them. A signal that a hand meter was ever held against is judged by the meter
// alone. latest is what was last expected of each; of says which of its two ranges is asked for.
func compared(samples []linkSample, of func(expectation) registermap.Expected) (all []registermap.Sample, latest map[signal.Name]expectation) {
	metered := map[signal.Name]bool{}
	for _, s := range samples {
		for n := range s.meters {
			metered[n] = true
		}
	}
	latest = map[signal.Name]expectation{}
	for _, s := range samples {
		x := registermap.Sample{Words: s.words, Expected: map[signal.Name]registermap.Expected{}}
		put := func(n signal.Name, e expectation) { x.Expected[n], latest[n] = of(e), e }
		for n, e := range s.site {
			if !metered[n] {
				put(n, e)
			}
		}
		for n, e := range s.meters {
			put(n, e)
		}
		all = append(all, x)
	}
	return all, latest
}

func narrowly(e expectation) registermap.Expected { return e.Expected }

func widely(e expectation) registermap.Expected { return e.wide }

// judge compares all samples with what was expected of them. One change to the whole map must leave room for a side that is
// dead, since a plant half of which is dead is common; a single signal in between dead and its window is asked for the window.
func judge(m registermap.Map, own uint8, samples []linkSample) (registermap.Diagnosis, map[signal.Name]expectation) {
	all, expected := compared(samples, narrowly)
	d := registermap.Diagnose(m, own, all)
	all, _ = compared(samples, widely)
	d.Whole = registermap.Diagnose(m, own, all).Whole
	return d, expected
}

// opinion is what is to be thought of a map, in lines for people.
type opinion struct {
	lines   []string
	accused bool // something in the map, not in the plant, is likely wrong
	doubts  bool // something differs that need not be the map's fault
}

func (o *opinion) add(format string, v ...any) { o.lines = append(o.lines, fmt.Sprintf(format, v...)) }

// mostRivals are how many rivals of a signal are listed.
const mostRivals = 6

// opinionOf puts a diagnosis into words.
func opinionOf(p papers, d registermap.Diagnosis, expected map[signal.Name]expectation, refused []poll.Refusal) opinion {
	var o opinion
	mended := o.whole(p, d, expected)
	var agree, unasked []string
	unread := map[bool][]string{} // by whether the device refuses them
	meters := 0
	for _, s := range d.Signals {
		e := expected[s.Point.Name]
		switch {
		case s.Verdict == registermap.Agrees:
			agree = append(agree, string(s.Point.Name))
			if e.basis == byMeter {
				meters++
			}
		case s.Verdict == registermap.Unasked:
			unasked = append(unasked, string(s.Point.Name))
		case s.Verdict == registermap.NotRead && !mended[s.Point.Name]:
			has := isRefused(s.Point, p.unit(), refused)
			unread[has] = append(unread[has], string(s.Point.Name))
		case !mended[s.Point.Name] && (len(mended) == 0 || e.basis != byRest):
			o.signal(p, s, e)
		}
	}
	if list := unread[true]; len(list) > 0 {
		o.accused = true
		o.add("The device has not got the registers of %s: compare their addresses with its list.", strings.Join(list, ", "))
	}
	if list := unread[false]; len(list) > 0 {
		o.add("Nothing can be said of %s: their registers could not be read.", strings.Join(list, ", "))
	}
	switch {
	case o.accused || len(agree) == 0:
	case o.doubts:
		o.add("Nothing else speaks against the map: %d signals read what is expected.", len(agree))
	default:
		o.add("The map is right as far as can be seen: %d signals read what is expected.", len(agree))
	}
	if len(unasked) > 0 {
		o.add("Not compared, since nothing is known of them: %s.", strings.Join(unasked, ", "))
	}
	if meters == 0 && !o.accused {
		o.add("What is expected is wide. Hold a hand meter against one value before any is believed, for example --meter bus-voltage=712.4V")
	}
	return o
}

// isRefused tells whether the device says that it has not got a point's registers.
func isRefused(p registermap.Point, own uint8, refused []poll.Refusal) bool {
	if p.HasUnitID {
		own = p.UnitID
	}
	at := registermap.Span{UnitID: own, Table: p.Table, Address: p.Address, Quantity: 1}
	last := at
	last.Address += registermap.Address(p.Words() - 1)
	return slices.ContainsFunc(refused, func(r poll.Refusal) bool {
		return link.KindOf(r.Err) == link.NoRegister && (r.Span.Covers(at) || r.Span.Covers(last))
	})
}

// accuses tells whether a signal's difference speaks against its map line rather than against plant, sensor or setting.
func accuses(s registermap.SignalDiagnosis, e expectation) bool {
	switch s.Verdict {
	case registermap.Explained:
		return e.basis != byRest && !e.setOtherwise(s.Value)
	case registermap.Unexplained:
		return e.basis == byMeter && !isNear(s.Value, e)
	}
	return false
}

// isNear tells a reading that is off by so little that its sensor, or the meter, is likelier wrong than its map line.
func isNear(value float64, e expectation) bool {
	return math.Abs(value-e.Value) <= 0.1*math.Abs(e.Value)+e.Tolerance
}

// whole says which one change mends all signals that differ, and gives those.
func (o *opinion) whole(p papers, d registermap.Diagnosis, expected map[signal.Name]expectation) map[signal.Name]bool {
	strong := func(n signal.Name) bool {
		return slices.ContainsFunc(d.Signals, func(s registermap.SignalDiagnosis) bool { return s.Point.Name == n && accuses(s, expected[n]) })
	}
	mended := map[signal.Name]bool{}
	list := slices.DeleteFunc(slices.Clone(d.Whole), func(e registermap.Explanation) bool { return !slices.ContainsFunc(e.Signals, strong) })
	if len(list) == 0 {
		return mended
	}
	o.accused = true
	list = slices.DeleteFunc(list, func(e registermap.Explanation) bool { return isLess(e, list[0]) })
	if len(list) == 1 {
		o.add("The map is wrong in one way throughout, as far as can be seen. One change mends %d signals:", len(list[0].Signals))
	} else {
		o.add("The map is wrong throughout. Each of these changes alone would mend it; they cannot be told apart yet:")
	}
	for _, e := range list {
		o.add("  %s: %s", filepath.Base(p.mapFile), e.Line)
		o.add("    mends %s", names(e.Signals))
		for _, n := range e.Signals {
			mended[n] = true
		}
	}
	if len(list) > 1 {
		o.add("  To part them: hand readings (--meter) of signals that not all of them mend, at levels a tenth apart.")
	}
	return mended
}

// isLess tells whether one change mends only some of what another mends, and nothing else.
func isLess(e, than registermap.Explanation) bool {
	return len(e.Signals) < len(than.Signals) &&
		!slices.ContainsFunc(e.Signals, func(n signal.Name) bool { return !slices.Contains(than.Signals, n) })
}

func names(list []signal.Name) string {
	var words []string
	for _, n := range list {
		words = append(words, string(n))
	}
	return strings.Join(words, ", ")
}

// signal says what is to be thought of one signal that differs.
func (o *opinion) signal(p papers, s registermap.SignalDiagnosis, e expectation) {
	reads := shown(s.Point, s.Value)
	if e.basis == bySetting && e.setOtherwise(s.Value) {
		o.add("%s is %s, the site file has %s: correct whichever is wrong.", s.Point.Name, reads, e.text(s.Point))
		return
	}
	o.add("%s reads %s, expected %s.", s.Point.Name, reads, e.text(s.Point))
	o.accused, o.doubts = o.accused || accuses(s, e), true
	switch {
	case s.Verdict == registermap.Explained && e.basis == byRest:
		o.add("  In between nothing is proved: it may be charging or discharging. At rest, this would explain it:")
	case s.Verdict == registermap.Explained && len(s.Hypotheses) == 1 && s.Enough:
		o.add("  One line explains it:")
	case s.Verdict == registermap.Explained && len(s.Hypotheses) == 1:
		o.add("  One line would explain it; a suspicion until more is known:")
	case s.Verdict == registermap.Explained:
		o.add("  %d ways to read it agree and cannot be told apart yet:", len(s.Hypotheses))
	}
	o.rivals(p, s, e)
	if advice := o.advice(s, e); advice != "" {
		o.add("  Next: %s.", advice)
	}
}

func (o *opinion) advice(s registermap.SignalDiagnosis, e expectation) string {
	if s.Verdict == registermap.Explained && e.basis != byMeter {
		return fmt.Sprintf("hold a hand meter against it, --meter %s=VALUE", s.Point.Name)
	}
	if s.Verdict == registermap.Unexplained && e.basis != byMeter {
		return "no line of the map explains it: look at the plant, or hold a hand meter against it"
	}
	return s.Advice
}

// rivals lists the changes of each way to read a signal. Where only a range is expected nearly anything fits with two lines
// changed; where they are many, those of one line are listed and the others counted.
func (o *opinion) rivals(p papers, s registermap.SignalDiagnosis, e expectation) {
	listed := slices.DeleteFunc(slices.Clone(s.Hypotheses), func(h registermap.Hypothesis) bool {
		return !isPossible(s.Point.Name, h.Value) || !e.agrees(h.Point, h.Value) || len(s.Hypotheses) > mostRivals && !e.isNarrow() && len(h.Changes) > 1
	})
	if len(listed) == 0 {
		listed = s.Hypotheses
	}
	listed = listed[:min(len(listed), mostRivals)]
	for i, h := range listed {
		mark := "-"
		if len(listed) > 1 {
			mark = fmt.Sprintf("%d.", i+1)
		}
		o.add("  %s %s, reads %s", mark, way(h), shown(h.Point, h.Value))
		for _, c := range h.Changes {
			for _, line := range p.edit(s.Point, h.Point, c) {
				o.add("       %s", line)
			}
		}
	}
	if more := len(s.Hypotheses) - len(listed); more > 0 {
		o.add("  and %d more, less likely", more)
	}
	if len(s.Hypotheses) > 1 && len(s.Certain) > 0 {
		var lines []string
		for _, c := range s.Certain {
			lines = append(lines, c.Line())
		}
		o.add("  All of them have %s.", strings.Join(lines, ", "))
	}
}

// edit says where a line of the map file stands and what it should read: "site.map.toml:12: address = 100" and beneath it the
// new text.
func (p papers) edit(was, will registermap.Point, c registermap.Change) []string {
	file := filepath.Base(p.mapFile)
	line, key, text := lineOf(p.mapText, was.Line, c.Key)
	to := c.Line()
	if key == "reference" {
		to = fmt.Sprintf("reference = %q", will.Reference())
	} else if c.Key == "address" {
		to += "  # " + will.Reference()
	}
	switch {
	case text == "":
		return []string{fmt.Sprintf("%s:%d: add %s", file, line, to)}
	case c.Key == "missing":
		return []string{fmt.Sprintf("%s:%d: %s; add the code %s", file, line, text, c.To)}
	}
	return []string{fmt.Sprintf("%s:%d: %s", file, line, text), "write instead: " + to}
}

// lineOf finds a key of the table that begins at a line of a map file; an address may be given as a reference. Without the
// key, text is empty and line is the table's own.
func lineOf(mapText string, table int, key string) (line int, found, text string) {
	all := strings.Split(mapText, "\n")
	for i := table; i < len(all); i++ {
		t := strings.TrimSpace(all[i])
		if strings.HasPrefix(t, "[") {
			break
		}
		k, _, ok := strings.Cut(t, "=")
		k = strings.TrimSpace(k)
		if ok && (k == key || key == "address" && k == "reference") {
			t, _, _ = strings.Cut(t, "#")
			return i + 1, k, strings.TrimSpace(t)
		}
	}
	return table, key, ""
}
