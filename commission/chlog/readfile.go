package chlog

import (
	"fmt"
	"io"
	"os"
	"path/filepath"
)

// ReadFile reads a whole log strictly. Where it is damaged, the intact lines before the damage come with the error.
func ReadFile(path string) ([]Line, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	r := NewReader(f)
	var lines []Line
	for {
		l, err := r.Next()
		if err == io.EOF {
			return lines, nil
		}
		if err != nil {
			return lines, fmt.Errorf("%s: %w", filepath.Base(path), err)
		}
		lines = append(lines, l)
	}
}
