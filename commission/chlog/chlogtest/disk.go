package chlogtest

import (
	"errors"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"sync"

	"chargehand/commission/chlog"
)

// Disk is a disk in memory that fails when it is told to, and that can lose its power. What was written and never synced may
// then be there, in part, with holes, or not at all; a name whose folder was never synced may be gone.
type Disk struct {
	mu    sync.Mutex
	files map[string]*file
	locks map[string]bool
	calls int
	// FailAt is the call that fails, counted from 1 over every write, sync, truncation and opening; 0 for none.
	FailAt int
	// Err is the error of the failing call and of all that follow, as of a medium that is gone; nil lets the later ones pass.
	Err error
	// Through is how many bytes of a failing write get through all the same.
	Through int
	// Once lets calls after the failing one pass again.
	Once bool
}

var _ chlog.FS = (*Disk)(nil)

// ErrGone is an error for [Disk.Err].
var ErrGone = errors.New("input/output error")

type file struct {
	synced  []byte // survives a loss of power for certain
	current []byte // what a reader sees
	named   bool   // its name survives
}

// NewDisk gives an empty disk.
func NewDisk() *Disk { return &Disk{files: map[string]*file{}, locks: map[string]bool{}} }

// Calls is how many calls there have been that can fail.
func (d *Disk) Calls() int { d.mu.Lock(); defer d.mu.Unlock(); return d.calls }

// fails counts a call and tells whether it fails.
func (d *Disk) fails() error {
	d.calls++
	if d.FailAt > 0 && (d.calls == d.FailAt || d.calls > d.FailAt && !d.Once) {
		return d.Err
	}
	return nil
}

// OpenFile opens or makes a file.
func (d *Disk) OpenFile(name string, flag int, _ fs.FileMode) (chlog.File, error) {
	d.mu.Lock()
	defer d.mu.Unlock()
	if err := d.fails(); err != nil {
		return nil, &fs.PathError{Op: "open", Path: name, Err: err}
	}
	f, there := d.files[name]
	switch {
	case there && flag&os.O_EXCL != 0:
		return nil, &fs.PathError{Op: "open", Path: name, Err: fs.ErrExist}
	case !there && flag&os.O_CREATE == 0:
		return nil, &fs.PathError{Op: "open", Path: name, Err: fs.ErrNotExist}
	case !there:
		f = &file{}
		d.files[name] = f
	case flag&os.O_TRUNC != 0:
		f.current = nil
	}
	return &handle{disk: d, file: f}, nil
}

// SyncDir makes the names in a folder lasting.
func (d *Disk) SyncDir(name string) error {
	d.mu.Lock()
	defer d.mu.Unlock()
	if err := d.fails(); err != nil {
		return err
	}
	for n, f := range d.files {
		if filepath.Dir(n) == filepath.Clean(name) {
			f.named = true
		}
	}
	return nil
}

type unlock func()

func (u unlock) Close() error { u(); return nil }

// Lock locks a name until it is closed.
func (d *Disk) Lock(name string) (io.Closer, error) {
	d.mu.Lock()
	defer d.mu.Unlock()
	if d.locks[name] {
		return nil, chlog.ErrLocked
	}
	d.locks[name] = true
	return unlock(func() { d.mu.Lock(); defer d.mu.Unlock(); delete(d.locks, name) }), nil
}

// Read gives a file's bytes as a reader sees them now.
func (d *Disk) Read(name string) []byte {
	d.mu.Lock()
	defer d.mu.Unlock()
	if f := d.files[name]; f != nil {
		return append([]byte(nil), f.current...)
	}
	return nil
}

// Unsynced is how many bytes at the end of a file a loss of power may take.
func (d *Disk) Unsynced(name string) int {
	d.mu.Lock()
	defer d.mu.Unlock()
	if f := d.files[name]; f != nil {
		return max(0, len(f.current)-len(f.synced))
	}
	return 0
}

// Loss says what becomes of bytes that were never synced. It gets the synced bytes and all bytes, and returns what the disk
// holds after the power comes back.
type Loss func(synced, current []byte) []byte

// Kept keeps everything: the process died, not the machine.
func Kept(_, current []byte) []byte { return current }

// Dropped loses everything that was not synced.
func Dropped(synced, _ []byte) []byte { return synced }

// CutAt keeps the first n bytes that were not synced.
func CutAt(n int) Loss {
	return func(synced, current []byte) []byte {
		if len(current) <= len(synced) {
			return synced
		}
		return current[:min(len(current), len(synced)+n)]
	}
}

// Reordered keeps the bytes from the n-th unsynced one on and leaves zeros where those before should be: the file's new
// length and its last block reached the disk, the block before did not.
func Reordered(n int) Loss {
	return func(synced, current []byte) []byte {
		if len(current) <= len(synced) {
			return synced
		}
		after := append([]byte(nil), current...)
		clear(after[len(synced):min(len(after), len(synced)+n)])
		return after
	}
}

// AfterPowerLoss is the disk as it comes up again: without faults, locks and names that were never synced.
func (d *Disk) AfterPowerLoss(loss Loss) *Disk {
	d.mu.Lock()
	defer d.mu.Unlock()
	up := NewDisk()
	for name, f := range d.files {
		if f.named {
			b := append([]byte(nil), loss(f.synced, f.current)...)
			up.files[name] = &file{synced: b, current: append([]byte(nil), b...), named: true}
		}
	}
	return up
}

type handle struct {
	disk *Disk
	file *file
	at   int
}

func (h *handle) Read(p []byte) (int, error) {
	h.disk.mu.Lock()
	defer h.disk.mu.Unlock()
	if h.at >= len(h.file.current) {
		return 0, io.EOF
	}
	n := copy(p, h.file.current[h.at:])
	h.at += n
	return n, nil
}

func (h *handle) Write(p []byte) (int, error) {
	h.disk.mu.Lock()
	defer h.disk.mu.Unlock()
	if err := h.disk.fails(); err != nil {
		n := min(h.disk.Through, len(p))
		h.file.current = append(h.file.current, p[:n]...)
		return n, err
	}
	h.file.current = append(h.file.current, p...)
	return len(p), nil
}

func (h *handle) Sync() error {
	h.disk.mu.Lock()
	defer h.disk.mu.Unlock()
	if err := h.disk.fails(); err != nil {
		return err
	}
	h.file.synced = append([]byte(nil), h.file.current...)
	return nil
}

func (h *handle) Truncate(size int64) error {
	h.disk.mu.Lock()
	defer h.disk.mu.Unlock()
	if err := h.disk.fails(); err != nil {
		return err
	}
	h.file.current = append([]byte(nil), h.file.current[:size]...)
	return nil
}

func (h *handle) Close() error { return nil }
