package chlog_test

import (
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"os"
	"path/filepath"
	"testing"
	"time"

	"chargehand/commission/chlog"
	"chargehand/commission/chlog/chlogtest"
	"chargehand/commission/record"
	"chargehand/commission/signing"
)

// testKey loads a key of testdata, from where only the test can read it.
func testKey(t testing.TB, name string) signing.Key {
	t.Helper()
	path := filepath.Join(t.TempDir(), name)
	if err := os.WriteFile(path, read(t, filepath.Join("testdata", name)), 0o600); err != nil {
		t.Fatal(err)
	}
	k, err := signing.Load(path, nil)
	if err != nil {
		t.Fatal(err)
	}
	return k
}

func ptr[T any](v T) *T { return &v }

// exampleLog writes a log that holds every kind of record. It depends on nothing but testdata's keys, since an Ed25519
// signature depends on nothing but key and message.
func exampleLog(t testing.TB) (path string) {
	t.Helper()
	key, surveyor := testKey(t, "example.key"), testKey(t, "surveyor.key")
	path = filepath.Join(t.TempDir(), "example.chlog")
	wall, monotonic := chlogtest.Start, time.Duration(0)
	o := chlog.Options{Program: "1.0.0", Monotonic: func() time.Duration { return monotonic }, Now: func() time.Time { return wall }}
	pass := func(d time.Duration) { wall, monotonic = wall.Add(d), monotonic+d }
	site := "format = \"chargehand-site/1\"\n\n[site]\nname = \"Ferry Wagtail, aft battery string\"\n"
	sum := sha256.Sum256([]byte(site))
	opened := chlogtest.Opened(record.RehearsalMode)
	opened.Disturb, opened.Seed, opened.Speed = []string{"resistor-high=12 %"}, ptr[int64](7), 1
	w, err := chlog.Create(chlog.Disk{}, path, opened, o)
	if err != nil {
		t.Fatal(err)
	}
	add := func(bodies ...record.Body) {
		for _, b := range bodies {
			pass(time.Second)
			chlogtest.Append(t, w, b)
		}
	}
	add(record.File{Role: "site", Name: "wagtail.site.toml", SHA256: hex.EncodeToString(sum[:]), Text: site},
		record.Person{ID: "p1", Name: "A. Example", Role: "technician", Organisation: "Aldermere slipway", Key: ptr(key.Fingerprint())},
		record.Person{ID: "p2", Name: "B. Example", Role: "surveyor", Organisation: "class", Key: ptr(surveyor.Fingerprint())},
		record.Instrument{ID: "i1", Name: "hand multimeter", Serial: "HM-0417", Calibrated: "2026-03-01", Due: "2027-03-01",
			Accuracy: record.InstrumentAccuracy{OfReading: 0.0005, Plus: 0.1, Unit: "V"}},
		record.Link{Event: "up", Peer: "127.0.0.1:1502"},
		record.Setting{Name: "droop-setting", When: "as-found", Value: 0.136, Unit: "V/A", Raw: ptr[int64](1360), Source: record.FromDevice},
		record.Stage{Stage: "charge", Event: record.Entered, Invalidates: []int64{}},
		record.Reading{Point: "charge.source", Signal: "source-voltage", Value: ptr(712.4), Unit: "V", Source: record.FromDevice,
			Raw: []uint16{7124}, Age: 0.021, U: 0.05, Quality: "good"},
		record.Attempt{N: 1, Earliest: chlog.FormatTime(wall)},
		record.Capture{ID: "c1", Part: 1, Parts: 1, Stage: "charge", What: "precharge", Attempt: 1, T0: chlog.FormatTime(wall),
			Signals: []record.CaptureSignal{{Name: "bus-voltage", Unit: "V", Scale: 0.1, Type: "u16"}},
			Samples: []json.RawMessage{json.RawMessage(`[0,[0]]`), json.RawMessage(`[0.051,[311]]`), json.RawMessage(`[0.102,null]`)},
			Gaps:    []json.RawMessage{json.RawMessage(`[0.051,0.153,"link"]`)}},
		record.Finding{JSON: json.RawMessage(`{"id":"measured.precharge","subject":null,"title":"Measured pre-charge","unit":"s","state":"finite",` +
			`"value":{"low":1.36,"nominal":1.37,"high":1.38},"parts":[],"limit":{"low":0.95,"high":1.56},"margin":0.18,"verdict":"pass",` +
			`"because":["inside the predicted band"],"basis":"fit of an exponential","remedy":"","captures":["c1"],` +
			`"cause":[{"id":"resistor-high","score":0.93,"evidence":["time constant 12 % above nominal"],"confirm":"measure the resistor cold"}]}`)},
		record.Point{ID: "charge.curve", Result: "fail", Readings: []int64{8}, Note: "slower than the plate says"},
		record.Deviation{Point: "charge.curve", Reason: "resistor replaced by one of 112 Ω, ordered", AcceptedBy: "p2"},
		record.Punch{ID: "k1", What: "fit the 100 Ω resistor", Severity: "B", Owner: "slipway", Due: "2027-01-15", Event: "raised", Point: "charge.curve"},
		record.Note{Text: "reading 8 was taken at the fuse, not at the bypass", Corrects: ptr[int64](8)},
		record.Hastened{What: "cool-down", Factor: 50})
	wall = wall.Add(-3600200 * time.Millisecond)
	add(record.Link{Event: "reconnected", Peer: "127.0.0.1:1502", Why: "answered again after 3 s"})
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	torn := append(read(t, path), `{"prev":"0123`...)
	write(t, path, torn)
	if w, _, err = chlog.Resume(chlog.Disk{}, path, o); err != nil {
		t.Fatal(err)
	}
	pass(time.Second)
	if _, err := w.SignOff("p1", "charge.curve", key, ""); err != nil {
		t.Fatal(err)
	}
	if _, err := w.SignOff("p2", "charge.curve", nil, "left before the end"); err != nil {
		t.Fatal(err)
	}
	if _, err := w.Seal("p1", "fail", key, ""); err != nil {
		t.Fatal(err)
	}
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	for _, k := range []signing.Key{key, surveyor} {
		if _, err := chlog.SignFile(path, k); err != nil {
			t.Fatal(err)
		}
	}
	return path
}
