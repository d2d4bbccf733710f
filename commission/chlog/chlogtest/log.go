// Package chlogtest makes logs for tests, and a disk that fails on purpose.
package chlogtest

import (
	"path/filepath"
	"testing"
	"time"

	"chargehand/commission/chlog"
	"chargehand/commission/record"
	"chargehand/commission/signing"
)

// ID is the log id of every log made here.
const ID = "0f1e2d3c4b5a69788796a5b4c3d2e1f0"

// Start is the time of a log's first record; each later one comes a second after.
var Start = time.Date(2026, 12, 1, 9, 30, 0, 0, time.FixedZone("", 3600))

// Clock counts a second for each line: the writer asks it once when it begins and twice for a line.
func Clock() func() time.Time {
	calls := -1
	return func() time.Time {
		calls++
		return Start.Add(time.Duration((calls)/2) * time.Second)
	}
}

// Options are those of a writer with [Clock].
func Options() chlog.Options { return chlog.Options{Now: Clock(), Program: "1.0.0"} }

// Key makes a key.
func Key(t testing.TB) signing.Key {
	t.Helper()
	k, err := signing.Generate()
	if err != nil {
		t.Fatal(err)
	}
	return k
}

// Opened is the first record of a log made here.
func Opened(mode string) record.Opened {
	return record.Opened{Log: ID, Mode: mode, Program: "1.0.0", Device: "127.0.0.1:1502", Speed: 1}
}

// Begin begins a log with one technician, whose key it is, in a folder of the test's own.
func Begin(t testing.TB, mode string, key signing.Key) *chlog.Writer {
	t.Helper()
	path := filepath.Join(t.TempDir(), "wagtail.chlog")
	w, err := chlog.Create(chlog.Disk{}, path, Opened(mode), Options())
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { w.Close() })
	fingerprint := key.Fingerprint()
	Append(t, w, record.Person{ID: "p1", Name: "A. Example", Role: "technician", Organisation: "Aldermere slipway", Key: &fingerprint})
	return w
}

// Append appends bodies.
func Append(t testing.TB, w *chlog.Writer, bodies ...record.Body) {
	t.Helper()
	for _, b := range bodies {
		if _, err := w.Append(b); err != nil {
			t.Fatal(err)
		}
	}
}

// Sealed makes a small log with a sign-off and a seal, and its detached signature. It returns the log's path.
func Sealed(t testing.TB, mode string, key signing.Key) string {
	t.Helper()
	w := Begin(t, mode, key)
	Append(t, w,
		record.File{Role: "site", Name: "wagtail.site.toml", SHA256: "ab12", Text: "format = \"chargehand-site/1\"\n"},
		record.Stage{Stage: "charge", Event: record.Entered, Invalidates: []int64{}},
		record.Point{ID: "charge.curve", Result: "pass", Readings: []int64{}})
	if _, err := w.SignOff("p1", "charge.curve", key, ""); err != nil {
		t.Fatal(err)
	}
	Append(t, w, record.Note{Text: "second charge not needed"})
	if _, err := w.Seal("p1", "pass", key, ""); err != nil {
		t.Fatal(err)
	}
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	if _, err := chlog.SignFile(w.Path(), key); err != nil {
		t.Fatal(err)
	}
	return w.Path()
}
