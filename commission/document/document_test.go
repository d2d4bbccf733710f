package document

import (
	"errors"
	"fmt"
	"strings"
	"testing"
	"time"

	"chargehand/commission/quantity"
)

const format = "chargehand-test/1"

// sample reads one key of every kind, as the readers of whole files do.
type sample struct {
	Name     string
	Mode     string
	Active   bool
	Phases   int
	Scale    float64
	Due      time.Time
	Range    []float64
	Codes    []string
	R        quantity.Entered[quantity.Resistance]
	Error    quantity.ErrorBound
	Droop    quantity.DroopSetting
	Inner    quantity.Entered[quantity.Voltage]
	ListOf   []string
	Warnings []Warning
}

func readSample(text string) (sample, error) {
	f := Open("x.toml", []byte(text), format)
	t := f.Root()
	var s sample
	t.Text("name", &s.Name, "aft string")
	Choice(t, "mode", &s.Mode, "off", "voltage", "current")
	t.Bool("active", &s.Active)
	t.Whole("phases", &s.Phases, 1, 12)
	t.Number("scale", &s.Scale)
	t.Date("due", &s.Due)
	s.Range = t.Numbers("range", 2, "[0, 1300]")
	s.Codes = t.Texts("codes", `"8000"`)
	Quantity(t, "resistance", &s.R, quantity.Rule{Sign: quantity.Positive, Tolerance: true, Least: 1e-5, Most: 100})
	t.ErrorBound("error", &s.Error)
	t.Droop("droop", &s.Droop)
	Quantity(t.Table("fuse"), "voltage", &s.Inner, quantity.Rule{})
	for _, one := range t.Tables("bank") {
		name := ""
		one.Text("name", &name, "drive")
		one.Require(`name = "drive"`)
		s.ListOf = append(s.ListOf, name)
	}
	s.Warnings = f.Warnings()
	return s, f.Err()
}

const head = "format = \"chargehand-test/1\"\n"

func TestReadsEveryKind(t *testing.T) {
	s, err := readSample("\ufeff" + head + `name = "aft \u00b5"
mode = 'voltage'
active = true
phases = 0x3
scale = 0.1
due = 2027-03-01
range = [0, 1.3e3]
codes = ["8000", "7FFF"]
resistance = "62 mΩ ±15 %"
error = "0.5 %"
droop = "136 mV/A"
fuse = { voltage = "1250 V" }
[[bank]]
name = "a"
[[bank]]
name = "b"
`)
	if err != nil {
		t.Fatalf("readSample = %v", err)
	}
	got := fmt.Sprint(s.Name, s.Mode, s.Active, s.Phases, s.Scale, s.Due.Format(time.DateOnly), s.Range, s.Codes, s.R.Nominal, s.Error.Relative,
		s.Droop.PerAmpere, s.Inner.Nominal, s.ListOf, len(s.Warnings))
	want := "aft µvoltagetrue 3 0.12027-03-01[0 1300] [8000 7FFF] 0.062 Ω 0.5 % 0.136 V/A 1250 V [a b] 0"
	if got != want {
		t.Errorf("readSample = %s, want %s", got, want)
	}
}

func TestReadsDottedKeysHeadersAndCRLF(t *testing.T) {
	for _, text := range []string{
		head + "fuse.voltage = \"1250 V\"\nbank = [ { name = \"a\" }, { name = \"b\" } ]\n",
		head + "bank = [\n  { name = \"a\" }, # first\n  { name = \"b\" },\n]\n[fuse]\nvoltage = \"1250 V\"",
		strings.ReplaceAll(head+"[fuse] # of the source\nvoltage = \"1250 V\"\n[[bank]]\nname=\"a\"\n[[bank]]\nname=\"b\"\n", "\n", "\r\n"),
	} {
		s, err := readSample(text)
		if err != nil || s.Inner.Nominal != 1250 || strings.Join(s.ListOf, "") != "ab" {
			t.Errorf("readSample(%q) = %+v, %v", text, s, err)
		}
	}
}

// place:read | wanted | example, each a part of the whole; one problem a line.
func TestProblems(t *testing.T) {
	tests := []struct{ name, text, want string }{
		{"empty", "", "1:1: an empty file | the file's format | format = \"chargehand-test/1\""},
		{"empty with mark", "\ufeff \n", "1:1: an empty file | format | format"},
		{"no format", "name = \"x\"\n", "1:1: no format | the file's format | format ="},
		{"newer", "format = \"chargehand-test/2\"\nunheard = 1\n", `1:10: "chargehand-test/2" | another version | chargehand-test/1`},
		{"other file", "format = \"chargehand-map/1\"\n", `1:10: "chargehand-map/1" | another kind of file | chargehand-test/1`},
		{"format not text", "format = 1\n", `1:10: 1 | the format | chargehand-test/1`},

		{"unknown key", head + "nmae = \"x\"\n", "2:1: the key nmae at the top of the file | a known key, perhaps name; or the file is for a newer version | name"},
		{"unknown table", head + "[colour]\nred = 1\n", "2:2: the table colour at the top of the file | a known key; or the file is for a newer version | name mode"},
		{"unknown in table", head + "[fuse]\nvolts = \"1 V\"\n", "3:1: the key volts in [fuse] | a known key | voltage"},
		{"unknown in inline table", head + "fuse = { voltage = \"1 V\", b = 1 }\n", "2:27: the key b in [fuse] | a known key | voltage"},
		{"unknown in list", head + "bank = [ { name = \"a\", x = 1 } ]\n", "2:24: the key x in [bank] | a known key | name"},
		{"upper case beside lower", head + "name = \"x\"\nName = \"y\"\n", "3:1: the key Name at the top of the file | lower case exactly: name | name"},
		{"twice", head + "name = \"x\"\nname = \"y\"\n", "3:1: name a second time | once; it stands in line 2 already | "},
		{"twice inline", head + "fuse = { voltage = \"1 V\", voltage = \"1 V\" }\n", "2:27: voltage a second time | once | "},
		{"table twice", head + "[fuse]\n[fuse]\n", "3:2: fuse a second time | a table once; it stands in line 2 | "},
		{"table after key", head + "fuse = { }\n[fuse]\n", "3:2: fuse a second time | once | "},
		{"table into text", head + "name = \"x\"\n[name.inner]\n", "3:2: name a second time | once | "},
		{"dotted into inline", head + "fuse = { }\nfuse.voltage = \"1 V\"\n", "3:1: fuse a second time | once | "},
		{"table for list", head + "[[bank]]\nname = \"a\"\n[bank]\nname = \"b\"\n", "4:2: [bank] | double brackets | [[bank]]"},

		{"text wanted", head + "name = 3\n", "2:8: 3 | text in quotes | name = \"aft string\""},
		{"text is empty", head + "name = \"\"\n", "2:8: \"\" | not empty | name ="},
		{"text with space", head + "name = \" x\"\n", "2:8: \" x\" | without space | name ="},
		{"choice", head + "mode = \"voltgae\"\n", "2:8: \"voltgae\" | one of off, voltage, current | mode = \"voltage\""},
		{"bool", head + "active = \"yes\"\n", "2:10: \"yes\" | true or false | active = true"},
		{"whole", head + "phases = 3.0\n", "2:10: 3.0 | a whole number from 1 to 12 | phases = 3"},
		{"whole in quotes", head + "phases = \"5\"\n", "2:10: \"5\" | a whole number from 1 to 12 | phases = 5"},
		{"date by points", head + "due = 01.03.2026\n", "2:7: \"01.03.2026\" | a date as year-month-day | due = 2026-03-01"},
		{"whole too large", head + "phases = 13\n", "2:10: 13 | from 1 to 12 | phases = 1"},
		{"whole with underscore", head + "phases = 1_0\n", "2:10: 1_0 | a whole number | phases = 1"},
		{"whole beyond 64 bits", head + "phases = 99999999999999999999\n", "2:10: 99999999999999999999 | a whole number | phases = 1"},
		{"number nan", head + "scale = nan\n", "2:9: nan | a finite number | scale = 0.1"},
		{"number inf", head + "scale = -inf\n", "2:9: -inf | a finite number | scale = 0.1"},
		{"number too large", head + "scale = 1e999\n", "2:9: 1e999 | a finite number | scale = 0.1"},
		{"number with underscore", head + "scale = 1_0.5e3\n", "2:9: 1_0.5e3 | a finite number | scale = 0.1"},
		{"numbers", head + "range = [0]\n", "2:9: a list | a list of 2 numbers | range = [0, 1300]"},
		{"texts", head + "codes = [1]\n", "2:9: a list | text in quotes, or a list of it | codes = \"8000\""},
		{"date in quotes", head + "due = \"2027-03-01\"\n", "2:7: \"2027-03-01\" | a date as year-month-day, without quotes | due = 2026-03-01"},
		{"no such date", head + "due = 2027-02-30\n", "2:7: 2027-02-30 | a date that exists | 2026-03-01"},
		{"date with time", head + "due = 2027-03-01T10:00:00Z\n", "2:7: 2027-03-01T10:00:00Z | a date | due ="},
		{"table wanted", head + "fuse = 3\n", "2:8: 3 | a table | fuse = { … }"},
		{"tables wanted", head + "bank = \"a\"\n", "2:8: \"a\" | a list of tables | bank = [ {"},
		{"table in list wanted", head + "bank = [ 1 ]\n", "2:10: 1 | a table in the list | bank ="},
		{"missing key", head + "[[bank]]\n", "2:1: no name in [bank] | the key name | name = \"drive\""},

		{"bare number", head + "resistance = 33\n", "2:14: 33 | a value with its unit, in quotes | resistance = \"33 Ω\""},
		{"bare boolean", head + "resistance = true\n", "2:14: true | a value with its unit, in quotes | resistance = \"33 Ω\""},
		{"no unit", head + "resistance = \"33\"\n", "2:14: \"33\" | a unit: µΩ mΩ Ω kΩ MΩ GΩ | resistance = \"33 Ω\""},
		{"column in characters", head + "bank = [ { name = \"Ωµ\" }, { nom = \"b\" } ]\n", "2:27: no name in [bank] | the key name | name\n2:29: the key nom in [bank] | a known key | name"},
		{"error bound", head + "error = 0.5\n", "2:9: 0.5 | a value with its unit | error = \"0.5 %\""},
		{"droop", head + "droop = \"0 %\"\n", "2:9: \"0 %\" | above 0 | droop = \"3 %\""},

		{"control escape", head + "name = \"a\\nb\"\n", "2:8: U+000A in text | without control characters | "},
		{"control in many lines", head + "name = \"\"\"a\nb\"\"\"\n", "2:8: U+000A in text | on one line | "},
		{"direction mark", head + "name = \"a\u202eb\"\n", "2:8: U+202E in text | without control characters | "},
		{"control in key", head + "\"a\\tb\" = 1\n", "2:1: U+0009 in a key | a key of letters | \n2:1: the key a\tb at the top | a known key | "},
		{"raw control", head + "name = \"a\x01b\"\n", "2:10: \"\\x01b\\\"\" | without control characters | "},
		{"new escape", head + "name = \"a\\x41\"\n", "2:8: \\x in text | an escape of TOML 1.0 | "},
		{"unknown escape", head + "name = \"a\\q\"\n", "2:10: \"\\\\q\\\"\" | an escape of TOML 1.0 | "},
		{"inline over lines", head + "fuse = { voltage = \"1 V\",\n}\n", "2:25: a comma before } | no comma | { on\n2:26: a line break or comment in an inline table | on one line | {"},

		{"not UTF-8", head + "name = \"a\xe4\"\nmode = \"\xb1\"\n", "2:10: the byte 0xE4 | text in UTF-8 | saved as UTF-8\n3:9: the byte 0xB1 | text in UTF-8 | saved"},
		{"UTF-16", "\xff\xfef\x00o\x00", "1:1: the byte 0xFF | text in UTF-8 | instead of UTF-16"},

		{"unquoted value", head + "resistance = 33 Ω   # cold\n", "2:17: \"Ω   # cold\" | the end of the line; text, and a value with its unit, stand in quotes | resistance = \"33 Ω\""},
		{"unquoted unit", head + "resistance = 33Ω\n", "2:16: \"Ω\" | in quotes | resistance = \"33Ω\""},
		{"unquoted with letter", head + "droop = 3x\n", "2:10: \"x\" | in quotes | droop = \"3x\""},
		{"unquoted text", head + "name = aft\n", "2:8: \"aft\" | in quotes | name = \"aft\""},
		{"no value", head + "name =\nmode = \"off\"\n", "2:7: the end of the line | in quotes | resistance"},
		{"no equals", head + "name \"x\"\n", "2:6: \"\\\"x\\\"\" | an equals sign | name = \"text\""},
		{"open quote", head + "name = \"x\nmode = \"off\"\n", "2:10: the end of the line | a closing quote on the same line | name = \"x\""},
		{"open list", head + "range = [0, 1\nname = 3\n", "3:1: \"name = 3\" | in the list | range\n3:8: 3 | text in quotes | name"},
		{"open brace", head + "fuse = { voltage = \"1 V\"\nname = 3\n", "3:1: \"name = 3\" | inline table | {\n3:8: 3 | text in quotes | name"},
		{"bad header hides its keys only", head + "[fuse\nunheard = 1\n[[bank]]\nnam = 1\n", "2:6: the end of the line | a closing bracket | [bus]\n5:1: the key nam in [bank] | perhaps name | name"},
		{"many at once", head + "name = 1\nphases = x\nactive = 2\n", "2:8: 1 | text | name\n3:10: \"x\" | in quotes | phases = \"x\"\n4:10: 2 | true or false | active"},
		{"lone carriage return", head + "name = \"x\"\rmode = \"off\"\n", "2:11: \"\\rmode = \\\"off\\\"\" | line ends of LF or CR LF | "},
		{"leading zero", head + "phases = 03\n", "2:10: \"03\" | without leading zeroes | "},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			s, err := readSample(tt.text)
			var p *Problems
			if !errors.As(err, &p) {
				t.Fatalf("readSample(%q) = %+v, %v, want problems", tt.text, s, err)
			}
			want := strings.Split(tt.want, "\n")
			if len(p.List) != len(want) {
				t.Fatalf("readSample(%q) has the problems\n%v\nwant %d", tt.text, p, len(want))
			}
			for i, w := range want {
				place, rest, _ := strings.Cut(w, ": ")
				parts := strings.Split(rest, " | ")
				q := p.List[i]
				if place != fmt.Sprintf("%d:%d", q.Line, q.Column) || !strings.Contains(q.Read, parts[0]) ||
					!strings.Contains(q.Wanted, parts[1]) || !strings.Contains(q.Example, parts[2]) {
					t.Errorf("readSample(%q) = %d:%d: %s | %s | %s\nwant %s", tt.text, q.Line, q.Column, q.Read, q.Wanted, q.Example, w)
				}
			}
		})
	}
}

func TestWarnsOfAnImplausibleSize(t *testing.T) {
	s, err := readSample(head + "resistance = \"62 MΩ ±15 %\"\n")
	if err != nil || len(s.Warnings) != 1 || s.Warnings[0].Line != 2 || s.Warnings[0].Column != 14 {
		t.Fatalf("warnings = %+v, %v, want one at 2:14", s.Warnings, err)
	}
	if got := s.Warnings[0].Text; !strings.Contains(got, "62 MΩ ±15 % is unusual") {
		t.Errorf("warning = %q", got)
	}
}

// Bad files of the greatest size end in time and with a bearable list.
func TestLargeFiles(t *testing.T) {
	line := "x = \n"
	for name, text := range map[string]string{
		"10 MB":           head + strings.Repeat("# filled with a comment\n", 10<<20/24),
		"only errors":     head + strings.Repeat(line, (MaxSize-len(head))/len(line)),
		"one line":        head + "fuse = {" + strings.Repeat("a=1,", (MaxSize-len(head)-20)/4) + "b=1}\n",
		"deep":            head + "range = " + strings.Repeat("[", 9000) + strings.Repeat("]", 9000) + "\n",
		"too deep":        head + "range = " + strings.Repeat("[", 100_000),
		"deep tables":     head + "fuse = " + strings.Repeat("{a=", 9000) + "1" + strings.Repeat("}", 9000) + "\n",
		"many same":       head + strings.Repeat("name = \"x\"\n", 50_000),
		"many headers":    head + strings.Repeat("[a]\n", 100_000),
		"unknown keys":    head + manyKeys(50_000),
		"quotes":          head + strings.Repeat("name = \"\n", 50_000),
		"garbage headers": head + strings.Repeat("[[[\n", 50_000),
	} {
		start := time.Now()
		_, err := readSample(text)
		var p *Problems
		if !errors.As(err, &p) || len(p.List) == 0 || len(p.List) > mostProblems+1 {
			t.Errorf("%s: readSample = %v problems, want 1 to %d", name, p, mostProblems+1)
		}
		t.Logf("%s: %v", name, time.Since(start))
	}
	_, err := readSample(head + strings.Repeat("# filled with a comment\n", 10<<20/24))
	if got := err.Error(); !strings.Contains(got, "x.toml:43691:12:") || !strings.Contains(got, "a file of at most 1048576 bytes") {
		t.Errorf("a file of 10 MB = %q", got)
	}
}

func manyKeys(n int) string {
	var b strings.Builder
	for i := range n {
		fmt.Fprintf(&b, "namex%d = 1\n", i)
	}
	return b.String()
}

func TestRevise(t *testing.T) {
	const text = "\ufeff# site\r\nformat = \"chargehand-test/1\" # first\r\nactive = true\r\n[precharge]  # pre\r\nresistance = '47 Ω'   # typed\r\n" +
		"pulse = [ { duration = \"1 s\", energy = \"3 kJ\" }, { duration = \"2 s\", energy = \"4 kJ\" } ]\r\n[[infeed]]\r\ndroop = \"3 %\"\r\nattempts = 3\r\n" +
		"[[infeed]]\r\ndroop = \"4 %\"\r\nfuse = { a = \"1 A\" }\r\n"
	got, err := Revise([]byte(text), map[string]string{
		"active": "false", "precharge.resistance": "100 Ω ±5 %", "precharge.pulse.1.energy": "5 kJ", "infeed.1.droop": "3 %", "infeed.0.attempts": "2",
		"precharge.attempts": "4", "precharge.timeout": "3 s", "infeed.1.fuse.b": "2 A",
	})
	want := strings.NewReplacer("active = true", "active = false", "'47 Ω'", "\"100 Ω ±5 %\"", "\"4 kJ\"", "\"5 kJ\"", "\"4 %\"", "\"3 %\"",
		"attempts = 3", "attempts = 2", "} ]\r\n", "} ]\r\nattempts = 4\r\ntimeout = \"3 s\"\r\n", "\"1 A\" }", "\"1 A\", b = \"2 A\" }").Replace(text)
	if err != nil || string(got) != want {
		t.Errorf("Revise =\n%s, %v\nwant\n%s", got, err, want)
	}
	if same, err := Revise([]byte(text), nil); err != nil || string(same) != text {
		t.Errorf("Revise without changes = %q, %v, want the text itself", same, err)
	}
	for _, path := range []string{"", ".", "nothing.here", "infeed.2.droop", "infeed.x.droop", "infeed.droop", "precharge", "precharge.pulse", "active.x", "infeed.0.\"x"} {
		if got, err := Revise([]byte(text), map[string]string{path: "1 V"}); err == nil {
			t.Errorf("Revise(%q) = %q, want an error", path, got)
		}
	}
	for path, to := range map[string]string{"active": "maybe # x", "precharge.resistance": "1\n2", "infeed.0.attempts": "2 V"} {
		if got, err := Revise([]byte(text), map[string]string{path: to}); err == nil {
			t.Errorf("Revise(%q: %q) = %q, want an error", path, to, got)
		}
	}
	if _, err := Revise([]byte("a = \n"), map[string]string{"a": "1"}); err == nil {
		t.Error("Revise of a broken file succeeded, want its problems")
	}
}

func TestValueIsWhatReviseTakes(t *testing.T) {
	text := []byte("a = \"1 µ\\u03a9\"\nb = 3\nc = { d = 2026-03-01 }\n[[e]]\nf = true\n")
	for path, want := range map[string]string{"a": "1 µΩ", "b": "3", "c.d": "2026-03-01", "e.0.f": "true"} {
		if got, ok := Value(text, path); !ok || got != want {
			t.Errorf("Value(%q) = %q, %v, want %q", path, got, ok, want)
		}
		if revised, err := Revise(text, map[string]string{path: want}); err != nil || !strings.Contains(string(revised), want) {
			t.Errorf("Revise(%q) = %q, %v", path, revised, err)
		}
	}
	for _, path := range []string{"", "x", "c", "e", "e.1.f", "a.b"} {
		if got, ok := Value(text, path); ok {
			t.Errorf("Value(%q) = %q, want none", path, got)
		}
	}
}

func TestNearest(t *testing.T) {
	known := []string{"bus-voltage", "bus-current", "power", "mode"}
	for word, want := range map[string]string{"bus-volatge": "bus-voltage", "BUS-CURRENT": "bus-current", "powr": "power", "mod": "mode", "x": "", "": ""} {
		if got := Nearest(word, known); got != want {
			t.Errorf("Nearest(%q) = %q, want %q", word, got, want)
		}
	}
}
