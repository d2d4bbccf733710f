package document

import (
	"fmt"
	"slices"
	"strconv"
	"strings"
	"unicode/utf8"
)

// kind is what a value is.
type kind int

const (
	invalid kind = iota // its problem is reported; readers pass over it in silence
	text
	boolean
	integer
	float
	date
	moment // a time of day, or a date with one: no key takes these
	list
	table
	tables // of [[header]]s
)

// value is one value of the file with its place.
type value struct {
	kind    kind
	at, end int    // byte offsets; of a table with a header, those of the header
	text    string // decoded
	items   []*value
	table   *Table
}

// entry is one key of a table.
type entry struct {
	key   string
	at    int
	value *value
	asked bool
}

// definition is how a table came to be, which says what may still be added to it (TOML 1.0, "Table").
type definition int

const (
	implicit definition = iota // named on the way in a header
	explicit                   // by its own header
	dotted                     // by a dotted key
	inline
)

// Table is one table of a file. A nil Table is absent: reading from it gives nothing and reports nothing.
type Table struct {
	file    *File
	name    string // as in the file: "bus.capacitance"; empty for the top level and for inline tables before they are asked for
	at      int
	tail    int // end of the last key read into it, or of its header
	defined definition
	broken  bool // an inline table over several lines was reported
	entries []*entry
	index   map[string]*entry
	asked   []string // the keys that readers know, for suggestions
}

func newTable(f *File, name string, at int, d definition) *Table {
	return &Table{file: f, name: name, at: at, tail: at, defined: d, index: map[string]*entry{}}
}

func (t *Table) find(key string) *entry {
	if t == nil {
		return nil
	}
	return t.index[key]
}

func (t *Table) put(k key, v *value) *entry {
	e := &entry{key: k.name, at: k.at, value: v}
	t.entries = append(t.entries, e)
	t.index[k.name] = e
	return e
}

// header goes to the table that a [header] or [[header]] names, making it and those on the way. It is nil where the header
// contradicts what stands before; that is reported.
func (t *Table) header(keys []key, isList bool) *Table {
	f := t.file
	last := keys[len(keys)-1]
	for i, k := range keys[:len(keys)-1] {
		e := t.find(k.name)
		if e == nil {
			inner := newTable(f, dottedName(keys[:i+1]), k.at, implicit)
			e = t.put(k, &value{kind: table, at: k.at, end: k.end, table: inner})
		}
		if t = e.value.innermost(); t == nil || t.defined == inline {
			f.again(k, e, "a table")
			return nil
		}
	}
	name := dottedName(keys)
	e := t.find(last.name)
	one := newTable(f, name, bracket(f, keys[0].at), explicit)
	switch {
	case isList && e == nil:
		t.put(last, &value{kind: tables, at: one.at, end: last.end, items: []*value{{kind: table, at: one.at, end: last.end, table: one}}})
		return one
	case isList && e.value.kind == tables:
		e.value.items = append(e.value.items, &value{kind: table, at: one.at, end: last.end, table: one})
		return one
	case !isList && e == nil:
		t.put(last, &value{kind: table, at: one.at, end: last.end, table: one})
		return one
	case !isList && e.value.kind == table && e.value.table.defined == implicit:
		old := e.value.table
		old.defined, old.at, e.value.at, e.at = explicit, one.at, one.at, last.at
		return old
	case !isList && e.value.kind == tables:
		f.problem(last.at, "["+name+"]", "double brackets, as above in the file", "[["+name+"]]")
		return nil
	}
	f.again(last, e, "a table")
	return nil
}

func dottedName(keys []key) string {
	names := make([]string, len(keys))
	for i, k := range keys {
		names[i] = k.name
	}
	return strings.Join(names, ".")
}

// bracket goes back from a header's first key to its first bracket.
func bracket(f *File, at int) int {
	for at > 0 && strings.IndexByte("[ \t", f.text[at-1]) >= 0 {
		at--
	}
	for f.text[at] != '[' {
		at++
	}
	return at
}

// innermost is the table that a header's path goes on in: of a list, the last.
func (v *value) innermost() *Table {
	switch v.kind {
	case table:
		return v.table
	case tables:
		return v.items[len(v.items)-1].table
	}
	return nil
}

// assign puts a value at a key that may be dotted.
func (t *Table) assign(keys []key, v *value) {
	f := t.file
	for _, k := range keys[:len(keys)-1] {
		e := t.find(k.name)
		if e == nil {
			inner := newTable(f, k.name, k.at, dotted)
			e = t.put(k, &value{kind: table, at: k.at, end: v.end, table: inner})
		}
		if e.value.kind != table || e.value.table.defined != dotted {
			f.again(k, e, "a key")
			return
		}
		t = e.value.table
	}
	last := keys[len(keys)-1]
	if e := t.find(last.name); e != nil {
		f.again(last, e, "a key")
		return
	}
	t.put(last, v)
}

// again reports a key or table that stands twice.
func (f *File) again(k key, e *entry, what string) {
	if f.isFull() {
		return
	}
	line, _ := f.place(e.at)
	f.problem(k.at, fmt.Sprintf("%s a second time", k.name), fmt.Sprintf("%s once; it stands in line %d already", what, line), "")
}

// describe quotes a value as it stands in the file.
func (f *File) describe(v *value) string {
	switch v.kind {
	case text:
		return shortened(v.text)
	case list:
		return "a list"
	case table:
		return "a table"
	case tables:
		return "a list of tables"
	}
	s := string(f.text[v.at:v.end])
	if utf8.RuneCountInString(s) > 40 {
		s = string([]rune(s)[:40]) + "…"
	}
	return s
}

// reportUnknown reports every key that nobody asked for. Inside one that is unknown itself nothing more is said.
func (t *Table) reportUnknown() {
	for _, e := range t.entries {
		switch {
		case !e.asked:
			t.unknown(e)
		case e.value.kind == table:
			e.value.table.reportUnknown()
		default:
			for _, item := range e.value.items {
				if item.kind == table {
					item.table.reportUnknown()
				}
			}
		}
	}
}

func (t *Table) unknown(e *entry) {
	if t.file.isFull() {
		return
	}
	const newer = "; or the file is for a newer version of this program"
	what := "the key " + e.key
	if e.value.kind == tables || e.value.kind == table && e.value.table.defined != inline {
		what = "the table " + e.key
	}
	where := " at the top of the file"
	if t.name != "" {
		where = " in [" + t.name + "]"
	}
	known := Nearest(e.key, t.asked)
	switch {
	case known != "" && strings.EqualFold(known, e.key):
		t.file.problem(e.at, what+where, "keys in lower case exactly: "+known+newer, known)
	case known != "":
		t.file.problem(e.at, what+where, "a known key, perhaps "+known+newer, known)
	default:
		t.file.problem(e.at, what+where, "a known key"+newer, strings.Join(t.asked, " "))
	}
}

// ask gives a key's entry and notes that it is known.
func (t *Table) ask(key string) *entry {
	if t == nil {
		return nil
	}
	if !slices.Contains(t.asked, key) {
		t.asked = append(t.asked, key)
	}
	e := t.find(key)
	if e != nil {
		e.asked = true
	}
	return e
}

// Has tells whether the key stands in the table, whatever its value.
func (t *Table) Has(key string) bool { return t.find(key) != nil }

// Line is the line of the table's header, or of the brace of an inline table.
func (t *Table) Line() int {
	if t == nil {
		return 0
	}
	line, _ := t.file.place(t.at)
	return line
}

// Refuse reports a value, as it stands in the file, that a rule beyond its own type forbids.
func (t *Table) Refuse(key, wanted, example string) {
	e := t.find(key)
	if e == nil {
		t.RefuseTable("no "+key, wanted, example)
		return
	}
	if e.value.kind == invalid {
		return
	}
	t.file.problem(e.value.at, t.file.describe(e.value), wanted, example)
}

// RefuseTable reports a problem of the table as a whole.
func (t *Table) RefuseTable(read, wanted, example string) {
	if t != nil {
		t.file.problem(t.at, read, wanted, example)
	}
}

// Warn notes that a key's value is allowed and likely a slip.
func (t *Table) Warn(key, text string) {
	if e := t.find(key); e != nil {
		t.file.warn(e.value.at, key+": "+text)
	}
}

// Require reports the keys that are missing. Each example is a whole assignment, such as `phases = 3`. Nothing is said where
// part of the file could not be parsed, because they may stand there.
func (t *Table) Require(examples ...string) {
	if t == nil || t.file.broken {
		return
	}
	for _, example := range examples {
		key, _, _ := strings.Cut(example, " ")
		if t.Has(key) {
			continue
		}
		where := "at the top of the file"
		if t.name != "" {
			where = "in [" + t.name + "]"
		}
		t.file.problem(t.at, "no "+key+" "+where, "the key "+key, example)
	}
}

// RequireTable reports a table that is missing from the top level; header is how it is written, such as "[bus]".
func (t *Table) RequireTable(header, example string) {
	if t == nil || t.file.broken {
		return
	}
	key := strings.Trim(header, "[]")
	if i := strings.LastIndexByte(key, '.'); i >= 0 {
		key = key[i+1:]
	}
	if !t.Has(key) {
		t.file.problem(t.at, "no "+header, "the table "+header, example)
	}
}

// wrongKind reports a value of another type than wanted.
func (t *Table) wrongKind(e *entry, wanted, example string) {
	if e.value.kind != invalid {
		t.file.problem(e.value.at, t.file.describe(e.value), wanted, e.key+" = "+example)
	}
}

func quote(s string) string { return strconv.Quote(s) }
