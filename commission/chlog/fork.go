package chlog

import (
	"bufio"
	"bytes"
	"fmt"
	"io"
	"os"
	"path/filepath"
)

// findForks compares logs of one call that have the same id. Only logs whose own chain holds are compared: a damaged file is
// no second history. A shorter copy of another log is no fork either, but says where it ends.
func findForks(reports []Report, paths []string) {
	for i := range reports {
		for j := i + 1; j < len(reports); j++ {
			a, b := &reports[i], &reports[j]
			if a.Log == "" || a.Log != b.Log || a.Damage != nil || b.Damage != nil {
				continue
			}
			d, err := compare(paths[i], paths[j])
			if err != nil {
				note := fmt.Sprintf("could not be compared with %s: %v", filepath.Base(paths[j]), err)
				a.Notes = append(a.Notes, note)
				continue
			}
			tell(a, d, paths[j], d.aEnded, d.bEnded)
			tell(b, d, paths[i], d.bEnded, d.aEnded)
		}
	}
}

// divergence is where two files differ.
type divergence struct {
	record         int64 // the first that differs
	offset         int64 // the first byte that differs
	aEnded, bEnded bool  // whose file ends here
}

func tell(r *Report, d divergence, other string, ended, otherEnded bool) {
	other = filepath.Base(other)
	switch {
	case ended && otherEnded:
		r.Notes = append(r.Notes, "the same, byte for byte, as "+other)
	case ended:
		r.Notes = append(r.Notes, fmt.Sprintf("the beginning of %s, which goes on with record %d", other, d.record))
	case otherEnded:
		r.Notes = append(r.Notes, fmt.Sprintf("goes on after record %d, where %s ends", d.record-1, other))
	default:
		sentence := fmt.Sprintf("fork after record %d: %s has the same log id and other bytes from offset %d on", d.record-1, other, d.offset)
		if d.record == 0 {
			sentence = fmt.Sprintf("fork in the first record: %s has the same log id and other bytes from offset %d on", other, d.offset)
		}
		if r.Exit > 0 {
			r.Notes = append(r.Notes, sentence)
			return
		}
		r.Notes = append(r.Notes, r.Sentence)
		r.Outcome, r.Sentence, r.Exit = Forked, sentence, Forked.Exit()
	}
}

// compare reads two files side by side up to the first difference.
func compare(a, b string) (divergence, error) {
	fa, err := os.Open(a)
	if err != nil {
		return divergence{}, err
	}
	defer fa.Close()
	fb, err := os.Open(b)
	if err != nil {
		return divergence{}, err
	}
	defer fb.Close()
	return diverge(bufio.NewReaderSize(fa, 64<<10), bufio.NewReaderSize(fb, 64<<10))
}

func diverge(a, b *bufio.Reader) (divergence, error) {
	var d divergence
	for {
		_, errA := a.Peek(1)
		_, errB := b.Peek(1)
		d.aEnded, d.bEnded = errA == io.EOF, errB == io.EOF
		if d.aEnded || d.bEnded {
			return d, nil
		}
		if errA != nil || errB != nil {
			return d, fmt.Errorf("compare: %w", firstOf(errA, errB))
		}
		pa, _ := a.Peek(a.Buffered())
		pb, _ := b.Peek(b.Buffered())
		n := min(len(pa), len(pb))
		if same := commonPrefix(pa[:n], pb[:n]); same < n {
			d.offset += int64(same)
			d.record += int64(bytes.Count(pa[:same], []byte("\n")))
			return d, nil
		}
		d.offset += int64(n)
		d.record += int64(bytes.Count(pa[:n], []byte("\n")))
		a.Discard(n)
		b.Discard(n)
	}
}

func commonPrefix(a, b []byte) int {
	if bytes.Equal(a, b) {
		return len(a)
	}
	for i := range a {
		if a[i] != b[i] {
			return i
		}
	}
	return len(a)
}

func firstOf(errs ...error) error {
	for _, e := range errs {
		if e != nil {
			return e
		}
	}
	return nil
}
