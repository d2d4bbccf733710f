package form

import (
	"strings"

	"github.com/charmbracelet/bubbles/key"
	tea "github.com/charmbracelet/bubbletea"

	"chargehand/tui/theme"
)

// Outcome says what a key has done to a form as a whole.
type Outcome uint8

// The outcomes.
const (
	Editing  Outcome = iota // still being filled in
	Accepted                // finished, and every check is content
	Left                    // left by Esc; what was typed is still there
)

// Form is some fields, one of which has the focus. It is a value: a change that is not kept is lost.
type Form struct {
	Keys   KeyMap
	fields []Field
	focus  int
}

// New makes a form with the focus on its first field.
func New(keys KeyMap, fields ...Field) Form {
	return Form{Keys: keys, fields: append([]Field(nil), fields...)}
}

// Update applies a message; everything but keys is ignored. Enter goes on to the next field, and on the last one finishes
// the form, or goes to the first field that is not in order.
func (f Form) Update(msg tea.Msg) (Form, Outcome) {
	k, ok := msg.(tea.KeyMsg)
	if !ok || len(f.fields) == 0 {
		if ok && key.Matches(k, f.Keys.Leave) {
			return f, Left
		}
		return f, Editing
	}
	switch {
	case k.Paste: // a pasted Tab or Enter is text
		return f.withKey(k), Editing
	case key.Matches(k, f.Keys.Leave):
		return f, Left
	case key.Matches(k, f.Keys.Accept) && f.fields[f.focus].hasBlank():
		return f.onBlank(), Editing
	case key.Matches(k, f.Keys.Accept) && f.focus == len(f.fields)-1:
		return f.accept()
	case key.Matches(k, f.Keys.Next), key.Matches(k, f.Keys.Accept):
		return f.moved(1), Editing
	case key.Matches(k, f.Keys.Previous):
		return f.moved(-1), Editing
	}
	return f.withKey(k), Editing
}

func (f Form) withKey(msg tea.KeyMsg) Form {
	return f.with(f.focus, f.fields[f.focus].update(msg, f.Keys))
}

// onBlank puts the cursor on the focused field's next blank.
func (f Form) onBlank() Form {
	field := f.fields[f.focus]
	field.editor, field.touched = field.editor.toBlank(), true
	return f.with(f.focus, field)
}

// with replaces one field in a copy.
func (f Form) with(i int, field Field) Form {
	f.fields = append([]Field(nil), f.fields...)
	f.fields[i] = field
	return f
}

func (f Form) moved(by int) Form {
	left := f.fields[f.focus]
	left.touched = left.touched || left.Value() != ""
	f = f.with(f.focus, left)
	f.focus = (f.focus + by + len(f.fields)) % len(f.fields)
	return f
}

func (f Form) accept() (Form, Outcome) {
	first := -1
	for i, field := range f.fields {
		field.touched = true
		f = f.with(i, field)
		if ok, _ := field.Verdict(); !ok && first < 0 {
			first = i
		}
	}
	if first >= 0 {
		f.focus = first
		return f, Editing
	}
	return f, Accepted
}

// Value is what the field of that id holds; empty where there is none.
func (f Form) Value(id string) string {
	field, _ := f.Field(id)
	return field.Value()
}

// Field gives the field of that id.
func (f Form) Field(id string) (Field, bool) {
	for _, field := range f.fields {
		if field.ID == id {
			return field, true
		}
	}
	return Field{}, false
}

// Fields are the fields in order.
func (f Form) Fields() []Field { return append([]Field(nil), f.fields...) }

// Prepared is the form with a prepared text in one field, which gets the focus, on its first blank if it has one.
func (f Form) Prepared(id, text string) Form {
	f = f.WithValue(id, text).Focus(id)
	if field, ok := f.Field(id); ok && field.hasBlank() {
		field.editor.cursor = 0
		f = f.with(f.focus, field)
		return f.onBlank()
	}
	return f
}

// WithValue is the form with another text in one field.
func (f Form) WithValue(id, text string) Form {
	for i, field := range f.fields {
		if field.ID == id {
			return f.with(i, field.WithValue(text))
		}
	}
	return f
}

// WithCheck is the form with another check of one field.
func (f Form) WithCheck(id string, check Check) Form {
	for i, field := range f.fields {
		if field.ID == id {
			field.Check = check
			return f.with(i, field)
		}
	}
	return f
}

// Focused is the id of the field that the keys act on.
func (f Form) Focused() string {
	if len(f.fields) == 0 {
		return ""
	}
	return f.fields[f.focus].ID
}

// Focus is the form with the focus on the field of that id.
func (f Form) Focus(id string) Form {
	for i, field := range f.fields {
		if field.ID == id {
			f.focus = i
		}
	}
	return f
}

// TakesText tells whether letters go into a field, so that the screen must not take them for keys.
func (f Form) TakesText() bool { return len(f.fields) > 0 && !f.fields[f.focus].IsChoice() }

// IsGood tells whether every check is content.
func (f Form) IsGood() bool {
	for _, field := range f.fields {
		if ok, _ := field.Verdict(); !ok {
			return false
		}
	}
	return true
}

// View draws the form in exactly width columns and at most height rows. Where not all fields find room it shows those
// around the focus.
func (f Form) View(t theme.Theme, width, height int) string {
	if width <= 0 || height <= 0 {
		return ""
	}
	label := 0
	for _, field := range f.fields {
		label = max(label, theme.Width(theme.Clean(field.Label)))
	}
	label = min(label, mostLabel, width/3)
	var lines []string
	from, to := 0, 0
	for i, field := range f.fields {
		if i == f.focus {
			from = len(lines)
		}
		lines = append(lines, field.lines(t, i == f.focus, label, width)...)
		if i == f.focus {
			to = len(lines)
		}
	}
	if len(lines) > height {
		top := min(max(0, (from+to-height)/2), len(lines)-height, from)
		lines = lines[top : top+height]
	}
	return strings.Join(lines, "\n")
}
