// Package deskview is the screen of the findings: what needs attention first, and the calculation of each on Enter.
//
// Start at [Model].
package deskview

import (
	"fmt"
	"slices"
	"strings"

	"github.com/charmbracelet/bubbles/key"
	tea "github.com/charmbracelet/bubbletea"

	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
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
	site          site.Site
	findings      []finding.Finding
	at, top       int
	opened        bool // the calculation of the finding at is shown
	window        bool // the window over the state of charge is shown
	cursor        *float64
	explain       bool
	page          int
}

// New makes the screen of some findings, the gravest first; within a verdict they keep their order.
func New(of site.Site, findings []finding.Finding, t theme.Theme, width, height int) Model {
	sorted := slices.Clone(findings)
	slices.SortStableFunc(sorted, func(a, b finding.Finding) int {
		switch {
		case a.Verdict.IsWorseThan(b.Verdict):
			return -1
		case b.Verdict.IsWorseThan(a.Verdict):
			return 1
		}
		return 0
	})
	k := form.DefaultKeys()
	k.Open.SetHelp("Enter", "the calculation")
	return Model{theme: t, keys: k, width: width, height: height, site: of, findings: sorted}
}

// Resized gives the screen a new size.
func (m Model) Resized(width, height int) Model {
	m.width, m.height = width, height
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
	case key.Matches(press, m.keys.Explain):
		m.explain = true
	case press.String() == windowKey:
		m.window, m.cursor = !m.window, nil
	case m.window && key.Matches(press, m.keys.Back, m.keys.Open):
		m.window = false
	case m.window:
		return m.read(press), nil
	case key.Matches(press, m.keys.Back) && m.opened:
		m.opened, m.page = false, 0
	case key.Matches(press, m.keys.Back):
		return m, func() tea.Msg { return Left{} }
	case key.Matches(press, m.keys.Open):
		m.opened, m.page = !m.opened, 0
	case key.Matches(press, m.keys.Up):
		return m.moved(-1), nil
	case key.Matches(press, m.keys.Down):
		return m.moved(+1), nil
	case key.Matches(press, m.keys.PageUp):
		return m.moved(-m.room()), nil
	case key.Matches(press, m.keys.PageDown):
		return m.moved(m.room()), nil
	}
	return m, nil
}

func (m Model) moved(by int) Model {
	if m.opened {
		m.page = max(0, m.page+by)
		return m
	}
	m.at = min(max(m.at+by, 0), max(len(m.findings)-1, 0))
	switch room := m.room(); {
	case m.at < m.top:
		m.top = m.at
	case m.at >= m.top+room:
		m.top = m.at - room + 1
	}
	return m
}

func (m Model) room() int { return max(m.height-4, 1) }

// View draws the screen in exactly its size.
func (m Model) View() string {
	if m.width <= 0 || m.height <= 0 {
		return ""
	}
	rows := []string{" " + m.theme.Paint(theme.Title, theme.Clean(m.site.Name)) + m.counts(),
		m.theme.Paint(theme.Wire, strings.Repeat(m.theme.Pick("─", "-"), m.width))}
	rows = append(rows, m.body()...)
	for len(rows) < m.height-1 {
		rows = append(rows, "")
	}
	rows = append(rows[:m.height-1], " "+form.HelpLine(m.theme, max(m.width-2, 0), m.shortHelp()))
	for i := range rows {
		rows[i] = m.theme.Clip(rows[i], m.width)
	}
	return strings.Join(rows, "\n")
}

// windowKey shows the window over the state of charge.
const windowKey = "g"

func (m Model) shortHelp() []key.Binding {
	k := m.keys
	graph := key.NewBinding(key.WithKeys(windowKey), key.WithHelp(windowKey, "window chart"))
	switch {
	case m.explain:
		return []key.Binding{k.Back}
	case m.window:
		return []key.Binding{k.Back, k.CursorLeft, k.CursorRight}
	case m.opened:
		k.Open.SetHelp("Enter", "the list")
		return []key.Binding{k.Open, k.Back, graph, k.Explain, k.PageDown, k.PageUp}
	}
	return []key.Binding{k.Open, k.Back, graph, k.Explain, k.Up, k.Down, k.PageDown}
}

func (m Model) body() []string {
	switch {
	case m.explain:
		page := form.HelpPage(m.theme, m.width-2, m.height-3, "Desk findings", purpose, [][]key.Binding{m.shortListed()})
		return strings.Split(page, "\n")
	case m.window:
		return strings.Split(m.windowChart().View(m.theme, m.width-1, m.height-3), "\n")
	case m.opened && m.at < len(m.findings):
		text := Explained(m.findings[m.at], m.theme, m.width-2)
		first := min(m.page, max(0, len(text)-m.room()))
		var rows []string
		for _, l := range text[first:min(first+m.room(), len(text))] {
			rows = append(rows, " "+l)
		}
		return rows
	}
	var rows []string
	for i := m.top; i < min(m.top+m.room(), len(m.findings)); i++ {
		rows = append(rows, m.row(m.findings[i], i == m.at))
	}
	return rows
}

func (m Model) shortListed() []key.Binding {
	m.explain = false
	return m.shortHelp()
}

const purpose = "Every calculation of this site, what needs attention first: its verdict, its range over all corners of the tolerances, " +
	"and its limit. Enter shows the calculation with this site's numbers put in and what would make a failed one pass."

func (m Model) counts() string {
	counts := map[finding.Verdict]int{}
	for _, f := range m.findings {
		counts[f.Verdict]++
	}
	text := ""
	for _, v := range []finding.Verdict{finding.Fail, finding.Undecided, finding.Marginal, finding.Pass, finding.Info} {
		if counts[v] > 0 {
			text += fmt.Sprintf("   %d %s", counts[v], m.theme.Verdict(v))
		}
	}
	return text
}

// row is one finding: verdict, id, the value's worst corner and its limit.
func (m Model) row(f finding.Finding, selected bool) string {
	lead := "   "
	if selected {
		lead = " " + m.theme.Pick("▸ ", "> ")
	}
	name := f.ID
	if f.Subject != "" {
		name += " " + f.Subject
	}
	value, limit := Words(f)
	wide := max(m.width-16, 20)
	row := m.theme.Fit(theme.Clean(name), min(wide*5/10, 44)) + m.theme.Fit(value, wide*3/10) + limit
	if selected {
		row = m.theme.Paint(theme.Selected, m.theme.Fit(row, wide))
	}
	verdict := m.theme.VerdictSign(f.Verdict) + " " + string(f.Verdict)
	return lead + m.theme.Paint(theme.VerdictRole(f.Verdict), m.theme.Fit(verdict, 12)) + row
}

// Words are a finding's value over its corners and its limit, for people.
func Words(f finding.Finding) (value, limit string) {
	switch f.State {
	case finding.Never:
		value = "never"
	case finding.Unlimited:
		value = "unlimited"
	case finding.Finite:
		low, high := quantity.Engineering(f.Value.Low, f.Unit, 3), quantity.Engineering(f.Value.High, f.Unit, 3)
		value = low
		if low != high {
			value = low + " … " + high
		}
	}
	switch {
	case f.Limit.Low != nil && f.Limit.High != nil:
		limit = quantity.Engineering(*f.Limit.Low, f.Unit, 3) + " … " + quantity.Engineering(*f.Limit.High, f.Unit, 3)
	case f.Limit.Low != nil:
		limit = "≥ " + quantity.Engineering(*f.Limit.Low, f.Unit, 3)
	case f.Limit.High != nil:
		limit = "≤ " + quantity.Engineering(*f.Limit.High, f.Unit, 3)
	}
	return value, limit
}

// Explained is everything known of a finding, as lines of at most width columns.
func Explained(f finding.Finding, t theme.Theme, width int) []string {
	value, limit := Words(f)
	rows := []string{t.Verdict(f.Verdict) + "  " + t.Paint(theme.Title, theme.Clean(f.ID+" "+f.Subject)), theme.Clean(f.Title), ""}
	pair := func(label, text string) {
		if text != "" {
			rows = append(rows, hanging(label, text, t, width)...)
		}
	}
	pair("value", value)
	pair("limit", limit)
	for _, p := range f.Parts {
		pair("part", p.Name+": "+quantity.Engineering(p.Value.Low, p.Unit, 3)+" … "+quantity.Engineering(p.Value.High, p.Unit, 3))
	}
	for _, because := range f.Because {
		pair("because", because)
	}
	pair("remedy", f.Remedy)
	pair("basis", f.Basis)
	for _, c := range f.Cause {
		pair("cause", fmt.Sprintf("%s %.0f %%: %s. Confirm: %s", c.ID, 100*c.Score, strings.Join(c.Evidence, "; "), c.Confirm))
	}
	if e := f.Explanation; e != nil {
		rows = append(rows, "")
		pair("formula", e.Formula)
		for _, s := range e.Symbols {
			pair("with", s.Name+" = "+quantity.Engineering(s.Value, s.Unit, 5)+", "+s.Meaning)
		}
		for _, s := range e.Steps {
			pair("step", s.Name+" = "+s.Expression+" = "+quantity.Engineering(s.Result, s.Unit, 5))
		}
		pair("governs", e.Governs)
		for _, s := range e.Shares {
			pair("moves", fmt.Sprintf("%s %.0f %%", s.Input, 100*s.Share))
		}
		pair("source", e.Source)
		pair("valid", e.Validity)
	}
	return rows
}

// hanging sets a text beside its label, wrapped.
func hanging(label, text string, t theme.Theme, width int) []string {
	const indent = 9
	var rows []string
	line := ""
	flush := func() {
		lead := strings.Repeat(" ", indent)
		if len(rows) == 0 {
			lead = t.Paint(theme.Faint, t.Fit(label, indent))
		}
		rows, line = append(rows, lead+t.Plain(line)), ""
	}
	for _, word := range strings.Fields(theme.Clean(text)) {
		if line != "" && theme.Width(line)+1+theme.Width(word) > width-indent {
			flush()
		}
		if line != "" {
			line += " "
		}
		line += word
	}
	flush()
	return rows
}
