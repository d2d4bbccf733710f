package main

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
)

// absent is an error where a file, a folder or a link of this name is there already.
func absent(path string) error {
	if _, err := os.Lstat(path); err == nil {
		return fmt.Errorf("%s is there already; --force overwrites it", path)
	}
	return nil
}

// notItself keeps a result from being written over the log that it is of, or over one of its signatures.
func notItself(out, log string) error {
	from, err := os.Stat(log)
	if err != nil {
		return err
	}
	to, err := os.Stat(out)
	if err == nil && os.SameFile(from, to) || strings.HasSuffix(out, ".chlog") || strings.HasSuffix(out, ".sig") {
		return fmt.Errorf("%s would be written over a log or its signature; choose another name", out)
	}
	return nil
}

// writeFile writes a file whole or not at all. The name is never followed as a link: a file is made beside it and then takes
// its place. Without force the name must be free, and it is reserved first, so that nothing made meanwhile is lost.
func writeFile(path string, force bool, write func(io.Writer) error) (err error) {
	if info, err := os.Lstat(path); err == nil && info.IsDir() {
		return fmt.Errorf("write %s: it is a folder; name a file in it", path)
	}
	if !force {
		reserved, err := os.OpenFile(path, os.O_CREATE|os.O_EXCL|os.O_WRONLY, 0o644)
		if errors.Is(err, fs.ErrExist) {
			return fmt.Errorf("%s is there already; --force overwrites it", path)
		}
		if err != nil {
			return unwritable(path, err)
		}
		if err := reserved.Close(); err != nil {
			return unwritable(path, err)
		}
		defer func() {
			if err != nil {
				os.Remove(path)
			}
		}()
	}
	f, err := os.CreateTemp(filepath.Dir(path), "."+filepath.Base(path)+".new-*")
	if err != nil {
		return unwritable(path, err)
	}
	err = errors.Join(write(f), f.Sync(), f.Chmod(0o644), f.Close())
	if err == nil {
		err = os.Rename(f.Name(), path)
	}
	if err != nil {
		os.Remove(f.Name())
		return unwritable(path, err)
	}
	return nil
}

// unwritable says in a sentence why nothing can be written there.
func unwritable(path string, err error) error {
	folder := filepath.Dir(path)
	var why string
	switch info, statErr := os.Stat(folder); {
	case errors.Is(statErr, fs.ErrNotExist):
		why = fmt.Sprintf("the folder %s does not exist", folder)
	case statErr == nil && !info.IsDir():
		why = folder + " is a file, not a folder"
	case errors.Is(err, fs.ErrPermission):
		why = fmt.Sprintf("the folder %s may not be written to; name another place with --out", folder)
	default:
		return fmt.Errorf("write %s: %w", path, err)
	}
	return fmt.Errorf("write %s: %s", path, why)
}
