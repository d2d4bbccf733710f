package form

import "github.com/charmbracelet/bubbles/key"

// KeyMap are the keys inside a form.
type KeyMap struct {
	Next, Previous, Accept, Leave key.Binding

	Left, Right, WordLeft, WordRight, Start, End                      key.Binding
	DeleteBack, DeleteForward, DeleteWord, DeleteToStart, DeleteToEnd key.Binding
}

// DefaultKeyMap are the keys inside a form. Ctrl+V is not among them: the terminal itself pastes.
func DefaultKeyMap() KeyMap {
	return KeyMap{
		Next:          bind("Tab", "next field", "tab", "down"),
		Previous:      bind("Shift+Tab", "field before", "shift+tab", "up"),
		Accept:        bind("Enter", "next, and take over at the last", "enter"),
		Leave:         bind("Esc", "back, keeps what is typed", "esc"),
		Left:          bind("←", "a letter back", "left", "ctrl+b"),
		Right:         bind("→", "a letter on", "right", "ctrl+f"),
		WordLeft:      bind("Ctrl+←", "a word back", "ctrl+left", "alt+left", "alt+b"),
		WordRight:     bind("Ctrl+→", "a word on", "ctrl+right", "alt+right", "alt+f"),
		Start:         bind("Home", "to the beginning", "home", "ctrl+a"),
		End:           bind("End", "to the end", "end", "ctrl+e"),
		DeleteBack:    bind("Backspace", "delete the letter before", "backspace", "ctrl+h"),
		DeleteForward: bind("Del", "delete the letter after", "delete", "ctrl+d"),
		DeleteWord:    bind("Ctrl+W", "delete the word before", "ctrl+w", "alt+backspace"),
		DeleteToStart: bind("Ctrl+U", "delete to the beginning", "ctrl+u"),
		DeleteToEnd:   bind("Ctrl+K", "delete to the end", "ctrl+k"),
	}
}

// ShortHelp is what the bottom line shows.
func (k KeyMap) ShortHelp() []key.Binding {
	return []key.Binding{k.Accept, k.Next, k.Previous, k.Leave}
}

// FullHelp is what the page behind the question mark shows.
func (k KeyMap) FullHelp() [][]key.Binding {
	return [][]key.Binding{
		{k.Accept, k.Next, k.Previous, k.Leave},
		{k.Left, k.Right, k.WordLeft, k.WordRight, k.Start, k.End},
		{k.DeleteBack, k.DeleteForward, k.DeleteWord, k.DeleteToStart, k.DeleteToEnd},
	}
}

// Keys are the keys of all screens, so that no letter means two things. A screen's own key map takes its bindings from
// here. While a text field has the focus, letters go into it and only the other keys work.
type Keys struct {
	// Moving about.
	Up, Down, Left, Right key.Binding
	PageUp, PageDown      key.Binding
	First, Last           key.Binding
	NextPane, BeforePane  key.Binding
	Open, Back            key.Binding

	// Working on a point.
	Arm, Stop, Note, Punch, NotApplicable, Witness, Typed key.Binding

	// Looking closer.
	CursorLeft, CursorRight, Far, Bell, Explain, Quit key.Binding
}

// DefaultKeys are the keys of all screens.
func DefaultKeys() Keys {
	return Keys{
		Up:            bind("↑", "up", "up"),
		Down:          bind("↓", "down", "down"),
		Left:          bind("←", "left", "left"),
		Right:         bind("→", "right", "right"),
		PageUp:        bind("PgUp", "a page up", "pgup"),
		PageDown:      bind("PgDn", "a page down", "pgdown"),
		First:         bind("Home", "first", "home"),
		Last:          bind("End", "last", "end"),
		NextPane:      bind("Tab", "next part", "tab"),
		BeforePane:    bind("Shift+Tab", "part before", "shift+tab"),
		Open:          bind("Enter", "open", "enter"),
		Back:          bind("Esc", "back", "esc"),
		Arm:           bind("a", "arm the capture", "a"),
		Stop:          bind("s", "stop the capture", "s"),
		Note:          bind("n", "note", "n"),
		Punch:         bind("p", "punch item", "p"),
		NotApplicable: bind("x", "not applicable", "x"),
		Witness:       bind("w", "witness", "w"),
		Typed:         bind("i", "instrument reading", "i"),
		CursorLeft:    bind("[", "cursor back", "["),
		CursorRight:   bind("]", "cursor on", "]"),
		Far:           bind("f", "far view", "f"),
		Bell:          bind("b", "bell on or off", "b"),
		Explain:       bind("?", "explain", "?", "f1"),
		Quit:          bind("Ctrl+C", "leave the program", "ctrl+c"),
	}
}

// ShortHelp is what stands at the bottom of a screen that has nothing of its own to say.
func (k Keys) ShortHelp() []key.Binding {
	return []key.Binding{k.Open, k.Far, k.Note, k.Punch, k.Explain, k.Back}
}

// FullHelp is every key, by what it is for.
func (k Keys) FullHelp() [][]key.Binding {
	return [][]key.Binding{
		{k.Up, k.Down, k.Left, k.Right, k.PageUp, k.PageDown, k.First, k.Last, k.NextPane, k.BeforePane, k.Open, k.Back},
		{k.Arm, k.Stop, k.Typed, k.Note, k.Punch, k.Witness, k.NotApplicable},
		{k.CursorLeft, k.CursorRight, k.Far, k.Bell, k.Explain, k.Quit},
	}
}

func bind(shown, does string, keys ...string) key.Binding {
	return key.NewBinding(key.WithKeys(keys...), key.WithHelp(shown, does))
}
