package walk_test

import (
	"fmt"
	"reflect"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
	"pgregory.net/rapid"

	"chargehand/commission/desk"
	"chargehand/commission/finding"
	"chargehand/commission/record"
	"chargehand/commission/site"
	"chargehand/commission/walk"
)

// opening is the example's walk up to its first event, made once: the desk findings take most of a book's time.
var opening = func() []walk.Line {
	b := example(panics{})
	return b.lines
}()

type panics struct{}

func (panics) Helper()                           {}
func (panics) Fatalf(format string, args ...any) { panic(fmt.Sprintf(format, args...)) }

func replay(lines []walk.Line) walk.State {
	var s walk.State
	for _, l := range lines {
		s = s.With(l)
	}
	return s.Ready()
}

// differ compares two states to the last field; a finding without a limit has a margin that is not a number.
func differ(a, b walk.State) string {
	return cmp.Diff(a.Ready(), b, cmp.Exporter(func(reflect.Type) bool { return true }), cmpopts.EquateNaNs(), cmpopts.EquateEmpty())
}

// TestRandomWalks drives random actions, sensible and not, and holds against them what must never be.
func TestRandomWalks(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		b := &book{t: t, now: morning, lines: append([]walk.Line(nil), opening...), state: replay(opening)}
		if rapid.Bool().Draw(t, "far into the walk") {
			b.passTo(rapid.SampledFrom([]string{"dead.polarity", "charge.rise", "boost.first", "trip.stop", "leave.settings"}).Draw(t, "where"))
		}
		for range rapid.IntRange(1, 25).Draw(t, "actions") {
			b.now = b.now.Add(time.Duration(rapid.IntRange(0, 400).Draw(t, "pause")) * time.Second)
			before, lines := b.state, len(b.lines)
			e := anEvent(t, b.state)
			err := b.submit(e)
			if err != nil && len(b.lines) != lines {
				t.Fatalf("%T%+v refused with %v, and still %d lines", e, e, err, len(b.lines)-lines)
			}
			if before.Sealed() != nil && err == nil {
				t.Fatalf("%T%+v taken after the seal", e, e)
			}
			heldShut(t, before, e, err)
			cooled(t, before, e, err, b.now)
		}
		if diff := differ(b.state, replay(b.lines)); diff != "" {
			t.Fatalf("replaying %d lines gives another state (-written +replayed):\n%s", len(b.lines), diff)
		}
	})
}

// heldShut: no reading, result, signature or capture beyond an unsigned hold.
func heldShut(t *rapid.T, s walk.State, e walk.Event, err error) {
	var point string
	switch e := e.(type) {
	case walk.Take:
		point = e.Reading.Point
	case walk.Judge:
		point = e.Point
	case walk.Sign:
		point = e.Point
	case walk.Arm:
		point = e.Point
	case walk.Enter:
		if err != nil {
			return
		}
		for _, p := range s.Points() {
			if p.Stage < e.Stage && p.Kind == walk.Hold && len(s.Status(p.ID).Signed) == 0 {
				t.Fatalf("stage %d entered past the unsigned hold %s", e.Stage, p.ID)
			}
		}
		return
	default:
		return
	}
	if err != nil {
		return
	}
	for _, p := range s.Points() {
		if p.ID == point {
			return
		}
		if p.Kind == walk.Hold && len(s.Status(p.ID).Signed) == 0 {
			t.Fatalf("%T at %s taken past the unsigned hold %s", e, point, p.ID)
		}
	}
}

// cooled: no attempt while the resistor cools unless a reason stands in the log, and none before the cause is known.
func cooled(t *rapid.T, s walk.State, e walk.Event, err error, now time.Time) {
	arm, ok := e.(walk.Arm)
	p, known := s.Point(arm.Point)
	if !ok || !known || !p.Attempt || err != nil {
		return
	}
	if s.CoolsFor(now) > 0 && arm.Override == "" {
		t.Fatalf("attempt %d while the resistor cools for %v, with no reason", len(s.Attempts())+1, s.CoolsFor(now))
	}
	if s.CauseIsMissing() {
		t.Fatalf("attempt %d before the cause of the last is known", len(s.Attempts())+1)
	}
}

func anEvent(t *rapid.T, s walk.State) walk.Event {
	points := s.Points()
	p := points[rapid.IntRange(0, len(points)-1).Draw(t, "point")]
	if next, open := s.NextOpen(); open && rapid.IntRange(0, 3).Draw(t, "at random") > 0 {
		p = next
	}
	switch rapid.IntRange(0, 15).Draw(t, "event") {
	case 0, 1, 2:
		return walk.Take{Reading: aReading(t, p)}
	case 3, 4:
		return walk.Judge{Point: p.ID, Result: rapid.SampledFrom([]walk.Result{walk.Passed, walk.Failed, walk.NotApplicable, walk.Open}).Draw(t, "result"),
			Note: rapid.SampledFrom([]string{"", "because"}).Draw(t, "note")}
	case 5, 6:
		return walk.Sign{Point: p.ID, Person: rapid.SampledFrom([]string{"p1", "p2", "p7"}).Draw(t, "person")}
	case 7:
		return walk.Deviate{Point: p.ID, Reason: rapid.SampledFrom([]string{"", "agreed"}).Draw(t, "reason"), AcceptedBy: "p2"}
	case 8:
		return walk.Reopen{Point: p.ID, Why: rapid.SampledFrom([]string{"", "seen again"}).Draw(t, "why")}
	case 9, 10:
		a := rapid.SampledFrom([]string{"charge.rise", "share.stairs", "trip.time-out", p.ID}).Draw(t, "capture at")
		return walk.Arm{Point: a, Override: rapid.SampledFrom([]string{"", "insisted on"}).Draw(t, "override")}
	case 11:
		return walk.EnterCause{Cause: "bank-missing"}
	case 12:
		id := rapid.SampledFrom([]string{"measured.precharge", "measured.closing", "measured.sensor", "measured.droop"}).Draw(t, "id")
		v := rapid.SampledFrom([]finding.Verdict{finding.Pass, finding.Fail}).Draw(t, "verdict")
		return walk.Captured{Findings: []finding.Finding{{ID: id, Subject: "bus-voltage", Unit: "V", State: finding.Finite, Value: finding.Exactly(1), Verdict: v}}}
	case 13:
		return rapid.SampledFrom([]walk.Event{walk.Enter{Stage: p.Stage}, walk.Return{}, walk.RaisePunch{What: "x", Severity: "A", Owner: "yard", Due: "soon", Point: p.ID},
			walk.ClearPunch{ID: "k1"}, walk.Keep{Setting: record.Setting{Name: "droop-setting", When: "as-left"}},
			walk.Keep{Setting: record.Setting{Name: "droop-setting", When: "as-found"}}}).Draw(t, "other")
	case 14:
		return walk.Enter{Stage: rapid.IntRange(0, 13).Draw(t, "stage")}
	}
	if rapid.IntRange(0, 9).Draw(t, "seal") == 0 {
		return walk.Seal{Person: "p1", UnsignedBecause: "a test"}
	}
	return walk.AddNote{Text: "rain"}
}

func aReading(t *rapid.T, p walk.Point) record.Reading {
	r := record.Reading{Point: p.ID, Signal: "seen", Source: record.Observed, Text: "so", Quality: "good"}
	what, unit := "", ""
	switch {
	case len(p.Hand) > 0 && rapid.Bool().Draw(t, "by hand"):
		h := p.Hand[rapid.IntRange(0, len(p.Hand)-1).Draw(t, "hand")]
		id := "i1"
		what, unit, r.Source, r.Instrument = h.What, h.Unit, record.FromInstrument, &id
	case len(p.Signals) > 0 && rapid.Bool().Draw(t, "live"):
		n := p.Signals[rapid.IntRange(0, len(p.Signals)-1).Draw(t, "signal")]
		what, unit, r.Source = string(n), n.Unit(), record.FromDevice
	default:
		return r
	}
	v := rapid.Float64Range(-10, 1200).Draw(t, "value")
	for _, c := range p.Accept {
		if c.What == what && rapid.Bool().Draw(t, "as wanted") {
			v = middle(c)
		}
	}
	r.Signal, r.Value, r.Unit, r.Text = what, &v, unit, ""
	return r
}

// TestAnotherSiteReplaysToo: a log with a changed site file in it gives the state that wrote it.
func TestAnotherSiteReplaysToo(t *testing.T) {
	b := example(t)
	b.passTo("dead.contactors")
	text, _ := site.Example()
	s, _, err := site.Read("x", []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	b.do(walk.ChangeSite{Name: "example.rev1.site.toml", Text: text + "\n", Why: "a line", Findings: desk.Findings(s, nil)})
	b.pass("paper.findings")
	if diff := differ(b.state, replay(b.lines)); diff != "" {
		t.Errorf("replaying gives another state (-written +replayed):\n%s", diff)
	}
}
