package form

import (
	"strings"
	"unicode"

	"github.com/charmbracelet/bubbles/key"
	tea "github.com/charmbracelet/bubbletea"
	"github.com/charmbracelet/x/ansi"

	"chargehand/tui/theme"
)

// mostCharacters is how long a text may grow. A paste of a whole file is cut, not refused.
const mostCharacters = 2000

// editor is one line of text and the place in it where the next letter goes. The text is clean.
type editor struct {
	text   string
	cursor int // bytes before the cursor, at the edge of a character
}

func newEditor(text string) editor {
	text = theme.Clean(text)
	return editor{text, len(text)}
}

// update applies a key; changed tells whether the text is another one now.
func (e editor) update(msg tea.KeyMsg, keys KeyMap) (next editor, changed bool) {
	before := e.text
	switch {
	case key.Matches(msg, keys.Left):
		e.cursor = e.previous()
	case key.Matches(msg, keys.Right):
		e.cursor = e.next()
	case key.Matches(msg, keys.WordLeft):
		e.cursor = e.wordLeft()
	case key.Matches(msg, keys.WordRight):
		e.cursor = e.wordRight()
	case key.Matches(msg, keys.Start):
		e.cursor = 0
	case key.Matches(msg, keys.End):
		e.cursor = len(e.text)
	case key.Matches(msg, keys.DeleteBack):
		e = e.cut(e.previous(), e.cursor)
	case key.Matches(msg, keys.DeleteForward):
		e = e.cut(e.cursor, e.next())
	case key.Matches(msg, keys.DeleteWord):
		e = e.cut(e.wordLeft(), e.cursor)
	case key.Matches(msg, keys.DeleteToStart):
		e = e.cut(0, e.cursor)
	case key.Matches(msg, keys.DeleteToEnd):
		e = e.cut(e.cursor, len(e.text))
	case (msg.Type == tea.KeyRunes || msg.Type == tea.KeySpace) && !msg.Alt:
		e = e.insert(string(msg.Runes))
	}
	return e, e.text != before
}

// Blank stands in a prepared text for what is still to be written.
const Blank = "__"

// toBlank puts the cursor on the next blank from where it stands, or on the first; a text without one stays as it is.
func (e editor) toBlank() editor {
	if i := strings.Index(e.text[e.cursor:], Blank); i >= 0 {
		e.cursor += i
	} else if i := strings.Index(e.text, Blank); i >= 0 {
		e.cursor = i
	}
	return e
}

// insert puts text before the cursor, in place of a blank that stands there. The whole is cleaned once more, since a mark
// may join the letter before it.
func (e editor) insert(text string) editor {
	if strings.HasPrefix(e.text[e.cursor:], Blank) && strings.TrimSpace(text) != "" {
		e = e.cut(e.cursor, e.cursor+len(Blank))
	}
	head := theme.Clean(e.text[:e.cursor] + text)
	tail := e.text[e.cursor:]
	if room := mostCharacters - len(tail); len(head) > room {
		head = cutAtCharacter(head, max(room, 0))
	}
	return editor{head + tail, len(head)}
}

// cutAtCharacter shortens a text to at most so many bytes, at the edge of a character.
func cutAtCharacter(text string, most int) string {
	end := 0
	for end < len(text) {
		cluster, _ := ansi.FirstGraphemeCluster(text[end:], ansi.GraphemeWidth)
		if end+len(cluster) > most {
			break
		}
		end += len(cluster)
	}
	return text[:end]
}

func (e editor) cut(from, to int) editor {
	return editor{e.text[:from] + e.text[to:], from}
}

// next and previous are the edges of the character after and before the cursor.
func (e editor) next() int {
	if e.cursor >= len(e.text) {
		return len(e.text)
	}
	cluster, _ := ansi.FirstGraphemeCluster(e.text[e.cursor:], ansi.GraphemeWidth)
	return e.cursor + len(cluster)
}

func (e editor) previous() int {
	last := 0
	for at := 0; at < e.cursor; {
		last = at
		cluster, _ := ansi.FirstGraphemeCluster(e.text[at:], ansi.GraphemeWidth)
		at += len(cluster)
	}
	return last
}

func (e editor) wordLeft() int {
	head := strings.TrimRightFunc(e.text[:e.cursor], unicode.IsSpace)
	return strings.LastIndexByte(head, ' ') + 1
}

func (e editor) wordRight() int {
	tail := e.text[e.cursor:]
	skipped := len(tail) - len(strings.TrimLeftFunc(tail, unicode.IsSpace))
	if i := strings.IndexByte(tail[skipped:], ' '); i >= 0 {
		return e.cursor + skipped + i
	}
	return len(e.text)
}

// view shows the part of the text around the cursor in exactly width columns. Without colour the cursor is a stroke
// before the character instead of a field of the other colour.
func (e editor) view(t theme.Theme, width int, focused bool) string {
	if width <= 0 {
		return ""
	}
	if !focused {
		return t.Fit(e.text, width)
	}
	head, under, tail := e.text[:e.cursor], e.text[e.cursor:e.next()], e.text[e.next():]
	if under == "" {
		under = " "
	}
	stroke := ""
	if !t.HasColour() {
		stroke = t.Pick("▏", "|")
	}
	room := width - theme.Width(under) - theme.Width(stroke)
	if room < 0 {
		return t.Fit(stroke, width)
	}
	if over := theme.Width(head) - room; over > 0 {
		head = t.Pick("…", "<") + ansi.TruncateLeft(head, over+1, "")
	}
	tail = t.Fit(tail, max(width-theme.Width(head)-theme.Width(under)-theme.Width(stroke), 0))
	return t.Fit(head+stroke+t.Paint(theme.Selected, under)+tail, width)
}
