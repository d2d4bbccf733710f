package plain_test

import (
	"bytes"
	"context"
	"strings"
	"sync"
	"testing"
	"time"

	"chargehand/commission/record"
	"chargehand/tui/plain"
	"chargehand/tui/start"
	"chargehand/tui/walkview/walkviewtest"
)

// paper is what is printed, read by the test while the walk prints.
type paper struct {
	mu   sync.Mutex
	text bytes.Buffer
}

func (p *paper) Write(b []byte) (int, error) {
	p.mu.Lock()
	defer p.mu.Unlock()
	return p.text.Write(b)
}

func (p *paper) String() string {
	p.mu.Lock()
	defer p.mu.Unlock()
	return p.text.String()
}

// typed goes a walk with lines typed one after the other until the input ends.
func typed(t *testing.T, w walkviewtest.Walk, lines ...string) string {
	t.Helper()
	ctx, cancel := context.WithTimeout(context.Background(), 30*time.Second)
	defer cancel()
	out := &paper{}
	if err := plain.Walk(ctx, w.Session, plain.Lines(ctx, strings.NewReader(strings.Join(lines, "\n"))), out); err != nil {
		t.Fatalf("%v, after\n%s", err, out)
	}
	return out.String()
}

func contains(t *testing.T, text string, wanted ...string) {
	t.Helper()
	for _, want := range wanted {
		if !strings.Contains(text, want) {
			t.Errorf("lacks %q:\n%s", want, text)
		}
	}
}

func TestAPoint(t *testing.T) {
	w := walkviewtest.Open(t, record.RehearsalMode, "safe.permit")
	out := typed(t, w, "", "/", "118", "6 pm", "N. N.", "", "quit")
	contains(t, out, "REHEARSAL, stage 1 of 12", "[enter the document]", "[pass and sign]", "safe.permit passed and signed", "safe.sources")
	contains(t, string(w.Disk.Read(walkviewtest.Log)), "permit no. 118, valid until 6 pm, in charge: N. N.", `{"id":"safe.permit","result":"pass"`)
	if strings.Contains(out, "\x1b") {
		t.Errorf("something is drawn: %q", out)
	}
}

func TestWrongLines(t *testing.T) {
	w := walkviewtest.Open(t, record.SiteMode, "paper.plates")
	before := string(w.Disk.Read(walkviewtest.Log))
	out := typed(t, w, "yes", "o", "x", "f", "\x1b[2J", "u", ".", "v", "precharge.resistance", "120", "120 V", ".", "?", "quit")
	contains(t, out, `"yes" is nothing to type here`, `"o" is nothing`, "cannot be left out", "nothing entered", "unmet: fail the point")
	if after := string(w.Disk.Read(walkviewtest.Log)); after != before {
		t.Errorf("wrong lines were recorded:\n%s", strings.TrimPrefix(after, before))
	}
	if strings.Contains(out, "\x1b") {
		t.Errorf("an escape sequence is printed: %q", out)
	}
}

func TestAnInstrument(t *testing.T) {
	w := walkviewtest.Open(t, record.RehearsalMode, "charge.source")
	out := typed(t, w, "i", "795", "795.1 V", "9", "1", "quit")
	contains(t, out, "source-voltage in V", "refused: ", "wanted a unit", "1 i1 hand multimeter", "type the number of one of them", "instrument reading")
	contains(t, string(w.Disk.Read(walkviewtest.Log)), `"signal":"source-voltage","value":795.1,"unit":"V","source":"instrument"`)
}

// TestTheEndOfTheInputKeepsACapture ends the input while a capture waits: the log says so.
func TestTheEndOfTheInputKeepsACapture(t *testing.T) {
	w := walkviewtest.Open(t, record.RehearsalMode, "charge.rise")
	out := typed(t, w, "", "o", "o")
	contains(t, out, "capture armed", "plant: close the pre-charge")
	contains(t, string(w.Disk.Read(walkviewtest.Log)), "capture at charge.rise ended before anything happened: stopped by hand")
}

func TestChoose(t *testing.T) {
	entries := []start.Entry{{Kind: start.Resume, Title: "Ferry \x1b[31mWagtail"}, {Kind: start.Rehearse, Title: "built-in example"}}
	for _, c := range []struct {
		typed string
		want  int // index; -1: nothing
	}{{"\n", 0}, {"2\n", 1}, {"9\nx\n2\n", 1}, {"quit\n", -1}, {"", -1}} {
		ctx, cancel := context.WithCancel(context.Background())
		var out bytes.Buffer
		got, ok := plain.Choose(ctx, entries, plain.Lines(ctx, strings.NewReader(c.typed)), &out)
		cancel()
		if ok != (c.want >= 0) || ok && got != entries[c.want] {
			t.Errorf("Choose(%q) = %+v, %v, want entry %d", c.typed, got, ok, c.want)
		}
		if strings.Contains(out.String(), "\x1b") {
			t.Errorf("an escape sequence is printed: %q", out.String())
		}
	}
}
