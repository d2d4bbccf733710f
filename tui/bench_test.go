package tui_test

import (
	"testing"
	"time"

	tea "github.com/charmbracelet/bubbletea"

	"chargehand/commission/record"
	"chargehand/tui"
	"chargehand/tui/theme"
	"chargehand/tui/walkview"
	"chargehand/tui/walkview/walkviewtest"
)

// BenchmarkDraw draws the walk at 140×40 during a capture, in colour; at most 1 ms is wanted.
func BenchmarkDraw(b *testing.B) {
	w := walkviewtest.Open(b, record.RehearsalMode, "charge.rise")
	s := w.Snapshot(b, walkviewtest.Live(704, 795))
	c := walkviewtest.Charging(s.State.Site(), 8*time.Second)
	s.Capture = &c
	m := walkview.New(w.Session, theme.New(theme.Options{Colour: true, Dark: true}), 140, 40, s)
	for b.Loop() {
		_ = m.View()
	}
}

// BenchmarkWatch is one second of watching at 20 Hz: twenty snapshots taken in and drawn. At most 3 % of a core is 30 ms.
func BenchmarkWatch(b *testing.B) {
	w := walkviewtest.Open(b, record.RehearsalMode, "charge.rise")
	s := w.Snapshot(b, walkviewtest.Live(704, 795))
	m := walkview.New(w.Session, theme.New(theme.Options{Colour: true, Dark: true}), 140, 40, s)
	for b.Loop() {
		for range 20 {
			s.Now = s.Now.Add(50 * time.Millisecond)
			s.Live = walkviewtest.Live(704, 795)
			m, _ = m.WithSnapshot(s)
			_ = m.View()
		}
	}
}

// BenchmarkFirstScreen makes the program and draws its start screen; with the start of the process at most 100 ms of CPU are
// wanted.
func BenchmarkFirstScreen(b *testing.B) {
	h := &host{t: b}
	for b.Loop() {
		var m tea.Model = tui.New(h, theme.New(theme.Options{Colour: true, Dark: true}))
		m, _ = m.Update(tea.WindowSizeMsg{Width: 140, Height: 40})
		_ = m.View()
	}
}
