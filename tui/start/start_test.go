package start_test

import (
	"fmt"
	"strings"
	"testing"

	tea "github.com/charmbracelet/bubbletea"

	"chargehand/tui/golden"
	"chargehand/tui/start"
	"chargehand/tui/theme"
)

var some = []start.Entry{
	{Kind: start.Resume, Title: "Ferry Wagtail, aft battery string", Detail: "WAG-017-20261201-093000.chlog, site, stopped at charge.rise", Log: "a"},
	{Kind: start.Walk, Title: "Ferry Wagtail, aft battery string", Detail: "wagtail.site.toml", Site: "wagtail.site.toml"},
	{Kind: start.Rehearse, Title: "rehearse the built-in example", Detail: "a simulated converter, nothing to connect"},
	{Kind: start.Check, Title: "desk checks of the built-in example"},
}

func TestGolden(t *testing.T) {
	for name, m := range map[string]start.Model{
		"first":   start.New(some[2:], theme.Theme{}, 0, 0),
		"some":    start.New(some, theme.Theme{}, 0, 0),
		"refused": start.New(some, theme.Theme{}, 0, 0).WithMessage("wagtail.site.toml names no register map; a walk needs one under [device] map"),
	} {
		var b strings.Builder
		for _, size := range [][2]int{{80, 24}, {100, 30}, {140, 40}} {
			view := m.Resized(size[0], size[1]).View()
			fits(t, view, size[0], size[1])
			fmt.Fprintf(&b, "%d×%d\n%s\n", size[0], size[1], view)
		}
		golden.Compare(t, name, b.String())
	}
	coloured := start.New(some, theme.New(theme.Options{Colour: true, Dark: true}), 80, 24)
	golden.Compare(t, "colour", coloured.View())
}

func fits(t *testing.T, view string, width, height int) {
	t.Helper()
	rows := strings.Split(view, "\n")
	if len(rows) != height {
		t.Errorf("%d×%d: %d rows, want %d", width, height, len(rows), height)
	}
	for i, row := range rows {
		if theme.Width(row) > width {
			t.Errorf("%d×%d: row %d is %d wide", width, height, i, theme.Width(row))
		}
	}
}

// TestTheChosenOneIsSeen goes down a list longer than the screen: the chosen entry is always shown.
func TestTheChosenOneIsSeen(t *testing.T) {
	var many []start.Entry
	for i := range 40 {
		many = append(many, start.Entry{Kind: start.Walk, Title: fmt.Sprintf("site %02d", i), Detail: "folder"})
	}
	m := start.New(many, theme.Theme{}, 80, 24)
	for i := range many {
		fits(t, m.View(), 80, 24)
		if want := fmt.Sprintf("▸ site %02d", i); !strings.Contains(m.View(), want) {
			t.Fatalf("after %d times down the screen lacks %q:\n%s", i, want, m.View())
		}
		m, _ = m.Update(tea.KeyMsg{Type: tea.KeyDown})
	}
}

func TestEnterChooses(t *testing.T) {
	m := start.New(some, theme.Theme{}, 80, 24)
	m, _ = m.Update(tea.KeyMsg{Type: tea.KeyDown})
	m, _ = m.Update(tea.KeyMsg{Type: tea.KeyRunes, Runes: []rune("x")})
	_, cmd := m.Update(tea.KeyMsg{Type: tea.KeyEnter})
	if cmd == nil {
		t.Fatal("Enter chooses nothing")
	}
	if got, ok := cmd().(start.Chosen); !ok || got.Entry != some[1] {
		t.Errorf("chosen %+v, want %+v", got, some[1])
	}
	empty := start.New(nil, theme.Theme{}, 80, 24)
	if _, cmd := empty.Update(tea.KeyMsg{Type: tea.KeyEnter}); cmd != nil {
		t.Error("an empty list chooses something")
	}
}
