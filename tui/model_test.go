package tui_test

import (
	"context"
	"errors"
	"strings"
	"testing"
	"time"

	tea "github.com/charmbracelet/bubbletea"

	"chargehand/commission/desk"
	"chargehand/commission/record"
	"chargehand/commission/site"
	"chargehand/tui"
	"chargehand/tui/start"
	"chargehand/tui/theme"
	"chargehand/tui/walkview"
	"chargehand/tui/walkview/walkviewtest"
)

// host opens walks in memory.
type host struct {
	t    testing.TB
	err  error
	walk *walkviewtest.Walk
}

func (h *host) Entries(context.Context) []start.Entry {
	return []start.Entry{{Kind: start.Rehearse, Title: "rehearse the built-in example"}, {Kind: start.Check, Title: "desk checks"}}
}

func (h *host) Open(context.Context, start.Entry) (walkview.Session, error) {
	if h.err != nil {
		return walkview.Session{}, h.err
	}
	w := walkviewtest.Open(h.t, record.RehearsalMode, "charge.rise")
	h.walk = &w
	return w.Session, nil
}

func (h *host) Check(context.Context, string) (site.Site, desk.Sheet, error) {
	text, _ := site.Example()
	s, _, err := site.Read(site.ExampleName, []byte(text))
	return s, desk.Check(s, nil), err
}

// program carries out what the model asks for, each command by itself as the real program does.
type program struct {
	t       *testing.T
	m       tea.Model
	quit    bool
	results chan tea.Msg
}

func begin(t *testing.T, h *host, width, height int) *program {
	p := &program{t: t, m: tui.New(h, theme.Theme{}), results: make(chan tea.Msg, 100)}
	p.carryOut(p.m.Init())
	p.send(tea.WindowSizeMsg{Width: width, Height: height})
	return p
}

func (p *program) send(msg tea.Msg) {
	p.t.Helper()
	var cmd tea.Cmd
	p.m, cmd = p.m.Update(msg)
	p.carryOut(cmd)
	_ = p.m.View()
}

func (p *program) carryOut(cmd tea.Cmd) {
	if cmd != nil {
		go func() { p.results <- cmd() }()
	}
}

// take takes what a command has brought.
func (p *program) take(msg tea.Msg) {
	switch msg := msg.(type) {
	case tea.BatchMsg:
		for _, c := range msg {
			p.carryOut(c)
		}
	case tea.QuitMsg:
		p.quit = true
	case nil:
	default:
		p.send(msg)
	}
}

// until takes results until something has come about. The limit only keeps a broken program from waiting for ever.
func (p *program) until(what string, done func() bool) {
	p.t.Helper()
	limit := time.After(time.Minute)
	for !done() {
		select {
		case msg := <-p.results:
			p.take(msg)
		case <-limit:
			p.t.Fatalf("%s does not come:\n%s", what, p.m.View())
		}
	}
}

func (p *program) press(keys ...string) {
	for _, name := range keys {
		k := tea.KeyMsg{Type: tea.KeyRunes, Runes: []rune(name)}
		switch name {
		case "enter":
			k = tea.KeyMsg{Type: tea.KeyEnter}
		case "esc":
			k = tea.KeyMsg{Type: tea.KeyEsc}
		case "down":
			k = tea.KeyMsg{Type: tea.KeyDown}
		case "ctrl+c":
			k = tea.KeyMsg{Type: tea.KeyCtrlC}
		}
		p.send(k)
	}
}

func (p *program) sees(text string) {
	p.t.Helper()
	p.until(text, func() bool { return strings.Contains(p.m.View(), text) })
}

func (p *program) ends() {
	p.t.Helper()
	p.until("the end", func() bool { return p.quit })
}

func TestFromScreenToScreen(t *testing.T) {
	p := begin(t, &host{t: t}, 100, 30)
	p.sees("rehearse the built-in example")
	p.press("enter")
	p.sees("charge.rise  First rise")
	p.press("l")
	p.sees("place")
	p.press("esc")
	p.sees("charge.rise  First rise")
	p.press("c")
	p.sees("discharge.touch-safe")
	p.press("esc")
	p.sees("charge.rise  First rise")
	p.press("?")
	p.sees("the log keeps")
	p.press("x", "esc")
	p.sees("rehearse the built-in example")
	p.press("down", "enter")
	p.sees("marginal")
	p.press("esc")
	p.sees("rehearse the built-in example")
	p.press("esc")
	p.ends()
}

func TestARefusedWalkIsExplained(t *testing.T) {
	h := &host{t: t, err: errors.New("wagtail.site.toml names no register map")}
	p := begin(t, h, 80, 24)
	p.sees("rehearse the built-in example")
	p.press("enter")
	p.sees("names no register map")
	p.sees("rehearse the built-in example")
}

func TestCtrlCEndsAndLosesNothing(t *testing.T) {
	h := &host{t: t}
	p := begin(t, h, 80, 24)
	p.sees("rehearse the built-in example")
	p.press("enter")
	p.sees("charge.rise  First rise")
	p.press("n", "a", "b", "enter")
	p.sees("on disk: note")
	p.press("ctrl+c")
	p.ends()
	if log := string(h.walk.Disk.Read(walkviewtest.Log)); !strings.Contains(log, `"text":"ab"`) {
		t.Errorf("what was acknowledged is not in the log:\n%s", log)
	}
}

// TestSizes: no size at all draws nothing, a terminal below the least says so and recovers.
func TestSizes(t *testing.T) {
	p := begin(t, &host{t: t}, 0, 0)
	if view := p.m.View(); view != "" {
		t.Errorf("a terminal of no size shows %q", view)
	}
	for _, size := range [][2]int{{79, 24}, {80, 23}, {40, 10}, {5, 2}, {1, 1}} {
		p.send(tea.WindowSizeMsg{Width: size[0], Height: size[1]})
		rows := strings.Split(p.m.View(), "\n")
		if len(rows) > size[1] || theme.Width(rows[0]) > size[0] {
			t.Errorf("%v: %d rows, the first %d wide", size, len(rows), theme.Width(rows[0]))
		}
		if size[0] >= 40 && !strings.Contains(strings.Join(rows, " "), "80 columns and 24 rows") {
			t.Errorf("%v: the screen does not say what it needs:\n%s", size, p.m.View())
		}
	}
	p.send(tea.WindowSizeMsg{Width: 80, Height: 24})
	p.sees("rehearse the built-in example")
}
