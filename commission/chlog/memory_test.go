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
	return line
}

// Verify needs no more memory for a long log than for a short one: less than 64 MB (the log is longer than that), here
// counted as everything the runtime took from the system, the maker's own lines included.
func TestVerifyStreams(t *testing.T) {
	key := chlogtest.Key(t)
	signature := read(t, chlogtest.Sealed(t, record.SiteMode, key)+".sig")
	var before, after runtime.MemStats
	runtime.GC()
	runtime.ReadMemStats(&before)
	s := &stream{left: 100 << 20, prev: chlog.NoPrev}
	r := chlog.Verifier{Now: now}.VerifyReader(s, signature)
	runtime.ReadMemStats(&after)
	if r.Records < 25 || r.Damage != nil {
		t.Fatalf("Verify = %s after %d records, want an intact log without its seal", r, r.Records)
	}
	if took := int64(after.HeapSys-before.HeapSys) + int64(before.HeapSys-before.HeapInuse); took > 64e6 {
		t.Errorf("Verify of %d MB took %d MB, want at most 64", r.Bytes>>20, took>>20)
	}
}
