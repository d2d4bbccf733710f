package chlog_test

import (
	"bytes"
	"fmt"
	"math/rand/v2"
	"os"
	"runtime"
	"sync"
	"sync/atomic"
	"testing"

	"chargehand/commission/chlog"
	"chargehand/commission/chlog/chlogtest"
	"chargehand/commission/record"
)

// smallest is the smallest sealed log that holds every thing that can be forged, and its signature.
func smallest(t testing.TB) (log, signature []byte, key interface{ AuthorizedKey() string }) {
	k := chlogtest.Key(t)
	w := chlogtest.Begin(t, record.SiteMode, k)
	if _, err := w.SignOff("p1", "charge.curve", k, ""); err != nil {
		t.Fatal(err)
	}
	if _, err := w.Seal("p1", "pass", k, ""); err != nil {
		t.Fatal(err)
	}
	name, err := chlog.SignFile(w.Path(), k)
	if err != nil {
		t.Fatal(err)
	}
	return read(t, w.Path()), read(t, name), k
}

// hunt verifies altered logs on every processor and reports each that passes, or that blames a record after the altered one.
type hunt struct {
	t         *testing.T
	v         chlog.Verifier
	signature []byte
	whole     []byte
	tried     atomic.Int64
}

func (h *hunt) try(what string, at int, log []byte) {
	if bytes.Equal(log, h.whole) {
		return
	}
	h.tried.Add(1)
	r := h.v.VerifyReader(bytes.NewReader(log), h.signature)
	if r.Exit == 0 {
		h.t.Errorf("%s at byte %d: Verify = %s, want it found", what, at, r)
	}
	altered := int64(bytes.Count(h.whole[:min(at, len(h.whole))], []byte("\n")))
	if r.Damage != nil && (r.Damage.Record > altered+1 || r.Records > altered+1) {
		h.t.Errorf("%s at byte %d (record %d): Verify = %s, which vouches for too much", what, at, altered, r)
	}
}

func (h *hunt) everywhere(do func(i int)) {
	var workers sync.WaitGroup
	var next atomic.Int64
	for range runtime.GOMAXPROCS(0) {
		workers.Go(func() {
			for {
				i := int(next.Add(1)) - 1
				if i >= len(h.whole) || h.t.Failed() {
					return
				}
				do(i)
			}
		})
	}
	workers.Wait()
}

// Every change of a byte, every deletion, insertion, swap of neighbours, doubling and truncation of a small
// sealed log with its signature is found.
func TestEverySingleByteIsVouchedFor(t *testing.T) {
	whole, signature, key := smallest(t)
	h := &hunt{t: t, v: chlog.Verifier{Signers: allow(t, "tech@example.org "+key.AuthorizedKey()), Now: now}, signature: signature, whole: whole}
	if r := h.v.VerifyReader(bytes.NewReader(whole), signature); r.Exit != 0 {
		t.Fatalf("Verify of the unaltered log = %s", r)
	}
	h.everywhere(func(i int) {
		changed := bytes.Clone(whole)
		for _, c := range replacements(whole[i]) {
			changed[i] = c
			h.try(fmt.Sprintf("change to %#02x", c), i, changed)
		}
		changed[i] = whole[i]
		if i > 0 {
			changed[i], changed[i-1] = changed[i-1], changed[i]
			h.try("swap", i-1, changed)
		}
		longer := append(append(bytes.Clone(whole[:i]), 0), whole[i:]...)
		for _, c := range insertions() {
			longer[i] = c
			h.try(fmt.Sprintf("insertion of %#02x", c), i, longer)
		}
		h.try("deletion", i, append(bytes.Clone(whole[:i]), whole[i+1:]...))
		h.try("truncation", i, whole[:i])
	})
	for c := range 256 {
		h.try("a byte after the end", len(whole), append(bytes.Clone(whole), byte(c)))
	}
	t.Logf("%d altered logs of %d bytes, all found", h.tried.Load(), len(whole))
}

// everyValue asks for every value of every byte: about 1.1 million altered logs, which take minutes.
var everyValue = os.Getenv("CHARGEHAND_EVERY_BYTE") != ""

// replacements are the bytes to put in the place of c: each that differs in one bit, and those that are inserted.
func replacements(c byte) []byte {
	some := insertions()
	for bit := range 8 {
		some = append(some, c^1<<bit)
	}
	return some
}

// insertions are the bytes to put in at each place: some that mean something to JSON, or every byte.
func insertions() []byte {
	if !everyValue {
		return []byte("\n\"0 ")
	}
	all := make([]byte, 256)
	for i := range all {
		all[i] = byte(i)
	}
	return all
}

// Lines swapped, deleted, doubled, put in, or spliced from another log of the same signer are found.
func TestEveryLineIsVouchedFor(t *testing.T) {
	key := chlogtest.Key(t)
	path := chlogtest.Sealed(t, record.SiteMode, key)
	whole, signature := read(t, path), read(t, path+".sig")
	other := read(t, chlogtest.Sealed(t, record.SiteMode, key))
	lines, theirs := bytes.SplitAfter(whole, []byte("\n")), bytes.SplitAfter(other, []byte("\n"))
	lines, theirs = lines[:len(lines)-1], theirs[:len(theirs)-1]
	h := &hunt{t: t, v: chlog.Verifier{Signers: allow(t, "tech@example.org "+key.AuthorizedKey()), Now: now}, signature: signature, whole: whole}
	join := func(parts ...[][]byte) []byte {
		var b []byte
		for _, p := range parts {
			b = append(b, bytes.Join(p, nil)...)
		}
		return b
	}
	offset := func(i int) int { return len(join(lines[:i])) }
	for i := range lines {
		h.try(fmt.Sprintf("line %d deleted", i+1), offset(i), join(lines[:i], lines[i+1:]))
		h.try(fmt.Sprintf("line %d doubled", i+1), offset(i), join(lines[:i+1], lines[i:]))
		h.try(fmt.Sprintf("spliced before line %d", i+1), offset(i), join(lines[:i], theirs[i:]))
		h.try(fmt.Sprintf("re-chained splice before line %d", i+1), len(whole), rechainWithStatements(join(lines[:i], theirs[i:])))
		for j := i + 1; j < len(lines); j++ {
			swapped := append([][]byte(nil), lines...)
			swapped[i], swapped[j] = swapped[j], swapped[i]
			h.try(fmt.Sprintf("lines %d and %d swapped", i+1, j+1), offset(i), join(swapped))
			h.try(fmt.Sprintf("lines %d to %d cut out", i+1, j), offset(i), join(lines[:i], lines[j:]))
		}
	}
}

// A log of some hundred kilobytes is altered at random.
func TestALargeLogAlteredAtRandom(t *testing.T) {
	key := chlogtest.Key(t)
	w := chlogtest.Begin(t, record.SiteMode, key)
	random := rand.New(rand.NewPCG(1, 2))
	for i := range 300 {
		v := random.Float64() * 1000
		chlogtest.Append(t, w, record.Reading{Point: "charge.curve", Signal: "bus-voltage", Value: &v, Unit: "V", Source: record.FromDevice, Raw: []uint16{uint16(i)}, Quality: "good"})
	}
	if _, err := w.Seal("p1", "pass", key, ""); err != nil {
		t.Fatal(err)
	}
	name, err := chlog.SignFile(w.Path(), key)
	if err != nil {
		t.Fatal(err)
	}
	whole := read(t, w.Path())
	h := &hunt{t: t, v: chlog.Verifier{Now: now}, signature: read(t, name), whole: whole}
	for range 300 {
		i, j := random.IntN(len(whole)), random.IntN(len(whole))
		changed := bytes.Clone(whole)
		changed[i] ^= 1 << random.IntN(8)
		h.try("bit turned", i, changed)
		i, j = min(i, j), max(i, j)
		h.try("stretch cut out", i, append(bytes.Clone(whole[:i]), whole[j:]...))
	}
}
