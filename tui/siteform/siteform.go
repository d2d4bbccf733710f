package siteform

import (
	"errors"
	"fmt"
	"maps"
	"strings"

	"github.com/charmbracelet/bubbles/key"
	tea "github.com/charmbracelet/bubbletea"

	"chargehand/commission/document"
	"chargehand/commission/finding"
	"chargehand/commission/site"
	"chargehand/tui/deskview"
	"chargehand/tui/form"
	"chargehand/tui/theme"
)

// Model is the screen. It is a tea.Model of its own, since it is the whole program while a file is made.
type Model struct {
	theme         theme.Theme
	keys          form.Keys
	width, height int
	name          string // of the file
	check         func(site.Site) []finding.Finding

	text     string            // the file as it reads now
	before   []finding.Finding // as the focused field was come to
	findings []finding.Finding
	moved    []string
	bad      map[string]string // what was typed and does not read, by path; never changed, only replaced
	because  map[string]string // why; likewise

	sections []section
	at       int
	form     form.Form
	explain  bool
	leaving  bool // Esc was pressed once
	message  string
	saved    bool
}

// New makes the screen of a file that reads; check calculates a site's findings, purely and quickly.
func New(name, text string, check func(site.Site) []finding.Finding, t theme.Theme) (Model, error) {
	s, _, err := site.Read(name, []byte(text))
	if err != nil {
		return Model{}, err
	}
	m := Model{theme: t, keys: form.DefaultKeys(), name: name, check: check, text: text, sections: sections(text),
		bad: map[string]string{}, because: map[string]string{}}
	m.findings = check(s)
	return m.opened(0), nil
}

// Text is the file as it reads, and whether it is to be written.
func (m Model) Text() (text string, save bool) { return m.text, m.saved }

// Init begins nothing.
func (m Model) Init() tea.Cmd { return tea.SetWindowTitle("chargehand " + theme.Clean(m.name)) }

// opened shows a section.
func (m Model) opened(at int) Model {
	m.at = min(max(at, 0), len(m.sections)-1)
	var fields []form.Field
	for _, f := range m.sections[m.at].fields {
		value, _ := site.Value([]byte(m.text), f.path)
		if typed, bad := m.bad[f.path]; bad {
			value = typed
		}
		fields = append(fields, form.Input(f.path, f.label, "", m.verdict(f.path)).WithValue(value))
	}
	m.form = form.New(form.DefaultKeyMap(), fields...)
	m.before, m.moved = m.findings, nil
	return m
}

// verdict is what was found of a field when it was typed; the drawing calculates nothing.
func (m Model) verdict(path string) form.Check {
	because, bad := m.because[path]
	return func(string) (bool, string) { return !bad, because }
}

const saveKey = "ctrl+s"

// Update takes one message.
func (m Model) Update(msg tea.Msg) (tea.Model, tea.Cmd) {
	switch msg := msg.(type) {
	case tea.WindowSizeMsg:
		m.width, m.height = msg.Width, msg.Height
	case tea.KeyMsg:
		return m.pressed(msg)
	}
	return m, nil
}

func (m Model) pressed(msg tea.KeyMsg) (Model, tea.Cmd) {
	leaving := m.leaving
	m.leaving, m.message = false, ""
	if m.explain && msg.Type != tea.KeyCtrlC {
		m.explain = false
		return m, nil
	}
	switch {
	case msg.Type == tea.KeyCtrlC:
		return m, tea.Quit
	case msg.Paste:
	case msg.String() == saveKey:
		return m.save()
	case msg.Type == tea.KeyF1:
		m.explain = true
		return m, nil
	case key.Matches(msg, m.keys.PageDown):
		return m.opened(m.at + 1), nil
	case key.Matches(msg, m.keys.PageUp):
		return m.opened(m.at - 1), nil
	case key.Matches(msg, m.keys.Back) && leaving:
		return m, tea.Quit
	case key.Matches(msg, m.keys.Back):
		m.leaving, m.message = true, "Esc again leaves and writes nothing; Ctrl+S writes "+m.name
		return m, nil
	case key.Matches(msg, m.keys.Open) && m.form.Focused() == m.lastField():
		return m.opened((m.at + 1) % len(m.sections)), nil
	}
	path := m.form.Focused()
	m.form, _ = m.form.Update(msg)
	m = m.typed(path)
	if m.form.Focused() != path {
		m.before, m.moved = m.findings, nil
	}
	return m, nil
}

func (m Model) lastField() string {
	fields := m.sections[m.at].fields
	if len(fields) == 0 {
		return ""
	}
	return fields[len(fields)-1].path
}

// typed takes a field's value over where the file still reads with it, and says what is wrong where it does not. Values that
// were wrong only together with the old one are tried again.
func (m Model) typed(path string) Model {
	value := m.form.Value(path)
	if now, _ := site.Value([]byte(m.text), path); now == value && m.bad[path] == "" {
		return m
	}
	m.bad, m.because = maps.Clone(m.bad), maps.Clone(m.because)
	m.bad[path] = value
	for again := true; again; {
		again = false
		for p, v := range m.bad {
			text, err := m.with(p, v)
			if err != nil {
				m.because[p] = err.Error()
				continue
			}
			delete(m.bad, p)
			delete(m.because, p)
			m, again = m.reading(text), true
		}
	}
	for _, f := range m.sections[m.at].fields {
		m.form = m.form.WithCheck(f.path, m.verdict(f.path))
	}
	return m
}

// with is the file with one value in it, if it reads.
func (m Model) with(path, value string) (string, error) {
	text, err := site.Revise([]byte(m.text), map[string]string{path: value})
	if err != nil {
		return "", err
	}
	if _, _, err = site.Read(m.name, text); err == nil {
		return string(text), nil
	}
	var problems *document.Problems
	if errors.As(err, &problems) && len(problems.List) > 0 {
		p := problems.List[0]
		words := "wanted " + p.Wanted
		if p.Example != "" {
			words += ", for example " + p.Example
		}
		return "", errors.New(words)
	}
	return "", err
}

// reading takes another text over, and its findings.
func (m Model) reading(text string) Model {
	m.text = text
	if s, _, err := site.Read(m.name, []byte(text)); err == nil {
		m.findings = m.check(s)
		m.moved = deskview.Moves(m.before, m.findings)
	}
	return m
}

// save ends the form where every value reads, else goes to the first that does not.
func (m Model) save() (Model, tea.Cmd) {
	for i, s := range m.sections {
		for _, f := range s.fields {
			if _, bad := m.bad[f.path]; bad {
				m = m.opened(i)
				m.form = m.form.Focus(f.path)
				m.message = "not written: " + s.name + " " + f.label + " does not read"
				return m, nil
			}
		}
	}
	m.saved = true
	return m, tea.Quit
}

// View draws the screen in exactly its size.
func (m Model) View() string {
	const leastWidth, leastHeight = 80, 24
	switch {
	case m.width <= 0 || m.height <= 0:
		return ""
	case m.width < leastWidth || m.height < leastHeight:
		return m.theme.Clip(fmt.Sprintf("needs %d columns and %d rows; nothing is lost", leastWidth, leastHeight), m.width)
	}
	rule := m.theme.Paint(theme.Wire, strings.Repeat(m.theme.Pick("─", "-"), m.width))
	rows := []string{" " + m.theme.Paint(theme.Title, theme.Clean(m.name)) + "  " + m.counts(), rule, m.tabs(), ""}
	if m.explain {
		page := form.HelpPage(m.theme, m.width-4, m.height-6, "A site file, value by value", purpose, m.groups())
		for _, l := range strings.Split(page, "\n") {
			rows = append(rows, "  "+l)
		}
	} else {
		rows = append(rows, m.body(m.height-len(rows)-2)...)
	}
	for len(rows) < m.height-2 {
		rows = append(rows, "")
	}
	line := rule
	if m.message != "" {
		line = " " + m.theme.Paint(theme.Abnormal, theme.Clean(m.message))
	}
	rows = append(rows[:m.height-2], line, m.hints())
	for i := range rows {
		rows[i] = m.theme.Clip(rows[i], m.width)
	}
	return strings.Join(rows, "\n")
}

const purpose = "Every value of the file with its unit and, where it has one, its tolerance: \"33 Ω ±5 %\". What is wrong stands beside its " +
	"field, and what moves with a value below. Comments and lists of the file stay as they are; tables that your site lacks are " +
	"taken out with an editor afterwards. `chargehand check` on the file shows all findings."

// counts are the verdicts as they stand.
func (m Model) counts() string {
	counts := map[finding.Verdict]int{}
	for _, f := range m.findings {
		counts[f.Verdict]++
	}
	var parts []string
	for _, v := range []finding.Verdict{finding.Fail, finding.Undecided, finding.Marginal, finding.Pass} {
		if counts[v] > 0 {
			parts = append(parts, fmt.Sprintf("%d %s", counts[v], m.theme.Verdict(v)))
		}
	}
	return strings.Join(parts, "  ")
}

// tabs are the sections around the open one.
func (m Model) tabs() string {
	line := fmt.Sprintf(" %d of %d  ", m.at+1, len(m.sections))
	for i := max(0, min(m.at-1, len(m.sections)-5)); i < len(m.sections); i++ {
		name := " " + theme.Clean(m.sections[i].name) + " "
		if theme.Width(line)+theme.Width(name) > m.width-2 {
			break
		}
		if i == m.at {
			name = m.theme.Paint(theme.Selected, name)
			if !m.theme.HasColour() {
				name = "[" + theme.Clean(m.sections[i].name) + "]"
			}
		}
		line += name
	}
	return line
}

// body is the fields, then what the file says of the focused one and what moves with it.
func (m Model) body(height int) []string {
	below := m.below(max(height/3, 4))
	rows := strings.Split(strings.TrimRight(m.form.View(m.theme, m.width-2, height-len(below)-1), "\n"), "\n")
	for len(rows) < height-len(below) {
		rows = append(rows, "")
	}
	return append(rows, below...)
}

func (m Model) below(most int) []string {
	var rows []string
	for _, f := range m.sections[m.at].fields {
		if f.path == m.form.Focused() {
			rows = append(rows, "  "+m.theme.Paint(theme.Faint, f.path)+"  "+m.theme.Plain(theme.Clean(f.says)))
		}
	}
	for _, moved := range m.moved {
		rows = append(rows, "  "+m.theme.Paint(theme.Abnormal, m.theme.Plain(theme.Clean(moved))))
	}
	return rows[:min(len(rows), most)]
}

func (m Model) groups() [][]key.Binding {
	k := m.keys
	k.Open.SetHelp("Enter", "next value")
	k.PageDown.SetHelp("PgDn", "next table")
	k.PageUp.SetHelp("PgUp", "table before")
	save := key.NewBinding(key.WithKeys(saveKey), key.WithHelp("Ctrl+S", "write the file"))
	help := key.NewBinding(key.WithKeys("f1"), key.WithHelp("F1", "explain"))
	k.Back.SetHelp("Esc", "leave")
	return [][]key.Binding{{k.Open, k.PageDown, save, k.Back, help, k.PageUp}}
}

func (m Model) hints() string {
	return " " + form.HelpLine(m.theme, m.width-2, m.groups()[0])
}
