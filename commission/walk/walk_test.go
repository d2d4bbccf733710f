package walk_test

import (
	"encoding/json"
	"errors"
	"strings"
	"time"

	"chargehand/commission/desk"
	"chargehand/commission/finding"
	"chargehand/commission/record"
	"chargehand/commission/site"
	"chargehand/commission/walk"
)

// morning is when the walks of these tests begin.
var morning = time.Date(2026, 12, 1, 8, 0, 0, 0, time.UTC)

// book is a walk with its log: what Decide says is written down, read back and taken in.
type book struct {
	t     fataler
	state walk.State
	lines []walk.Line
	now   time.Time
}

type fataler interface {
	Helper()
	Fatalf(format string, args ...any)
}

// begun is the walk of a site file with one technician, one owner and the site's instruments.
func begun(t fataler, text string) *book {
	t.Helper()
	s, _, err := site.Read("example.site.toml", []byte(text))
	if err != nil {
		t.Fatalf("Read(example) = %v", err)
	}
	b := &book{t: t, now: morning}
	b.take(record.Opened{Format: record.Format, Log: strings.Repeat("0", 32), Mode: record.SiteMode, Disturb: []string{}})
	b.take(record.File{Role: "site", Name: "example.site.toml", SHA256: strings.Repeat("1", 64), Text: text})
	for _, f := range desk.Findings(s, nil) {
		b.take(b.findingRecord(f))
	}
	for i, known := range s.Instruments {
		b.take(record.Instrument{ID: "i" + string(rune('1'+i)), Name: known.Name, Serial: known.Serial, Due: known.Due.Format(time.DateOnly)})
	}
	b.take(record.Person{ID: "p1", Name: "A. Example", Role: "technician"})
	b.take(record.Person{ID: "p2", Name: "B. Example", Role: "owner"})
	return b
}

func example(t fataler) *book {
	text, _ := site.Example()
	return begun(t, text)
}

func (b *book) findingRecord(f finding.Finding) record.Finding {
	b.t.Helper()
	text, err := json.Marshal(f)
	if err != nil {
		b.t.Fatalf("Marshal(%s) = %v", f.ID, err)
	}
	return record.Finding{JSON: text}
}

// take writes one record down as the log would: encoded, decoded, numbered.
func (b *book) take(body record.Body) {
	b.t.Helper()
	text, err := json.Marshal(body)
	if err != nil {
		b.t.Fatalf("Marshal(%s) = %v", body.Kind(), err)
	}
	read, err := record.Decode(body.Kind(), text)
	if err != nil {
		b.t.Fatalf("Decode(%s) = %v", text, err)
	}
	line := walk.Line{Seq: int64(len(b.lines)), At: b.now, Body: read}
	b.lines = append(b.lines, line)
	b.state = b.state.With(line)
}

// submit is what the owner of the log does with an event.
func (b *book) submit(e walk.Event) error {
	b.t.Helper()
	bodies, err := b.state.Decide(e, b.now)
	if err != nil {
		return err
	}
	for _, body := range bodies {
		b.take(body)
	}
	b.state = b.state.Ready()
	return nil
}

// do submits what must be taken.
func (b *book) do(events ...walk.Event) {
	b.t.Helper()
	for _, e := range events {
		if err := b.submit(e); err != nil {
			b.t.Fatalf("Decide(%T%+v) = %v, want records", e, e, err)
		}
	}
}

// refused submits what must be refused, for the reason given.
func (b *book) refused(e walk.Event, because string) {
	b.t.Helper()
	before := len(b.lines)
	err := b.submit(e)
	var refused *walk.RefusedError
	if !errors.As(err, &refused) || !strings.Contains(err.Error(), because) {
		b.t.Fatalf("Decide(%T%+v) = %v, want a refusal with %q", e, e, err, because)
	}
	if len(b.lines) != before {
		b.t.Fatalf("Decide(%T%+v) wrote %d records beside refusing", e, e, len(b.lines)-before)
	}
}

// read takes a reading.
func (b *book) read(point, signal string, value float64, unit, source string) error {
	b.t.Helper()
	r := record.Reading{Point: point, Signal: signal, Value: &value, Unit: unit, Source: source, Quality: "good"}
	if source == record.FromInstrument {
		id := "i1"
		r.Instrument = &id
	}
	return b.submit(walk.Take{Reading: r})
}

func (b *book) seen(point string) {
	b.t.Helper()
	b.do(walk.Take{Reading: record.Reading{Point: point, Signal: "seen", Source: record.Observed, Text: "as wanted"}})
}

// judge brings in what a measured finding says.
func (b *book) measured(id, subject string, v finding.Verdict) {
	b.t.Helper()
	b.do(walk.Captured{Findings: []finding.Finding{{ID: id, Subject: subject, Title: "t", Unit: "V", State: finding.Finite, Value: finding.Exactly(1), Verdict: v}}})
}

// pass brings a point to its pass, with readings in the middle of what is accepted, and signs a hold.
func (b *book) pass(id string) {
	b.t.Helper()
	p, ok := b.state.Point(id)
	if !ok {
		b.t.Fatalf("the walk has no point %s", id)
	}
	b.fulfil(p)
	b.do(walk.Judge{Point: id, Result: walk.Passed})
	if p.Kind == walk.Hold {
		b.do(walk.Sign{Point: id, Person: "p1", UnsignedBecause: "a test"})
	}
}

// fulfil takes every reading a point wants.
func (b *book) fulfil(p walk.Point) {
	b.t.Helper()
	middles := map[string]float64{}
	for _, c := range p.Accept {
		middles[c.What] = middle(c)
	}
	take := func(what, unit, source string) {
		v, known := middles[what]
		if !known {
			v = usual(what)
		}
		if p.ID == "charge.bus-state" {
			v = 3
		}
		if err := b.read(p.ID, what, v, unit, source); err != nil {
			b.t.Fatalf("%s: Take(%s = %g %s) = %v", p.ID, what, v, unit, err)
		}
	}
	for _, h := range p.Hand {
		take(h.What, h.Unit, record.FromInstrument)
	}
	for _, name := range p.Signals {
		take(string(name), name.Unit(), record.FromDevice)
	}
	for _, name := range p.Proves {
		if !p.Wants(walk.Instrument) {
			take(string(name), name.Unit(), record.Observed)
		}
	}
	if p.Wants(walk.Observation) || p.Wants(walk.Document) {
		b.seen(p.ID)
	}
	for _, c := range p.Accept {
		if c.What == "rise" || c.What == "settled steps" {
			take(c.What, c.Unit, record.FromDevice)
		}
	}
	for _, id := range p.Findings {
		if name, subject, _ := strings.Cut(id, ":"); strings.HasPrefix(name, "measured.") {
			b.measured(name, subject, finding.Pass)
		}
	}
}

func middle(c walk.Criterion) float64 {
	switch {
	case c.Low != nil && c.High != nil:
		return (*c.Low + *c.High) / 2
	case c.Low != nil:
		return *c.Low
	case c.High != nil:
		return *c.High / 2
	}
	return 1
}

// usual is a value that is not zero, so that equal readings prove a signal.
func usual(what string) float64 {
	switch what {
	case "source-voltage":
		return 724
	case "bus-voltage", "star-point-voltage", "voltage-setpoint":
		return 700
	case "power":
		return 70000
	}
	return 100
}

// passTo brings every point before id to its end.
func (b *book) passTo(id string) {
	b.t.Helper()
	for _, p := range b.state.Points() {
		if p.ID == id {
			return
		}
		if b.state.IsDone(p) {
			continue
		}
		if p.ID == "charge.live-bus" {
			b.do(walk.Judge{Point: p.ID, Result: walk.NotApplicable, Note: "dead"}, walk.Sign{Point: p.ID, Person: "p1"})
			continue
		}
		b.pass(p.ID)
	}
	b.t.Fatalf("the walk has no point %s", id)
}
