package walk

import (
	"encoding/json"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
	"time"

	"chargehand/commission/capture"
	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/record"
	"chargehand/commission/signal"
)

// RefusedError says why an event may not happen, and what would let it.
type RefusedError struct{ What, Because, Instead string }

// Error is one sentence for the screen.
func (e *RefusedError) Error() string {
	s := e.What + ": " + e.Because
	if e.Instead != "" {
		s += "; " + e.Instead
	}
	return s
}

func refuse(what, because, instead string) error { return &RefusedError{what, because, instead} }

// Decide gives the records that an event makes, in order, or a *RefusedError. now is the plant's time. Sign and Seal come
// without statement and signature: only the owner of the log knows their place in the chain.
func (s State) Decide(e Event, now time.Time) ([]record.Body, error) {
	if s.seal != nil {
		return nil, refuse("the log is sealed", "nothing is appended after the seal", "start a new log that continues it")
	}
	switch e := e.(type) {
	case Enter:
		return s.decideEnter(e)
	case AddPerson:
		return s.decidePerson(e)
	case AddInstrument:
		e.Record.ID = numbered("i", len(s.instruments)+1)
		if e.Record.Name == "" {
			return nil, refuse("the instrument has no name", "a reading must name what it was read with", "")
		}
		return one(e.Record), nil
	case Take:
		return s.decideTake(e, now)
	case Judge:
		return s.decideJudge(e)
	case Sign:
		return s.decideSign(e)
	case Deviate:
		return s.decideDeviate(e)
	case RaisePunch:
		return s.decidePunch(e)
	case ClearPunch:
		return s.decideClear(e)
	case AddNote:
		return s.decideNote(e)
	case Reopen:
		return s.decideReopen(e)
	case Keep:
		return s.decideKeep(e)
	case Arm:
		return s.decideArm(e, now)
	case EnterCause:
		return s.decideCause(e)
	case ChangeSite:
		return s.decideChange(e)
	case Captured:
		return decideCaptured(e)
	case Seal:
		return s.decideSeal(e)
	case LinkChanged:
		return one(e.Link), nil
	case Return:
		return s.decideReturn(now)
	case Hastened:
		if !s.IsRehearsal() {
			return nil, refuse("a wait on a real plant is not shortened", "only a rehearsal has a simulated clock", "")
		}
		return one(e.Hastened), nil
	}
	return nil, refuse("this event is not for the rules", fmt.Sprintf("%T belongs to the owner of the captures", e), "")
}

func one(b record.Body) []record.Body { return []record.Body{b} }

func (s State) decideEnter(e Enter) ([]record.Body, error) {
	if e.Stage < 1 || e.Stage > Stages {
		return nil, refuse(fmt.Sprintf("there is no stage %d", e.Stage), "the walk has twelve", "")
	}
	for _, p := range s.Points() {
		if p.Stage < e.Stage && p.Kind == Hold && !s.IsDone(p) {
			return nil, refuse(fmt.Sprintf("stage %d stays closed", e.Stage), "hold point "+p.ID+" is not signed", "finish it first")
		}
	}
	var records []record.Body
	if s.stage > 0 && s.stage != e.Stage {
		if absent := s.unwitnessed(s.stage); len(absent) > 0 {
			records = append(records, record.Note{Text: "went on without a witness's signature: " + strings.Join(absent, ", ")})
		}
		records = append(records, record.Stage{Stage: stageName(s.stage), Event: record.Left, Invalidates: []int64{}})
	}
	return append(records, record.Stage{Stage: stageName(e.Stage), Event: record.Entered, Invalidates: []int64{}}), nil
}

// unwitnessed are a stage's witness points that have a result and that nobody but the technician has signed: the witness was
// invited, and the walk went on.
func (s State) unwitnessed(stage int) []string {
	var ids []string
	for _, p := range s.InStage(stage) {
		st := s.Status(p.ID)
		if p.Kind == Witness && st.Result != Open && !slices.ContainsFunc(st.Signed, s.isWitness) {
			ids = append(ids, p.ID)
		}
	}
	return ids
}

func (s State) isWitness(person string) bool {
	return slices.ContainsFunc(s.people, func(p record.Person) bool { return p.ID == person && p.Role != "technician" })
}

var roles = []string{"technician", "witness", "surveyor", "owner"}

func (s State) decidePerson(e AddPerson) ([]record.Body, error) {
	if strings.TrimSpace(e.Name) == "" {
		return nil, refuse("the person has no name", "a signature must name somebody", "")
	}
	if !slices.Contains(roles, e.Role) {
		return nil, refuse("role "+strconv.Quote(e.Role), "it is one of "+strings.Join(roles, ", "), "")
	}
	p := record.Person{ID: numbered("p", len(s.people)+1), Name: e.Name, Role: e.Role, Organisation: e.Organisation}
	if e.Key != "" {
		p.Key = &e.Key
	}
	return one(p), nil
}

func (s State) decideTake(e Take, now time.Time) ([]record.Body, error) {
	r := e.Reading
	p, err := s.reach(r.Point)
	if err != nil {
		return nil, err
	}
	if s.Status(p.ID).Result != Open {
		return nil, refuse(p.ID+" has its result", "a reading would stand under it unseen", "reopen the point first")
	}
	if !slices.Contains([]string{record.FromDevice, record.FromInstrument, record.Observed}, r.Source) {
		return nil, refuse("the reading has no source", "it comes from the device, an instrument or was observed", "")
	}
	if r.Value != nil && (math.IsNaN(*r.Value) || math.IsInf(*r.Value, 0)) {
		return nil, refuse("the reading is no number", "not a number or infinite", "leave it out and say why")
	}
	if r.Value == nil && strings.TrimSpace(r.Text) == "" && r.Quality == "" {
		return nil, refuse("the reading is empty", "no tick without a value", "enter a value or what was seen")
	}
	if name := signal.Name(r.Signal); name.IsKnown() && r.Unit != name.Unit() {
		return nil, refuse("unit "+strconv.Quote(r.Unit)+" for "+r.Signal, "it is read in "+strconv.Quote(name.Unit()), "")
	}
	if r.Source == record.FromInstrument {
		if err := s.fitness(r, now); err != nil {
			return nil, err
		}
	}
	if r.Raw == nil {
		r.Raw = []uint16{}
	}
	return one(r), nil
}

// reach gives a point that the holds before it leave open.
func (s State) reach(id string) (Point, error) {
	p, ok := s.Point(id)
	if !ok {
		return p, refuse("point "+strconv.Quote(id), "the walk has no such point", "")
	}
	if hold, held := s.HeldBy(p); held {
		return p, refuse(p.ID+" stays closed", "hold point "+hold.ID+" is not signed", "finish it first")
	}
	return p, nil
}

// fitness refuses an instrument that is unknown, overdue or too small, unless a deviation at the point accepts it.
func (s State) fitness(r record.Reading, now time.Time) error {
	if r.Instrument == nil {
		return refuse("the reading names no instrument", "no tick without a value and its instrument", "choose the instrument")
	}
	for _, i := range s.instruments {
		if i.ID != *r.Instrument {
			continue
		}
		if s.Status(r.Point).Granted != nil {
			return nil
		}
		if i.Due == "" {
			return refuse("instrument "+i.Name, "its calibration date is not known", "use another, or accept it by a deviation")
		}
		if due, err := time.Parse(time.DateOnly, i.Due); err != nil || now.After(due.AddDate(0, 0, 1)) {
			return refuse("instrument "+i.Name, "its calibration was due "+i.Due, "use another, or accept it by a deviation")
		}
		if v, least := s.rangeOf(i), s.rangeFor(r); r.Unit == "V" && v > 0 && v < least {
			return refuse("instrument "+i.Name, fmt.Sprintf("its range ends at %.0f V, %.0f V are wanted here", v, least),
				"use another, or accept it by a deviation")
		}
		return nil
	}
	return refuse("instrument "+*r.Instrument, "nobody entered it", "enter it with serial and calibration date")
}

// rangeFor is what an instrument must be made for: what it reads, and what the bus can reach before its over-voltage trip.
func (s State) rangeFor(r record.Reading) float64 {
	least := float64(s.site.Bus.OverVoltageTrip.Nominal)
	if r.Value != nil {
		least = math.Max(least, math.Abs(*r.Value))
	}
	return least
}

// rangeOf is the greatest voltage an instrument is made for, by its record or the site file; 0 where neither says.
func (s State) rangeOf(i record.Instrument) float64 {
	if i.MaxVoltage > 0 {
		return i.MaxVoltage
	}
	for _, known := range s.site.Instruments {
		if known.Serial == i.Serial && known.Name == i.Name {
			return float64(known.MaxVoltage.Nominal)
		}
	}
	return 0
}

func (s State) decideJudge(e Judge) ([]record.Body, error) {
	p, err := s.reach(e.Point)
	if err != nil {
		return nil, err
	}
	if s.Status(p.ID).Result != Open {
		return nil, refuse(p.ID+" has its result", "a result is not written over", "reopen the point first")
	}
	switch e.Result {
	case NotApplicable:
		if err := s.omissible(p, e.Note); err != nil {
			return nil, err
		}
	case Failed:
	case Passed:
		if verdict := s.Assess(p); verdict.Result != Passed {
			return nil, refuse(p.ID+" is not passed", strings.Join(verdict.Because, "; "), p.Otherwise)
		}
	default:
		return nil, refuse("result "+strconv.Quote(string(e.Result)), "it is pass, fail or not-applicable", "")
	}
	st := s.Status(p.ID)
	records := one(record.Point{ID: p.ID, Result: string(e.Result), Readings: orEmpty(st.Readings), Note: e.Note})
	if e.Result == Failed || p.ID == "share.keyed" && s.settingsMoved(p) {
		if reopened := s.invalidatedBy(p); len(reopened) > 0 {
			records = append(records, record.Stage{Stage: stageName(p.Stage), Event: record.Reopened, Invalidates: reopened})
		}
	}
	return records, nil
}

// omissible refuses to leave a point out that is not optional, or whose case has come about.
func (s State) omissible(p Point, note string) error {
	if !p.MayOmit || strings.TrimSpace(note) == "" {
		return refuse(p.ID+" cannot be left out", "only an optional point may be, with a reason", "fail it with a deviation instead")
	}
	if found := s.BusBefore(); p.OmitWhen != "" && found != "" && found != p.OmitWhen {
		return refuse(p.ID+" cannot be left out", "the bus was found "+string(found)+" at charge.bus-state", "")
	}
	return nil
}

// settingsMoved tells whether a setting read back at the point differs from the same setting as found: what was measured
// with the old one is open again.
func (s State) settingsMoved(p Point) bool {
	taken := s.latest(p.ID)
	for _, k := range s.settings {
		r, ok := taken.from(record.FromDevice, k.Name)
		if ok && k.When == "as-found" && r.Value != nil && *r.Value != k.Value {
			return true
		}
	}
	return false
}

func (s State) decideSign(e Sign) ([]record.Body, error) {
	p, err := s.reach(e.Point)
	if err != nil {
		return nil, err
	}
	if !s.knowsPerson(e.Person) {
		return nil, refuse("person "+strconv.Quote(e.Person), "nobody entered them", "enter name and role first")
	}
	st := s.Status(p.ID)
	switch {
	case st.Result == Open:
		return nil, refuse(p.ID+" has no result", "a signature stands under a result", "judge the point first")
	case st.Result == Failed && st.Accepted == nil && !s.hasOpenPunch(p.ID):
		return nil, refuse(p.ID+" has failed", "nobody accepted it", "enter a deviation or a punch item first")
	case slices.Contains(st.Signed, e.Person):
		return nil, refuse(p.ID, "this person has signed it", "")
	}
	so := record.SignOff{Person: e.Person, Point: p.ID}
	if e.UnsignedBecause != "" {
		so.UnsignedBecause = &e.UnsignedBecause
	}
	return one(so), nil
}

func (s State) knowsPerson(id string) bool {
	return slices.ContainsFunc(s.people, func(p record.Person) bool { return p.ID == id })
}

func (s State) decideDeviate(e Deviate) ([]record.Body, error) {
	if _, ok := s.Point(e.Point); !ok {
		return nil, refuse("point "+strconv.Quote(e.Point), "the walk has no such point", "")
	}
	if strings.TrimSpace(e.Reason) == "" {
		return nil, refuse("the deviation has no reason", "who reads the log must see why", "")
	}
	if !s.knowsPerson(e.AcceptedBy) {
		return nil, refuse("person "+strconv.Quote(e.AcceptedBy), "a deviation is accepted by somebody who was entered", "")
	}
	return one(record.Deviation{Point: e.Point, Reason: e.Reason, AcceptedBy: e.AcceptedBy}), nil
}

func (s State) decidePunch(e RaisePunch) ([]record.Body, error) {
	switch {
	case strings.TrimSpace(e.What) == "" || strings.TrimSpace(e.Owner) == "" || strings.TrimSpace(e.Due) == "":
		return nil, refuse("the punch item is not whole", "it needs what, owner and due date", "")
	case !slices.Contains([]string{"A", "B", "C"}, e.Severity):
		return nil, refuse("severity "+strconv.Quote(e.Severity), "A before energising, B before handover, C later", "")
	}
	return one(record.Punch{ID: numbered("k", len(s.punches)+1), What: e.What, Severity: e.Severity, Owner: e.Owner,
		Due: e.Due, Event: "raised", Point: e.Point}), nil
}

func (s State) decideClear(e ClearPunch) ([]record.Body, error) {
	for _, k := range s.punches {
		if k.ID == e.ID && k.Event == "raised" {
			k.Event = "cleared"
			return one(k), nil
		}
	}
	return nil, refuse("punch item "+strconv.Quote(e.ID), "it is not open", "")
}

func (s State) decideNote(e AddNote) ([]record.Body, error) {
	if strings.TrimSpace(e.Text) == "" {
		return nil, refuse("the note is empty", "there is nothing to keep", "")
	}
	if e.Corrects != nil && (*e.Corrects < 0 || *e.Corrects >= s.nextSeq) {
		return nil, refuse(fmt.Sprintf("record %d", *e.Corrects), "the log has no such line yet", "")
	}
	return one(record.Note{Text: e.Text, Corrects: e.Corrects}), nil
}

func (s State) decideReopen(e Reopen) ([]record.Body, error) {
	p, ok := s.Point(e.Point)
	if !ok {
		return nil, refuse("point "+strconv.Quote(e.Point), "the walk has no such point", "")
	}
	if strings.TrimSpace(e.Why) == "" {
		return nil, refuse(p.ID+" stays closed", "reopening needs a reason", "")
	}
	if s.Status(p.ID).Result == Open {
		return nil, refuse(p.ID+" is open", "it has no result to take back", "")
	}
	invalid := append(s.invalidatedBy(p), s.Status(p.ID).Seq)
	slices.Sort(invalid)
	return []record.Body{
		record.Stage{Stage: stageName(p.Stage), Event: record.Reopened, Invalidates: invalid},
		record.Note{Text: p.ID + " reopened: " + e.Why},
	}, nil
}

// invalidatedBy are the results that rest on p and stand now: those it reopens, and those that these reopen in turn.
func (s State) invalidatedBy(p Point) []int64 {
	reopened := map[string]bool{p.ID: true}
	var seqs []int64
	for queue := []Point{p}; len(queue) > 0; queue = queue[1:] {
		for _, q := range s.Points() {
			if reopened[q.ID] || s.Status(q.ID).Result == Open || !queue[0].reopens(q.ID) {
				continue
			}
			reopened[q.ID] = true
			seqs = append(seqs, s.Status(q.ID).Seq)
			queue = append(queue, q)
		}
	}
	slices.Sort(seqs)
	return seqs
}

func (p Point) reopens(id string) bool {
	return slices.ContainsFunc(p.Reopens, func(pattern string) bool { return matches(pattern, id) })
}

// decideReturn opens again what a night undoes. Once the source is on, the dead plant cannot be shown any more without
// shutting down, so only the emergency stop is shown anew then.
func (s State) decideReturn(now time.Time) ([]record.Body, error) {
	if s.lastAt.IsZero() || s.lastAt.In(now.Location()).Format(time.DateOnly) == now.Format(time.DateOnly) {
		return nil, nil
	}
	ids := []string{"safe.dead", "safe.stop"}
	if s.Status("charge.source").Result != Open {
		ids = ids[1:]
	}
	var invalid []int64
	for _, id := range ids {
		if st := s.Status(id); st.Result != Open {
			invalid = append(invalid, st.Seq)
		}
	}
	if len(invalid) == 0 {
		return nil, nil
	}
	slices.Sort(invalid)
	return []record.Body{
		record.Stage{Stage: stageName(1), Event: record.Reopened, Invalidates: invalid},
		record.Note{Text: "a new day: " + strings.Join(ids, " and ") + " again"},
	}, nil
}

func matches(pattern, id string) bool {
	if family, ok := strings.CutSuffix(pattern, ".*"); ok {
		return strings.HasPrefix(id, family+".")
	}
	return pattern == id
}

func (s State) decideKeep(e Keep) ([]record.Body, error) {
	w := e.Setting
	found := func(k record.Setting) bool { return k.Name == w.Name && k.When == "as-found" }
	switch {
	case w.When != "as-found" && w.When != "as-left":
		return nil, refuse(w.Name, "a setting is kept as-found or as-left", "")
	case w.When == "as-found" && slices.ContainsFunc(s.settings, found):
		return nil, refuse(w.Name+" as found", "it is recorded already", "record it as left")
	}
	if w.When == "as-left" && !slices.ContainsFunc(s.settings, found) {
		return nil, refuse(w.Name+" as left", "it was never recorded as found", "record it as found first")
	}
	if math.IsNaN(w.Value) || math.IsInf(w.Value, 0) {
		return nil, refuse(w.Name, "the value is no number", "")
	}
	return one(w), nil
}

func (s State) decideArm(e Arm, now time.Time) ([]record.Body, error) {
	p, ok := s.Point(e.Point)
	if !ok || p.Capture == "" {
		return nil, refuse("point "+strconv.Quote(e.Point), "no capture belongs to it", "")
	}
	if hold, held := s.HeldBy(p); held && !e.Observing {
		return nil, refuse("no capture at "+p.ID, "hold point "+hold.ID+" is not signed", "finish it first")
	}
	if s.Status(p.ID).Result != Open && !e.Observing {
		return nil, refuse("no capture at "+p.ID, "the point has its result", "reopen it first")
	}
	if p.Capture != capture.Precharge && !p.Attempt {
		return nil, nil
	}
	if e.Observing {
		watched := "observed, operated by others"
		return one(record.Attempt{N: len(s.attempts) + 1, Earliest: now.Add(s.interval()).Format(time.RFC3339Nano), Override: &watched}), nil
	}
	if because := s.NotBefore(now); because != "" && strings.TrimSpace(e.Override) == "" {
		return nil, refuse("no attempt yet", because, "or give a reason that stands in the log")
	}
	if s.CauseIsMissing() {
		return nil, refuse("no further attempt", "the cause of the last one is not entered", "find it first, then enter it")
	}
	next := record.Attempt{N: len(s.attempts) + 1, Earliest: now.Add(s.interval()).Format(time.RFC3339Nano)}
	if e.Override != "" {
		next.Override = &e.Override
	}
	return one(next), nil
}

func (s State) interval() time.Duration {
	return time.Duration(float64(s.site.Precharge.Interval.Nominal) * float64(time.Second))
}

// NotBefore says why the next pre-charge attempt may not start at now, or nothing.
func (s State) NotBefore(now time.Time) string {
	if len(s.attempts) == 0 {
		return ""
	}
	last := s.attempts[len(s.attempts)-1]
	if permitted := s.site.Precharge.Attempts; permitted > 0 && len(s.attempts) >= permitted && now.Before(s.cooledAt()) {
		return fmt.Sprintf("the %d permitted attempts are used up until %s", permitted, s.cooledAt().Format(time.TimeOnly))
	}
	if earliest, err := time.Parse(time.RFC3339Nano, last.Earliest); err == nil && now.Before(earliest) {
		return fmt.Sprintf("the resistor cools for another %d s", int(math.Ceil(earliest.Sub(now).Seconds())))
	}
	return ""
}

// CoolsFor is how long after now the next attempt may start at the earliest; 0 when it may.
func (s State) CoolsFor(now time.Time) time.Duration {
	if len(s.attempts) == 0 {
		return 0
	}
	until, err := time.Parse(time.RFC3339Nano, s.attempts[len(s.attempts)-1].Earliest)
	if err != nil {
		return 0
	}
	if permitted := s.site.Precharge.Attempts; permitted > 0 && len(s.attempts) >= permitted {
		until = s.cooledAt()
	}
	return max(until.Sub(now), 0)
}

// cooledAt is when a series of attempts may begin anew: five thermal time constants after the last attempt, when less than
// 1 % of its rise is left; without a thermal model one interval per attempt made.
func (s State) cooledAt() time.Time {
	last := s.attempts[len(s.attempts)-1]
	earliest, err := time.Parse(time.RFC3339Nano, last.Earliest)
	if err != nil {
		return time.Time{}
	}
	began := earliest.Add(-s.interval())
	if th := s.site.Precharge.Thermal; th != nil {
		return began.Add(time.Duration(5 * float64(th.TimeConstant.Nominal) * float64(time.Second)))
	}
	return began.Add(time.Duration(len(s.attempts)) * s.interval())
}

// CauseIsMissing tells whether the last attempt failed, or was broken off, and nobody has said why.
func (s State) CauseIsMissing() bool {
	if len(s.attempts) == 0 || s.attempts[len(s.attempts)-1].Cause != "" {
		return false
	}
	for _, verdict := range s.attempted {
		if verdict == finding.Fail {
			return true
		}
	}
	return len(s.attempted) == 0 // broken off
}

func (s State) decideCause(e EnterCause) ([]record.Body, error) {
	if !s.CauseIsMissing() {
		return nil, refuse("no cause is asked for", "the last attempt did not fail", "")
	}
	if strings.TrimSpace(e.Cause) == "" {
		return nil, refuse("the cause is empty", "find it before any further attempt", "")
	}
	last := s.attempts[len(s.attempts)-1]
	last.Cause = e.Cause
	return one(last), nil
}

func (s State) decideChange(e ChangeSite) ([]record.Body, error) {
	if strings.TrimSpace(e.Why) == "" {
		return nil, refuse("the site file changes without a reason", "who reads the log must see why", "")
	}
	replaces := s.siteHash
	records := one(record.File{Role: "site", Name: e.Name, SHA256: hashOf(e.Text), Text: e.Text, Replaces: &replaces, Why: e.Why})
	var invalid []int64
	for _, id := range siteRests {
		if st := s.Status(id); st.Result != Open {
			invalid = append(invalid, st.Seq)
		}
	}
	if len(invalid) > 0 {
		slices.Sort(invalid)
		records = append(records, record.Stage{Stage: stageName(2), Event: record.Reopened, Invalidates: invalid})
	}
	return appendFindings(records, e.Findings)
}

// siteRests are the points whose prediction a changed site file moves.
var siteRests = []string{"paper.findings", "charge.curve", "charge.difference", "rest.margin", "boost.setpoint", "share.droop",
	"share.share", "down.discharge", "down.label"}

func decideCaptured(e Captured) ([]record.Body, error) {
	records := make([]record.Body, 0, len(e.Parts)+len(e.Readings)+len(e.Findings))
	for _, part := range e.Parts {
		records = append(records, part)
	}
	for _, reading := range e.Readings {
		records = append(records, reading)
	}
	return appendFindings(records, e.Findings)
}

func appendFindings(records []record.Body, findings []finding.Finding) ([]record.Body, error) {
	for _, f := range findings {
		text, err := json.Marshal(f)
		if err != nil {
			return nil, fmt.Errorf("write finding %s: %w", f.ID, err)
		}
		records = append(records, record.Finding{JSON: text})
	}
	return records, nil
}

func (s State) decideSeal(e Seal) ([]record.Body, error) {
	if !s.knowsPerson(e.Person) {
		return nil, refuse("person "+strconv.Quote(e.Person), "nobody entered them", "enter name and role first")
	}
	seal := record.Seal{Person: e.Person, Verdict: string(s.Verdict())}
	if e.UnsignedBecause != "" {
		seal.UnsignedBecause = &e.UnsignedBecause
	}
	return one(seal), nil
}

// provesEachOther tells whether a device value agrees with a known one that is not zero.
func provesEachOther(name signal.Name, device, known, tolerance float64) bool {
	if name.IsState() {
		return device == known
	}
	if math.Abs(known) <= tolerance {
		return false
	}
	return math.Abs(device-known) <= tolerance
}

// proofTolerance is how far a device's value may stand from a known one: the device's own error bound for voltages, with
// the instrument's beside it, else 2 % of the known value (common practice for a one-point check).
func (s State) proofTolerance(name signal.Name, known record.Reading) float64 {
	instrument := math.Abs(known.U) * 2
	switch name {
	case signal.BusVoltage:
		return float64(s.site.Bus.Error()) + instrument
	case signal.SourceVoltage, signal.StarPointVoltage:
		return float64(s.site.Source.Error()) + instrument
	case signal.ResistorTemperature, signal.HeatsinkTemperature:
		return float64(5*quantity.Difference(1)) + instrument
	}
	return 0.02*math.Abs(*known.Value) + instrument
}
