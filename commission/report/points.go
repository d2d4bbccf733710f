package report

import (
	"maps"
	"slices"

	"chargehand/commission/chlog"
	"chargehand/commission/record"
	"chargehand/commission/walk"
)

// The results that are no [walk.Result]: a point without one, and one that an older or later program left so.
const (
	open      = "open"
	undecided = "undecided"
)

// told are the stages with their points as the walk left them.
func (t *teller) told() []Stage {
	known := map[string]bool{}
	var stages []Stage
	for number := 1; number <= walk.Stages; number++ {
		title := walk.StageTitles[number-1]
		stage := Stage{Number: number, Title: title, Events: t.stages[title], Points: []Point{}}
		for _, p := range t.state.InStage(number) {
			known[p.ID] = true
			stage.Points = append(stage.Points, t.point(p))
		}
		stages = append(stages, stage)
	}
	other := Stage{Title: "Points that this version does not know", Points: []Point{}}
	for _, id := range slices.Sorted(maps.Keys(t.mentioned())) {
		if !known[id] {
			other.Points = append(other.Points, t.point(walk.Point{ID: id}))
		}
	}
	if len(other.Points) > 0 {
		stages = append(stages, other)
	}
	return stages
}

// mentioned are the ids of all points that the log gives a result or a reading for.
func (t *teller) mentioned() map[string]bool {
	ids := map[string]bool{}
	for id := range t.results {
		ids[id] = true
	}
	for _, r := range t.readings {
		ids[r.Body.Point] = true
	}
	return ids
}

func (t *teller) point(p walk.Point) Point {
	status := t.state.Status(p.ID)
	out := Point{ID: p.ID, Kind: string(p.Kind), Title: p.Title, Expect: p.Expect, Result: string(status.Result), Note: status.Note,
		Deviation: status.Accepted, Reopened: status.Reopened, Readings: t.taken(p.ID), Signatures: t.signed(p.ID), Earlier: []Event[string]{}}
	if status.Result == walk.Open {
		out.Result = open
	}
	for _, r := range t.results[p.ID] {
		if r.Seq == status.Seq && status.Result != walk.Open {
			seq := r.Seq
			out.Seq, out.At = &seq, r.At
			continue
		}
		out.Earlier = append(out.Earlier, Event[string]{r.Seq, r.At, r.Body.Result})
	}
	return out
}

// taken are all readings at a point in order, those before it was reopened included.
func (t *teller) taken(id string) []Reading {
	readings := []Reading{}
	for _, r := range t.readings {
		if r.Body.Point == id {
			readings = append(readings, Reading{Seq: r.Seq, At: r.At, Body: r.Body, Instrument: t.instrument(r.Body), Corrected: t.corrected[r.Seq]})
		}
	}
	return readings
}

// instrument is the name and serial of the instrument that a reading names.
func (t *teller) instrument(r record.Reading) string {
	if r.Instrument == nil {
		return ""
	}
	for _, i := range t.state.Instruments() {
		if i.ID == *r.Instrument {
			return i.Name + " " + i.Serial
		}
	}
	return *r.Instrument
}

func (t *teller) signed(id string) []Signature {
	signatures := []Signature{}
	for _, s := range t.story.Verification.Statements {
		if s.Act == chlog.ActSignOff && s.Point == id {
			signatures = append(signatures, signatureOf(s))
		}
	}
	return signatures
}

func signatureOf(s chlog.StatementCheck) Signature {
	return Signature{Record: s.Record, At: s.At, Person: s.Person, Name: s.Name, Role: s.Role, Key: s.Key, State: string(s.State), Why: s.Why}
}
