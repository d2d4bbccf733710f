package chlog_test

import (
	"bytes"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"

	"chargehand/commission/chlog"
	"chargehand/commission/chlog/chlogtest"
	"chargehand/commission/record"
)

// lines reads a log strictly.
func lines(t testing.TB, text []byte) []chlog.Line {
	t.Helper()
	r := chlog.NewReader(bytes.NewReader(text))
	var all []chlog.Line
	for {
		l, err := r.Next()
		if err == io.EOF {
			return all
		}
		if err != nil {
			t.Fatalf("Next after %d lines = %v\n%s", len(all), err, text)
		}
		all = append(all, l)
	}
}

const path = "site/wagtail.chlog"

// session is one run of the program: it makes or resumes the log, appends some notes, and dies where the disk does. It tells
// which lines were acknowledged to it.
func session(d *chlogtest.Disk, name string, notes int) (acknowledged []chlog.Line, err error) {
	o := chlogtest.Options()
	o.Recorded = func(l chlog.Line) { acknowledged = append(acknowledged, l) }
	w, _, err := chlog.Resume(d, path, o)
	if errors.Is(err, fs.ErrNotExist) || isEmpty(err) {
		w, err = chlog.Create(d, path, chlogtest.Opened(record.SiteMode), o)
	}
	if err != nil {
		return acknowledged, err
	}
	for i := range notes {
		if _, err := w.Append(record.Note{Text: fmt.Sprintf("%s %d", name, i)}); err != nil {
			return acknowledged, err
		}
	}
	return acknowledged, nil
}

func isEmpty(err error) bool { _, ok := errors.AsType[*chlog.NotALogError](err); return ok }

// Whatever fails, and whatever a loss of power then takes of what was never synced: every line that was acknowledged is
// there again, and the log goes on as a whole one.
func TestNothingAcknowledgedIsLost(t *testing.T) {
	clean := chlogtest.NewDisk()
	if _, err := session(clean, "first", 3); err != nil {
		t.Fatal(err)
	}
	losses := map[string]chlogtest.Loss{"kept": chlogtest.Kept, "dropped": chlogtest.Dropped}
	for _, n := range []int{1, 120} {
		losses[fmt.Sprintf("cut at byte %d", n)] = chlogtest.CutAt(n)
		losses[fmt.Sprintf("first %d bytes zero", n)] = chlogtest.Reordered(n)
	}
	tried := 0
	for failAt := 1; failAt <= clean.Calls()+1; failAt++ {
		for _, through := range []int{0, 150, 1 << 20} {
			for name, loss := range losses {
				d := chlogtest.NewDisk()
				d.FailAt, d.Err, d.Through = failAt, chlogtest.ErrGone, through
				acknowledged, err := session(d, "first", 3)
				if err == nil && failAt <= clean.Calls() {
					t.Fatalf("call %d fails: session = nil, want an error", failAt)
				}
				what := fmt.Sprintf("call %d fails after %d bytes, then %s", failAt, through, name)
				comeBack(t, what, d.AfterPowerLoss(loss), acknowledged, loss)
				tried++
			}
		}
	}
	if tried < 200 {
		t.Errorf("only %d ways of dying were tried", tried)
	}
}

// comeBack resumes after a loss of power, dying once more at each call in turn, and checks what is left.
func comeBack(t *testing.T, what string, d *chlogtest.Disk, acknowledged []chlog.Line, loss chlogtest.Loss) {
	t.Helper()
	left := d.Read(path)
	for again := 0; ; again++ {
		up := d.AfterPowerLoss(chlogtest.Kept)
		up.FailAt, up.Err, up.Through = again, chlogtest.ErrGone, 20
		also, err := session(up, "second", 1)
		if err != nil && again == 0 {
			if len(acknowledged) == 0 && neverBegan(err) {
				return
			}
			t.Errorf("%s: resume = %v", what, err)
			return
		}
		if err != nil { // it died a second time: come up once more, now without faults
			up = up.AfterPowerLoss(loss)
			third, err := session(up, "third", 1)
			if len(acknowledged)+len(also) == 0 && neverBegan(err) {
				continue
			}
			if err != nil {
				t.Errorf("%s, then call %d fails: resume = %v", what, again, err)
				return
			}
			also = append(also, third...)
		}
		checkLeft(t, fmt.Sprintf("%s, then call %d fails", what, again), up, left, append(acknowledged[:len(acknowledged):len(acknowledged)], also...))
		if again > 0 && err == nil {
			return
		}
	}
}

// neverBegan tells that the disk holds part of a first line, which nobody was told of: another name is to be chosen.
func neverBegan(err error) bool {
	e, ok := errors.AsType[*chlog.DamageError](err)
	return ok && e.Record == 0 && e.Torn || errors.Is(err, fs.ErrExist)
}

// checkLeft wants each acknowledged line at its place, byte for byte, and what was torn off kept whole where the log says.
func checkLeft(t *testing.T, what string, d *chlogtest.Disk, before []byte, acknowledged []chlog.Line) {
	t.Helper()
	got := lines(t, d.Read(path))
	bySeq := map[int64]chlog.Line{}
	for _, l := range got {
		bySeq[l.Seq] = l
	}
	for _, want := range acknowledged {
		if diff := cmp.Diff(want, bySeq[want.Seq], cmp.Comparer(time.Time.Equal)); diff != "" {
			t.Fatalf("%s: acknowledged record %d has changed:\n%s", what, want.Seq, diff)
		}
	}
	for _, l := range got {
		body, err := l.Decode()
		if err != nil {
			t.Fatal(err)
		}
		resumed, ok := body.(record.Resumed)
		if !ok || resumed.Torn == nil {
			continue
		}
		kept := d.Read("site/" + resumed.Torn.KeptIn)
		if int64(len(kept)) != resumed.Torn.Bytes || chlog.HashOf(kept) != resumed.Torn.SHA256 {
			t.Fatalf("%s: %s holds %d bytes, want %d", what, resumed.Torn.KeptIn, len(kept), resumed.Torn.Bytes)
		}
	}
	// Nothing of what was on the disk before is silently dropped: it is in the log or set aside.
	whole := before[:bytes.LastIndexByte(before, '\n')+1]
	if tail := before[len(whole):]; len(tail) > 0 && !bytes.HasPrefix(d.Read(path+".torn-1"), tail) {
		t.Fatalf("%s: the torn line of %d bytes is nowhere", what, len(tail))
	}
}

func TestAPoisonedWriterSaysWhyAndWhatIsSafe(t *testing.T) {
	for _, c := range []struct {
		name    string
		calls   int // of one append, the one that fails
		through int
		do      string
	}{{"write", 1, 0, "write"}, {"short write", 1, 7, "write"}, {"sync", 2, 0, "sync"}} {
		d := chlogtest.NewDisk()
		w, err := chlog.Create(d, path, chlogtest.Opened(record.SiteMode), chlogtest.Options())
		if err != nil {
			t.Fatal(err)
		}
		chlogtest.Append(t, w, record.Note{Text: "one"})
		safe := w.Acknowledged()
		d.FailAt, d.Err, d.Through, d.Once = d.Calls()+c.calls, errors.New("no space left on device"), c.through, true
		_, err = w.Append(record.Note{Text: "two"})
		e, ok := errors.AsType[*chlog.WriteError](err)
		if !ok || e.Do != c.do || e.Safe != safe || e.Safe.Lines != 2 {
			t.Fatalf("%s: Append = %v, want a WriteError at %s with two safe lines", c.name, err, c.do)
		}
		if want := c.do + " wagtail.chlog: no space left on device; nothing more is taken; certainly on disk are records 0 to 1"; !strings.HasPrefix(err.Error(), want) {
			t.Errorf("%s: Append = %q, want %q at its beginning", c.name, err, want)
		}
		// The disk works again, but nobody knows what it holds: the writer stays shut.
		if _, again := w.Append(record.Note{Text: "three"}); !errors.Is(again, err) || w.Err() == nil {
			t.Errorf("%s: a later Append = %v, want the same error", c.name, again)
		}
		if w.Acknowledged() != safe {
			t.Errorf("%s: Acknowledged = %+v, want %+v", c.name, w.Acknowledged(), safe)
		}
	}
}

func TestMoveToGoesOnWhereThereIsRoom(t *testing.T) {
	d := chlogtest.NewDisk()
	w, err := chlog.Create(d, path, chlogtest.Opened(record.SiteMode), chlogtest.Options())
	if err != nil {
		t.Fatal(err)
	}
	chlogtest.Append(t, w, record.Person{ID: "p1", Name: "A. Example", Role: "technician"}, record.Note{Text: "one"})
	safe := w.Acknowledged()
	d.FailAt, d.Err, d.Once = d.Calls()+1, errors.New("no space left on device"), true
	if _, err := w.Append(record.Note{Text: "two"}); err == nil {
		t.Fatal("Append = nil, want an error")
	}
	moved, err := w.MoveTo("stick/wagtail.chlog")
	if err != nil {
		t.Fatal(err)
	}
	chlogtest.Append(t, moved, record.Note{Text: "two"})
	if _, err := moved.SignOff("p1", "charge.curve", nil, "key left at home"); err != nil {
		t.Errorf("SignOff after a move = %v, want the persons to have come along", err)
	}
	got := d.Read("stick/wagtail.chlog")
	if !bytes.HasPrefix(got, d.Read(path)[:safe.Bytes]) {
		t.Error("the moved log does not begin with the old one's bytes")
	}
	all := lines(t, got)
	body, err := all[3].Decode()
	if r, ok := body.(record.Resumed); err != nil || !ok || r.Moved == nil || *r.Moved != (record.Moved{From: "wagtail.chlog", Why: "write: no space left on device"}) {
		t.Errorf("record 3 = %+v, %v, want where it moved from", body, err)
	}
	if _, err := w.MoveTo("stick/wagtail.chlog"); err == nil {
		t.Error("MoveTo a log in use = nil, want an error")
	}
	if _, err := w.Append(record.Note{}); err == nil {
		t.Error("Append to the log that was left = nil, want an error")
	}
}

func TestASecondWriterIsRefused(t *testing.T) {
	file := filepath.Join(t.TempDir(), "wagtail.chlog")
	w, err := chlog.Create(chlog.Disk{}, file, chlogtest.Opened(record.SiteMode), chlogtest.Options())
	if err != nil {
		t.Fatal(err)
	}
	_, _, err = chlog.Resume(chlog.Disk{}, file, chlogtest.Options())
	if _, ok := errors.AsType[*chlog.InUseError](err); !ok || err.Error() != "another chargehand is writing wagtail.chlog; close it, or choose another log" {
		t.Errorf("Resume of a log in use = %v, want an InUseError", err)
	}
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	again, all, err := chlog.Resume(chlog.Disk{}, file, chlogtest.Options())
	if err != nil || len(all) != 2 || all[1].Kind != "resumed" {
		t.Fatalf("Resume after Close = %v, %v, want two lines", all, err)
	}
	again.Close()
	if _, err := chlog.Create(chlog.Disk{}, file, chlogtest.Opened(record.SiteMode), chlogtest.Options()); !errors.Is(err, fs.ErrExist) {
		t.Errorf("Create over a log = %v, want ErrExist", err)
	}
	if _, err := again.Append(record.Note{}); !errors.Is(err, chlog.ErrClosed) {
		t.Errorf("Append after Close = %v, want ErrClosed", err)
	}
}

func TestResumeRefusesABrokenMiddleAndASealedLog(t *testing.T) {
	file := chlogtest.Sealed(t, record.SiteMode, chlogtest.Key(t))
	if _, _, err := chlog.Resume(chlog.Disk{}, file, chlogtest.Options()); !errors.Is(err, chlog.ErrSealed) {
		t.Errorf("Resume of a sealed log = %v, want ErrSealed", err)
	}
	text := read(t, file)
	text = text[:bytes.LastIndexByte(text[:len(text)-1], '\n')+1] // no seal
	for name, broken := range map[string][]byte{
		"changed":          bytes.Replace(text, []byte("A. Example"), []byte("B. Example"), 1),
		"last prev wrong":  append(bytes.Clone(text[:bytes.LastIndex(text, []byte(`{"prev":"`))+9]), append(bytes.Repeat([]byte("0"), 64), text[bytes.LastIndex(text, []byte(`{"prev":"`))+73:]...)...),
		"ill-formed":       bytes.Replace(text, []byte(`"stage":"charge"`), []byte(`"stage": "charge"`), 1),
		"first line gone":  text[bytes.IndexByte(text, '\n')+1:],
		"no log":           []byte("hello\n"),
		"empty":            nil,
		"from the future":  bytes.Replace(text, []byte("chargehand-log/1"), []byte("chargehand-log/9"), 1),
		"torn first line":  text[:20],
		"second opened on": append(bytes.Clone(text), text...),
	} {
		write(t, file, broken)
		if _, _, err := chlog.Resume(chlog.Disk{}, file, chlogtest.Options()); err == nil {
			t.Errorf("%s: Resume = nil, want an error", name)
		}
		if got := read(t, file); !bytes.Equal(got, broken) {
			t.Errorf("%s: Resume changed a log it refused", name)
		}
	}
}

func TestAppendRefusesWhatWouldNotBeALineAndGoesOn(t *testing.T) {
	d := chlogtest.NewDisk()
	w, err := chlog.Create(d, path, chlogtest.Opened(record.SiteMode), chlogtest.Options())
	if err != nil {
		t.Fatal(err)
	}
	nan := 0.0
	nan /= nan
	for name, body := range map[string]record.Body{
		"control character":     record.Note{Text: "a\x1bb"},
		"C1 control character":  record.Note{Text: "a\u0085b"},
		"no UTF-8":              record.Note{Text: "a\xffb"},
		"not a number":          record.Setting{Value: nan},
		"too long":              record.Note{Text: strings.Repeat("x", chlog.MaxLine)},
		"key twice":             record.Finding{JSON: []byte(`{"id":"a","id":"b"}`)},
		"keys differ in case":   record.Finding{JSON: []byte(`{"id":"a","ID":"b"}`)},
		"not an object":         record.Finding{JSON: []byte(`[1]`)},
		"no JSON":               record.Finding{JSON: []byte(`{`)},
		"second opened":         chlogtest.Opened(record.SiteMode),
		"kind with a space":     record.Other{Name: "my kind", JSON: []byte(`{}`)},
		"kind that is too long": record.Other{Name: strings.Repeat("k", 41), JSON: []byte(`{}`)},
	} {
		before := w.Acknowledged()
		_, err := w.Append(body)
		if _, ok := errors.AsType[*chlog.RefusedError](err); !ok || w.Acknowledged() != before {
			t.Errorf("%s: Append = %v, want a RefusedError and nothing written", name, err)
		}
	}
	for _, text := range []string{"tab\tline\nCR\r", "µΩ ≤ U+2028 \u2028", "<script>&", "literal \\ufffd and \ufffd"} {
		l, err := w.Append(record.Note{Text: text})
		if err != nil {
			t.Errorf("Append(%q) = %v, want nil", text, err)
			continue
		}
		if body, _ := l.Decode(); body.(record.Note).Text != text {
			t.Errorf("Append(%q) reads back as %q", text, body)
		}
	}
	if n := len(lines(t, d.Read(path))); n != 5 {
		t.Errorf("%d lines, want 5", n)
	}
}

func TestClockStepsAreRecorded(t *testing.T) {
	d := chlogtest.NewDisk()
	wall, monotonic := chlogtest.Start, 100*time.Second
	w, err := chlog.Create(d, path, chlogtest.Opened(record.SiteMode), chlog.Options{
		Now: func() time.Time { return wall }, Monotonic: func() time.Duration { return monotonic }})
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		name      string
		wall, mon time.Duration
		want      string // the body of the clock record, "" for none
	}{
		{"in step", 10 * time.Second, 10 * time.Second, ""},
		{"half a second off", 10500 * time.Millisecond, 10 * time.Second, ""},
		{"set back an hour", -3590200 * time.Millisecond, 10 * time.Second, `{"wall_step":-3600.2,"monotonic":30}`},
		{"in step again", time.Second, time.Second, ""},
		{"set forward", 3 * time.Second, time.Second, `{"wall_step":2,"monotonic":32}`},
		{"slewed over eight hours", 8*time.Hour + 14*time.Second, 8 * time.Hour, ""},
		{"a minute off after eight hours", 8*time.Hour + time.Minute, 8 * time.Hour, `{"wall_step":60,"monotonic":57632}`},
	} {
		wall, monotonic = wall.Add(c.wall), monotonic+c.mon
		before := w.Acknowledged().Lines
		l, err := w.Append(record.Note{Text: c.name})
		if err != nil {
			t.Fatal(err)
		}
		all := lines(t, d.Read(path))
		got := ""
		if l.Seq > before {
			got = string(all[before].Body)
			if all[before].Kind != "clock" {
				t.Errorf("%s: record %d is %q, want clock", c.name, before, all[before].Kind)
			}
		}
		if got != c.want {
			t.Errorf("%s: clock record = %q, want %q", c.name, got, c.want)
		}
	}
}

func TestAppendSignedKnowsItsPlace(t *testing.T) {
	d := chlogtest.NewDisk()
	w, err := chlog.Create(d, path, chlogtest.Opened(record.SiteMode), chlogtest.Options())
	if err != nil {
		t.Fatal(err)
	}
	head := w.Acknowledged().Head
	l, err := w.AppendSigned(func(seq int64, prev string, at time.Time) (record.Body, error) {
		return record.Note{Text: fmt.Sprint(seq, prev, chlog.FormatTime(at))}, nil
	})
	if err != nil {
		t.Fatal(err)
	}
	body, _ := l.Decode()
	if want := fmt.Sprint(int64(1), head, chlog.FormatTime(l.At)); body.(record.Note).Text != want || l.Prev != head {
		t.Errorf("build was given %q, want %q", body, want)
	}
	cancelled := errors.New("the key was not touched")
	if _, err := w.AppendSigned(func(int64, string, time.Time) (record.Body, error) { return nil, cancelled }); !errors.Is(err, cancelled) || w.Err() != nil {
		t.Errorf("AppendSigned = %v (%v), want its own error and a writer that goes on", err, w.Err())
	}
}

func TestAPlaceThatCannotBeWrittenSaysSo(t *testing.T) {
	missing := filepath.Join(t.TempDir(), "no", "such", "folder", "wagtail.chlog")
	if _, err := chlog.Create(chlog.Disk{}, missing, chlogtest.Opened(record.SiteMode), chlogtest.Options()); !errors.Is(err, fs.ErrNotExist) || strings.Contains(err.Error(), "network") {
		t.Errorf("Create in a missing folder = %v, want ErrNotExist", err)
	}
	d := chlogtest.NewDisk()
	d.FailAt, d.Err = 1, errors.New("read-only file system")
	if _, err := chlog.Create(d, path, chlogtest.Opened(record.SiteMode), chlogtest.Options()); err == nil || !strings.Contains(err.Error(), "read-only file system") {
		t.Errorf("Create on a read-only disk = %v, want its error", err)
	}
	d = chlogtest.NewDisk()
	w, err := chlog.Create(d, path, chlogtest.Opened(record.SiteMode), chlogtest.Options())
	if err != nil {
		t.Fatal(err)
	}
	d.FailAt, d.Err = d.Calls()+1, chlogtest.ErrGone
	if _, err := w.Append(record.Note{Text: "lost"}); err == nil {
		t.Fatal("Append on a medium that is gone = nil, want an error")
	}
	if _, err := w.MoveTo("stick/wagtail.chlog"); !errors.Is(err, chlogtest.ErrGone) {
		t.Errorf("MoveTo another medium that is gone = %v, want ErrGone", err)
	}
	d.FailAt = 0
	if moved, err := w.MoveTo("stick/wagtail.chlog"); err != nil || moved.Acknowledged().Lines != 2 {
		t.Errorf("MoveTo once there is a place = %v, want the log with its two lines", err)
	}
}
