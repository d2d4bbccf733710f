// Package start is the first screen: walks that were not finished, sites seen lately, and the rehearsal of the built-in
// example.
//
// Start at [Model]; [Chosen] is the message of what was chosen.
package start

import (
	"strings"

	"github.com/charmbracelet/bubbles/key"
	tea "github.com/charmbracelet/bubbletea"

	"chargehand/tui/form"
	"chargehand/tui/theme"
)

// Kind is what an entry does.
type Kind string

// The kinds of entry.
const (
	Resume   Kind = "resume"   // go on with an unfinished log
	Walk     Kind = "walk"     // the walk of a site on its real device
	Rehearse Kind = "rehearse" // the same on a simulated converter
	Check    Kind = "check"    // the desk checks of a site
)

// Entry is one line to choose.
type Entry struct {
	Kind   Kind
	Site   string // path of the site file; empty for the built-in example
	Log    string // path of the log, to resume
	Title  string
	Detail string // where it stopped, or where it lies
}

// Chosen says what was chosen.
type Chosen struct{ Entry Entry }

// Quit says that the program is to end.
type Quit struct{}

// Model is the start screen.
type Model struct {
	theme         theme.Theme
	keys          form.Keys
	width, height int
	entries       []Entry
	at            int
	message       string
	explain       bool
}

// New makes the screen.
func New(entries []Entry, t theme.Theme, width, height int) Model {
	k := form.DefaultKeys()
	k.Back.SetHelp("Esc", "end")
	return Model{theme: t, keys: k, width: width, height: height, entries: entries}
}

// Resized gives the screen a new size.
func (m Model) Resized(width, height int) Model {
	m.width, m.height = width, height
	return m
}

// WithEntries gives the screen a new list.
func (m Model) WithEntries(entries []Entry) Model {
	m.entries, m.at = entries, min(m.at, max(len(entries)-1, 0))
	return m
}

// WithMessage says something at the foot, such as why a walk could not be opened.
func (m Model) WithMessage(text string) Model {
	m.message = text
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
	case key.Matches(press, m.keys.First):
		m.at = 0
	case key.Matches(press, m.keys.Last):
		m.at = max(len(m.entries)-1, 0)
	case key.Matches(press, m.keys.Up):
		m.at = max(0, m.at-1)
	case key.Matches(press, m.keys.Down):
		m.at = min(max(len(m.entries)-1, 0), m.at+1)
	case key.Matches(press, m.keys.Explain):
		m.explain = true
	case key.Matches(press, m.keys.Back):
		return m, func() tea.Msg { return Quit{} }
	case key.Matches(press, m.keys.Open) && m.at < len(m.entries):
		chosen := m.entries[m.at]
		m.message = "opening …"
		return m, func() tea.Msg { return Chosen{chosen} }
	}
	return m, nil
}

// View draws the screen in exactly its size.
func (m Model) View() string {
	if m.width <= 0 || m.height <= 0 {
		return ""
	}
	rows := m.rows()
	for len(rows) < m.height-1 {
		rows = append(rows, "")
	}
	rows = append(rows[:m.height-1], " "+form.HelpLine(m.theme, max(m.width-2, 0), []key.Binding{m.keys.Open, m.keys.Up, m.keys.Down, m.keys.Explain, m.keys.Back}))
	for i := range rows {
		rows[i] = m.theme.Clip(rows[i], m.width)
	}
	return strings.Join(rows, "\n")
}

func (m Model) rows() []string {
	t := m.theme
	rows := []string{
		" " + t.Paint(theme.Title, "chargehand") + "  commissions the tie of a source to a DC bus",
		t.Paint(theme.Wire, strings.Repeat(t.Pick("─", "-"), m.width)),
	}
	if m.explain {
		page := form.HelpPage(t, m.width-4, m.height-3, "Where to begin", purpose, [][]key.Binding{{m.keys.Up, m.keys.Down, m.keys.Open, m.keys.Back}})
		for _, l := range strings.Split(page, "\n") {
			rows = append(rows, "  "+l)
		}
		return rows
	}
	list, from, to := m.list()
	foot := m.foot()
	room := max(m.height-1-len(rows)-len(foot), 1)
	first := min(max(0, to-room), from, max(len(list)-room, 0))
	list = list[first:min(first+room, len(list))]
	rows = append(rows, list...)
	return append(rows, foot...)
}

// list is all entries under their headings, and which rows of it the chosen one takes.
func (m Model) list() (rows []string, from, to int) {
	last := Kind("")
	for i, e := range m.entries {
		start := len(rows)
		if heading := headings[e.Kind]; heading != headings[last] {
			rows = append(rows, "", "  "+m.theme.Paint(theme.Faint, heading))
		}
		last = e.Kind
		rows = append(rows, m.entry(e, i == m.at)...)
		if i == m.at {
			from, to = start, len(rows)
		}
	}
	return rows, from, to
}

// foot is what was said last, and what the program is not.
func (m Model) foot() []string {
	rows := []string{""}
	if m.message != "" {
		for _, l := range wrap(theme.Clean(m.message), m.width-4) {
			rows = append(rows, "  "+m.theme.Paint(theme.Abnormal, l))
		}
		rows = append(rows, "")
	}
	const limits = "It only reads the device; it assists and does not authorise. Local codes, the permit to work, the makers' " +
		"instructions and licensed practice prevail. A shown voltage never stands for absence of voltage."
	for _, l := range wrap(limits, m.width-4) {
		rows = append(rows, "  "+m.theme.Paint(theme.Faint, l))
	}
	return rows
}

// wrap breaks a text at blanks; a word that is longer than a line is cut when the line is clipped.
func wrap(text string, width int) []string {
	var rows []string
	line := ""
	for _, word := range strings.Fields(text) {
		if line != "" && theme.Width(line)+1+theme.Width(word) > width {
			rows, line = append(rows, line), ""
		}
		line = strings.TrimSpace(line + " " + word)
	}
	return append(rows, line)
}

const purpose = "Choose with the arrows and press Enter. A rehearsal goes the whole walk on a simulated converter and dials nothing but " +
	"this computer itself; a walk reads the device that the site file names, and only reads. Unfinished walks come first: they go " +
	"on exactly where their log ends. `chargehand new --guided my.site.toml` asks for the values of a new site; `chargehand " +
	"--help` lists the commands."

var headings = map[Kind]string{
	Resume: "not finished", Walk: "walk at the switchboard", Rehearse: "rehearse on a simulated converter", Check: "desk checks",
}

func (m Model) entry(e Entry, selected bool) []string {
	lead := "    "
	if selected {
		lead = "  " + m.theme.Pick("▸ ", "> ")
	}
	title := m.theme.Fit(theme.Clean(e.Title), min(max(m.width-6, 0), 70))
	if selected {
		title = m.theme.Paint(theme.Selected, title)
	}
	rows := []string{lead + title}
	if e.Detail != "" {
		rows = append(rows, "      "+m.theme.Paint(theme.Faint, theme.Clean(e.Detail)))
	}
	return rows
}
