package theme

import (
	"fmt"
	"io"
	"strings"

	"github.com/charmbracelet/lipgloss"
	"github.com/muesli/termenv"
)

// Theme is how everything on the screen looks. It is immutable and small to copy. The zero Theme has no colour and draws
// with Unicode.
type Theme struct {
	ascii   bool
	palette *palette // nil: no colour and no attributes at all
}

// palette is what the 16 colours make of each role: the escape sequences before and after a text, and the same as a style.
type palette struct {
	before, after [roleCount]string
	styles        [roleCount]lipgloss.Style
}

// Options are the properties of a [Theme].
type Options struct {
	Colour bool // 16 colours and attributes; without it no escape sequence is written at all
	Dark   bool // the terminal's ground is dark
	ASCII  bool // drawings use no character beyond ASCII
}

// New makes a theme. It asks neither the terminal nor the environment.
func New(o Options) Theme {
	if !o.Colour {
		return Theme{ascii: o.ASCII}
	}
	renderer := lipgloss.NewRenderer(io.Discard)
	renderer.SetColorProfile(termenv.ANSI)
	renderer.SetHasDarkBackground(o.Dark)
	p := &palette{}
	for role, look := range paints {
		p.styles[role] = look.style(renderer, o.Dark)
		// The sequences are taken from lipgloss once: a drawing of some thousand cells cannot afford a style for each.
		p.before[role], p.after[role], _ = strings.Cut(p.styles[role].Render("x"), "x")
	}
	return Theme{ascii: o.ASCII, palette: p}
}

func (p paint) style(renderer *lipgloss.Renderer, dark bool) lipgloss.Style {
	fore, back := p.light, p.lightBack
	if dark {
		fore, back = p.dark, p.darkBack
	}
	s := renderer.NewStyle().Bold(p.bold).Reverse(p.reverse)
	if fore != "" {
		s = s.Foreground(lipgloss.Color(fore))
	}
	if back != "" {
		s = s.Background(lipgloss.Color(back))
	}
	return s
}

// Terminal is what [Choose] must know of the surroundings. DarkGround may ask the terminal and is called at most once,
// only where the answer matters; call Choose before the screen starts.
type Terminal struct {
	IsTerminal bool
	LookupEnv  func(string) (string, bool)
	DarkGround func() bool
}

// Choose makes the theme that a `--theme` name asks for: auto, dark, light or none. Under auto there is no colour where
// the output is no terminal, where NO_COLOR is set and not empty, or on a dumb terminal; an explicit dark or light wins
// over NO_COLOR, as that convention asks of command line options.
func Choose(name string, ascii bool, terminal Terminal) (Theme, error) {
	switch name {
	case "none":
		return New(Options{ASCII: ascii}), nil
	case "dark", "light":
		return New(Options{Colour: true, Dark: name == "dark", ASCII: ascii}), nil
	case "auto", "":
		if !terminal.wantsColour() {
			return New(Options{ASCII: ascii}), nil
		}
		return New(Options{Colour: true, Dark: terminal.isDark(), ASCII: ascii}), nil
	}
	return Theme{}, fmt.Errorf("theme %q: no such theme; write auto, dark, light or none", Clean(name))
}

func (t Terminal) wantsColour() bool {
	if !t.IsTerminal {
		return false
	}
	if v, ok := t.env("NO_COLOR"); ok && v != "" {
		return false
	}
	v, _ := t.env("TERM")
	return v != "dumb"
}

// isDark reads COLORFGBG first ("15;0": the last number is the ground), which is all there is inside a terminal
// multiplexer.
func (t Terminal) isDark() bool {
	if v, ok := t.env("COLORFGBG"); ok {
		switch ground := v[strings.LastIndexByte(v, ';')+1:]; ground {
		case "0", "1", "2", "3", "4", "5", "6", "8":
			return true
		case "7", "9", "10", "11", "12", "13", "14", "15":
			return false
		}
	}
	return t.DarkGround == nil || t.DarkGround()
}

func (t Terminal) env(name string) (string, bool) {
	if t.LookupEnv == nil {
		return "", false
	}
	return t.LookupEnv(name)
}

// ASCII tells whether drawings must do without characters beyond ASCII.
func (t Theme) ASCII() bool { return t.ascii }

// HasColour tells whether the theme writes escape sequences at all.
func (t Theme) HasColour() bool { return t.palette != nil }

// Pick gives the first text, or under --ascii the second.
func (t Theme) Pick(unicode, ascii string) string {
	if t.ascii {
		return ascii
	}
	return unicode
}

// Paint gives the text the look of its role. The text must be clean and on one line.
func (t Theme) Paint(role Role, text string) string {
	if text == "" {
		return ""
	}
	before, after := t.Codes(role)
	return before + text + after
}

// Codes are the escape sequences that begin and end a role, both empty without colour.
func (t Theme) Codes(role Role) (before, after string) {
	if t.palette == nil || role >= roleCount {
		return "", ""
	}
	return t.palette.before[role], t.palette.after[role]
}

// Style is a role's look for use with lipgloss, to be set beside widths and borders. It is bound to this theme's colours,
// whatever the surroundings say.
func (t Theme) Style(role Role) lipgloss.Style {
	if t.palette == nil || role >= roleCount {
		return plainStyle()
	}
	return t.palette.styles[role]
}

func plainStyle() lipgloss.Style {
	renderer := lipgloss.NewRenderer(io.Discard)
	renderer.SetColorProfile(termenv.Ascii)
	return renderer.NewStyle()
}
