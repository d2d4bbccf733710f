package deskview_test

import (
	"fmt"
	"strings"
	"testing"

	tea "github.com/charmbracelet/bubbletea"

	"chargehand/commission/desk"
	"chargehand/commission/site"
	"chargehand/tui/deskview"
	"chargehand/tui/golden"
	"chargehand/tui/theme"
)

func example(t testing.TB) (site.Site, desk.Sheet) {
	text, _ := site.Example()
	s, _, err := site.Read(site.ExampleName, []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	return s, desk.Check(s, nil)
}

func TestGolden(t *testing.T) {
	s, sheet := example(t)
	enter, g, help := tea.KeyMsg{Type: tea.KeyEnter}, tea.KeyMsg{Type: tea.KeyRunes, Runes: []rune("g")}, tea.KeyMsg{Type: tea.KeyRunes, Runes: []rune("?")}
	left := tea.KeyMsg{Type: tea.KeyRunes, Runes: []rune("[")}
	for _, view := range []struct {
		name string
		keys []tea.KeyMsg
	}{{"list", nil}, {"explained", []tea.KeyMsg{{Type: tea.KeyDown}, enter}}, {"window", []tea.KeyMsg{g}}, {"window-cursor", []tea.KeyMsg{g, left, left, left}}, {"help", []tea.KeyMsg{help}}} {
		var b strings.Builder
		for _, size := range [][2]int{{80, 24}, {100, 30}, {140, 40}} {
			for _, th := range []theme.Theme{theme.New(theme.Options{Colour: true, Dark: true}), {}} {
				m := deskview.New(s, sheet.Findings, th, size[0], size[1])
				for _, k := range view.keys {
					m, _ = m.Update(k)
				}
				text := m.View()
				if rows := strings.Split(text, "\n"); len(rows) != size[1] {
					t.Errorf("%s %v: %d rows, want %d", view.name, size, len(rows), size[1])
				} else {
					for i, row := range rows {
						if theme.Width(row) > size[0] {
							t.Errorf("%s %v: row %d is %d wide", view.name, size, i, theme.Width(row))
						}
					}
				}
				fmt.Fprintf(&b, "%d×%d\n%s\n", size[0], size[1], text)
			}
		}
		golden.Compare(t, view.name, b.String())
	}
}

// TestTheGravestComesFirst: the built-in example has one marginal finding on paper, the discharge label.
func TestTheGravestComesFirst(t *testing.T) {
	s, sheet := example(t)
	view := deskview.New(s, sheet.Findings, theme.Theme{}, 100, 30).View()
	var first string
	for _, row := range strings.Split(view, "\n") {
		if strings.Contains(row, "undecided") {
			continue // no register map is given here, so droop.registers cannot be decided
		}
		if strings.Contains(row, ".") && strings.Contains(row, "marginal") {
			first = row
			break
		}
		if strings.Contains(row, " pass ") && strings.Contains(row, ".") {
			t.Fatalf("a passed finding stands before the marginal one:\n%s", view)
		}
	}
	if !strings.Contains(first, "discharge.touch-safe") {
		t.Errorf("first marginal row = %q, want discharge.touch-safe", first)
	}
}
