package linkview_test

import (
	"fmt"
	"strings"
	"testing"
	"time"

	tea "github.com/charmbracelet/bubbletea"

	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/tui/golden"
	"chargehand/tui/linkview"
	"chargehand/tui/theme"
	"chargehand/tui/walkview/walkviewtest"
)

func TestGolden(t *testing.T) {
	w := walkviewtest.Open(t, record.RehearsalMode, "link.zero")
	good := w.Snapshot(t, walkviewtest.Live(0.8, 1.6))
	mixed := good
	mixed.Live = walkviewtest.Live(0.8, 1.6)
	mixed.Live[signal.BusVoltage] = signal.Reading{Name: signal.BusVoltage, Value: 812.4, At: walkviewtest.Now.Add(-4 * time.Second), Quality: signal.Good, Raw: []uint16{0x1FBC}}
	mixed.Live[signal.SourceCurrent] = signal.Reading{Name: signal.SourceCurrent, Quality: signal.Missing, Why: "the device sent 8000", At: walkviewtest.Now, Raw: []uint16{0x8000}}
	mixed.Live[signal.Power] = signal.Reading{Name: signal.Power, Quality: signal.Bad, Why: "exception 2, illegal data address", At: walkviewtest.Now}
	mixed.Live[signal.Heartbeat] = signal.Reading{Name: signal.Heartbeat, Quality: signal.Never, Why: "no answer yet"}
	lost := mixed
	lost.Link = signal.Link{Peer: "192.0.2.21:502", Why: "no answer \x1b[2J within 1 s", Reconnects: 3}
	lost.Now = lost.Now.Add(20 * time.Second)
	var b strings.Builder
	for _, size := range [][2]int{{80, 24}, {100, 30}, {140, 40}} {
		for _, th := range []theme.Theme{theme.New(theme.Options{Colour: true, Dark: true}), {}, theme.New(theme.Options{ASCII: true})} {
			m := linkview.New(w.Session.Places, 500*time.Millisecond, nil, th, size[0], size[1], good)
			for _, s := range []struct {
				name string
				view string
			}{{"good", m.View()}, {"mixed", m.WithSnapshot(mixed).View()}, {"lost", m.WithSnapshot(lost).View()}} {
				rows := strings.Split(s.view, "\n")
				if len(rows) != size[1] {
					t.Errorf("%s %v: %d rows, want %d", s.name, size, len(rows), size[1])
				}
				for i, row := range rows {
					if theme.Width(row) > size[0] {
						t.Errorf("%s %v: row %d is %d wide: %s", s.name, size, i, theme.Width(row), row)
					}
				}
				fmt.Fprintf(&b, "%d×%d %s\n%s\n", size[0], size[1], s.name, s.view)
			}
		}
	}
	golden.Compare(t, "link", b.String())
}

// TestOldValuesAreWithdrawn: four seconds after its answer a voltage of 812.4 V is not on the screen any more.
func TestOldValuesAreWithdrawn(t *testing.T) {
	w := walkviewtest.Open(t, record.SiteMode, "link.zero")
	s := w.Snapshot(t, map[signal.Name]signal.Reading{signal.BusVoltage: {Name: signal.BusVoltage, Value: 812.4, At: walkviewtest.Now, Quality: signal.Good}})
	m := linkview.New(nil, 500*time.Millisecond, nil, theme.Theme{}, 80, 24, s)
	if !strings.Contains(m.View(), "812.4 V?") {
		t.Errorf("a fresh unproved value is not shown as such:\n%s", m.View())
	}
	s.Now = s.Now.Add(4 * time.Second)
	if view := m.WithSnapshot(s).View(); strings.Contains(view, "812.4") || !strings.Contains(view, "stale") {
		t.Errorf("an old value is shown:\n%s", view)
	}
}

func TestEscLeaves(t *testing.T) {
	w := walkviewtest.Open(t, record.SiteMode, "link.zero")
	m := linkview.New(nil, time.Second, nil, theme.Theme{}, 80, 24, w.Snapshot(t, walkviewtest.Live(1, 1)))
	for _, k := range []tea.KeyType{tea.KeyDown, tea.KeyPgDown, tea.KeyPgDown, tea.KeyUp, tea.KeyPgUp} {
		m, _ = m.Update(tea.KeyMsg{Type: k})
		_ = m.View()
	}
	_, cmd := m.Update(tea.KeyMsg{Type: tea.KeyEsc})
	if _, ok := cmd().(linkview.Left); !ok {
		t.Error("Esc does not leave")
	}
}
