package form

import (
	"slices"
	"strings"

	"github.com/charmbracelet/bubbles/key"
	tea "github.com/charmbracelet/bubbletea"

	"chargehand/tui/theme"
)

// Check judges a text as it is typed. The message says what is wrong and what to write, or of a good text how it was
// understood ("= 0.0042 F"); it may be empty. A check is pure and quick: it runs at every key and every drawing.
type Check func(text string) (ok bool, message string)

// Field is one thing to fill in. Make it with [Input], [Note] or [Choice].
type Field struct {
	ID, Label string
	Unit      string // a hint what to write behind the number: "V", "Ω ±5 %"
	Check     Check  // nil: every text is good

	options []string // of a choice
	editor  editor
	touched bool // somebody was here: what is wrong may be said loudly
}

// Input is a field for a value with its unit, checked as it is typed.
func Input(id, label, unit string, check Check) Field {
	return Field{ID: id, Label: label, Unit: unit, Check: check}
}

// Note is a field for free text on one line.
func Note(id, label string) Field { return Field{ID: id, Label: label} }

// Choice is a field that takes one of some texts, at first the first.
func Choice(id, label string, options ...string) Field {
	f := Field{ID: id, Label: label, options: slices.Clone(options)}
	if len(options) > 0 {
		f.editor.text = options[0]
	}
	return f
}

// Value is what the field holds, as typed but for blanks around it.
func (f Field) Value() string {
	if f.IsChoice() {
		return f.editor.text
	}
	return strings.TrimSpace(f.editor.text)
}

// WithValue is the field holding another text. A choice takes only what it offers.
func (f Field) WithValue(text string) Field {
	switch {
	case !f.IsChoice():
		f.editor = newEditor(text)
	case slices.Contains(f.options, text):
		f.editor.text = text
	}
	return f
}

// hasBlank tells whether something of a prepared text is still to be written.
func (f Field) hasBlank() bool { return !f.IsChoice() && strings.Contains(f.editor.text, Blank) }

// IsChoice tells whether the field offers options instead of taking text; letters then stay free for other keys.
func (f Field) IsChoice() bool { return f.options != nil }

// Options are what a choice offers; nil for a field that takes text.
func (f Field) Options() []string { return slices.Clone(f.options) }

// Verdict is what the check says to the present value.
func (f Field) Verdict() (ok bool, message string) {
	if f.hasBlank() {
		return false, "write what stands for " + Blank
	}
	if f.Check == nil {
		return true, ""
	}
	return f.Check(f.Value())
}

func (f Field) update(msg tea.KeyMsg, keys KeyMap) Field {
	if f.IsChoice() {
		return f.choose(msg, keys)
	}
	var changed bool
	f.editor, changed = f.editor.update(msg, keys)
	f.touched = f.touched || changed
	return f
}

func (f Field) choose(msg tea.KeyMsg, keys KeyMap) Field {
	at := slices.Index(f.options, f.editor.text)
	switch {
	case len(f.options) == 0:
		return f
	case key.Matches(msg, keys.Right) || msg.Type == tea.KeySpace:
		at = (at + 1) % len(f.options)
	case key.Matches(msg, keys.Left):
		at = (max(at, 0) + len(f.options) - 1) % len(f.options)
	default:
		return f
	}
	f.editor.text, f.touched = f.options[at], true
	return f
}

// The columns of a field: its label, then what is typed, then the unit and what the check says.
const (
	leastInput = 12
	mostInput  = 28
	mostLabel  = 30

	mostMessage = 3 // lines of what the check says
)

// lines draws the field in exactly width columns: on one line, or with the message on further ones where it finds no room
// beside the field.
func (f Field) lines(t theme.Theme, focused bool, label, width int) []string {
	mark, role := "  ", theme.Text
	if focused {
		mark, role = t.Pick("▸ ", "> "), theme.Title
	}
	room := max(width-2-label-1, 0)
	input := min(max(room/3, leastInput), mostInput, room)
	if f.Unit == "" && !f.IsChoice() {
		input = room // text takes the whole line
	}
	line := t.Paint(role, mark+t.Fit(theme.Clean(f.Label), label)) + " " + f.input(t, focused, input)
	used := 2 + label + 1 + input
	if unit := t.Plain(theme.Clean(f.Unit)); unit != "" {
		line += " " + t.Paint(theme.Faint, unit)
		used += 1 + theme.Width(unit)
	}
	message, look := f.message(t)
	switch {
	case message == "":
		return []string{t.Fit(line, width)}
	case used+2+theme.Width(message) <= width:
		return []string{t.Fit(line+"  "+t.Paint(look, message), width)}
	}
	indent := label + 3
	if indent+theme.Width(message) > width {
		indent = 4
	}
	lines := []string{t.Fit(line, width)}
	for _, part := range wrap(message, max(width-indent, 1)) {
		lines = append(lines, t.Fit(strings.Repeat(" ", indent)+t.Paint(look, part), width))
	}
	return lines[:min(len(lines), 1+mostMessage)]
}

// message is what the check says, with a sign before it. As long as nobody has typed, what is missing is said quietly.
func (f Field) message(t theme.Theme) (text string, role theme.Role) {
	ok, message := f.Verdict()
	message = t.Plain(theme.Clean(message))
	switch {
	case !ok && !f.touched && f.Value() == "":
		return message, theme.Faint
	case !ok:
		return t.Pick("✗ ", "X ") + message, theme.Danger
	case message != "":
		return t.Pick("✓ ", "+ ") + message, theme.Normal
	}
	return "", theme.Text
}

func (f Field) input(t theme.Theme, focused bool, width int) string {
	if width < 3 {
		return t.Fit("", width)
	}
	if f.IsChoice() {
		text := t.Fit(theme.Clean(f.editor.text), width-4)
		left, right := t.Pick("◂ ", "< "), t.Pick(" ▸", " >")
		if focused {
			return t.Paint(theme.Key, left) + t.Paint(theme.Selected, text) + t.Paint(theme.Key, right)
		}
		return t.Paint(theme.Faint, left) + text + t.Paint(theme.Faint, right)
	}
	return t.Paint(theme.Faint, "[") + f.editor.view(t, width-2, focused) + t.Paint(theme.Faint, "]")
}
