package document

import (
	"testing"

	"github.com/pelletier/go-toml/v2"
)

// FuzzParse compares with the TOML library's own decoder, which keeps its own account of duplicate keys and dates: what is
// accepted here without a problem it must accept too. And every problem has a place inside the file.
func FuzzParse(f *testing.F) {
	for _, text := range []string{head, "a.b = 1\n[a.c]\nd = 2\n", "[[a]]\nb = 1\n[[a]]\nb = 2\n[a.c]\n[[a.c.d]]\n", "a = { b = { c = [1, { d = 2 }] } }\n",
		"a.b.c = 1\na.b.d = 2\n[x]\n[x.y.z]\n[x.y]\n", "[a]\n[a.b]\n[a]\n", "a = 1\n[a.b]\n", "a = []\n[[a]]\n", "[a.b]\n[[a]]\n", "a.b = 1\n[a]\n",
		"[a]\nb.c = 1\n[a.b]\n", "a = 2026-02-30\n", "a = 1979-05-27 07:32:00\n", "a = '''\nx\n'''\n", "\"\" = 1\n'a b'.c = 2\n", "a = {b=1,b.c=2}\n",
		"[[a]]\n[a]\n", "[a]\n[[a]]\n", "[a.b.c]\n[a]\nb.d = 1\n", "x = 0xff_ff\ny = 1e_5\n"} {
		f.Add([]byte(text))
	}
	f.Fuzz(func(t *testing.T, text []byte) {
		file := parse("x", text)
		for _, p := range file.problems {
			if p.Line < 1 || p.Line > len(file.lines) || p.Column < 1 {
				t.Fatalf("parse(%q) has a problem at %d:%d", text, p.Line, p.Column)
			}
		}
		if file.broken && len(file.problems) == 0 {
			t.Fatalf("parse(%q) is broken without a problem", text)
		}
		if file.broken || len(file.problems) > 0 {
			return
		}
		var any map[string]any
		if err := toml.Unmarshal(file.text, &any); err != nil && !isMoment(file.root) {
			t.Fatalf("parse(%q) found nothing wrong, the decoder: %v", text, err)
		}
	})
}

// isMoment tells whether a table holds a time of day, which no key takes and whose digits are not checked here, or a number
// that the reader of its key refuses.
func isMoment(t *Table) bool {
	for _, e := range t.entries {
		if t.momentIn(e.value) {
			return true
		}
	}
	return false
}

func (t *Table) momentIn(v *value) bool {
	switch v.kind {
	case moment:
		return true
	case integer, float:
		_, ok := t.finite(v)
		return !ok
	case table:
		return isMoment(v.table)
	}
	for _, item := range v.items {
		if t.momentIn(item) {
			return true
		}
	}
	return false
}
