package walkview

import (
	"context"
	"fmt"
	"maps"
	"slices"
	"strings"

	"github.com/charmbracelet/bubbles/key"
	tea "github.com/charmbracelet/bubbletea"

	"chargehand/commission"
	"chargehand/commission/capture"
	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/commission/walk"
	"chargehand/tui/oneline"
	"chargehand/tui/theme"
)

// Model is the walk's screen. It is a value: what Update does not return is lost.
type Model struct {
	session  Session
	theme    theme.Theme
	keys     keyMap
	width    int
	height   int
	snapshot commission.Snapshot
	plan     oneline.Plan
	planOf   string // hash of the site file that plan was made from

	point   string                               // id of the open point
	page    int                                  // first line of the point's text
	acts    int                                  // how many of the point's acts the simulated plant's hand has done
	kept    map[capture.Kind]commission.Progress // the last capture of each kind, as it ended; never changed, only replaced
	noted   map[string]float64                   // read by hand before its point's turn; never changed, only replaced
	words   bool                                 // the point's text is shown where its chart would be
	prompt  *prompt
	message string // what was recorded or refused last
	refused bool
	busy    bool // a command is under way
	far     bool
	explain bool
	silent  bool // no bell
	rung    string
	cursor  *float64
	done    []string // what Finish wrote, once the log is sealed
}

// Messages, named for what happened.
type (
	recordedMsg struct {
		what     string
		recorded commission.Recorded
		err      error
	}
	operatedMsg struct {
		act string
		err error
	}
	measuredMsg struct {
		values  map[string]float64 // by what was measured, in its coherent unit
		because []string           // why something has no value
	}
	keptMsg struct {
		path string
		err  error
	}
	movedMsg struct {
		path string
		err  error
	}
	finishedMsg struct {
		lines []string
		err   error
	}
)

// FindingsWanted asks the root to show the findings of the walk's site.
type FindingsWanted struct{}

// LinkWanted asks the root to show every signal of the device.
type LinkWanted struct{}

// Left says that the screen was left; the walk goes on in its log.
type Left struct{}

// New makes the screen of an open walk.
func New(session Session, t theme.Theme, width, height int, first commission.Snapshot) Model {
	m := Model{session: session, theme: t, keys: keys(), width: width, height: height}
	m.message = strings.Join(session.Notes, "; ")
	return m.withSnapshot(first)
}

// Resized gives the screen a new size.
func (m Model) Resized(width, height int) Model {
	m.width, m.height = width, height
	return m
}

// WithSnapshot takes what the walk's owner published.
func (m Model) WithSnapshot(s commission.Snapshot) (Model, tea.Cmd) {
	before := m.snapshot
	if ended := before.Capture; ended != nil && (s.Capture == nil || s.Capture.Point != ended.Point) && ended.Phase == commission.Running {
		m = m.keep(*ended)
	}
	m = m.withSnapshot(s)
	if because := ring(before, s); because != "" && !m.silent {
		m.rung = because
		return m, m.bell()
	}
	return m, nil
}

// keep keeps a capture that has ended, for its points to show.
func (m Model) keep(ended commission.Progress) Model {
	kept := map[capture.Kind]commission.Progress{}
	maps.Copy(kept, m.kept)
	kept[ended.Kind] = ended
	m.kept = kept
	return m
}

func (m Model) withSnapshot(s commission.Snapshot) Model {
	m.snapshot = s
	if _, _, hash := s.State.SiteFile(); hash != m.planOf {
		m.plan, m.planOf = oneline.NewPlan(s.State.Site()), hash
	}
	if m.point == "" {
		m.point = firstPoint(s.State)
	}
	return m
}

func firstPoint(state walk.State) string {
	if p, open := state.NextOpen(); open {
		return p.ID
	}
	points := state.Points()
	return points[len(points)-1].ID
}

// bell rings the terminal's bell.
func (m Model) bell() tea.Cmd {
	ring := m.session.Bell
	if ring == nil {
		return nil
	}
	return func() tea.Msg {
		ring()
		return nil
	}
}

// ring says why the bell rings between two snapshots, or nothing: the link is lost, the pre-charge must be opened, the
// closing difference is reached, a limit of the open bus is passed.
func ring(before, now commission.Snapshot) string {
	switch {
	case before.Link.Up && !now.Link.Up:
		return "link lost"
	case now.Capture != nil && now.Capture.OpenNow != "" && (before.Capture == nil || before.Capture.OpenNow == ""):
		return "open now"
	case !reachedDifference(before) && reachedDifference(now):
		return "closing difference reached"
	}
	return ""
}

func reachedDifference(s commission.Snapshot) bool {
	bus, source := s.Reading(signal.BusVoltage), s.Reading(signal.SourceVoltage)
	closing := s.State.Site().Precharge.ClosingDifference
	return s.Capture != nil && closing.IsGiven() && bus.Quality.HasValue() && source.Quality.HasValue() &&
		bus.Value > 0 && source.Value-bus.Value <= float64(closing.Nominal)
}

// current is the open point.
func (m Model) current() walk.Point {
	p, _ := m.snapshot.State.Point(m.point)
	return p
}

// Update takes one message.
func (m Model) Update(msg tea.Msg) (Model, tea.Cmd) {
	switch msg := msg.(type) {
	case tea.KeyMsg:
		return m.pressed(msg)
	case recordedMsg:
		return m.recorded(msg)
	case operatedMsg:
		return m.operated(msg), nil
	case measuredMsg:
		if m.prompt == nil {
			return m.metered(msg)
		}
		return m.measured(msg), nil
	case keptMsg:
		if msg.err != nil {
			return m.refuse("the revised site file stands in the log only: " + msg.err.Error()), nil
		}
		return m.say("revised site file written: " + msg.path), nil
	case movedMsg:
		m.busy = false
		if msg.err != nil {
			return m.refuse(msg.err.Error()), nil
		}
		m.session.Log = msg.path
		return m.say("the log goes on in " + msg.path), nil
	case finishedMsg:
		return m.finished(msg), nil
	}
	return m, nil
}

func (m Model) pressed(msg tea.KeyMsg) (Model, tea.Cmd) {
	if m.prompt != nil {
		return m.typed(msg)
	}
	if m.explain {
		m.explain = false
		return m, nil
	}
	k := m.keys
	if m.far && !key.Matches(msg, k.Far, k.Back, k.Bell, k.Stop, k.Operate) {
		return m, nil // nothing is passed or signed that cannot be read
	}
	switch {
	case key.Matches(msg, k.Open):
		return m.enter()
	case key.Matches(msg, k.Up):
		return m.moved(-1), nil
	case key.Matches(msg, k.Down):
		return m.moved(+1), nil
	case key.Matches(msg, k.Left):
		return m.turned(-1), nil
	case key.Matches(msg, k.Right):
		return m.turned(+1), nil
	case key.Matches(msg, k.PageDown):
		m.page += 5
	case key.Matches(msg, k.PageUp):
		m.page = max(0, m.page-5)
	case key.Matches(msg, k.Far):
		m.far = !m.far
	case key.Matches(msg, k.Explain):
		m.explain = true
	case key.Matches(msg, k.Bell):
		m.silent = !m.silent
		m.message, m.refused = map[bool]string{true: "bell off", false: "bell on"}[m.silent], false
	case key.Matches(msg, k.CursorRight):
		return m.cursorBy(+1), nil
	case key.Matches(msg, k.CursorLeft):
		return m.cursorBy(-1), nil
	case key.Matches(msg, k.Findings):
		return m, func() tea.Msg { return FindingsWanted{} }
	case key.Matches(msg, k.Link):
		return m, func() tea.Msg { return LinkWanted{} }
	case key.Matches(msg, k.NextPane):
		m.words, m.page = !m.words, 0
	case key.Matches(msg, k.Back):
		if m.far || m.cursor != nil {
			m.far, m.cursor = false, nil
			return m, nil
		}
		if c := m.snapshot.Capture; c != nil {
			return m.refuse("a capture is " + string(c.Phase) + " at " + c.Point + ": s ends it and keeps what it has"), nil
		}
		return m, func() tea.Msg { return Left{} }
	case key.Matches(msg, k.Stop):
		return m.submit("capture stopped", walk.StopCapture{})
	case key.Matches(msg, k.Operate):
		return m.operate()
	default:
		return m.pressedAtPoint(msg)
	}
	return m, nil
}

// pressedAtPoint are the keys that ask for something about the open point.
func (m Model) pressedAtPoint(msg tea.KeyMsg) (Model, tea.Cmd) {
	p, k := m.current(), m.keys
	switch {
	case key.Matches(msg, k.Again):
		return m.again(p)
	case key.Matches(msg, k.Fail):
		return m.ask(m.askFail(p)), nil
	case key.Matches(msg, k.NotApplicable):
		if !mayOmit(m.snapshot.State, p) {
			return m.refuse(p.ID + " cannot be left out; fail it with a deviation instead"), nil
		}
		return m.ask(m.askOmit(p)), nil
	case key.Matches(msg, k.Note):
		return m.ask(askNote()), nil
	case key.Matches(msg, k.Punch):
		return m.ask(m.askPunch(p)), nil
	case key.Matches(msg, k.Clear):
		if open := openPunches(m.snapshot.State); len(open) > 0 {
			return m.ask(askClear(open)), nil
		}
		return m.refuse("no punch item is open"), nil
	case key.Matches(msg, k.Deviate):
		return m.ask(askDeviation(p, m.snapshot.State.People())), nil
	case key.Matches(msg, k.Witness):
		return m.ask(m.askWitness(p)), nil
	case key.Matches(msg, k.Instrument):
		return m.ask(askInstrument()), nil
	case key.Matches(msg, k.Change):
		return m.ask(m.askChange(p)), nil
	case key.Matches(msg, k.Hasten):
		return m.hasten()
	case key.Matches(msg, k.Place) && m.snapshot.Failure != nil:
		return m.ask(askPlace(m.session.Log + ".moved.chlog")), nil
	case key.Matches(msg, k.Typed):
		return m.measure(p)
	default:
		return m.refuse("no key of this screen; ? shows them"), nil
	}
}

func openPunches(state walk.State) []record.Punch {
	return slices.DeleteFunc(slices.Clone(state.Punches()), func(k record.Punch) bool { return k.Event != "raised" })
}

// askWitness asks who takes part, or at a point with a result who signs it beside the first.
func (m Model) askWitness(p walk.Point) *prompt {
	st := m.snapshot.State.Status(p.ID)
	people := m.snapshot.State.People()
	if m.needsPerson() {
		return askPerson(true)
	}
	if st.Result == walk.Open {
		return askPerson(false)
	}
	others := slices.DeleteFunc(slices.Clone(people), func(person record.Person) bool { return slices.Contains(st.Signed, person.ID) })
	return askSignature(p, others)
}

// measure asks for an instrument's reading: the point's own, or during a pre-charge the one at the open bypass.
func (m Model) measure(p walk.Point) (Model, tea.Cmd) {
	if c := m.snapshot.Capture; c != nil && c.Kind == capture.Precharge && len(p.Hand) == 0 {
		p, _ = m.snapshot.State.Point(differencePoint)
	}
	if len(p.Hand) == 0 {
		return m.refuse("nothing is read by instrument at " + p.ID), nil
	}
	return m.ask(m.askMeasure(p)), nil
}

// hasten lets a rehearsal's cool-down pass faster.
func (m Model) hasten() (Model, tea.Cmd) {
	state := m.snapshot.State
	switch {
	case !state.IsRehearsal():
		return m.refuse("a wait on a real plant is not shortened"), nil
	case state.CoolsFor(m.snapshot.Now) == 0 || state.Opened().Speed <= 1:
		return m.refuse("there is no wait to shorten"), nil
	}
	return m.submit("cool-down hastened", walk.Hastened{Hastened: record.Hastened{What: "cool-down", Factor: state.Opened().Speed}})
}

// refuse and say put a line under the screen.
func (m Model) refuse(because string) Model { m.message, m.refused = because, true; return m }
func (m Model) say(what string) Model       { m.message, m.refused = what, false; return m }

// again takes a point's readings once more, or opens a point that has its result.
func (m Model) again(p walk.Point) (Model, tea.Cmd) {
	if m.snapshot.State.Status(p.ID).Result != walk.Open {
		return m.ask(askReopen(p)), nil
	}
	switch {
	case p.Capture != "":
		return m.do(nextArm(m.snapshot, p), p)
	case p.Wants(walk.Live):
		return m.submit("live readings", walk.TakeLive{Point: p.ID})
	case len(p.Hand) > 0:
		return m.ask(m.askMeasure(p)), nil
	}
	return m.ask(m.askSeen(p)), nil
}

// enter does the next thing.
func (m Model) enter() (Model, tea.Cmd) {
	p := m.current()
	return m.do(m.next(p), p)
}

func (m Model) do(a action, p walk.Point) (Model, tea.Cmd) {
	switch a.step {
	case stepPerson:
		return m.ask(askPerson(true)), nil
	case stepGo:
		return m.at(a.point), nil
	case stepEnter:
		return m.submit(fmt.Sprintf("stage %d entered", p.Stage), walk.Enter{Stage: p.Stage})
	case stepArm:
		if p.Capture != capture.Step || m.acts >= len(actsAt(p.ID)) { // a trip is prepared first, and may want two captures
			m.acts = 0
		}
		return m.submit("capture armed", walk.Arm{Point: a.point})
	case stepCause:
		return m.ask(m.askCause()), nil
	case stepOverride:
		m.acts = 0
		return m.ask(askOverride(p, a.reason)), nil
	case stepLive:
		return m.submit("live readings", walk.TakeLive{Point: p.ID})
	case stepMeasure:
		return m.ask(m.askMeasure(p)), nil
	case stepSeen:
		return m.ask(m.askSeen(p)), nil
	case stepPass:
		return m.judge(p, walk.Passed, "")
	case stepFail:
		if m.snapshot.State.Status(p.ID).Result == walk.Failed {
			return m.ask(m.askPunch(p)), nil
		}
		return m.ask(m.askFail(p)), nil
	case stepSign:
		return m.submit(p.ID+" signed", m.signature(p))
	case stepSeal:
		return m.ask(askSeal()), nil
	case stepNothing:
		if a.reason != "" {
			return m.refuse(a.reason), nil
		}
	}
	return m, nil
}

// judge gives a point's result, with the signature of whoever goes the walk where it is a hold.
func (m Model) judge(p walk.Point, result walk.Result, note string) (Model, tea.Cmd) {
	events := []walk.Event{walk.Judge{Point: p.ID, Result: result, Note: note}}
	word := map[walk.Result]string{walk.Passed: " passed", walk.NotApplicable: " not applicable"}[result]
	if p.Kind == walk.Hold {
		events, word = append(events, m.signature(p)), word+" and signed"
	}
	return m.submit(p.ID+word, events...)
}

func (m Model) signature(p walk.Point) walk.Event {
	return walk.Sign{Point: p.ID, Person: m.person(), UnsignedBecause: m.session.Unsigned}
}

// submit hands events to the walk's owner in order; what came of them comes back as one message.
func (m Model) submit(what string, events ...walk.Event) (Model, tea.Cmd) {
	if m.busy {
		return m, nil // a key pressed twice is not meant twice
	}
	m.busy = true
	run := m.session.Run
	return m, func() tea.Msg {
		var all commission.Recorded
		for _, event := range events {
			recorded, err := run.Submit(context.Background(), event)
			if err != nil {
				all.State = recorded.State
				return recordedMsg{what, all, err}
			}
			all.Seqs, all.State = append(all.Seqs, recorded.Seqs...), recorded.State
		}
		return recordedMsg{what, all, nil}
	}
}

func (m Model) recorded(msg recordedMsg) (Model, tea.Cmd) {
	m.busy, m.refused = false, msg.err != nil
	if msg.recorded.State.NextSeq() > m.snapshot.State.NextSeq() {
		m.snapshot.State = msg.recorded.State
	}
	if msg.err != nil {
		return m.refuse(msg.err.Error()), nil
	}
	m.message = msg.what
	if n := len(msg.recorded.Seqs); n > 0 {
		m.message = fmt.Sprintf("record %d on disk: %s", msg.recorded.Seqs[n-1], msg.what)
	}
	if m.snapshot.State.Sealed() != nil && m.done == nil {
		finish := m.session.Finish
		m.done = []string{"sealed; signing and writing the report …"}
		return m, func() tea.Msg {
			lines, err := finish(context.Background())
			return finishedMsg{lines, err}
		}
	}
	return m.onward(), nil
}

// onward goes to the next open point once the open one is done.
func (m Model) onward() Model {
	p := m.current()
	if !m.snapshot.State.IsDone(p) {
		return m
	}
	if next, open := m.snapshot.State.NextOpen(); open {
		return m.at(next.ID)
	}
	return m
}

func (m Model) finished(msg finishedMsg) Model {
	m.done = msg.lines
	if msg.err != nil {
		m.done = append(m.done, "not finished: "+msg.err.Error())
	}
	return m
}

// at opens a point.
func (m Model) at(point string) Model {
	if point != m.point {
		m.acts = 0
	}
	m.point, m.page, m.cursor, m.words = point, 0, nil, false
	return m
}

// moved goes to the point before or after.
func (m Model) moved(by int) Model {
	points := m.snapshot.State.Points()
	for i, p := range points {
		if p.ID == m.point {
			return m.at(points[min(max(i+by, 0), len(points)-1)].ID)
		}
	}
	return m
}

// turned goes to the first open point of the stage before or after.
func (m Model) turned(by int) Model {
	stage := min(max(m.current().Stage+by, 1), walk.Stages)
	in := m.snapshot.State.InStage(stage)
	for _, p := range in {
		if !m.snapshot.State.IsDone(p) {
			return m.at(p.ID)
		}
	}
	return m.at(in[0].ID)
}

// person is who signs: whoever was entered with this session's key, else the one who goes the walk.
func (m Model) person() string {
	people := m.snapshot.State.People()
	for _, p := range people {
		if m.session.Key != "" && p.Key != nil && *p.Key == m.session.Key {
			return p.ID
		}
	}
	if len(people) > 0 {
		return people[0].ID
	}
	return ""
}

// needsPerson tells whether it must be asked who goes on: nobody yet, or nobody with this session's key.
func (m Model) needsPerson() bool {
	people := m.snapshot.State.People()
	return len(people) == 0 || m.session.Key != "" && !slices.ContainsFunc(people, func(p record.Person) bool { return p.Key != nil && *p.Key == m.session.Key })
}

// cursorBy moves the chart's cursor by a fiftieth of the trace, or puts it on the last sample.
func (m Model) cursorBy(direction float64) Model {
	c, ok := m.chartAt(m.current())
	if !ok || len(c.X) < 2 {
		return m
	}
	low, high := c.X[0], c.X[len(c.X)-1]
	at := high
	if m.cursor != nil {
		at = min(max(*m.cursor+direction*(high-low)/50, low), high)
	}
	m.cursor = &at
	return m
}

// State is the walk's state as last seen.
func (m Model) State() walk.State { return m.snapshot.State }

// Snapshot is what the walk's owner published last.
func (m Model) Snapshot() commission.Snapshot { return m.snapshot }

// Alarm is what must be done at once, whatever is shown; empty where nothing is.
func (m Model) Alarm() string {
	switch c := m.snapshot.Capture; {
	case c != nil && c.OpenNow != "":
		return "OPEN THE PRE-CHARGE NOW."
	case m.snapshot.Failure != nil:
		return "NOTHING IS RECORDED."
	}
	return ""
}
