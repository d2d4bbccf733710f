package walkview_test

import (
	"errors"
	"fmt"
	"strings"
	"testing"
	"time"

	tea "github.com/charmbracelet/bubbletea"

	"chargehand/commission"
	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/commission/walk"
	"chargehand/tui/golden"
	"chargehand/tui/theme"
	"chargehand/tui/walkview"
	"chargehand/tui/walkview/walkviewtest"
)

// sizes are those that every screen is drawn in, each with 16 colours and without any.
var sizes = [][2]int{{80, 24}, {100, 30}, {140, 40}}

// everyLook draws a screen in every size, with and without colour, as one text, and checks that each keeps to its size.
func everyLook(t *testing.T, screen func(theme.Theme, int, int) string) string {
	t.Helper()
	var b strings.Builder
	for _, size := range sizes {
		for _, o := range []theme.Options{{Colour: true, Dark: true}, {}} {
			view := screen(theme.New(o), size[0], size[1])
			fits(t, view, size[0], size[1])
			fmt.Fprintf(&b, "%d×%d colour %v\n%s\n", size[0], size[1], o.Colour, view)
		}
	}
	return b.String()
}

func fits(t *testing.T, view string, width, height int) {
	t.Helper()
	rows := strings.Split(view, "\n")
	if len(rows) != height {
		t.Errorf("%d×%d: %d rows, want %d", width, height, len(rows), height)
	}
	for i, row := range rows {
		if got := theme.Width(row); got > width {
			t.Errorf("%d×%d: row %d is %d columns wide:\n%s", width, height, i, got, row)
		}
	}
}

// firstOf is the first point of each stage.
func firstOf(t *testing.T) []string {
	w := walkviewtest.Open(t, record.RehearsalMode, "safe.permit")
	state := w.Snapshot(t, nil).State
	var ids []string
	for stage := 1; stage <= walk.Stages; stage++ {
		ids = append(ids, state.InStage(stage)[0].ID)
	}
	return ids
}

// standing is how the plant stands in a stage: bus and source voltage, and which contacts are closed.
func standing(stage int) map[signal.Name]signal.Reading {
	switch {
	case stage < 5:
		return walkviewtest.Live(0.8, 1.6)
	case stage == 5:
		return walkviewtest.Live(0.8, 795)
	case stage == 6:
		live := walkviewtest.Live(794.6, 795)
		return with(live, signal.BypassClosed, 1)
	case stage < 12:
		live := with(walkviewtest.Live(1029.8, 794.2), signal.BypassClosed, 1)
		return with(with(live, signal.Running, 1), signal.Mode, signal.ModeVoltage)
	}
	return walkviewtest.Live(4.1, 1.6)
}

func with(live map[signal.Name]signal.Reading, name signal.Name, v float64) map[signal.Name]signal.Reading {
	r := live[name]
	r.Value = v
	live[name] = r
	return live
}

func TestEveryStage(t *testing.T) {
	for i, point := range firstOf(t) {
		t.Run(point, func(t *testing.T) {
			w := walkviewtest.Open(t, record.RehearsalMode, point)
			s := w.Snapshot(t, standing(i+1))
			golden.Compare(t, fmt.Sprintf("stage-%02d", i+1), everyLook(t, func(th theme.Theme, width, height int) string {
				return walkview.New(w.Session, th, width, height, s).View()
			}))
		})
	}
}

// scene is one view of the walk: a point, what happens there, and the keys pressed.
type scene struct {
	name, point, mode string
	live              map[signal.Name]signal.Reading
	capture           *commission.Progress
	ended             bool // the capture is over
	snapshot          func(*commission.Snapshot)
	keys              []string
}

func TestEveryView(t *testing.T) {
	example := walkviewtest.Open(t, record.RehearsalMode, "safe.permit").Snapshot(t, nil).State.Site()
	armed := walkviewtest.Charging(example, 0)
	armed.Phase, armed.Elapsed = commission.Armed, 3*time.Second
	running, settled, stairs := walkviewtest.Charging(example, 2600*time.Millisecond), walkviewtest.Charging(example, 8*time.Second), walkviewtest.Stairs()
	shorted := walkviewtest.Charging(example, 600*time.Millisecond)
	for i := range shorted.Y {
		shorted.Y[i] = 0.9
	}
	seen := 0.9
	shorted.Rise.Seen, shorted.OpenNow, shorted.SoFar = &seen, "the bus has risen by 1 V of at least 103 V", nil
	charging := with(walkviewtest.Live(704, 795), signal.PrechargeClosed, 1)
	for _, sc := range []scene{
		{name: "armed", point: "charge.rise", live: standing(5), capture: &armed},
		{name: "running", point: "charge.rise", live: charging, capture: &running},
		{name: "open-now", point: "charge.rise", live: with(walkviewtest.Live(0.9, 788), signal.PrechargeClosed, 1), capture: &shorted},
		{name: "open-now-far", point: "charge.rise", live: with(walkviewtest.Live(0.9, 788), signal.PrechargeClosed, 1), capture: &shorted, keys: []string{"f"}},
		{name: "ended", point: "charge.rise", live: standing(6), capture: &settled, ended: true},
		{name: "cursor", point: "charge.rise", live: charging, capture: &running, keys: []string{"]", "[", "[", "[", "[", "[", "[", "["}},
		{name: "stairs", point: "share.stairs", live: standing(8), capture: &stairs},
		{name: "far", point: "charge.rise", live: charging, capture: &running, keys: []string{"f"}},
		{name: "help", point: "charge.rise", live: standing(5), keys: []string{"?"}},
		{name: "seen", point: "safe.permit", live: standing(1), keys: []string{"enter", "ctrl+n"}},
		{name: "measure", point: "charge.source", live: standing(5), keys: []string{"i"}},
		{name: "change", point: "paper.plates", live: standing(2), keys: []string{"v", "enter", "1", "2", "0", " ", "Ω"}},
		{name: "punch", point: "paper.plates", live: standing(2), keys: []string{"p"}},
		{name: "no-link", point: "charge.rise", live: walkviewtest.Live(704, 795), mode: record.SiteMode, snapshot: func(s *commission.Snapshot) {
			s.Link = signal.Link{Peer: "192.0.2.21:502", Why: "no answer", NextTry: walkviewtest.Now.Add(2 * time.Second)}
			s.Now = s.Now.Add(14 * time.Second)
		}},
		{name: "log-full", point: "paper.plates", live: standing(2), snapshot: func(s *commission.Snapshot) {
			s.Failure = errors.New("the log takes nothing more: write PIP-001.chlog: no space left on device")
		}},
	} {
		t.Run(sc.name, func(t *testing.T) {
			mode := sc.mode
			if mode == "" {
				mode = record.RehearsalMode
			}
			w := walkviewtest.Open(t, mode, sc.point)
			s := w.Snapshot(t, sc.live)
			if sc.snapshot != nil {
				sc.snapshot(&s)
			}
			golden.Compare(t, "view-"+sc.name, everyLook(t, func(th theme.Theme, width, height int) string {
				m := walkview.New(w.Session, th, width, height, s)
				if sc.capture != nil {
					during := s
					during.Capture = sc.capture
					m, _ = m.WithSnapshot(during)
				}
				if sc.ended {
					m, _ = m.WithSnapshot(s)
				}
				for _, k := range sc.keys {
					m, _ = m.Update(keyOf(k))
				}
				return m.View()
			}))
		})
	}
}

func keyOf(name string) tea.KeyMsg {
	if name == " " {
		return tea.KeyMsg{Type: tea.KeySpace, Runes: []rune(name)}
	}
	for kind := tea.KeyType(-100); kind < 128; kind++ {
		if k := (tea.KeyMsg{Type: kind}); k.String() == name && kind != tea.KeyRunes {
			return k
		}
	}
	return tea.KeyMsg{Type: tea.KeyRunes, Runes: []rune(name)}
}
