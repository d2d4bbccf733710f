package siteform_test

import (
	"fmt"
	"strings"
	"testing"

	tea "github.com/charmbracelet/bubbletea"

	"chargehand/commission/desk"
	"chargehand/commission/finding"
	"chargehand/commission/site"
	"chargehand/tui/golden"
	"chargehand/tui/siteform"
	"chargehand/tui/theme"
)

func open(t *testing.T, th theme.Theme, width, height int) tea.Model {
	t.Helper()
	text, err := site.Template("my.map.toml")
	if err != nil {
		t.Fatal(err)
	}
	m, err := siteform.New("my.site.toml", text, func(s site.Site) []finding.Finding { return desk.Findings(s, nil) }, th)
	if err != nil {
		t.Fatal(err)
	}
	sized, _ := m.Update(tea.WindowSizeMsg{Width: width, Height: height})
	return sized
}

func press(m tea.Model, keys ...tea.KeyType) tea.Model {
	for _, k := range keys {
		m, _ = m.Update(tea.KeyMsg{Type: k})
	}
	return m
}

func write(m tea.Model, text string) tea.Model {
	m, _ = m.Update(tea.KeyMsg{Type: tea.KeyCtrlU})
	m, _ = m.Update(tea.KeyMsg{Type: tea.KeyRunes, Runes: []rune(text)})
	return m
}

func TestGolden(t *testing.T) {
	for name, prepare := range map[string]func(tea.Model) tea.Model{
		"first": func(m tea.Model) tea.Model { return m },
		"moves": func(m tea.Model) tea.Model { return write(press(m, tea.KeyPgDown, tea.KeyDown, tea.KeyDown), "4.60 V") },
		"wrong": func(m tea.Model) tea.Model { return write(press(m, tea.KeyPgDown, tea.KeyDown, tea.KeyDown), "4,15 V") },
		"help":  func(m tea.Model) tea.Model { return press(m, tea.KeyF1) },
	} {
		var b strings.Builder
		for _, size := range [][2]int{{80, 24}, {100, 30}, {140, 40}} {
			for _, th := range []theme.Theme{theme.New(theme.Options{Colour: true, Dark: true}), {}} {
				view := prepare(open(t, th, size[0], size[1])).View()
				rows := strings.Split(view, "\n")
				if len(rows) != size[1] {
					t.Errorf("%s %v: %d rows, want %d", name, size, len(rows), size[1])
				}
				for i, row := range rows {
					if theme.Width(row) > size[0] {
						t.Errorf("%s %v: row %d is %d wide", name, size, i, theme.Width(row))
					}
				}
				fmt.Fprintf(&b, "%d×%d\n%s\n", size[0], size[1], view)
			}
		}
		golden.Compare(t, name, b.String())
	}
}

// TestTypedValuesStandInTheFile: values go into the text in place, and what does not read is not written.
func TestTypedValuesStandInTheFile(t *testing.T) {
	m := write(press(open(t, theme.Theme{}, 80, 24), tea.KeyPgDown, tea.KeyDown, tea.KeyDown), "4,15 V")
	if !strings.Contains(m.View(), "wanted") {
		t.Errorf("a decimal comma is not refused:\n%s", m.View())
	}
	m, cmd := m.Update(tea.KeyMsg{Type: tea.KeyCtrlS})
	if _, save := m.(siteform.Model).Text(); save || cmd != nil {
		t.Error("a value that does not read is written")
	}
	m = write(m, "4.10 V")
	m, _ = m.Update(tea.KeyMsg{Type: tea.KeyCtrlS})
	text, save := m.(siteform.Model).Text()
	if got, _ := site.Value([]byte(text), "source.cell_max"); !save || got != "4.10 V" {
		t.Errorf("saved %v with source.cell_max = %q, want 4.10 V", save, got)
	}
	if !strings.Contains(text, "# of the source loop, cables included") {
		t.Error("a comment of the file is gone")
	}
}

// TestValuesThatDependOnEachOther: a least cell voltage above the greatest is wrong until the greatest is raised.
func TestValuesThatDependOnEachOther(t *testing.T) {
	m := press(open(t, theme.Theme{}, 100, 30), tea.KeyPgDown, tea.KeyDown, tea.KeyDown, tea.KeyDown)
	m = write(m, "4.20 V")
	if !strings.Contains(m.View(), "✗") {
		t.Fatalf("cell_min above cell_max is not refused:\n%s", m.View())
	}
	m = write(press(m, tea.KeyUp), "4.30 V")
	if strings.Contains(m.View(), "✗ wanted") {
		t.Errorf("both values read together, yet one is refused:\n%s", m.View())
	}
}

// TestEveryValueHasItsField goes through all tables: every text, number and switch of the template is somewhere.
func TestEveryValueHasItsField(t *testing.T) {
	m := open(t, theme.Theme{}, 140, 200)
	var seen strings.Builder
	for range 30 {
		seen.WriteString(m.View())
		m = press(m, tea.KeyPgDown)
	}
	for _, want := range []string{"internal resistance", "fuse: breaking capacity", "touch safe: within", "closing difference", "setpoint error", "cable: section", "unit id", "isolated"} {
		if !strings.Contains(seen.String(), want) {
			t.Errorf("no field for %q", want)
		}
	}
}

func TestEscAsksFirst(t *testing.T) {
	m := write(open(t, theme.Theme{}, 80, 24), "Ferry Wagtail")
	m, cmd := m.Update(tea.KeyMsg{Type: tea.KeyEsc})
	if cmd != nil || !strings.Contains(m.View(), "Esc again") || !strings.Contains(m.View(), "Ferry Wagtail") {
		t.Errorf("the first Esc leaves, or loses what was typed:\n%s", m.View())
	}
	if _, cmd = m.Update(tea.KeyMsg{Type: tea.KeyEsc}); cmd == nil {
		t.Error("the second Esc does not leave")
	}
}
