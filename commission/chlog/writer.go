package chlog

import (
	"crypto/rand"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"math"
	"os"
	"path/filepath"
	"sync"
	"time"

	"chargehand/commission/record"
)

// Options are what a writer needs from outside.
type Options struct {
	// Now is the wall clock: what a line's "at" says.
	Now func() time.Time
	// Monotonic is a clock that is never set, counted from any fixed instant. Where the wall clock gains or loses against it,
	// a record "clock" says so before the next line. Nil leaves the wall clock unwatched.
	Monotonic func() time.Duration
	// Program is this program's version, for the record "resumed".
	Program string
	// Recorded is told each line once it is on disk, those too that the writer adds of itself. It must not call the writer, and
	// may be nil.
	Recorded func(Line)
}

// Writer appends records to one log. A record is on disk before Append returns. It is safe for several goroutines.
//
// After a failed write or sync it takes nothing more, since nobody can say what of the last line is on disk: see [WriteError].
type Writer struct {
	mu      sync.Mutex
	fsys    FS
	path    string
	options Options
	file    File
	lock    io.Closer
	failed  *WriteError
	closed  bool

	opened  record.Opened
	persons map[string]record.Person
	files   []string // SHA-256 of each file record, in order
	kept    [][]byte // every acknowledged line, so that the log can go on elsewhere when this place is gone
	size    int64
	seq     int64 // of the next line
	head    string
	sealed  bool

	wall      time.Time
	monotonic time.Duration
	began     time.Duration
}

// NewID makes a log's identity: 32 random lower-case hexadecimal digits.
func NewID() string {
	var b [16]byte
	rand.Read(b[:]) // never fails (crypto/rand)
	return hex.EncodeToString(b[:])
}

// Create begins a log with opened as its first record, in a file that does not exist yet or is empty, as an earlier Create
// leaves it that died at once. The format is filled in, and the log id where it has none.
func Create(fsys FS, path string, opened record.Opened, o Options) (*Writer, error) {
	opened.Format = record.Format
	if opened.Log == "" {
		opened.Log = NewID()
	}
	if opened.Disturb == nil {
		opened.Disturb = []string{}
	}
	if why := faultOf(opened); why != "" {
		return nil, &RefusedError{"opened", why}
	}
	w := newWriter(fsys, path, o)
	if err := w.takeLock(); err != nil {
		return nil, err
	}
	if err := w.create(); err != nil {
		return nil, errors.Join(err, w.lock.Close())
	}
	if _, err := w.Append(opened); err != nil {
		return nil, errors.Join(err, w.Close())
	}
	return w, nil
}

func newWriter(fsys FS, path string, o Options) *Writer {
	w := &Writer{fsys: fsys, path: path, options: o, head: NoPrev, persons: map[string]record.Person{}}
	w.wall = o.Now()
	if o.Monotonic != nil {
		w.began = o.Monotonic()
		w.monotonic = w.began
	}
	return w
}

func (w *Writer) takeLock() error {
	lock, err := w.fsys.Lock(w.path + ".lock")
	if errors.Is(err, ErrLocked) {
		return &InUseError{w.path}
	}
	w.lock = lock
	return err
}

// create makes the empty file, and its name in the folder lasting.
func (w *Writer) create() error {
	f, err := w.fsys.OpenFile(w.path, os.O_WRONLY|os.O_APPEND|os.O_CREATE|os.O_EXCL, 0o644)
	if errors.Is(err, fs.ErrExist) && w.isEmpty() {
		f, err = w.fsys.OpenFile(w.path, os.O_WRONLY|os.O_APPEND, 0o644)
	}
	if errors.Is(err, fs.ErrExist) {
		return fmt.Errorf("%s exists already; resume it, or choose another name: %w", filepath.Base(w.path), err)
	}
	if err != nil {
		return err
	}
	if err := w.fsys.SyncDir(filepath.Dir(w.path)); err != nil {
		return errors.Join(fmt.Errorf("sync the folder of %s: %w", filepath.Base(w.path), err), f.Close())
	}
	w.file = f
	return nil
}

func (w *Writer) isEmpty() bool {
	text, err := readAll(w.fsys, w.path)
	return err == nil && len(text) == 0
}

// Append writes one record, syncs, and only then returns its line.
func (w *Writer) Append(body record.Body) (Line, error) {
	return w.AppendSigned(func(int64, string, time.Time) (record.Body, error) { return body, nil })
}

// AppendSigned writes one record that must know its own place: build is given the seq and the prev of the line to be, and its
// time. Nothing else is appended meanwhile, however long a hardware key waits to be touched.
func (w *Writer) AppendSigned(build func(seq int64, head string, at time.Time) (record.Body, error)) (Line, error) {
	w.mu.Lock()
	defer w.mu.Unlock()
	if err := w.ready(); err != nil {
		return Line{}, err
	}
	if err := w.noteClock(); err != nil {
		return Line{}, err
	}
	at := w.options.Now()
	body, err := build(w.seq, w.head, at)
	if err != nil {
		return Line{}, err
	}
	return w.append(body, at)
}

func (w *Writer) ready() error {
	switch {
	case w.failed != nil:
		return w.failed
	case w.closed:
		return ErrClosed
	case w.sealed:
		return ErrSealed
	}
	return nil
}

// A step is told from two clocks drifting apart by its size: more than stepFloor and more than stepRate of the time since
// the last line. 500 parts per million is the most by which systems slew a clock (common practice, ntpd's limit).
const (
	stepFloor = 500 * time.Millisecond
	stepRate  = 500e-6
)

// noteClock records a step of the wall clock since the last line. A machine that slept shows one too: its monotonic clock
// may stand still meanwhile.
func (w *Writer) noteClock() error {
	if w.options.Monotonic == nil {
		return nil
	}
	wall, monotonic := w.options.Now(), w.options.Monotonic()
	elapsed := monotonic - w.monotonic
	step := wall.Round(0).Sub(w.wall.Round(0)) - elapsed
	w.wall, w.monotonic = wall, monotonic
	if step.Abs() <= stepFloor+time.Duration(stepRate*float64(elapsed)) || w.seq == 0 {
		return nil
	}
	_, err := w.append(record.Clock{WallStep: milliseconds(step), Monotonic: milliseconds(monotonic - w.began)}, wall)
	return err
}

// milliseconds gives seconds, rounded to what a line's time can show.
func milliseconds(d time.Duration) float64 { return math.Round(d.Seconds()*1000) / 1000 }

// append encodes, checks, writes and syncs one line.
func (w *Writer) append(body record.Body, at time.Time) (Line, error) {
	if w.seq > 0 && body.Kind() == "opened" {
		return Line{}, &RefusedError{"opened", "a log is opened once"}
	}
	text, err := encodeBody(body)
	if err != nil {
		return Line{}, &RefusedError{body.Kind(), err.Error()}
	}
	line := encode(w.head, w.seq, at, body.Kind(), text)
	if len(line) > MaxLine {
		return Line{}, &RefusedError{body.Kind(), fmt.Sprintf("%d bytes are more than a line may have (%d); split it into parts", len(line), MaxLine)}
	}
	raw, fault := parse(line[:len(line)-1], new([][]byte))
	if fault != nil {
		return Line{}, &RefusedError{body.Kind(), fault.what}
	}
	if raw.replaced {
		return Line{}, &RefusedError{body.Kind(), "its text is not UTF-8"}
	}
	if w.notes(body) {
		read, err := record.Decode(body.Kind(), text)
		if err != nil {
			return Line{}, &RefusedError{body.Kind(), err.Error()}
		}
		body = read
	}
	if err := w.write(line); err != nil {
		return Line{}, err
	}
	l := Line{Seq: w.seq, At: raw.time, Kind: body.Kind(), Prev: w.head, Body: text}
	w.take(body, line)
	if w.options.Recorded != nil {
		w.options.Recorded(l)
	}
	return l, nil
}

// write is one write and one sync: the line is acknowledged only when both have gone well.
func (w *Writer) write(line []byte) error {
	n, err := w.file.Write(line)
	if err == nil && n < len(line) {
		err = io.ErrShortWrite
	}
	if err != nil {
		w.failed = &WriteError{w.acknowledged(), "write", err}
		return w.failed
	}
	if err := w.file.Sync(); err != nil {
		w.failed = &WriteError{w.acknowledged(), "sync", err}
		return w.failed
	}
	return nil
}

// notes tells whether take wants the body as a reader would see it: those kinds that it notes, and those of a known kind that
// come as bare JSON.
func (w *Writer) notes(body record.Body) bool {
	if _, bare := body.(record.Other); bare {
		return record.Known(body.Kind())
	}
	switch body.Kind() {
	case "opened", "person", "file", "seal", "finding":
		return true
	}
	return false
}

// take notes a line that is on disk.
func (w *Writer) take(body record.Body, line []byte) {
	switch b := body.(type) {
	case record.Opened:
		w.opened = b
	case record.Person:
		w.persons[b.ID] = b
	case record.File:
		w.files = append(w.files, b.SHA256)
	case record.Seal:
		w.sealed = true
	}
	w.kept = append(w.kept, line)
	w.size += int64(len(line))
	w.head = hashOf(line)
	w.seq++
}

func (w *Writer) acknowledged() Acknowledged {
	return Acknowledged{Path: w.path, Lines: w.seq, Bytes: w.size, Head: w.head}
}

// Acknowledged tells what is certainly on disk.
func (w *Writer) Acknowledged() Acknowledged {
	w.mu.Lock()
	defer w.mu.Unlock()
	return w.acknowledged()
}

// Err is why the writer takes nothing more, or nil.
func (w *Writer) Err() error {
	w.mu.Lock()
	defer w.mu.Unlock()
	return w.ready()
}

// Path is the log's file.
func (w *Writer) Path() string { return w.path }

// Opened is the log's first record.
func (w *Writer) Opened() record.Opened { return w.opened }

// Close closes the file and frees the lock. Every acknowledged record stays where it is.
func (w *Writer) Close() error {
	w.mu.Lock()
	defer w.mu.Unlock()
	if w.closed {
		return nil
	}
	w.closed = true
	return errors.Join(w.file.Close(), w.lock.Close())
}
