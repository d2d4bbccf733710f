package walk

import (
	"encoding/json"
	"maps"
	"math"
	"slices"
	"strings"
	"time"

	"chargehand/commission/capture"
	"chargehand/commission/finding"
	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/commission/site"
)

// State is where a walk stands. It is a value: With gives a new one and leaves the old as it was.
type State struct {
	opened   record.Opened
	site     site.Site
	siteName string
	siteText string
	siteHash string
	mapHash  string
	files    []string // SHA-256 of every file, in order

	people      []record.Person
	instruments []record.Instrument

	desk     []finding.Finding
	measured map[string]finding.Finding // latest by id and subject
	points   []Point

	stage      int
	status     map[string]Status
	readings   map[int64]record.Reading
	readAt     map[int64]time.Time
	proved     map[signal.Name]int64
	captures   []string
	captured   map[capture.Kind][]record.Capture // parts of the latest of each kind
	attempts   []record.Attempt
	attempted  map[string]finding.Verdict // what the last attempt's findings came to
	settings   []record.Setting
	punches    []record.Punch
	deviations []record.Deviation

	nextSeq int64
	lastAt  time.Time // of the last record
	seal    *record.Seal
}

// Status is where one point stands.
type Status struct {
	Result   Result
	Seq      int64   // of the record that gave the result
	Readings []int64 // taken since the point was opened
	Note     string
	Signed   []string          // ids of the persons who signed
	Unsigned string            // why a sign-off has no signature
	Accepted *record.Deviation // of the failed result
	Granted  *record.Deviation // entered before there was a result: an instrument that is not fit may be used
	Reopened int               // how often
}

// With takes one record that is on disk into the state.
func (s State) With(line Line) State {
	s.nextSeq, s.lastAt = line.Seq+1, line.At
	switch b := line.Body.(type) {
	case record.Opened:
		s.opened = b
	case record.File:
		s = s.withFile(b)
	case record.Person:
		s = s.withPerson(b)
	case record.Instrument:
		s.instruments = append(slices.Clip(s.instruments), b)
	case record.Reading:
		s = s.withReading(line, b)
	case record.Capture:
		s = s.withCapture(b)
	case record.Finding:
		s = s.withFinding(b)
	case record.Stage:
		s = s.withStage(b)
	case record.Point:
		s = s.withStatus(b.ID, func(st *Status) {
			st.Result, st.Seq, st.Note, st.Accepted = Result(b.Result), line.Seq, b.Note, nil
		})
	case record.Attempt:
		s = s.withAttempt(b)
	case record.Deviation:
		s.deviations = append(slices.Clip(s.deviations), b)
		s = s.withStatus(b.Point, func(st *Status) {
			if st.Result == Failed {
				st.Accepted = &b
				return
			}
			st.Granted = &b
		})
	case record.Punch:
		s = s.withPunch(b)
	case record.Setting:
		s.settings = append(slices.Clip(s.settings), b)
	case record.SignOff:
		s = s.withSignOff(b)
	case record.Seal:
		s.seal = &b
	}
	return s
}

func (s State) withFile(f record.File) State {
	s.files = append(slices.Clip(s.files), f.SHA256)
	if f.Role != "site" {
		s.mapHash = f.SHA256
		return s
	}
	// A file that does not read was refused before it was recorded; an older log may hold one a newer version refuses,
	// and then the site stays as it was.
	if read, _, err := site.Read(f.Name, []byte(f.Text)); err == nil {
		s.site = read
	}
	s.siteName, s.siteText, s.siteHash = f.Name, f.Text, f.SHA256
	s.desk = nil
	s.points = nil
	return s
}

// withPerson takes a person in; a later record with the same id replaces the earlier one.
func (s State) withPerson(p record.Person) State {
	s.people = slices.Clone(s.people)
	for i, known := range s.people {
		if known.ID == p.ID {
			s.people[i] = p
			return s
		}
	}
	s.people = append(s.people, p)
	return s
}

// withFinding keeps a desk finding with the site's others, and the latest measured finding of each kind.
func (s State) withFinding(r record.Finding) State {
	var f finding.Finding
	if json.Unmarshal(r.JSON, &f) != nil {
		return s
	}
	if !strings.HasPrefix(f.ID, "measured.") {
		s.desk = append(slices.Clip(s.desk), f)
		s.points = nil
		return s
	}
	s.measured = maps.Clone(s.measured)
	if s.measured == nil {
		s.measured = map[string]finding.Finding{}
	}
	s.measured[f.ID+":"+f.Subject] = f
	switch {
	case names("measured.precharge", f), names("measured.closing", f), names("measured.trip:"+TimeOut, f):
		s.attempted = maps.Clone(s.attempted)
		if s.attempted == nil {
			s.attempted = map[string]finding.Verdict{}
		}
		s.attempted[f.ID] = f.Verdict
	case f.ID == "measured.sensor" && f.Verdict == finding.Fail:
		s.proved = maps.Clone(s.proved)
		delete(s.proved, signal.Name(f.Subject))
	}
	return s
}

// withCapture keeps the parts of the latest capture of each kind, so that it can be judged anew when the site file changes.
func (s State) withCapture(c record.Capture) State {
	s.captured = maps.Clone(s.captured)
	if s.captured == nil {
		s.captured = map[capture.Kind][]record.Capture{}
	}
	kind := capture.Kind(c.What)
	if c.Part == 1 {
		s.captured[kind] = nil
	}
	s.captured[kind] = append(slices.Clip(s.captured[kind]), c)
	if c.Part == c.Parts {
		s.captures = append(slices.Clip(s.captures), c.ID)
	}
	return s
}

func (s State) withReading(line Line, r record.Reading) State {
	s.readings, s.readAt = maps.Clone(s.readings), maps.Clone(s.readAt)
	if s.readings == nil {
		s.readings, s.readAt = map[int64]record.Reading{}, map[int64]time.Time{}
	}
	s.readings[line.Seq], s.readAt[line.Seq] = r, line.At
	s = s.withStatus(r.Point, func(st *Status) { st.Readings = append(slices.Clip(st.Readings), line.Seq) })
	return s.withProof(line.Seq, r)
}

// withProof marks a signal as proved when the device's reading and an instrument's (or an observed) one agree on a value
// that is not zero, taken at the same point (design 7.4, walk point link.known).
func (s State) withProof(seq int64, r record.Reading) State {
	name := signal.Name(r.Signal)
	if !name.IsKnown() || r.Value == nil {
		return s
	}
	s = s.withDerivedProof(seq, r)
	for _, other := range s.Status(r.Point).Readings {
		o := s.readings[other]
		if o.Signal != r.Signal || o.Value == nil || (o.Source == record.FromDevice) == (r.Source == record.FromDevice) {
			continue
		}
		device, known := o, r
		if r.Source == record.FromDevice {
			device, known = r, o
		}
		if provesEachOther(name, *device.Value, *known.Value, s.proofTolerance(name, known)) {
			s = s.withProved(name, seq)
		}
	}
	return s
}

// withDerivedProof marks the power as proved when it equals the product of bus voltage and bus current, both proved, read at
// the same point: within 5 % (common practice for readings that are not taken at one instant).
func (s State) withDerivedProof(seq int64, r record.Reading) State {
	taken := s.latest(r.Point)
	power, ok := taken.from(record.FromDevice, string(signal.Power))
	u, hasU := taken.from(record.FromDevice, string(signal.BusVoltage))
	i, hasI := taken.from(record.FromDevice, string(signal.BusCurrent))
	if !ok || !hasU || !hasI || power.Value == nil || u.Value == nil || i.Value == nil ||
		!s.IsProved(signal.BusVoltage) || !s.IsProved(signal.BusCurrent) {
		return s
	}
	product := *u.Value * *i.Value
	if product == 0 || math.Abs(*power.Value-product) > 0.05*math.Abs(product) {
		return s
	}
	return s.withProved(signal.Power, seq)
}

func (s State) withProved(name signal.Name, seq int64) State {
	s.proved = maps.Clone(s.proved)
	if s.proved == nil {
		s.proved = map[signal.Name]int64{}
	}
	s.proved[name] = seq
	return s
}

func (s State) withStage(b record.Stage) State {
	number := stageNumber(b.Stage)
	if b.Event == record.Entered && number > 0 {
		s.stage = number
	}
	for _, seq := range b.Invalidates {
		for id, st := range s.status {
			if st.Seq == seq && st.Result != Open {
				s = s.withReopened(id)
			}
		}
	}
	return s
}

// withReopened opens a point again: what was read, proved and concluded at it counts no more.
func (s State) withReopened(id string) State {
	s = s.withStatus(id, func(st *Status) { *st = Status{Reopened: st.Reopened + 1} })
	s.proved = maps.Clone(s.proved)
	maps.DeleteFunc(s.proved, func(_ signal.Name, seq int64) bool { return s.readings[seq].Point == id })
	p, ok := s.Point(id)
	if !ok {
		return s
	}
	if p.Capture != "" {
		s.captured = maps.Clone(s.captured)
		delete(s.captured, p.Capture)
	}
	s.measured = maps.Clone(s.measured)
	maps.DeleteFunc(s.measured, func(_ string, f finding.Finding) bool {
		return slices.ContainsFunc(p.Findings, func(id string) bool { return names(id, f) })
	})
	return s
}

func (s State) withAttempt(a record.Attempt) State {
	s.attempts = slices.Clone(s.attempts)
	if n := len(s.attempts); n > 0 && s.attempts[n-1].N == a.N {
		s.attempts[n-1] = a
		return s
	}
	s.attempts = append(s.attempts, a)
	s.attempted = nil
	s.measured = maps.Clone(s.measured)
	maps.DeleteFunc(s.measured, func(_ string, f finding.Finding) bool {
		return s.stage <= chargeStage && (f.ID == "measured.precharge" || f.ID == "measured.closing")
	})
	return s
}

// chargeStage is the stage of the pre-charge. A time-out provoked in a later stage leaves the charge's own findings standing.
const chargeStage = 5

func (s State) withPunch(p record.Punch) State {
	s.punches = slices.Clone(s.punches)
	for i, k := range s.punches {
		if k.ID == p.ID {
			s.punches[i] = p
			return s
		}
	}
	s.punches = append(s.punches, p)
	return s
}

func (s State) withSignOff(b record.SignOff) State {
	return s.withStatus(b.Point, func(st *Status) {
		st.Signed = append(slices.Clip(st.Signed), b.Person)
		if b.UnsignedBecause != nil {
			st.Unsigned = *b.UnsignedBecause
		}
	})
}

func (s State) withStatus(id string, change func(*Status)) State {
	s.status = maps.Clone(s.status)
	if s.status == nil {
		s.status = map[string]Status{}
	}
	st := s.status[id]
	change(&st)
	s.status[id] = st
	return s
}

// Ready prepares the points with this site's numbers; until then they are made anew at every call of Points. The owner of
// a State calls it once a record has changed the site or its findings.
func (s State) Ready() State {
	if s.points == nil {
		s.points = Content(s.site, s.desk)
	}
	return s
}

// Opened, Site and the rest tell what the walk is of.
func (s State) Opened() record.Opened                    { return s.opened }
func (s State) Site() site.Site                          { return s.site }
func (s State) SiteFile() (name, text, hash string)      { return s.siteName, s.siteText, s.siteHash }
func (s State) Files() []string                          { return s.files }
func (s State) People() []record.Person                  { return s.people }
func (s State) Instruments() []record.Instrument         { return s.instruments }
func (s State) Desk() []finding.Finding                  { return s.desk }
func (s State) Attempts() []record.Attempt               { return s.attempts }
func (s State) Settings() []record.Setting               { return s.settings }
func (s State) Punches() []record.Punch                  { return s.punches }
func (s State) Deviations() []record.Deviation           { return s.deviations }
func (s State) Sealed() *record.Seal                     { return s.seal }
func (s State) IsRehearsal() bool                        { return s.opened.Mode == record.RehearsalMode }
func (s State) NextSeq() int64                           { return s.nextSeq }
func (s State) Status(point string) Status               { return s.status[point] }
func (s State) Reading(seq int64) (record.Reading, bool) { r, ok := s.readings[seq]; return r, ok }
func (s State) IsProved(n signal.Name) bool              { _, ok := s.proved[n]; return ok }
func (s State) NextCapture() string                      { return numbered("c", len(s.captures)+1) }

// Stage is the stage that was entered last; 1 before any.
func (s State) Stage() int { return max(s.stage, 1) }

// Points are all points of the walk in order.
func (s State) Points() []Point {
	if s.points != nil {
		return s.points
	}
	return Content(s.site, s.desk)
}

// InStage are the points of one stage in order.
func (s State) InStage(stage int) []Point {
	var in []Point
	for _, p := range s.Points() {
		if p.Stage == stage {
			in = append(in, p)
		}
	}
	return in
}

// Point gives a point by its id.
func (s State) Point(id string) (Point, bool) {
	for _, p := range s.Points() {
		if p.ID == id {
			return p, true
		}
	}
	return Point{}, false
}

// Measured gives the latest measured findings of an id, or the one of "id:subject"; all of them for an empty id.
func (s State) Measured(id string) []finding.Finding {
	var found []finding.Finding
	for _, key := range slices.Sorted(maps.Keys(s.measured)) {
		if f := s.measured[key]; id == "" || names(id, f) {
			found = append(found, f)
		}
	}
	return found
}

// names tells whether a point's "id" or "id:subject" means the finding.
func names(id string, f finding.Finding) bool {
	id, subject, one := strings.Cut(id, ":")
	return f.ID == id && (!one || f.Subject == subject)
}

// Captured gives the parts of the latest capture of a kind; none where its point was opened again.
func (s State) Captured(k capture.Kind) []record.Capture { return s.captured[k] }

// Finding gives a desk or measured finding by id; the first where an id stands several times.
func (s State) Finding(id string) (finding.Finding, bool) {
	for _, f := range s.desk {
		if f.ID == id {
			return f, true
		}
	}
	if m := s.Measured(id); len(m) > 0 {
		return m[0], true
	}
	return finding.Finding{}, false
}

// BusBefore is what the bus was found to be before the charge, by the readings at charge.bus-state and charge.source: dead
// below the touch-safe voltage, live where it stood above the source. Empty while unknown, or still charged in between.
func (s State) BusBefore() BusState {
	t := s.site.Bus.TouchSafe
	bus, hasBus := s.latest("charge.bus-state").of(string(signal.BusVoltage))
	source, hasSource := s.latest("charge.source").of(string(signal.SourceVoltage))
	switch {
	case !hasBus || bus.Value == nil:
		return ""
	case t != nil && t.Voltage.IsGiven() && *bus.Value < float64(t.Voltage.Nominal):
		return BusDead
	case hasSource && source.Value != nil && *bus.Value > *source.Value:
		return BusLive
	}
	return ""
}

// IsDone tells whether a point needs nobody any more: it has a result that stands, and its signature where it is a hold.
func (s State) IsDone(p Point) bool {
	st := s.Status(p.ID)
	switch {
	case st.Result == Open:
		return false
	case st.Result == Failed && st.Accepted == nil && !s.hasOpenPunch(p.ID):
		return false
	case p.Kind == Hold:
		return len(st.Signed) > 0
	}
	return true
}

func (s State) hasOpenPunch(point string) bool {
	for _, k := range s.punches {
		if k.Point == point && k.Event == "raised" {
			return true
		}
	}
	return false
}

// Progress is how many points of a stage are done, and of how many.
func (s State) Progress(stage int) (done, all int) {
	for _, p := range s.InStage(stage) {
		all++
		if s.IsDone(p) {
			done++
		}
	}
	return done, all
}

// NextOpen is the first point that is not done, in order.
func (s State) NextOpen() (Point, bool) {
	for _, p := range s.Points() {
		if !s.IsDone(p) {
			return p, true
		}
	}
	return Point{}, false
}

// HeldBy is the first hold before point p that is not done: nobody passes it.
func (s State) HeldBy(p Point) (Point, bool) {
	for _, q := range s.Points() {
		if q.ID == p.ID {
			return Point{}, false
		}
		if q.Kind == Hold && !s.IsDone(q) {
			return q, true
		}
	}
	return Point{}, false
}

// Verdict is the walk's verdict as it stands: the worst of desk findings, measured findings and points.
func (s State) Verdict() finding.Verdict {
	worst := finding.Pass
	add := func(v finding.Verdict) {
		if v.IsWorseThan(worst) {
			worst = v
		}
	}
	for _, f := range s.desk {
		add(f.Verdict)
	}
	for _, f := range s.measured {
		add(f.Verdict)
	}
	for _, p := range s.Points() {
		switch st := s.Status(p.ID); {
		case st.Result == Failed:
			add(finding.Fail)
		case !s.IsDone(p):
			add(finding.Undecided)
		}
	}
	return worst
}

// CaptureOf is the point at which a kind of capture is armed.
func (s State) CaptureOf(k capture.Kind) (Point, bool) {
	for _, p := range s.Points() {
		if p.Capture == k {
			return p, true
		}
	}
	return Point{}, false
}
