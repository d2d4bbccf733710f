package chlog

import (
	"errors"
	"fmt"
	"path/filepath"
)

// Acknowledged is what is certainly on disk.
type Acknowledged struct {
	Path  string
	Lines int64
	Bytes int64
	Head  string // SHA-256 of the last line
}

// WriteError says that a log can take nothing more, and what of it is safe.
type WriteError struct {
	Safe Acknowledged
	Do   string // "write", "sync"
	Err  error
}

func (e *WriteError) Error() string {
	return fmt.Sprintf("%s %s: %v; nothing more is taken; certainly on disk are records 0 to %d (%d bytes)",
		e.Do, filepath.Base(e.Safe.Path), e.Err, e.Safe.Lines-1, e.Safe.Bytes)
}

// Unwrap gives the system's error.
func (e *WriteError) Unwrap() error { return e.Err }

// InUseError says that somebody else writes this log.
type InUseError struct{ Path string }

func (e *InUseError) Error() string {
	return fmt.Sprintf("another chargehand is writing %s; close it, or choose another log", filepath.Base(e.Path))
}

// RefusedError says that one record cannot be written as it is. The log is unharmed and takes the next.
type RefusedError struct {
	Kind string
	Why  string
}

func (e *RefusedError) Error() string { return fmt.Sprintf("record %q refused: %s", e.Kind, e.Why) }

// ErrSealed says that a log has ended; what is to be added needs a new log with "continues".
var ErrSealed = errors.New("the log is sealed; a supplement is a new log that continues it")

// ErrClosed says that the writer has been closed.
var ErrClosed = errors.New("the log is closed")
