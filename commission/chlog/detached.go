package chlog

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
	"slices"
	"strconv"
	"strings"
	"time"

	"chargehand/commission/signing"
)

// FileSigner signs a whole file without keeping it in memory.
type FileSigner interface {
	SignFrom(r io.Reader) (armored string, err error)
	Fingerprint() string
}

// NotSealedError says that a log has not ended, so that a signature under it would be under an unfinished file.
type NotSealedError struct {
	Path    string
	Records int64
}

func (e *NotSealedError) Error() string {
	return fmt.Sprintf("%s ends at record %d without a seal; finish the walk before it is signed", filepath.Base(e.Path), e.Records-1)
}

// SignFile makes a detached signature of every byte of a sealed log and writes it beside it: NAME.chlog.sig, or the next free
// NAME.chlog.2.sig, … for a countersignature. The log itself is read strictly and never touched. A key that has signed it
// already does not sign it again.
func SignFile(path string, signer FileSigner) (signature string, err error) {
	if err := checkSealed(path); err != nil {
		return "", err
	}
	existing, err := signatureFiles(path)
	if err != nil {
		return "", err
	}
	for _, e := range existing {
		text, err := readUpTo(e.path, 1<<20)
		if err != nil {
			return "", err
		}
		if s, err := signing.Parse(text); err == nil && s.Key().Fingerprint() == signer.Fingerprint() {
			return "", fmt.Errorf("%s is signed by this key already: %s", filepath.Base(path), filepath.Base(e.path))
		}
	}
	n := 1
	if len(existing) > 0 {
		n = existing[len(existing)-1].n + 1
	}
	f, err := os.Open(path)
	if err != nil {
		return "", err
	}
	armoured, err := signer.SignFrom(f)
	if err = errors.Join(err, f.Close()); err != nil {
		return "", err
	}
	name := signatureName(path, n)
	return name, writeBeside(name, []byte(armoured))
}

func checkSealed(path string) error {
	f, err := os.Open(path)
	if err != nil {
		return err
	}
	defer f.Close()
	r := NewReader(f)
	for {
		if _, err = r.next(); err != nil {
			break
		}
	}
	switch {
	case err != io.EOF:
		return fmt.Errorf("%s: %w", filepath.Base(path), err)
	case !r.Sealed():
		return &NotSealedError{path, r.seq}
	}
	return nil
}

// signatureName is the name of a log's n-th signature, from 1.
func signatureName(path string, n int) string {
	if n == 1 {
		return path + ".sig"
	}
	return fmt.Sprintf("%s.%d.sig", path, n)
}

type signatureFile struct {
	path string
	n    int
}

// signatureFiles are the signatures beside a log, in order.
func signatureFiles(path string) ([]signatureFile, error) {
	entries, err := os.ReadDir(filepath.Dir(path))
	if err != nil {
		return nil, err
	}
	var found []signatureFile
	for _, e := range entries {
		middle, ok := strings.CutPrefix(e.Name(), filepath.Base(path))
		if !ok || e.IsDir() {
			continue
		}
		n := 0
		if middle == ".sig" {
			n = 1
		} else if digits, ok := strings.CutSuffix(middle, ".sig"); ok && strings.HasPrefix(digits, ".") {
			n, _ = strconv.Atoi(digits[1:])
		}
		if n > 0 && filepath.Base(signatureName(path, n)) == e.Name() {
			found = append(found, signatureFile{filepath.Join(filepath.Dir(path), e.Name()), n})
		}
	}
	slices.SortFunc(found, func(a, b signatureFile) int { return a.n - b.n })
	return found, nil
}

// writeBeside writes a new file whole: under another name first, so that nobody ever sees half a signature.
func writeBeside(name string, text []byte) error {
	if _, err := os.Lstat(name); !errors.Is(err, fs.ErrNotExist) {
		return fmt.Errorf("%s exists already: %w", filepath.Base(name), fs.ErrExist)
	}
	f, err := os.CreateTemp(filepath.Dir(name), filepath.Base(name)+".new-*")
	if err != nil {
		return err
	}
	_, err = f.Write(text)
	if err == nil {
		err = f.Sync()
	}
	if err = errors.Join(err, f.Chmod(0o644), f.Close()); err == nil {
		err = rename(f.Name(), name)
	}
	if err != nil {
		os.Remove(f.Name())
		return fmt.Errorf("write %s: %w", filepath.Base(name), err)
	}
	return Disk{}.SyncDir(filepath.Dir(name))
}

// rename tries for a second on Windows, where a virus scanner may hold a file that has just been written.
func rename(from, to string) error {
	err := os.Rename(from, to)
	for range 10 {
		if err == nil || runtime.GOOS != "windows" {
			break
		}
		time.Sleep(100 * time.Millisecond)
		err = os.Rename(from, to)
	}
	return err
}
