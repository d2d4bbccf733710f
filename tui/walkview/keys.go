package walkview

import (
	"github.com/charmbracelet/bubbles/key"

	"chargehand/tui/form"
)

// keyMap is every key of this screen: those all screens share, and the walk's own.
type keyMap struct {
	form.Keys
	Operate, Hasten, Again, Fail, Deviate, Clear, Findings, Link, Instrument, Change, Place key.Binding
}

func keys() keyMap {
	own := func(name, does string) key.Binding {
		return key.NewBinding(key.WithKeys(name), key.WithHelp(name, does))
	}
	k := keyMap{
		Keys:       form.DefaultKeys(),
		Operate:    own("o", "the plant's hand"),
		Hasten:     own("h", "hasten the wait"),
		Again:      own("r", "read again, or reopen"),
		Fail:       own("u", "unmet: fail the point"),
		Deviate:    own("d", "accept by deviation"),
		Clear:      own("k", "clear a punch item"),
		Findings:   own("c", "calculated findings"),
		Link:       own("l", "every signal of the link"),
		Instrument: own("m", "enter a meter"),
		Change:     own("v", "change a value of the site"),
		Place:      own("g", "go on with the log elsewhere"),
	}
	k.Open.SetHelp("Enter", "the next thing")
	k.Up.SetHelp("↑", "point before")
	k.Down.SetHelp("↓", "next point")
	k.Left.SetHelp("←", "stage before")
	k.Right.SetHelp("→", "next stage")
	k.PageDown.SetHelp("PgDn", "text on")
	k.PageUp.SetHelp("PgUp", "text back")
	k.NextPane.SetHelp("Tab", "chart or text")
	k.Witness.SetHelp("w", "who takes part or signs")
	k.Far.SetHelp("f", "far")
	k.Explain.SetHelp("?", "keys")
	k.Back.SetHelp("Esc", "leave")
	k.Stop.SetHelp("s", "stop")
	return k
}

// groups are the keys for the help page.
func (k keyMap) groups(simulated bool) [][]key.Binding {
	k.Operate.SetEnabled(simulated)
	k.Hasten.SetEnabled(simulated)
	k.Far.SetHelp("f", "far view: large digits")
	k.Stop.SetHelp("s", "stop the capture")
	k.Explain.SetHelp("?", "this page")
	k.Back.SetHelp("Esc", "leave; the log keeps everything")
	return [][]key.Binding{
		{k.Open, k.Up, k.Down, k.Left, k.Right, k.NextPane, k.PageDown, k.PageUp},
		{k.Typed, k.Again, k.Stop, k.Operate, k.Hasten, k.Far, k.CursorLeft, k.CursorRight},
		{k.Fail, k.NotApplicable, k.Deviate, k.Punch, k.Clear, k.Note, k.Witness, k.Instrument, k.Change},
		{k.Findings, k.Link, k.Bell, k.Place, k.Explain, k.Back},
	}
}
