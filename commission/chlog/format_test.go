package chlog_test

import (
	"bytes"
	"flag"
	"fmt"
	"os"
	"reflect"
	"strings"
	"testing"

	"chargehand/commission/chlog"
	"chargehand/commission/record"
)

var update = flag.Bool("update", false, "rewrite testdata/example.chlog and the examples in FORMAT.md")

const recordsHeading = "## 7. The records\n"

// exampleBodies gives the first body of each kind in a log.
func exampleBodies(t testing.TB, text []byte) map[string]chlog.Line {
	t.Helper()
	first := map[string]chlog.Line{}
	for _, l := range lines(t, text) {
		if _, ok := first[l.Kind]; !ok {
			first[l.Kind] = l
		}
	}
	return first
}

// The log in testdata is what the writer writes, byte for byte, signatures included.
func TestExampleLogIsWhatTheWriterWrites(t *testing.T) {
	made := exampleLog(t)
	for _, suffix := range []string{"", ".sig", ".2.sig", ".torn-1"} {
		stored := "testdata/example.chlog" + suffix
		if *update {
			write(t, stored, read(t, made+suffix))
		}
		if got, want := read(t, made+suffix), read(t, stored); !bytes.Equal(got, want) {
			t.Errorf("%s: written = %s, want %s", stored, got, want)
		}
	}
	r := chlog.Verifier{Now: now, Signers: allow(t, string(read(t, "testdata/allowed_signers")))}.File("testdata/example.chlog")
	wantReport(t, r, chlog.Unchanged, 0, "REHEARSAL ", "unchanged since tech@example.org (A. Example, technician) and surveyor@example.org (B. Example, surveyor) signed")
	if len(r.Torn) != 1 || r.Torn[0] != "example.chlog.torn-1" || *r.SignedTo != r.Records-1 {
		t.Errorf("Verify = %+v, want the torn line named and the whole log signed", r)
	}
}

// The document shows a body of every kind, and each is the one in the example log, byte for byte.
func TestFormatShowsEveryRecordAsItIs(t *testing.T) {
	document := string(read(t, "FORMAT.md"))
	examples := exampleBodies(t, read(t, "testdata/example.chlog"))
	for _, kind := range record.Kinds() {
		body, ok := examples[kind]
		if !ok {
			t.Errorf("the example log holds no %q", kind)
			continue
		}
		section := sectionOf(document, kind)
		example := "    " + string(body.Body) + "\n"
		if *update {
			changed := replaceExample(section, example)
			document = strings.Replace(document, section, changed, 1)
			section = changed
		}
		if !strings.Contains(section, example) {
			t.Errorf("FORMAT.md, %s: the example is not the body of record %d:\n%s", kind, body.Seq, body.Body)
		}
	}
	if *update {
		if err := os.WriteFile("FORMAT.md", []byte(document), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	_, records, _ := strings.Cut(document, recordsHeading)
	for _, heading := range strings.Split(records, "\n### `")[1:] {
		kind, _, _ := strings.Cut(heading, "`")
		if !record.Known(kind) {
			t.Errorf("FORMAT.md describes %q, which no version writes", kind)
		}
	}
}

func sectionOf(document, kind string) string {
	start := strings.Index(document, "\n### `"+kind+"`")
	if start < 0 {
		return ""
	}
	rest := document[start+1:]
	if end := strings.Index(rest, "\n### `"); end >= 0 {
		rest = rest[:end+1]
	}
	return rest
}

// replaceExample puts the example in the place of the one in a section, or at its end.
func replaceExample(section, example string) string {
	var kept []string
	for line := range strings.Lines(section) {
		if !strings.HasPrefix(line, "    {") {
			kept = append(kept, line)
		}
	}
	return strings.TrimRight(strings.Join(kept, ""), "\n") + "\n\n" + example + "\n"
}

// Every field that a record can have is described in its section, by name.
func TestFormatDescribesEveryField(t *testing.T) {
	document := string(read(t, "FORMAT.md"))
	for _, kind := range record.Kinds() {
		section := sectionOf(document, kind)
		for _, field := range fieldsOf(t, kind) {
			if !strings.Contains(section, "`"+field+"`") {
				t.Errorf("FORMAT.md, %s: field %q is not described", kind, field)
			}
		}
	}
}

// fieldsOf lists the JSON fields of a kind, nested ones too.
func fieldsOf(t testing.TB, kind string) (names []string) {
	t.Helper()
	empty, err := record.Decode(kind, []byte(`{}`))
	if err != nil {
		t.Fatal(err)
	}
	var walk func(reflect.Type)
	walk = func(of reflect.Type) {
		for of.Kind() == reflect.Pointer || of.Kind() == reflect.Slice {
			of = of.Elem()
		}
		if of.Kind() != reflect.Struct {
			return
		}
		for i := range of.NumField() {
			if name, _, _ := strings.Cut(of.Field(i).Tag.Get("json"), ","); name != "" {
				names = append(names, name)
				walk(of.Field(i).Type)
			}
		}
	}
	walk(reflect.TypeOf(empty))
	if len(names) == 0 && kind != "finding" {
		t.Fatal(fmt.Errorf("%s has no fields", kind))
	}
	return names
}
