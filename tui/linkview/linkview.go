package linkview

import (
	"fmt"
	"strings"
	"time"

	"github.com/charmbracelet/bubbles/key"
	tea "github.com/charmbracelet/bubbletea"

	"chargehand/commission"
	"chargehand/commission/signal"
	"chargehand/tui/form"
	"chargehand/tui/theme"
)

// Left says that the screen was left.
type Left struct{}

// Model is the screen.
type Model struct {
	theme         theme.Theme
	keys          form.Keys
	width, height int
	places        map[signal.Name]string // where the map reads a signal, in both notations
	longest       time.Duration          // how old a reading may be by the wall clock
	pace          func() float64         // of the plant's clock; nil is 1
	snapshot      commission.Snapshot
	top           int
	explain       bool
}

// New makes the screen of a walk's link.
func New(places map[signal.Name]string, maxAge time.Duration, pace func() float64, t theme.Theme, width, height int, first commission.Snapshot) Model {
	return Model{theme: t, keys: form.DefaultKeys(), width: width, height: height, places: places, longest: maxAge, pace: pace, snapshot: first}
}

// Resized gives the screen a new size.
func (m Model) Resized(width, height int) Model {
	m.width, m.height = width, height
	return m
}

// WithSnapshot takes what the walk's owner published.
func (m Model) WithSnapshot(s commission.Snapshot) Model {
	m.snapshot = s
	return m
}

// Update takes one message.
func (m Model) Update(msg tea.Msg) (Model, tea.Cmd) {
	press, ok := msg.(tea.KeyMsg)
	if !ok {
		return m, nil
	}
	if m.explain {
		m.explain = false
		return m, nil
	}
	switch {
	case key.Matches(press, m.keys.Back):
		return m, func() tea.Msg { return Left{} }
	case key.Matches(press, m.keys.Explain):
		m.explain = true
	case key.Matches(press, m.keys.Up):
		m.top--
	case key.Matches(press, m.keys.Down):
		m.top++
	case key.Matches(press, m.keys.PageUp):
		m.top -= m.room()
	case key.Matches(press, m.keys.PageDown):
		m.top += m.room()
	}
	m.top = min(max(m.top, 0), max(len(m.names())-m.room(), 0))
	return m, nil
}

func (m Model) room() int { return max(m.height-6, 1) }

// names are the signals that the device has, in the vocabulary's order.
func (m Model) names() []signal.Name {
	var names []signal.Name
	for _, name := range signal.Names {
		if _, ok := m.snapshot.Live[name]; ok {
			names = append(names, name)
		}
	}
	return names
}

// View draws the screen in exactly its size.
func (m Model) View() string {
	if m.width <= 0 || m.height <= 0 {
		return ""
	}
	rule := m.theme.Paint(theme.Wire, strings.Repeat(m.theme.Pick("─", "-"), m.width))
	rows := []string{" " + m.theme.Paint(theme.Title, "Link") + "   " + m.state(), rule}
	if m.explain {
		page := form.HelpPage(m.theme, m.width-2, m.height-3, "The link", explanation, [][]key.Binding{
			{m.keys.Up, m.keys.Down, m.keys.PageUp, m.keys.PageDown, m.keys.Back}})
		rows = append(rows, strings.Split(page, "\n")...)
	} else {
		rows = append(rows, m.theme.Paint(theme.Faint, m.columns("signal", "value", "words", "place", "age", "")), "")
		names := m.names()
		from := min(m.top, max(len(names)-m.room(), 0))
		for _, name := range names[from:min(from+m.room(), len(names))] {
			rows = append(rows, m.row(name))
		}
		if len(names) == 0 {
			rows = append(rows, "  nothing has been read yet")
		}
	}
	for len(rows) < m.height-1 {
		rows = append(rows, "")
	}
	rows = append(rows[:m.height-1], " "+form.HelpLine(m.theme, max(m.width-2, 0), []key.Binding{m.keys.Back, m.keys.Explain, m.keys.Up, m.keys.Down, m.keys.PageDown}))
	for i := range rows {
		rows[i] = m.theme.Clip(rows[i], m.width)
	}
	return strings.Join(rows, "\n")
}

const explanation = "Every signal that the map names, as the device answers it. The words are hexadecimal as on the wire. The place is " +
	"the table and address counted from 0 as on the wire, and the reference counted from 1. A value older than its limit is " +
	"withdrawn, never shown as live. A question mark stands on what nobody has compared with a known value that is not zero yet. " +
	"`chargehand link SITE` tries other readings of the map beside the expected value."

// state is the link in one line.
func (m Model) state() string {
	l := m.snapshot.Link
	if !l.Up {
		words := " NO LINK "
		if l.Why != "" {
			words += theme.Clean(l.Why) + " "
		}
		return m.theme.Paint(theme.Alarm, words)
	}
	dot := m.theme.Pick(" · ", " - ")
	words := theme.Clean(l.Peer) + dot + fmt.Sprintf("%.0f polls a second", l.Rate) + dot + "round trip " +
		fmt.Sprintf("%.1f ms", float64(l.RoundTrip.Microseconds())/1000)
	if l.Reconnects > 0 {
		words += dot + fmt.Sprintf("%d reconnects", l.Reconnects)
	}
	return m.theme.Paint(theme.Normal, words)
}

func (m Model) maxAge() time.Duration {
	if m.pace == nil {
		return m.longest
	}
	return time.Duration(float64(m.longest) * m.pace())
}

// columns sets a row: the place gets what room is left.
func (m Model) columns(name, value, words, place, age, quality string) string {
	t := m.theme
	const named, valued, worded, aged, judged = 22, 11, 10, 7, 7
	row := "  " + t.Fit(name, named) + t.Fit(value, valued) + t.Fit(words, worded)
	if wide := m.width - 2 - named - valued - worded - aged - judged; wide >= 16 {
		row += t.Fit(t.Clip(place, wide-1), min(wide, 34))
	}
	return row + t.Fit(age, aged) + quality
}

func (m Model) row(name signal.Name) string {
	r := m.snapshot.Live[name]
	now := m.snapshot.Now
	unproved := !name.IsState() && !m.snapshot.State.IsProved(name)
	shown := m.theme.Show(r, unproved, now, m.maxAge())
	value := m.theme.Paint(theme.Withdrawn, "no value")
	if shown.HasValue() {
		value = m.theme.Paint(shown.Role, shown.String())
	}
	quality := r.Withdrawn(now, m.maxAge()).Quality
	role := theme.Faint
	if quality != signal.Good {
		role = theme.Abnormal
	}
	age := ""
	if !r.At.IsZero() {
		age = theme.Age(max(r.Age(now), 0))
	}
	return m.columns(string(name), value, hex(r.Raw), m.theme.Plain(m.places[name]), age, m.theme.Paint(role, string(quality)))
}

func hex(words []uint16) string {
	texts := make([]string, len(words))
	for i, w := range words {
		texts[i] = fmt.Sprintf("%04X", w)
	}
	return strings.Join(texts, " ")
}
