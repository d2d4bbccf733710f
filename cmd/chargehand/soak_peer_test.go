//go:build peer

package main

import (
	"context"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"sync/atomic"
	"testing"
	"time"

	tea "github.com/charmbracelet/bubbletea"

	"chargehand/commission/chlog"
	"chargehand/commission/record"
	"chargehand/commission/walk"
	"chargehand/tui"
	"chargehand/tui/start"
	"chargehand/tui/theme"
	"chargehand/tui/walkview"
)

// soakTime is how long the watch is kept: CHARGEHAND_SOAK, such as 20m, else 30 s.
func soakTime(t *testing.T) time.Duration {
	t.Helper()
	text, given := os.LookupEnv("CHARGEHAND_SOAK")
	if !given {
		return 30 * time.Second
	}
	d, err := time.ParseDuration(text)
	if err != nil || d < 12*time.Second {
		t.Fatalf("CHARGEHAND_SOAK = %q, want a duration of at least 12s", text)
	}
	return d
}

// soakHost hands out the session that the screen has opened.
type soakHost struct {
	*host
	opened chan opening
}

type opening struct {
	session walkview.Session
	err     error
}

func (h soakHost) Open(ctx context.Context, e start.Entry) (walkview.Session, error) {
	s, err := h.host.Open(ctx, e)
	h.opened <- opening{s, err}
	return s, err
}

// held is what the process holds at a moment.
type held struct {
	goroutines int
	heap       uint64 // bytes that are still reached
	size       int64  // of the log
}

func holds(log string) held {
	runtime.GC()
	var m runtime.MemStats
	runtime.ReadMemStats(&m)
	h := held{goroutines: runtime.NumGoroutine(), heap: m.HeapAlloc}
	if info, err := os.Stat(log); err == nil {
		h.size = info.Size()
	}
	return h
}

// least is the least of each over some moments: what comes and goes, such as a connection being made, is no growth.
func least(moments []held) held {
	low := moments[0]
	for _, h := range moments {
		low.goroutines, low.heap, low.size = min(low.goroutines, h.goroutines), min(low.heap, h.heap), min(low.size, h.size)
	}
	return low
}

// The whole program, screen and all, watches a rehearsal whose link breaks for 1.5 s of every 6 s, and writes a note every
// second: it holds no more at the end than at the beginning, but for what it keeps of its log, and no record is missed.
func TestSoak(t *testing.T) {
	const breaks, off = 6 * time.Second, "1.5"
	lasting := soakTime(t)
	folder := t.TempDir()
	log := filepath.Join(folder, "soak.chlog")
	a := &app{surroundings: surroundings{in: strings.NewReader(""), out: io.Discard, err: io.Discard, folder: folder,
		env: func(name string) (string, bool) { return folder, name == "HOME" }}, now: time.Now}
	h := soakHost{&host{app: a, ctx: t.Context(), options: walkOptions{rehearse: true, log: log, seed: 1, speed: 1,
		disturb: "link-drops=" + off}}, make(chan opening, 1)}
	typed, keys := io.Pipe()
	var drawn atomic.Int64 // messages that the screen took
	program := tea.NewProgram(tui.Opening(h, theme.New(theme.Options{Colour: true}), start.Entry{Kind: start.Rehearse, Log: log}),
		tea.WithInput(typed), tea.WithOutput(io.Discard), tea.WithoutSignalHandler(),
		tea.WithFilter(func(_ tea.Model, msg tea.Msg) tea.Msg { drawn.Add(1); return msg }))
	ended := make(chan error, 1)
	go func() { _, err := program.Run(); ended <- err }()
	program.Send(tea.WindowSizeMsg{Width: 140, Height: 40})
	var session walkview.Session
	select {
	case o := <-h.opened:
		if session = o.session; o.err != nil {
			t.Fatal(o.err)
		}
	case err := <-ended:
		t.Fatalf("the program ended: %v", err)
	case <-time.After(10 * time.Second):
		t.Fatal("the walk did not open in 10 s")
	}

	var moments []held
	var acknowledged []int64
	began := time.Now()
	for tick := time.NewTicker(time.Second); time.Since(began) < lasting; <-tick.C {
		recorded, err := session.Run.Submit(t.Context(), walk.AddNote{Text: fmt.Sprintf("note %d", len(acknowledged))})
		if err != nil {
			t.Fatal(err)
		}
		acknowledged = append(acknowledged, recorded.Seqs...)
		moments = append(moments, holds(log))
	}
	took := time.Since(began)
	program.Send(tea.KeyMsg{Type: tea.KeyCtrlC})
	if err := <-ended; err != nil {
		t.Error(err)
	}
	keys.Close()

	third := len(moments) / 3
	first, last := least(moments[:third]), least(moments[len(moments)-third:])
	t.Logf("%v: goroutines %d then %d, heap %.2f MB then %.2f MB, log %.2f MB then %.2f MB, %.1f messages a second on the screen", took.Round(time.Second),
		first.goroutines, last.goroutines, float64(first.heap)/1e6, float64(last.heap)/1e6, float64(first.size)/1e6, float64(last.size)/1e6,
		float64(drawn.Load())/took.Seconds())
	if last.goroutines > first.goroutines+1 { // one left behind by each break would be three in the shortest run
		t.Errorf("%d goroutines after %v, %d at the beginning, want at most one more (a connection is up or down)",
			last.goroutines, took, first.goroutines)
	}
	// What was polled is about 1 MB in 30 s; a log's lines are kept, as text and as the state they lead to.
	if grown, kept := int64(last.heap)-int64(first.heap), 8*(last.size-first.size); grown > kept+500e3 {
		t.Errorf("the heap grew by %d bytes in %v, want at most 8 times the log's growth (%d) and 500 kB", grown, took, kept)
	}
	soakLog(t, log, acknowledged, int(took/breaks))
}

// soakLog holds a log against what was acknowledged, and counts the losses of the link.
func soakLog(t *testing.T, path string, acknowledged []int64, breaks int) {
	t.Helper()
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	notes, events := 0, map[string]int{}
	r := chlog.NewReader(f)
	for {
		line, err := r.Next()
		if err == io.EOF {
			break
		}
		if err != nil {
			t.Fatal(err)
		}
		body, err := line.Decode()
		if err != nil {
			t.Fatal(err)
		}
		switch b := body.(type) {
		case record.Note:
			want := fmt.Sprintf("note %d", notes)
			if b.Text != want || notes >= len(acknowledged) || line.Seq != acknowledged[notes] {
				t.Fatalf("record %d is %q, want %q where it was acknowledged", line.Seq, b.Text, want)
			}
			notes++
		case record.Link:
			events[b.Event]++
		}
	}
	t.Logf("%d notes, link: %v", notes, events)
	if notes != len(acknowledged) {
		t.Errorf("the log has %d notes, want the %d that were acknowledged", notes, len(acknowledged))
	}
	if lost := events["lost"]; lost < breaks-1 || lost > breaks+2 {
		t.Errorf("the log tells of %d losses of the link, want about %d", lost, breaks)
	}
	if d := events["lost"] - events["reconnected"]; d < 0 || d > 1 {
		t.Errorf("the log tells of %d losses and %d returns, want a return after each loss but the last", events["lost"], events["reconnected"])
	}
}
