package walkview

import (
	"github.com/charmbracelet/bubbles/key"

	"chargehand/tui/form"
)

// keyMap is every key of this screen: those all screens share, and the walk's own.
type keyMap struct {
	form.Keys
	Operate, Again, Fail, Deviate, Findings key.Binding
}

func keys() keyMap {
	own := func(name, does string) key.Binding {
		return key.NewBinding(key.WithKeys(name), key.WithHelp(name, does))
	}
	k := keyMap{
		Keys:     form.DefaultKeys(),
		Operate:  own("o", "operate the simulated plant"),
		Again:    own("r", "read again, or reopen"),
		Fail:     own("u", "unmet: fail the point"),
		Deviate:  own("d", "accept by deviation"),
		Findings: own("c", "desk checks"),
	}
	k.Open.SetHelp("Enter", "the next thing")
	k.Up.SetHelp("↑", "point before")
	k.Down.SetHelp("↓", "next point")
	k.Left.SetHelp("←", "stage before")
	k.Right.SetHelp("→", "next stage")
	k.PageDown.SetHelp("PgDn", "text on")
	k.PageUp.SetHelp("PgUp", "text back")
	return k
}

// groups are the keys for the help page.
func (k keyMap) groups(simulated bool) [][]key.Binding {
	k.Operate.SetEnabled(simulated)
	return [][]key.Binding{
		{k.Open, k.Up, k.Down, k.Left, k.Right, k.PageDown, k.PageUp, k.Back},
		{k.Stop, k.Operate, k.Again, k.Typed, k.Fail, k.NotApplicable, k.Deviate, k.Punch, k.Note},
		{k.Far, k.CursorLeft, k.CursorRight, k.Findings, k.Bell, k.Explain},
	}
}
