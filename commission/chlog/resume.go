package chlog

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"

	"chargehand/commission/record"
)

// Resume goes on with a log that ended without a seal, for whatever reason. It reads every line strictly; sets a last line
// that is not whole aside in NAME.chlog.torn-N, where nothing of it is lost; refuses a log that is broken anywhere else; and
// appends a record "resumed", one more for each earlier torn line that a crash kept from being recorded. It returns every line
// of the log, those too.
func Resume(fsys FS, path string, o Options) (*Writer, []Line, error) {
	w := newWriter(fsys, path, o)
	if err := w.takeLock(); err != nil {
		return nil, nil, err
	}
	lines, err := w.resume()
	if err != nil {
		if w.file != nil {
			err = errors.Join(err, w.file.Close())
		}
		return nil, nil, errors.Join(err, w.lock.Close())
	}
	return w, lines, nil
}

func (w *Writer) resume() ([]Line, error) {
	text, err := readAll(w.fsys, w.path)
	if err != nil {
		return nil, err
	}
	lines, err := w.replay(text)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", filepath.Base(w.path), err)
	}
	if w.sealed {
		return nil, fmt.Errorf("%s: %w", filepath.Base(w.path), ErrSealed)
	}
	aside, err := w.setAside(text[w.size:], tornCount(lines))
	if err != nil {
		return nil, err
	}
	w.file, err = w.fsys.OpenFile(w.path, os.O_WRONLY|os.O_APPEND, 0)
	if err != nil {
		return nil, err
	}
	// A crash may have left lines that were written but never synced: what "resumed" is chained to must be on disk before it.
	if err := w.file.Sync(); err != nil {
		return nil, fmt.Errorf("sync %s: %w", filepath.Base(w.path), err)
	}
	for _, torn := range aside {
		l, err := w.Append(record.Resumed{Program: w.options.Program, Torn: torn})
		if err != nil {
			return nil, err
		}
		lines = append(lines, l)
	}
	return lines, nil
}

// replay takes every whole line of a log's text. What is left after w.size is a torn last line.
func (w *Writer) replay(text []byte) ([]Line, error) {
	r := NewReader(bytes.NewReader(text))
	var lines []Line
	for {
		l, err := r.Next()
		if damage, ok := errors.AsType[*DamageError](err); ok && damage.Torn && damage.Record > 0 {
			return lines, nil
		}
		if err == io.EOF {
			return lines, nil
		}
		if err != nil {
			return nil, err
		}
		body, err := l.Decode()
		if err != nil {
			return nil, err
		}
		lines = append(lines, l)
		w.take(body, text[r.Offset():r.End()])
	}
}

// setAside keeps the torn last line in a file of its own and cuts it off the log, and gives what the "resumed" records are to
// say: one for each such file that no record names yet, or one that names none. The copy is on disk before the cut, so that a
// crash in between leaves both, and the next resume writes the same copy again; a crash after the cut leaves a copy that no
// record names, and the next resume names it.
func (w *Writer) setAside(tail []byte, named int) ([]*record.Torn, error) {
	var aside []*record.Torn
	n := named + 1
	var last []byte
	for ; ; n++ {
		text, err := readAll(w.fsys, w.tornName(n))
		if errors.Is(err, fs.ErrNotExist) {
			break
		}
		if err != nil {
			return nil, err
		}
		last = text
		aside = append(aside, tornRecord(w.tornName(n), text))
	}
	if len(tail) > 0 {
		if len(aside) > 0 && bytes.HasPrefix(tail, last) { // the crash came between copy and cut
			n--
			aside = aside[:len(aside)-1]
		}
		if err := w.writeWhole(w.tornName(n), tail); err != nil {
			return nil, fmt.Errorf("set the torn last line aside: %w", err)
		}
		aside = append(aside, tornRecord(w.tornName(n), tail))
		if err := w.cut(); err != nil {
			return nil, err
		}
	}
	if len(aside) == 0 {
		aside = append(aside, nil)
	}
	return aside, nil
}

func (w *Writer) tornName(n int) string { return fmt.Sprintf("%s.torn-%d", w.path, n) }

func tornCount(lines []Line) int {
	n := 0
	for _, l := range lines {
		if body, err := l.Decode(); err == nil {
			if r, ok := body.(record.Resumed); ok && r.Torn != nil {
				n++
			}
		}
	}
	return n
}

func tornRecord(name string, text []byte) *record.Torn {
	sum := sha256.Sum256(text)
	return &record.Torn{Bytes: int64(len(text)), SHA256: hex.EncodeToString(sum[:]), KeptIn: filepath.Base(name)}
}

// writeWhole writes a file and has it and its name on disk before it returns.
func (w *Writer) writeWhole(name string, text []byte) error {
	f, err := w.fsys.OpenFile(name, os.O_WRONLY|os.O_CREATE|os.O_TRUNC, 0o644)
	if err != nil {
		return err
	}
	_, err = f.Write(text)
	if err == nil {
		err = f.Sync()
	}
	return errors.Join(err, f.Close(), w.fsys.SyncDir(filepath.Dir(name)))
}

// cut shortens the log to its whole lines. It opens the file anew: on Windows one opened for appending cannot be cut.
func (w *Writer) cut() error {
	f, err := w.fsys.OpenFile(w.path, os.O_RDWR, 0)
	if err != nil {
		return err
	}
	err = f.Truncate(w.size)
	if err == nil {
		err = f.Sync()
	}
	if err = errors.Join(err, f.Close()); err != nil {
		return fmt.Errorf("cut the torn last line off %s: %w", filepath.Base(w.path), err)
	}
	return nil
}
