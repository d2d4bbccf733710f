package document

import (
	"bytes"
	"cmp"
	"fmt"
	"slices"
	"sort"
	"strconv"
	"strings"
	"unicode/utf8"
)

// MaxSize is the greatest size of a file in bytes. A whole site with sixteen infeeds takes a hundredth of it.
const MaxSize = 1 << 20

// mostProblems is how many problems are kept: nobody reads more, and a file of garbage must not fill the memory.
const mostProblems = 500

var byteOrderMark = []byte("\xef\xbb\xbf")

// Warning is something in a file that is allowed and yet likely to be a slip.
type Warning struct {
	Line   int    `json:"line"`   // from 1
	Column int    `json:"column"` // from 1, in characters
	Text   string `json:"text"`
}

// File is one file being read, with everything found wrong so far.
type File struct {
	name     string
	text     []byte // without the byte-order mark
	lines    []int  // byte offset of each line's start
	root     *Table
	problems []Problem
	warnings []Warning
	broken   bool // not all of it could be parsed: what is missing may stand in the part that was not
	stopped  bool // nothing more is to be said
	more     bool // there were more than mostProblems
}

// Open parses the file's text, whose first key must be format with the value wanted here, such as "chargehand-site/1".
func Open(name string, text []byte, format string) *File {
	f := parse(name, text)
	f.checkFormat(format)
	return f
}

// parse reads the text without asking for its format.
func parse(name string, text []byte) *File {
	f := &File{name: name, text: bytes.TrimPrefix(text, byteOrderMark), lines: []int{0}}
	f.root = newTable(f, "", 0, explicit)
	if f.isReadable() {
		f.indexLines()
		f.parse()
	}
	return f
}

// Root is the table of the file's top level.
func (f *File) Root() *Table { return f.root }

// isReadable refuses what is no text of a bearable size before anything is parsed.
func (f *File) isReadable() bool {
	if len(f.text) > MaxSize {
		cut := f.text[:MaxSize]
		line := bytes.Count(cut, []byte("\n")) + 1
		column := utf8.RuneCount(cut[bytes.LastIndexByte(cut, '\n')+1:]) + 1
		f.problems = []Problem{{line, column, fmt.Sprintf("a file of %d bytes", len(f.text)), fmt.Sprintf("a file of at most %d bytes", MaxSize), ""}}
		f.stopped = true
		return false
	}
	if utf8.Valid(f.text) {
		return true
	}
	example := "a file that an editor saved as UTF-8"
	if bytes.HasPrefix(f.text, []byte("\xff\xfe")) || bytes.HasPrefix(f.text, []byte("\xfe\xff")) {
		example = "the same file saved as UTF-8 instead of UTF-16"
	}
	f.indexLines()
	for _, start := range f.lines {
		if bad, at := invalidByte(f.lineAt(start)); at >= 0 {
			f.problem(start+at, fmt.Sprintf("the byte 0x%02X", bad), "text in UTF-8", example)
		}
	}
	f.stopped = true
	return false
}

// invalidByte finds the first byte of a line that is no UTF-8; at is -1 where all is well.
func invalidByte(line []byte) (b byte, at int) {
	for i := 0; i < len(line); {
		r, size := utf8.DecodeRune(line[i:])
		if r == utf8.RuneError && size == 1 {
			return line[i], i
		}
		i += size
	}
	return 0, -1
}

func (f *File) indexLines() {
	for i, b := range f.text {
		if b == '\n' {
			f.lines = append(f.lines, i+1)
		}
	}
}

// place gives line and column of a byte offset.
func (f *File) place(offset int) (line, column int) {
	i := sort.SearchInts(f.lines, offset+1) - 1
	return i + 1, utf8.RuneCount(f.text[f.lines[i]:offset]) + 1
}

// lineAt is the text from an offset to the end of its line.
func (f *File) lineAt(offset int) []byte {
	rest := f.text[offset:]
	if i := bytes.IndexByte(rest, '\n'); i >= 0 {
		return rest[:i]
	}
	return rest
}

// isFull tells whether nothing more is to be kept, so that a caller may spare the search for a place or a near word.
func (f *File) isFull() bool {
	if !f.stopped && len(f.problems) >= mostProblems {
		f.more = true
	}
	return f.stopped || f.more
}

func (f *File) problem(offset int, read, wanted, example string) {
	if f.isFull() {
		return
	}
	line, column := f.place(offset)
	f.problems = append(f.problems, Problem{line, column, read, wanted, example})
}

func (f *File) warn(offset int, text string) {
	line, column := f.place(offset)
	f.warnings = append(f.warnings, Warning{line, column, text})
}

// Warnings are what is allowed and yet likely to be a slip, in order of place.
func (f *File) Warnings() []Warning {
	slices.SortStableFunc(f.warnings, func(a, b Warning) int {
		return cmp.Or(a.Line-b.Line, a.Column-b.Column)
	})
	return f.warnings
}

// Err reports the keys that nobody asked for and gives all problems as a [*Problems], or nil. Call it when everything has
// been read.
func (f *File) Err() error {
	f.root.reportUnknown()
	if len(f.problems) == 0 {
		return nil
	}
	list := slices.Clone(f.problems)
	slices.SortStableFunc(list, func(a, b Problem) int {
		return cmp.Or(a.Line-b.Line, a.Column-b.Column)
	})
	list = slices.Compact(list)
	if f.more {
		last := list[len(list)-1]
		list = append(list, Problem{last.Line, last.Column, fmt.Sprintf("more than %d problems", mostProblems), "the ones above mended first", ""})
	}
	return &Problems{File: f.name, List: list}
}

// checkFormat looks at what the file says it is: first the kind, then the version, and only then at the rest.
func (f *File) checkFormat(format string) {
	if f.stopped {
		return
	}
	e := f.root.ask("format")
	example := `format = "` + format + `"`
	if e == nil {
		if !f.broken {
			read := "no format"
			if len(bytes.TrimSpace(f.text)) == 0 {
				read = "an empty file"
			}
			f.problem(0, read, "the file's format in its first line", example)
			f.stopped = len(f.root.entries) == 0
		}
		return
	}
	if e.value.kind == invalid || e.value.kind == text && e.value.text == format {
		return
	}
	kind, _, _ := strings.Cut(format, "/")
	wanted := "the format " + strconv.Quote(format)
	if given, version, ok := strings.Cut(e.value.text, "/"); ok && given == kind && version != "" {
		wanted += "; another version needs another version of this program"
	} else if strings.HasPrefix(e.value.text, "chargehand-") {
		wanted += "; this is another kind of file"
	}
	f.problem(e.value.at, f.describe(e.value), wanted, example)
	f.stopped = true
}
