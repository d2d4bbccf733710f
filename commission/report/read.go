package report

import (
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"path/filepath"
	"slices"
	"strings"

	"chargehand/commission/chlog"
	"chargehand/commission/finding"
	"chargehand/commission/record"
	"chargehand/commission/walk"
	"chargehand/commission/window"
)

type windowRow = window.Row

// Read tells the log that r gives; v is what its verification came to. Of a damaged log it tells what stands before the
// damage. It is an error where the log is none, is of a later version, or is not the one that was verified.
func Read(r io.Reader, v chlog.Report) (Story, error) {
	whole := sha256.New()
	log := chlog.NewReader(io.TeeReader(r, whole))
	var lines []chlog.Line
	head := chlog.NoPrev
	for {
		line, err := log.Next()
		var damage *chlog.DamageError
		if errors.Is(err, io.EOF) || errors.As(err, &damage) {
			break
		}
		if err != nil {
			return Story{}, err
		}
		if int64(len(lines)) == v.Records { // the verifier found this line not to be relied on
			break
		}
		lines, head = append(lines, line), log.Head()
	}
	if _, err := io.Copy(io.Discard, io.TeeReader(r, whole)); err != nil {
		return Story{}, err
	}
	if int64(len(lines)) != v.Records || v.Head != "" && v.Head != head {
		return Story{}, fmt.Errorf("%s changed while it was read; try again", filepath.Base(v.File))
	}
	v.Head = head
	s := New(lines, v)
	s.Log.SHA256 = hex.EncodeToString(whole.Sum(nil))
	return s, nil
}

// New tells the lines of a log that was verified.
func New(lines []chlog.Line, v chlog.Report) Story {
	v.File = filepath.Base(v.File)
	t := teller{story: Story{Format: Format, Verification: v, Because: []string{}, Marks: marksOf(v)}, stages: map[string][]Event[string]{},
		results: map[string][]Event[record.Point]{}, corrected: map[int64]string{}}
	for _, line := range lines {
		t.take(line)
	}
	t.state = t.state.Ready()
	t.finish(lines)
	return t.story
}

// marksOf are the marks that a verification asks for. A rehearsal comes first.
func marksOf(v chlog.Report) []Mark {
	marks := []Mark{}
	if v.Rehearsal {
		marks = append(marks, Rehearsal)
	}
	switch v.Outcome {
	case chlog.Damaged, chlog.OtherHistory, chlog.BadSignature, chlog.Forked:
		return append(marks, Broken)
	}
	if !v.Sealed {
		marks = append(marks, Unsealed)
	}
	return marks
}

// teller replays a log into a story.
type teller struct {
	story     Story
	state     walk.State
	assembled assembled
	first     *walk.State // after the first site file
	stages    map[string][]Event[string]
	results   map[string][]Event[record.Point]
	readings  []Event[record.Reading]
	corrected map[int64]string
}

func (t *teller) take(line chlog.Line) {
	at := chlog.FormatTime(line.At)
	body, err := line.Decode()
	if err != nil {
		t.story.Unread = append(t.story.Unread, Event[string]{line.Seq, at, err.Error()})
		return
	}
	if f, isFile := body.(record.File); isFile && f.Role == "site" {
		t.supersedeDesk()
	}
	t.state = t.state.With(walk.Line{Seq: line.Seq, At: line.At, Body: body})
	s := &t.story
	switch b := body.(type) {
	case record.File:
		s.Files = append(s.Files, Event[File]{line.Seq, at, File{b.Role, b.Name, b.SHA256, b.Replaces, b.Why}})
		if t.first == nil && b.Role == "site" {
			first := t.state
			t.first = &first
		}
	case record.Reading:
		t.readings = append(t.readings, Event[record.Reading]{line.Seq, at, b})
	case record.Capture:
		if parts, whole := t.assembled.take(b); whole {
			s.Captures = append(s.Captures, captureOf(line.Seq, at, parts, t.state.Site()))
		}
	case record.Finding:
		t.finding(line.Seq, at, b)
	case record.Stage:
		t.stages[b.Stage] = append(t.stages[b.Stage], Event[string]{line.Seq, at, b.Event})
	case record.Point:
		t.results[b.ID] = append(t.results[b.ID], Event[record.Point]{line.Seq, at, b})
	case record.Punch:
		t.punch(line.Seq, at, b)
	case record.Setting:
		t.setting(b)
	case record.Note:
		s.Notes = append(s.Notes, Event[record.Note]{line.Seq, at, b})
		if b.Corrects != nil {
			t.corrected[*b.Corrects] = fmt.Sprintf("corrected by record %d: %s", line.Seq, b.Text)
		}
	default:
		t.event(line.Seq, at, body)
	}
}

// event takes the kinds that are only listed.
func (t *teller) event(seq int64, at string, body record.Body) {
	s := &t.story
	switch b := body.(type) {
	case record.Deviation:
		s.Deviations = append(s.Deviations, Event[record.Deviation]{seq, at, b})
	case record.Attempt:
		s.Attempts = append(s.Attempts, Event[record.Attempt]{seq, at, b})
	case record.Link:
		s.Links = append(s.Links, Event[record.Link]{seq, at, b})
	case record.Clock:
		s.Clocks = append(s.Clocks, Event[record.Clock]{seq, at, b})
	case record.Hastened:
		s.Hastened = append(s.Hastened, Event[record.Hastened]{seq, at, b})
	case record.Resumed:
		s.Resumed = append(s.Resumed, Event[record.Resumed]{seq, at, b})
	case record.Other:
		s.Others = append(s.Others, Event[record.Other]{seq, at, b})
	}
}

// supersedeDesk marks every desk finding so far: a new site file brings its own.
func (t *teller) supersedeDesk() {
	for i := range t.story.Desk {
		t.story.Desk[i].Superseded = true
	}
}

func (t *teller) finding(seq int64, at string, b record.Finding) {
	f := Finding{Seq: seq, At: at}
	if err := json.Unmarshal(b.JSON, &f.Finding); err != nil {
		t.story.Unread = append(t.story.Unread, Event[string]{seq, at, err.Error()})
		return
	}
	if !strings.HasPrefix(f.Finding.ID, "measured.") {
		t.story.Desk = append(t.story.Desk, f)
		return
	}
	for i, m := range t.story.Measured {
		if m.Finding.ID == f.Finding.ID && m.Finding.Subject == f.Finding.Subject {
			t.story.Measured[i].Superseded = true
		}
	}
	t.story.Measured = append(t.story.Measured, f)
}

func (t *teller) punch(seq int64, at string, b record.Punch) {
	for i, k := range t.story.Punches {
		if k.Body.ID == b.ID {
			t.story.Punches[i].Body = b
			if b.Event == "cleared" {
				t.story.Punches[i].Cleared = at
			} else {
				t.story.Punches[i].Cleared = ""
			}
			return
		}
	}
	t.story.Punches = append(t.story.Punches, Punch{Seq: seq, Raised: at, Body: b})
}

// setting keeps the first value as found and the last as left.
func (t *teller) setting(b record.Setting) {
	i := slices.IndexFunc(t.story.Settings, func(s Setting) bool { return s.Name == b.Name })
	if i < 0 {
		t.story.Settings = append(t.story.Settings, Setting{Name: b.Name, Unit: b.Unit, Source: b.Source})
		i = len(t.story.Settings) - 1
	}
	s := &t.story.Settings[i]
	value := b.Value
	switch {
	case b.When == "as-left":
		s.AsLeft, s.LeftRaw = &value, b.Raw
	case s.AsFound == nil:
		s.AsFound, s.FoundRaw = &value, b.Raw
	}
}

func (t *teller) finish(lines []chlog.Line) {
	s := &t.story
	o := t.state.Opened()
	s.Log = Log{File: s.Verification.File, ID: o.Log, Mode: o.Mode, Program: o.Program, Device: o.Device, Speed: o.Speed, Disturb: o.Disturb,
		Seed: o.Seed, Continues: o.Continues, Records: int64(len(lines)), Head: s.Verification.Head}
	if len(lines) > 0 {
		s.Log.Begun, s.Log.Ended = chlog.FormatTime(lines[0].At), chlog.FormatTime(lines[len(lines)-1].At)
	}
	left := t.state.Site()
	found := left
	if t.first != nil {
		found = t.first.Site()
	}
	s.Site = Site{Name: left.Name, Reference: left.Reference, Location: left.Location, Plates: platesOf(found, left)}
	s.People, s.Instruments = t.state.People(), t.state.Instruments()
	s.Stages = t.told()
	s.table = window.Table(left)
	t.judge()
	s.fill()
}

// fill makes every list that has nothing an empty one, so that its JSON is [] and never null.
func (s *Story) fill() {
	s.Files, s.People, s.Instruments, s.Settings = some(s.Files), some(s.People), some(s.Instruments), some(s.Settings)
	s.Desk, s.Measured, s.Captures, s.Stages = some(s.Desk), some(s.Measured), some(s.Captures), some(s.Stages)
	s.Deviations, s.Punches, s.Notes, s.Attempts = some(s.Deviations), some(s.Punches), some(s.Notes), some(s.Attempts)
	s.Links, s.Clocks, s.Hastened, s.Resumed = some(s.Links), some(s.Clocks), some(s.Hastened), some(s.Resumed)
	s.Others, s.Unread, s.Site.Plates = some(s.Others), some(s.Unread), some(s.Site.Plates)
	s.Log.Disturb = some(s.Log.Disturb)
	for i := range s.Captures {
		s.Captures[i].Signals = some(s.Captures[i].Signals)
	}
	for i := range s.Stages {
		s.Stages[i].Events = some(s.Stages[i].Events)
	}
}

func some[T any](list []T) []T {
	if list == nil {
		return []T{}
	}
	return list
}

// judge gives the verdict and what it rests on.
func (t *teller) judge() {
	s := &t.story
	s.Verdict = t.state.Verdict()
	if seal := t.state.Sealed(); seal != nil {
		come := s.Verdict
		s.Verdict = finding.Verdict(seal.Verdict)
		if come != s.Verdict {
			s.Because = append(s.Because, fmt.Sprintf("the seal says %s; the records by themselves come to %s", seal.Verdict, come))
		}
	} else if open := t.open(); open > 0 {
		s.Because = append(s.Because, fmt.Sprintf("%d points are still open", open))
	}
	for _, f := range slices.Concat(s.Measured, s.Desk) {
		if v := f.Finding.Verdict; !f.Superseded && (v == finding.Fail || v == finding.Undecided || v == finding.Marginal) {
			s.Because = append(s.Because, named(f.Finding)+" is "+verdictWord(v)+reasons(f.Finding.Because))
		}
	}
	for _, stage := range s.Stages {
		for _, p := range stage.Points {
			if p.Result == string(walk.Failed) || p.Result == undecided {
				s.Because = append(s.Because, p.ID+" ("+p.Title+"): "+p.Result+accepted(p))
			}
		}
	}
}

func (t *teller) open() int {
	open := 0
	for _, p := range t.state.Points() {
		if !t.state.IsDone(p) {
			open++
		}
	}
	return open
}

func reasons(because []string) string {
	if len(because) == 0 {
		return ""
	}
	return ": " + strings.Join(because, "; ")
}

func accepted(p Point) string {
	if p.Deviation == nil {
		return ""
	}
	return ", accepted by deviation"
}

func named(f finding.Finding) string {
	if f.Subject != "" {
		return f.ID + ", " + f.Subject
	}
	return f.ID
}

func verdictWord(v finding.Verdict) string {
	if v == finding.Fail {
		return "failed"
	}
	return string(v)
}
