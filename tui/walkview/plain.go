package walkview

import (
	"fmt"
	"strings"

	tea "github.com/charmbracelet/bubbletea"

	"chargehand/tui/form"
	"chargehand/tui/theme"
)

// Words is the open point in words, without drawing: for a walk line by line. Width is the longest line.
func (m Model) Words(width int) []string {
	p := m.current()
	stage := fmt.Sprintf("stage %d of 12, %s", p.Stage, shortTitles[p.Stage-1])
	if m.snapshot.State.IsRehearsal() {
		stage = "REHEARSAL, " + stage
	}
	rows := []string{stage, p.ID + ": " + theme.Clean(p.Title) + ", " + string(p.Kind) + " point, " + m.statusWords(p)}
	if m.done != nil {
		return append(rows[:1], strings.Split(strings.Join(m.ending(), "\n"), "\n")...)
	}
	if c, ok := m.chartAt(p); ok {
		rows = append(rows, m.captureWords(c, width)...)
	}
	return append(rows, m.text(p, width)...)
}

// Message is what was recorded or refused last, or what must be done at once.
func (m Model) Message() string {
	if alarm := m.Alarm(); alarm != "" {
		return strings.TrimSpace(theme.Theme{}.Plain(m.messageLine()))
	}
	switch {
	case m.message == "":
		return ""
	case m.refused:
		return "refused: " + theme.Clean(m.message)
	}
	return theme.Clean(m.message)
}

// Onward is what Enter does next, in words.
func (m Model) Onward() string { return m.next(m.current()).label }

// Form is the open prompt's form and what it asks for; false while none is open.
func (m Model) Form() (f form.Form, title string, open bool) {
	if m.prompt == nil {
		return form.Form{}, "", false
	}
	return m.prompt.form, theme.Clean(m.prompt.title), true
}

// Help says how the open prompt is filled in quickly.
func (m Model) Help() (prepared string, fills bool) {
	if m.prompt == nil {
		return "", false
	}
	if n := len(m.prompt.phrases); n > 0 {
		prepared = theme.Clean(m.prompt.phrases[m.prompt.phrase%n])
	}
	return prepared, m.prompt.canFill()
}

// Previewed is what the typed values would move.
func (m Model) Previewed() []string {
	if m.prompt == nil {
		return nil
	}
	return m.prompt.previewed
}

// WithForm puts values into the open prompt's form.
func (m Model) WithForm(f form.Form) Model {
	if m.prompt == nil {
		return m
	}
	p := *m.prompt
	p.form = f
	m.prompt = p.looked()
	return m
}

// Accept takes the open prompt's values over.
func (m Model) Accept() (Model, tea.Cmd) {
	if m.prompt == nil {
		return m, nil
	}
	p := *m.prompt
	m.prompt = nil
	return p.submit(m, p.form)
}

// Keys names the keys of the walk and what they do, in the order of the help page.
func (m Model) Keys() [][2]string {
	var all [][2]string
	for _, group := range m.keys.groups(m.session.Operator != nil) {
		for _, k := range group {
			if k.Enabled() && len(k.Help().Key) == 1 {
				all = append(all, [2]string{k.Help().Key, k.Help().Desc})
			}
		}
	}
	return all
}
