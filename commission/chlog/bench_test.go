package chlog_test

import (
	"bytes"
	"crypto/sha256"
	"crypto/sha512"
	"encoding/json"
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"testing"
	"time"

	"chargehand/commission/chlog"
	"chargehand/commission/chlog/chlogtest"
	"chargehand/commission/record"
)

// BenchmarkAppend pairs each append with a bare write and sync of the same bytes to another file of the same folder, in turn
// first and second, and reports the median of the ratios. Point TMPDIR at a real disk.
func BenchmarkAppend(b *testing.B) {
	w := chlogtest.Begin(b, record.SiteMode, chlogtest.Key(b))
	bare, err := os.OpenFile(filepath.Join(filepath.Dir(w.Path()), "bare"), os.O_WRONLY|os.O_APPEND|os.O_CREATE, 0o644)
	if err != nil {
		b.Fatal(err)
	}
	defer bare.Close()
	v := 712.4
	reading := record.Reading{Point: "charge.source", Signal: "source-voltage", Value: &v, Unit: "V", Source: record.FromDevice, Raw: []uint16{7124}, Age: 0.021, U: 0.05, Quality: "good"}
	last, err := w.Append(reading)
	if err != nil {
		b.Fatal(err)
	}
	line := chlog.Encode(last.Prev, last.Seq, last.At, last.Kind, last.Body)
	appendOne := func() time.Duration {
		began := time.Now()
		if _, err := w.Append(reading); err != nil {
			b.Fatal(err)
		}
		return time.Since(began)
	}
	bareOne := func() time.Duration {
		began := time.Now()
		if _, err := bare.Write(line); err != nil {
			b.Fatal(err)
		}
		if err := bare.Sync(); err != nil {
			b.Fatal(err)
		}
		return time.Since(began)
	}
	var ratios, appends, bares []float64
	for i := 0; b.Loop(); i++ {
		var ours, theirs time.Duration
		if i%2 == 0 {
			ours, theirs = appendOne(), bareOne()
		} else {
			theirs, ours = bareOne(), appendOne()
		}
		ratios = append(ratios, float64(ours)/float64(theirs))
		appends, bares = append(appends, float64(ours)), append(bares, float64(theirs))
	}
	b.ReportMetric(median(ratios), "median-ratio")
	b.ReportMetric(median(appends)/1000, "append-µs")
	b.ReportMetric(median(bares)/1000, "bare-µs")
}

func median(v []float64) float64 {
	slices.Sort(v)
	return v[len(v)/2]
}

// bigLog writes a sealed and signed log of about size bytes, nine tenths of it captures, without syncing each line.
func bigLog(b testing.TB, size int) string {
	b.Helper()
	key := chlogtest.Key(b)
	path := filepath.Join(b.TempDir(), "big.chlog")
	w, err := chlog.Create(unsynced{}, path, chlogtest.Opened(record.SiteMode), chlogtest.Options())
	if err != nil {
		b.Fatal(err)
	}
	chlogtest.Append(b, w, record.Person{ID: "p1", Name: "A. Example", Role: "technician"})
	random := rand.New(rand.NewPCG(1, 2))
	for n := 0; w.Acknowledged().Bytes < int64(size); n++ {
		c := record.Capture{ID: fmt.Sprintf("c%d", n), Part: 1, Parts: 1, Stage: "charge", What: "precharge", T0: chlog.FormatTime(chlogtest.Start),
			Signals: []record.CaptureSignal{{Name: "bus-voltage", Unit: "V", Scale: 0.1, Type: "u16"}, {Name: "source-current", Unit: "A", Scale: 0.1, Type: "i16"}}}
		for i := range 5000 {
			c.Samples = append(c.Samples, json.RawMessage(fmt.Sprintf(`[%.3f,[%d],[%d]]`, float64(i)*0.05, random.IntN(65536), random.IntN(65536))))
		}
		chlogtest.Append(b, w, c)
		for range 40 {
			v := random.Float64() * 1000
			chlogtest.Append(b, w, record.Reading{Point: "charge.source", Signal: "source-voltage", Value: &v, Unit: "V", Source: record.FromDevice, Raw: []uint16{7124}, Quality: "good"})
		}
		if _, err := w.SignOff("p1", "charge.curve", key, ""); err != nil {
			b.Fatal(err)
		}
	}
	if _, err := w.Seal("p1", "pass", key, ""); err != nil {
		b.Fatal(err)
	}
	if err := w.Close(); err != nil {
		b.Fatal(err)
	}
	if _, err := chlog.SignFile(path, key); err != nil {
		b.Fatal(err)
	}
	return path
}

// unsynced is the real disk without its syncs, to make big logs quickly.
type unsynced struct{ chlog.Disk }

func (unsynced) OpenFile(name string, flag int, mode os.FileMode) (chlog.File, error) {
	f, err := os.OpenFile(name, flag, mode)
	return lazyFile{f}, err
}

type lazyFile struct{ *os.File }

func (lazyFile) Sync() error { return nil }

// BenchmarkVerify pairs verify with the sum of its parts, serially in this process: the SHA-256 of every line, the SHA-512 of
// the file, and a JSON check of every line by package json.
func BenchmarkVerify(b *testing.B) {
	path := bigLog(b, 32<<20)
	whole := read(b, path)
	b.SetBytes(int64(len(whole)))
	verify := func() time.Duration {
		began := time.Now()
		if r := (chlog.Verifier{Now: now}).File(path); r.Exit != 0 {
			b.Fatal(r)
		}
		return time.Since(began)
	}
	parts := func() time.Duration {
		began := time.Now()
		for line := range bytes.Lines(whole) {
			sha256.Sum256(line)
		}
		sha512.Sum512(whole)
		for line := range bytes.Lines(whole) {
			if !json.Valid(line) {
				b.Fatal("no JSON")
			}
		}
		return time.Since(began)
	}
	var ratios, verifies []float64
	for i := 0; b.Loop(); i++ {
		var ours, theirs time.Duration
		if i%2 == 0 {
			ours, theirs = verify(), parts()
		} else {
			theirs, ours = parts(), verify()
		}
		ratios, verifies = append(ratios, float64(ours)/float64(theirs)), append(verifies, float64(ours))
	}
	b.ReportMetric(median(ratios), "median-ratio")
	b.ReportMetric(float64(len(whole))/1e6/(median(verifies)/1e9), "verify-MB/s")
}
