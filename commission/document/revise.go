package document

import (
	"cmp"
	"fmt"
	"regexp"
	"slices"
	"strconv"
	"strings"
)

// edit replaces the bytes from at to end.
type edit struct {
	at, end int
	text    string
}

// Revise replaces values in a file's text and keeps everything else, comments included, byte for byte. A change is named by
// the dotted path of its key, with the number of the table where there is a list of them, from 0: "precharge.resistance",
// "infeed.0.droop", "precharge.pulse.2.energy". Text is given without its quotes; a number, a boolean or a date as it stands
// in the file. A key that the table lacks is added behind the table's last one; a table that is lacking is an error.
func Revise(text []byte, changes map[string]string) ([]byte, error) {
	f := parse("site file", text)
	if f.broken || len(f.problems) > 0 {
		return nil, f.syntaxOnly()
	}
	var edits []edit
	for path, to := range changes {
		e, err := f.change(path, to)
		if err != nil {
			return nil, err
		}
		edits = append(edits, e)
	}
	slices.SortFunc(edits, func(a, b edit) int { return cmp.Or(a.at-b.at, strings.Compare(a.text, b.text)) })
	var out strings.Builder
	out.Write(text[:len(text)-len(f.text)]) // the byte-order mark
	done := 0
	for _, e := range edits {
		out.Write(f.text[done:e.at])
		out.WriteString(e.text)
		done = e.end
	}
	out.Write(f.text[done:])
	revised := []byte(out.String())
	if again := parse("site file", revised); again.broken || len(again.problems) > 0 {
		return nil, again.syntaxOnly()
	}
	return revised, nil
}

// Value gives the value at a path as [Revise] takes it; false where the path names none.
func Value(source []byte, path string) (string, bool) {
	f := parse("site file", source)
	v := &value{kind: table, table: f.root}
	for _, name := range strings.Split(path, ".") {
		if v = v.step(name); v == nil {
			return "", false
		}
	}
	switch v.kind {
	case text:
		return v.text, true
	case boolean, integer, float, date:
		return string(f.text[v.at:v.end]), true
	}
	return "", false
}

// syntaxOnly gives the problems found so far, without those of a reader.
func (f *File) syntaxOnly() error { return &Problems{File: f.name, List: f.problems} }

// change makes the edit for one key.
func (f *File) change(path, to string) (edit, error) {
	if r, bad := control(to); bad {
		return edit{}, fmt.Errorf("change %s: %U in the new value, wanted text without control characters", path, r)
	}
	names := strings.Split(path, ".")
	v := &value{kind: table, table: f.root}
	for i, name := range names[:len(names)-1] {
		next := v.step(name)
		if next == nil {
			return edit{}, fmt.Errorf("change %s: no %s in the file; add the table by hand", path, strings.Join(names[:i+1], "."))
		}
		v = next
	}
	last := names[len(names)-1]
	if old := v.step(last); old != nil {
		if old.kind == table || old.kind == tables || old.kind == list {
			return edit{}, fmt.Errorf("change %s: it is a table or list; change one of its values", path)
		}
		if old.kind == text {
			to = strconv.Quote(to)
		} else if !bareValue.MatchString(to) {
			return edit{}, fmt.Errorf("change %s: %q cannot take the place of %s", path, to, f.describe(old))
		}
		return edit{old.at, old.end, to}, nil
	}
	if v.kind != table || v.table.defined != explicit && v.table.defined != inline || !bareKey.MatchString(last) {
		return edit{}, fmt.Errorf("change %s: no such key in the file", path)
	}
	return f.insertion(v, last, to), nil
}

var (
	bareKey   = regexp.MustCompile(`^[a-z0-9_]+$`)
	bareValue = regexp.MustCompile(`^(true|false|-?[0-9]+(\.[0-9]+)?|[0-9]{4}-[0-9]{2}-[0-9]{2})$`)
)

// step goes from a table to a key's value, or from a list to one of its tables.
func (v *value) step(name string) *value {
	switch v.kind {
	case table:
		if e := v.table.find(name); e != nil {
			return e.value
		}
	case tables, list:
		if i, err := strconv.Atoi(name); err == nil && i >= 0 && i < len(v.items) {
			return v.items[i]
		}
	}
	return nil
}

// insertion adds a key to a table: inside the braces of an inline one, else on a line of its own.
func (f *File) insertion(v *value, key, to string) edit {
	if !bareValue.MatchString(to) {
		to = strconv.Quote(to)
	}
	if v.table.defined == inline {
		if len(v.table.entries) == 0 {
			return edit{v.end - 1, v.end - 1, " " + key + " = " + to + " "}
		}
		last := v.table.entries[len(v.table.entries)-1].value.end
		return edit{last, last, ", " + key + " = " + to}
	}
	tail := v.table.tail
	line := f.lineAt(tail)
	at := tail + len(line)
	newline := "\n"
	if strings.HasSuffix(string(line), "\r") {
		at, newline = at-1, "\r\n"
	}
	return edit{at, at, newline + key + " = " + to}
}
