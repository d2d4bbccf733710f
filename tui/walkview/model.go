package walkview

import (
	"context"
	"fmt"
	"strings"

	"github.com/charmbracelet/bubbles/key"
	tea "github.com/charmbracelet/bubbletea"

	"chargehand/commission"
	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/commission/unattended"
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

	point   string // id of the open point
	page    int    // first line of the point's text
	acts    int    // how many of the point's acts the simulated plant's hand has done
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
		what  string
		value float64
		err   error
	}
	finishedMsg struct {
		lines []string
		err   error
	}
)

// FindingsWanted asks the root to show the findings of the walk's site.
type FindingsWanted struct{}

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
	m = m.withSnapshot(s)
	if because := ring(before, s); because != "" && !m.silent {
		m.rung = because
		return m, m.bell()
	}
	return m, nil
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
// closing difference is reached.
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
		return m.measured(msg), nil
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
	case key.Matches(msg, k.Back):
		if m.far || m.cursor != nil {
			m.far, m.cursor = false, nil
			return m, nil
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
		return m.ask(askFail(p)), nil
	case key.Matches(msg, k.NotApplicable):
		return m.ask(askOmit(p)), nil
	case key.Matches(msg, k.Note):
		return m.ask(askNote()), nil
	case key.Matches(msg, k.Punch):
		return m.ask(askPunch(p)), nil
	case key.Matches(msg, k.Deviate):
		return m.ask(askDeviation(p, m.snapshot.State.People())), nil
	case key.Matches(msg, k.Typed) && len(p.Hand) > 0:
		return m.do(action{step: stepMeasure, hand: p.Hand[0]}, p)
	}
	return m, nil
}

// again takes a point's readings once more, or opens a point that has its result.
func (m Model) again(p walk.Point) (Model, tea.Cmd) {
	if m.snapshot.State.Status(p.ID).Result != walk.Open {
		return m.ask(askReopen(p)), nil
	}
	switch {
	case p.Capture != "":
		return m.do(nextArm(m.snapshot, p), p)
	case len(p.Hand) > 0 && has(m.snapshot.State, p, record.FromDevice, ""):
		return m.do(action{step: stepMeasure, hand: p.Hand[0]}, p)
	case p.Wants(walk.Live):
		return m.submit("live readings taken", walk.TakeLive{Point: p.ID})
	}
	return m.ask(askSeen(p)), nil
}

// enter does the next thing.
func (m Model) enter() (Model, tea.Cmd) {
	p := m.current()
	return m.do(next(m.snapshot, p), p)
}

func (m Model) do(a action, p walk.Point) (Model, tea.Cmd) {
	switch a.step {
	case stepPerson:
		return m.ask(askPerson()), nil
	case stepGo:
		return m.at(a.point), nil
	case stepEnter:
		return m.submit(fmt.Sprintf("stage %d entered", p.Stage), walk.Enter{Stage: p.Stage})
	case stepArm:
		m.acts = 0
		return m.submit("capture armed", walk.Arm{Point: p.ID})
	case stepCause:
		return m.ask(askCause()), nil
	case stepOverride:
		m.acts = 0
		return m.ask(askOverride(p, a.reason)), nil
	case stepLive:
		return m.submit("live readings taken", walk.TakeLive{Point: p.ID})
	case stepMeasure:
		return m.ask(askMeasure(p, a.hand, m.instruments(), m.session.Operator != nil)), nil
	case stepSeen:
		return m.ask(askSeen(p)), nil
	case stepPass:
		return m.submit(p.ID+" passed", walk.Judge{Point: p.ID, Result: walk.Passed})
	case stepFail:
		if m.snapshot.State.Status(p.ID).Result == walk.Failed {
			return m.ask(askPunch(p)), nil
		}
		return m.ask(askFail(p)), nil
	case stepSign:
		return m.submit(p.ID+" signed", walk.Sign{Point: p.ID, Person: m.person(), UnsignedBecause: m.session.Unsigned})
	case stepSeal:
		return m.ask(askSeal()), nil
	}
	return m, nil
}

// submit hands events to the walk's owner in order; what came of them comes back as one message.
func (m Model) submit(what string, events ...walk.Event) (Model, tea.Cmd) {
	m.busy = true
	run := m.session.Run
	return m, func() tea.Msg {
		var all commission.Recorded
		for _, event := range events {
			recorded, err := run.Submit(context.Background(), event)
			if err != nil {
				return recordedMsg{what, recorded, err}
			}
			all.Seqs, all.State = append(all.Seqs, recorded.Seqs...), recorded.State
		}
		return recordedMsg{what, all, nil}
	}
}

func (m Model) recorded(msg recordedMsg) (Model, tea.Cmd) {
	m.busy, m.refused = false, msg.err != nil
	if msg.err != nil {
		m.message = msg.err.Error()
		return m, nil
	}
	m.snapshot.State = msg.recorded.State
	m.message = msg.what
	if n := len(msg.recorded.Seqs); n > 0 {
		m.message = fmt.Sprintf("recorded as %d: %s", msg.recorded.Seqs[n-1], msg.what)
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
	m.point, m.page, m.acts, m.cursor = point, 0, 0, nil
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

// operate has the simulated plant's hand do the next act of the open point.
func (m Model) operate() (Model, tea.Cmd) {
	if m.session.Operator == nil {
		m.message, m.refused = "whoever operates the plant does so with its own controls", true
		return m, nil
	}
	acts := unattended.Acts(m.point)
	if m.acts >= len(acts) {
		m.message, m.refused = "nothing to operate at "+m.point, true
		return m, nil
	}
	act, operator := acts[m.acts], m.session.Operator
	m.acts++
	m.message, m.refused = "the plant's hand: "+act, false
	return m, func() tea.Msg { return operatedMsg{act, operator.Do(context.Background(), act)} }
}

func (m Model) operated(msg operatedMsg) Model {
	if msg.err != nil {
		m.message, m.refused = msg.err.Error(), true
		m.acts = max(0, m.acts-1)
		return m
	}
	m.message, m.refused = "done by the plant's hand: "+msg.act, false
	return m
}

// person is who signs: the one who goes the walk.
func (m Model) person() string {
	if people := m.snapshot.State.People(); len(people) > 0 {
		return people[0].ID
	}
	return ""
}

func (m Model) instruments() []record.Instrument { return m.snapshot.State.Instruments() }

// cursorBy moves the chart's cursor by a fiftieth of the trace, or puts it on the last sample.
func (m Model) cursorBy(direction float64) Model {
	c := m.snapshot.Capture
	if c == nil || len(c.X) < 2 {
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
