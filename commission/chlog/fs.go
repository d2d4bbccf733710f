package chlog

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"

	"github.com/gofrs/flock"
)

// FS is the file system under a log, small enough that a failing one can be put in its place.
type FS interface {
	// OpenFile opens a file with the flags of package os.
	OpenFile(name string, flag int, mode fs.FileMode) (File, error)
	// SyncDir has the names in a folder on disk before it returns.
	SyncDir(name string) error
	// Lock takes a lock that the system frees when the process dies, or returns [ErrLocked].
	Lock(name string) (io.Closer, error)
}

// File is one open file.
type File interface {
	io.ReadWriteCloser
	Sync() error
	Truncate(size int64) error
}

// ErrLocked says that another process, or another writer of this one, holds the lock.
var ErrLocked = errors.New("locked")

// Disk is the real file system.
type Disk struct{}

var _ FS = Disk{}

// OpenFile opens a file. To write, it follows no symbolic link: whoever may put one into a folder could else have another file
// written to, or cut.
func (Disk) OpenFile(name string, flag int, mode fs.FileMode) (File, error) {
	if flag&(os.O_WRONLY|os.O_RDWR) != 0 {
		if err := noLink(name); err != nil {
			return nil, err
		}
	}
	return os.OpenFile(name, flag, mode)
}

func noLink(name string) error {
	if info, err := os.Lstat(name); err == nil && info.Mode()&fs.ModeSymlink != 0 {
		return fmt.Errorf("%s is a symbolic link, and nothing is written through one; name the file itself", filepath.Base(name))
	}
	return nil
}

// SyncDir syncs a folder. Windows has no such thing and needs none.
func (Disk) SyncDir(name string) error {
	if runtime.GOOS == "windows" {
		return nil
	}
	d, err := os.Open(name)
	if err != nil {
		return err
	}
	return errors.Join(d.Sync(), d.Close())
}

// Lock locks a file that exists for nothing else: on Windows a locked file cannot be read by others, and the log must be.
// The file stays; deleting it would let two writers lock two files of one name.
func (Disk) Lock(name string) (io.Closer, error) {
	if err := noLink(name); err != nil {
		return nil, err
	}
	l := flock.New(name)
	got, err := l.TryLock()
	if _, unopened := errors.AsType[*fs.PathError](err); unopened {
		return nil, err
	}
	if err != nil {
		return nil, fmt.Errorf("lock %s: %w; a network drive may not be able to: choose a local disk", filepath.Base(name), err)
	}
	if !got {
		return nil, ErrLocked
	}
	return l, nil
}

// mostKept is the largest file that is taken into memory: many times the log of any walk.
const mostKept = 256 << 20

// readAll reads a whole file.
func readAll(fsys FS, name string) ([]byte, error) {
	f, err := fsys.OpenFile(name, os.O_RDONLY, 0)
	if err != nil {
		return nil, err
	}
	text, err := io.ReadAll(io.LimitReader(f, mostKept+1))
	if err == nil && len(text) > mostKept {
		err = fmt.Errorf("%s is larger than %d bytes, which no walk's log is; verify reads it all the same", filepath.Base(name), mostKept)
	}
	return text, errors.Join(err, f.Close())
}
