package document

import (
	"bytes"
	"errors"
	"fmt"
	"regexp"
	"strings"
	"time"
	"unicode"

	"github.com/pelletier/go-toml/v2/unstable"
)

// This file alone knows the TOML parser. Its package "unstable" gives positions but promises no compatibility, and checks
// neither duplicate keys nor the values of dates: both are done here.

var kinds = map[unstable.Kind]kind{
	unstable.String: text, unstable.Bool: boolean, unstable.Integer: integer, unstable.Float: float, unstable.LocalDate: date,
	unstable.Array: list, unstable.InlineTable: table,
	unstable.LocalTime: moment, unstable.LocalDateTime: moment, unstable.DateTime: moment,
}

// builder makes the tree of one file.
type builder struct {
	f       *File
	p       *unstable.Parser
	base    int    // offset of the parser's text in the file's
	current *Table // nil behind a broken header: its keys cannot be placed
}

// parse reads all expressions. After a syntax error it goes on at the next line that can begin one, so that a file's other
// problems are found too.
func (f *File) parse() {
	b := &builder{f: f, p: &unstable.Parser{}, current: f.root}
	for b.base < len(f.text) {
		// The capacity is cut too, because the parser finds offsets by it.
		b.p.Reset(f.text[b.base:len(f.text):len(f.text)])
		done := b.base
		for b.p.NextExpression() {
			done = b.expression(b.p.Expression())
		}
		if b.p.Error() == nil {
			return
		}
		f.broken = true
		b.base = b.syntaxError(b.p.Error(), done)
		if f.isFull() {
			return
		}
	}
}

// expression takes one header or one key with its value, and gives the offset of its end.
func (b *builder) expression(n *unstable.Node) int {
	keys := b.keys(n)
	last := keys[len(keys)-1]
	switch n.Kind {
	case unstable.Table:
		b.current = b.f.root.header(keys, false)
	case unstable.ArrayTable:
		b.current = b.f.root.header(keys, true)
	case unstable.KeyValue:
		v := b.assigned(n, last)
		if b.current != nil {
			b.current.assign(keys, v)
			b.current.tail = v.end
		}
		return v.end
	}
	if b.current != nil {
		b.current.tail = last.end
	}
	return last.end
}

// key is one part of a dotted key.
type key struct {
	name    string
	at, end int
}

func (b *builder) keys(n *unstable.Node) []key {
	var keys []key
	for it := n.Key(); it.Next(); {
		k := it.Node()
		at := b.base + int(k.Raw.Offset)
		keys = append(keys, key{string(k.Data), at, at + int(k.Raw.Length)})
		if r, bad := control(string(k.Data)); bad {
			b.f.problem(at, fmt.Sprintf("%U in a key", r), "a key of letters, digits, - and _", "")
		}
	}
	return keys
}

// assigned is the value of a key; the parser gives no place for a list, so it is found from the equals sign.
func (b *builder) assigned(n *unstable.Node, last key) *value {
	at := last.end
	for at < len(b.f.text) && strings.IndexByte(" \t=", b.f.text[at]) >= 0 {
		at++
	}
	return b.value(n.Value(), at, b.base+int(n.Raw.Offset+n.Raw.Length))
}

func (b *builder) value(n *unstable.Node, at, end int) *value {
	f := b.f
	v := &value{kind: kinds[n.Kind], at: at, end: end}
	switch v.kind {
	case text:
		v.text = string(n.Data)
		if r, bad := control(v.text); bad {
			f.problem(at, fmt.Sprintf("%U in text", r), "text on one line without control characters", "")
			v.kind = invalid
		}
		if escape, bad := newEscape(f.text[at:end]); bad {
			f.problem(at, escape+" in text", `an escape of TOML 1.0, such as \u00b5`, "")
			v.kind = invalid
		}
	case date:
		if _, err := time.Parse(time.DateOnly, string(n.Data)); err != nil {
			f.problem(at, string(n.Data), "a date that exists, as year-month-day", "2026-03-01")
			v.kind = invalid
		}
	case list:
		for it := n.Children(); it.Next(); {
			v.items = append(v.items, b.item(it.Node(), at, end))
		}
	case table:
		v.table = newTable(f, "", at, inline)
		b.inlineTable(n, v)
	}
	return v
}

// item is one element of a list. A list in a list has no place of its own and takes that of the outer one.
func (b *builder) item(n *unstable.Node, at, end int) *value {
	switch n.Kind {
	case unstable.Array:
		return b.value(n, at, end)
	case unstable.InlineTable:
		at = b.base + int(n.Raw.Offset)
		return b.value(n, at, b.inlineEnd(n, at))
	}
	at = b.base + int(n.Raw.Offset)
	return b.value(n, at, at+int(n.Raw.Length))
}

// inlineTable takes the keys of an inline table. TOML 1.1 allows line breaks and a last comma there; TOML 1.0 does not, and
// another reader of the same file might refuse it.
func (b *builder) inlineTable(n *unstable.Node, v *value) {
	gap := v.at + 1
	for it := n.Children(); it.Next(); {
		kv := it.Node()
		start := b.base + int(kv.Raw.Offset)
		b.oneLine(v, gap, start)
		gap = start + int(kv.Raw.Length)
		keys := b.keys(kv)
		v.table.assign(keys, b.assigned(kv, keys[len(keys)-1]))
	}
	b.oneLine(v, gap, v.end)
	if last := string(b.f.text[gap:v.end]); strings.Contains(strings.Split(last, "#")[0], ",") {
		b.f.problem(gap+strings.IndexByte(last, ','), "a comma before }", "no comma after the last key of an inline table", "{ on = true }")
	}
}

func (b *builder) oneLine(v *value, from, to int) {
	if i := strings.IndexAny(string(b.f.text[from:to]), "\n#"); i >= 0 && !v.table.broken {
		v.table.broken = true
		b.f.problem(from+i, "a line break or comment in an inline table", "the whole { … } on one line", `{ voltage = "60 V", within = "5 s" }`)
	}
}

// inlineEnd finds the end of an inline table inside a list.
func (b *builder) inlineEnd(n *unstable.Node, at int) int {
	end := at + 1
	for it := n.Children(); it.Next(); {
		end = b.base + int(it.Node().Raw.Offset+it.Node().Raw.Length)
	}
	comment := false
	for ; end < len(b.f.text); end++ {
		switch c := b.f.text[end]; {
		case comment:
			comment = c != '\n'
		case c == '#':
			comment = true
		case c == '}':
			return end + 1
		}
	}
	return end
}

// control finds a character that may not stand in text: it would spoil a signed statement or hide what is written.
func control(s string) (rune, bool) {
	for _, r := range s {
		switch {
		case unicode.IsControl(r), r == '\u2028', r == '\u2029', r >= '\u202a' && r <= '\u202e', r >= '\u2066' && r <= '\u2069', r == '\u200e',
			r == '\u200f', r == '\u061c':
			return r, true
		}
	}
	return 0, false
}

// newEscape finds an escape in a string's source that only TOML 1.1 knows.
func newEscape(raw []byte) (string, bool) {
	if raw[0] != '"' {
		return "", false
	}
	for i := 0; i+1 < len(raw); i++ {
		if raw[i] != '\\' {
			continue
		}
		if i++; raw[i] == 'e' || raw[i] == 'x' {
			return string(raw[i-1 : i+1]), true
		}
	}
	return "", false
}

var beginsExpression = regexp.MustCompile(`^[ \t]*(\[|[A-Za-z0-9_"'.-]+[ \t]*=)`)

// syntaxError reports why the parser stopped, and gives the offset of the line to go on at. done is the end of what was
// parsed before.
func (b *builder) syntaxError(err error, done int) int {
	f := b.f
	var broken *unstable.ParserError
	if !errors.As(err, &broken) {
		f.problem(b.base, "what is no TOML", err.Error(), "")
		return len(f.text)
	}
	at := b.base + int(b.p.Range(broken.Highlight).Offset)
	started := b.failedLine(done)
	if bytes.HasPrefix(bytes.TrimLeft(f.lineAt(started), " \t"), []byte("[")) {
		b.current = nil
	}
	f.explainSyntax(at, started, broken)
	line, _ := f.place(at)
	if start := f.lines[line-1]; start > started && beginsExpression.Match(f.text[start:]) {
		return start
	}
	if line < len(f.lines) {
		return f.lines[line]
	}
	return len(f.text)
}

// failedLine is the start of the first line behind done, the end of what was parsed before, that is neither empty nor a
// comment. What was parsed had its line to itself.
func (b *builder) failedLine(done int) int {
	line, _ := b.f.place(done)
	if done > b.base {
		line++
	}
	for ; line <= len(b.f.lines); line++ {
		start := b.f.lines[line-1]
		if rest := bytes.TrimSpace(b.f.lineAt(start)); len(rest) > 0 && rest[0] != '#' {
			return start
		}
	}
	return len(b.f.text)
}
