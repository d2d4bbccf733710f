package chlog

import (
	"bytes"
	"errors"
	"fmt"
	"path/filepath"

	"chargehand/commission/record"
)

// MoveTo goes on with this log in another file when its place can take nothing more. The copy holds every acknowledged line,
// byte for byte and with the same log id, then a record "resumed" that names the file it left; the record that failed is for
// the caller to append again. The old file is not touched: its last line may be torn, or whole but never acknowledged. Going
// on with both would make a fork, which verify finds; so the old one is to be kept and never resumed.
func (w *Writer) MoveTo(path string) (*Writer, error) {
	w.mu.Lock()
	defer w.mu.Unlock()
	if w.sealed {
		return nil, ErrSealed
	}
	why := "moved by hand"
	if w.failed != nil {
		why = fmt.Sprintf("%s: %v", w.failed.Do, w.failed.Err)
	}
	moved := newWriter(w.fsys, path, w.options)
	moved.wall, moved.monotonic, moved.began = w.wall, w.monotonic, w.began
	if err := moved.takeLock(); err != nil {
		return nil, err
	}
	if err := moved.copyOf(w, why); err != nil {
		if moved.file != nil {
			err = errors.Join(err, moved.file.Close())
		}
		return nil, errors.Join(err, moved.lock.Close())
	}
	if !w.closed {
		w.closed = true
		w.file.Close() // its place is gone or full: what it says no longer matters
		w.lock.Close()
	}
	return moved, nil
}

func (w *Writer) copyOf(old *Writer, why string) error {
	if err := w.create(); err != nil {
		return err
	}
	if err := w.write(bytes.Join(old.kept, nil)); err != nil {
		return err
	}
	w.opened, w.files, w.kept = old.opened, old.files, old.kept
	w.persons, w.size, w.seq, w.head = old.persons, old.size, old.seq, old.head
	_, err := w.Append(record.Resumed{Program: w.options.Program, Moved: &record.Moved{From: filepath.Base(old.path), Why: printable(why)}})
	return err
}
