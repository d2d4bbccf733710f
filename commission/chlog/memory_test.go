package chlog_test

import (
	"bytes"
	"io"
	"runtime"
	"strings"
	"testing"

	"chargehand/commission/chlog"
	"chargehand/commission/chlog/chlogtest"
	"chargehand/commission/record"
)

// stream makes a log while it is read: an opened record, then notes of nearly the longest line allowed.
type stream struct {
	left   int
	seq    int64
	prev   string
	buffer bytes.Reader
	live   uint64 // the most that was reachable at any line, bytes
}

func (s *stream) Read(p []byte) (int, error) {
	if s.buffer.Len() == 0 {
		if s.left <= 0 {
			return 0, io.EOF
		}
		s.buffer.Reset(s.line())
	}
	n, err := s.buffer.Read(p)
	s.left -= n
	return n, err
}

var longNote = []byte(`{"text":"` + strings.Repeat("0123456789abcdef", (chlog.MaxLine-500)/16) + `","corrects":null}`)

func (s *stream) line() []byte {
	body, kind := longNote, "note"
	if s.seq == 0 {
		body, kind = []byte(opened), "opened"
	}
	line := chlog.Encode(s.prev, s.seq, chlogtest.Start, kind, body)
	s.seq, s.prev = s.seq+1, chlog.HashOf(line)
	// Only what is reachable says how much Verify needs: what the heap holds beside it is a matter of when it was swept.
	runtime.GC()
	var now runtime.MemStats
	runtime.ReadMemStats(&now)
	s.live = max(s.live, now.HeapAlloc)
	return line
}

// Verify needs no more memory for a long log than for a short one. The collector lets a heap grow to twice what is reachable
// (GOGC 100), so half of the 64 MB may be reachable at any line, the maker's own lines included.
func TestVerifyStreams(t *testing.T) {
	key := chlogtest.Key(t)
	signature := read(t, chlogtest.Sealed(t, record.SiteMode, key)+".sig")
	runtime.GC()
	var before runtime.MemStats
	runtime.ReadMemStats(&before)
	s := &stream{left: 100 << 20, prev: chlog.NoPrev}
	r := chlog.Verifier{Now: now}.VerifyReader(s, signature)
	if r.Records < 25 || r.Damage != nil {
		t.Fatalf("Verify = %s after %d records, want an intact log without its seal", r, r.Records)
	}
	if reached := int64(s.live) - int64(before.HeapAlloc); reached > 32e6 {
		t.Errorf("Verify of %d MB holds %.1f MB, want at most 32", r.Bytes>>20, float64(reached)/1e6)
	} else {
		t.Logf("Verify of %d MB holds %.1f MB at the most", r.Bytes>>20, float64(reached)/1e6)
	}
}
