package document

import (
	"fmt"
	"strings"
)

// Problem is one thing wrong with a file.
type Problem struct {
	Line    int    `json:"line"`   // from 1
	Column  int    `json:"column"` // from 1, in characters
	Read    string `json:"read"`
	Wanted  string `json:"wanted"`
	Example string `json:"example"`
}

// Problems is everything wrong with one file, in order of place. It is an error when not empty.
type Problems struct {
	File string
	List []Problem
}

// Error gives one line a problem: file:line:column: read …, wanted …, for example ….
func (p *Problems) Error() string {
	lines := make([]string, 0, len(p.List))
	for _, q := range p.List {
		s := fmt.Sprintf("%s:%d:%d: read %s, wanted %s", p.File, q.Line, q.Column, q.Read, q.Wanted)
		if q.Example != "" {
			s += ", for example " + q.Example
		}
		lines = append(lines, s)
	}
	return strings.Join(lines, "\n")
}
