package tui

import (
	"context"
	"fmt"
	"slices"
	"strings"

	tea "github.com/charmbracelet/bubbletea"

	"chargehand/commission"
	"chargehand/commission/desk"
	"chargehand/commission/finding"
	"chargehand/commission/site"
	"chargehand/commission/walk"
	"chargehand/tui/deskview"
	"chargehand/tui/linkview"
	"chargehand/tui/start"
	"chargehand/tui/theme"
	"chargehand/tui/walkview"
)

// Host is what the screens need of the world.
type Host interface {
	// Entries lists what the start screen offers, unfinished logs first.
	Entries(ctx context.Context) []start.Entry
	// Open opens what was chosen there.
	Open(ctx context.Context, chosen start.Entry) (walkview.Session, error)
	// Check calculates a site's desk findings; an empty path is the built-in example.
	Check(ctx context.Context, siteFile string) (site.Site, desk.Sheet, error)
}

// screen is which screen is shown.
type screen int

const (
	onStart screen = iota
	onWalk
	onDesk
	onLink
)

// Model is the whole program.
type Model struct {
	host          Host
	theme         theme.Theme
	width, height int

	shown   screen
	before  screen // where the desk screen leads back to
	start   start.Model
	walk    walkview.Model
	desk    deskview.Model
	link    linkview.Model
	session *walkview.Session
	only    bool // one walk was asked for: leaving it ends the program
	opening *start.Entry
}

type (
	entriesMsg []start.Entry
	openedMsg  struct {
		session walkview.Session
		first   commission.Snapshot
		err     error
	}
	checkedMsg struct {
		site  site.Site
		sheet desk.Sheet
		err   error
	}
	snapshotMsg struct {
		run      *commission.Run
		snapshot commission.Snapshot
	}
	closedMsg struct{ err error }
)

// New makes the program with its start screen.
func New(host Host, t theme.Theme) Model {
	return Model{host: host, theme: t, start: start.New(nil, t, 0, 0)}
}

// Opening makes the program with one walk to open at once; leaving it ends the program.
func Opening(host Host, t theme.Theme, entry start.Entry) Model {
	m := New(host, t)
	m.only, m.opening = true, &entry
	m.start = m.start.WithMessage("opening …")
	return m
}

// Init asks for what the first screen shows.
func (m Model) Init() tea.Cmd {
	title := tea.SetWindowTitle("chargehand")
	if m.opening != nil {
		return tea.Batch(title, m.open(*m.opening))
	}
	return tea.Batch(title, m.entries())
}

func (m Model) entries() tea.Cmd {
	return func() tea.Msg { return entriesMsg(m.host.Entries(context.Background())) }
}

func (m Model) open(e start.Entry) tea.Cmd {
	return func() tea.Msg {
		session, err := m.host.Open(context.Background(), e)
		if err != nil {
			return openedMsg{err: err}
		}
		return openedMsg{session: session, first: <-session.Run.Snapshots()}
	}
}

func (m Model) check(file string) tea.Cmd {
	return func() tea.Msg {
		s, sheet, err := m.host.Check(context.Background(), file)
		return checkedMsg{s, sheet, err}
	}
}

// await waits for the next snapshot; it is asked again in one place, when one has come.
func await(run *commission.Run) tea.Cmd {
	return func() tea.Msg {
		s, ok := <-run.Snapshots()
		if !ok {
			return nil
		}
		return snapshotMsg{run, s}
	}
}

// Update takes one message.
func (m Model) Update(msg tea.Msg) (tea.Model, tea.Cmd) {
	switch msg := msg.(type) {
	case tea.WindowSizeMsg:
		return m.resized(msg.Width, msg.Height), nil
	case tea.KeyMsg:
		if msg.Type == tea.KeyCtrlC {
			return m.leave(true)
		}
	case entriesMsg:
		m.start = m.start.WithEntries(msg)
		return m, nil
	case start.Chosen:
		return m.chosen(msg.Entry)
	case start.Quit:
		return m, tea.Quit
	case openedMsg:
		return m.opened(msg)
	case snapshotMsg:
		return m.snapshot(msg)
	case checkedMsg:
		return m.checked(msg), nil
	case walkview.FindingsWanted:
		return m.findings(), nil
	case walkview.LinkWanted:
		m.shown = onLink
		m.link = linkview.New(m.session.Places, m.session.MaxAge, m.session.Pace, m.theme, m.width, m.height, m.walk.Snapshot())
		return m, nil
	case linkview.Left:
		m.shown = onWalk
		return m, nil
	case walkview.Left:
		return m.leave(m.only)
	case deskview.Left:
		m.shown = m.before
		return m, nil
	case closedMsg:
		if m.only {
			return m, tea.Quit
		}
		return m, m.entries()
	}
	return m.pass(msg)
}

// pass hands a message to the screen it is for: keys to the one shown, everything else to the walk.
func (m Model) pass(msg tea.Msg) (tea.Model, tea.Cmd) {
	var cmd tea.Cmd
	_, isKey := msg.(tea.KeyMsg)
	switch {
	case m.shown == onWalk || !isKey && m.session != nil:
		m.walk, cmd = m.walk.Update(msg)
	case m.shown == onDesk:
		m.desk, cmd = m.desk.Update(msg)
	case m.shown == onLink:
		m.link, cmd = m.link.Update(msg)
	default:
		m.start, cmd = m.start.Update(msg)
	}
	return m, cmd
}

func (m Model) resized(width, height int) Model {
	m.width, m.height = width, height
	m.start, m.walk = m.start.Resized(width, height), m.walk.Resized(width, height)
	m.desk, m.link = m.desk.Resized(width, height), m.link.Resized(width, height)
	return m
}

func (m Model) chosen(e start.Entry) (tea.Model, tea.Cmd) {
	if e.Kind == start.Check {
		return m, m.check(e.Site)
	}
	return m, m.open(e)
}

func (m Model) opened(msg openedMsg) (tea.Model, tea.Cmd) {
	if msg.err != nil {
		m.start = m.start.WithMessage(msg.err.Error())
		return m, m.entries()
	}
	m.session, m.shown = &msg.session, onWalk
	m.start = m.start.WithMessage("")
	m.walk = walkview.New(msg.session, m.theme, m.width, m.height, msg.first)
	title := "chargehand " + theme.Clean(msg.first.State.Site().Reference)
	return m, tea.Batch(await(msg.session.Run), tea.SetWindowTitle(title))
}

// snapshot passes a snapshot on, unless it is of a walk that has been left.
func (m Model) snapshot(msg snapshotMsg) (tea.Model, tea.Cmd) {
	if m.session == nil || msg.run != m.session.Run {
		return m, nil
	}
	var cmd tea.Cmd
	m.walk, cmd = m.walk.WithSnapshot(msg.snapshot)
	m.link = m.link.WithSnapshot(msg.snapshot)
	return m, tea.Batch(cmd, await(msg.run))
}

func (m Model) checked(msg checkedMsg) Model {
	if msg.err != nil {
		m.start = m.start.WithMessage(msg.err.Error())
		return m
	}
	m.start = m.start.WithMessage("")
	m.before, m.shown = m.shown, onDesk
	m.desk = deskview.New(msg.site, msg.sheet.Findings, m.theme, m.width, m.height)
	return m
}

// findings shows what the open walk's log holds of findings, desk and measured.
func (m Model) findings() Model {
	state := m.walk.State()
	all := append(state.Measured(""), explained(state.Site(), state.Desk())...)
	m.before, m.shown = onWalk, onDesk
	m.desk = deskview.New(state.Site(), all, m.theme, m.width, m.height)
	return m
}

// explained gives the findings of a log their workings back: a log keeps results, and the same site gives the same workings.
func explained(s site.Site, findings []finding.Finding) []finding.Finding {
	workings := map[string]*finding.Explanation{}
	for _, f := range desk.Findings(s, nil) {
		workings[f.ID+" "+f.Subject] = f.Explanation
	}
	findings = slices.Clone(findings)
	for i, f := range findings {
		findings[i].Explanation = workings[f.ID+" "+f.Subject]
	}
	return findings
}

// leave closes an open walk; its log stays as it is and can be gone on with.
func (m Model) leave(quit bool) (tea.Model, tea.Cmd) {
	if m.session == nil {
		return m, tea.Quit
	}
	session, capturing := *m.session, m.walk.Snapshot().Capture != nil
	m.session, m.shown, m.only = nil, onStart, quit
	return m, func() tea.Msg {
		if capturing { // what it has seen is kept, whatever ends the program; a failure shows in the log that is gone on with
			_, _ = session.Run.Submit(context.Background(), walk.StopCapture{})
		}
		return closedMsg{session.Close()}
	}
}

// LeastWidth and LeastHeight are the smallest terminal that screens are drawn in.
const (
	LeastWidth  = 80
	LeastHeight = 24
)

// View draws the screen shown.
func (m Model) View() string {
	switch {
	case m.width <= 0 || m.height <= 0:
		return ""
	case m.width < LeastWidth || m.height < LeastHeight:
		return m.tooSmall()
	}
	switch m.shown {
	case onWalk:
		return m.walk.View()
	case onDesk:
		return m.desk.View()
	case onLink:
		return m.link.View()
	}
	return m.start.View()
}

// tooSmall says what the screens need; an alarm of the walk is said all the same.
func (m Model) tooSmall() string {
	text := fmt.Sprintf("chargehand needs %d columns and %d rows; this terminal has %d and %d. Make it larger: nothing is lost.",
		LeastWidth, LeastHeight, m.width, m.height)
	if alarm := m.alarm(); alarm != "" {
		text = alarm + " " + text
	}
	var rows []string
	line := ""
	for _, word := range strings.Fields(text) {
		if line != "" && theme.Width(line)+1+theme.Width(word) > m.width {
			rows, line = append(rows, line), ""
		}
		line = strings.TrimSpace(line + " " + word)
	}
	rows = append(rows, line)
	for i := range rows {
		rows[i] = m.theme.Clip(rows[i], m.width)
	}
	return strings.Join(rows[:min(len(rows), m.height)], "\n")
}

func (m Model) alarm() string {
	if m.session == nil {
		return ""
	}
	return m.walk.Alarm()
}
