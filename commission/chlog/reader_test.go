package chlog_test

import (
	"bytes"
	"errors"
	"io"
	"strings"
	"testing"

	"chargehand/commission/chlog"
	"chargehand/commission/chlog/chlogtest"
	"chargehand/commission/record"
)

// SHA-256 of the examples of FIPS 180-4 (and of a million times "a").
func TestTheChainsHashIsSHA256(t *testing.T) {
	for message, want := range map[string]string{
		"":    "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855",
		"abc": "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad",
		"abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnopnopq": "248d6a61d20638b8e5c026930c3e6039a33ce45964ff2167f6ecedd419db06c1",
		strings.Repeat("a", 1_000_000):                             "cdc76e5c9914fb9281a1c7e284d73e67f1809a48a497200e046d39ccc7112cd0",
	} {
		if got := chlog.HashOf([]byte(message)); got != want {
			t.Errorf("hash of %.20q (%d bytes) = %s, want %s", message, len(message), got, want)
		}
	}
}

// first is a good first line; body lets the tests put anything in its place.
func first(body string) string {
	return `{"prev":"` + chlog.NoPrev + `","seq":0,"at":"2026-12-01T09:30:00.000+01:00","kind":"opened","body":` + body + "}\n"
}

const opened = `{"format":"chargehand-log/1","log":"0f1e2d3c4b5a69788796a5b4c3d2e1f0","mode":"site","program":"1.0.0","device":"","speed":1,"disturb":[],"seed":null,"continues":null}`

// next is a line that is chained to the last of log.
func next(log, seq, kind, body string) string {
	start := strings.LastIndexByte(strings.TrimSuffix(log, "\n"), '\n') + 1
	return log + `{"prev":"` + chlog.HashOf([]byte(log[start:])) + `","seq":` + seq + `,"at":"2026-12-01T09:30:01.000+01:00","kind":"` + kind + `","body":` + body + "}\n"
}

func TestReaderTakesWhatTheFormatAllows(t *testing.T) {
	log := first(opened)
	for i, body := range []string{
		`{}`, `{"unknown":{"deeply":[1,-0,0.5,1e9,1.5E-3,null,true,false,"",[],{}]}}`,
		`{"text":"tab \t line\n return\r quote \" slash \/ back \\ µ \u00b5 \u2028 \ud83d\ude00 €"}`,
		`{"a":1,"b":{"a":1,"A b":2}}`,
	} {
		log = next(log, []string{"1", "2", "3", "4"}[i], "kind-of-2099", body)
	}
	r := chlog.NewReader(strings.NewReader(log))
	n := 0
	for {
		l, err := r.Next()
		if err == io.EOF {
			break
		}
		if err != nil {
			t.Fatal(err)
		}
		if _, err := l.Decode(); err != nil {
			t.Errorf("Decode = %v", err)
		}
		n++
	}
	if n != 5 || r.End() != int64(len(log)) || r.Opened().Mode != record.SiteMode {
		t.Errorf("read %d lines to byte %d, want 5 to %d", n, r.End(), len(log))
	}
}

func TestReaderRefusesEverythingElse(t *testing.T) {
	one := first(opened)
	two := next(one, "1", "note", `{"text":"a","corrects":null}`)
	three := next(two, "2", "note", `{"text":"b","corrects":null}`)
	sealed := next(one, "1", "seal", `{}`)
	body := func(b string) string { return next(one, "1", "note", b) }
	at := int64(len(one))
	for _, c := range []struct {
		name, log string
		record    int64
		offset    int64 // -1: anywhere in the record
		what      string
	}{
		{"key twice", body(`{"a":1,"b":2,"a":3}`), 1, -1, `key "a" stands twice`},
		{"key twice deep inside", body(`{"x":[{"y":{"a":1,"a":1}}]}`), 1, -1, `key "a" stands twice`},
		{"keys that differ in case", body(`{"text":1,"Text":2}`), 1, -1, `keys "text" and "Text" differ only in case`},
		{"keys that differ in case beyond ASCII", body(`{"straße":1,"STRAßE":2}`), 1, -1, "differ only in case"},
		{"the same key escaped", body(`{"a":1,"\u0061":2}`), 1, -1, "holds an escape"},
		{"Kelvin sign", body(`{"k":1,"` + "\u212a" + `":2}`), 1, -1, "differ only in case"},
		{"invalid UTF-8", body("{\"a\":\"\xff\"}"), 1, -1, "byte 0xff is not UTF-8"},
		{"overlong UTF-8", body("{\"a\":\"\xc0\x80\"}"), 1, -1, "byte 0xc0 is not UTF-8"},
		{"surrogate in UTF-8", body("{\"a\":\"\xed\xa0\x80\"}"), 1, -1, "byte 0xed is not UTF-8"},
		{"half a surrogate pair", body(`{"a":"\ud800"}`), 1, -1, "half of a surrogate pair"},
		{"the other half", body(`{"a":"\udc00"}`), 1, -1, "half of a surrogate pair"},
		{"control character", body("{\"a\":\"\x1b[2J\"}"), 1, -1, "control character 0x1b inside text"},
		{"escaped control character", body(`{"a":"\u001b"}`), 1, -1, "control character U+001B inside text"},
		{"escaped backspace", body(`{"a":"\b"}`), 1, -1, "escape"},
		{"delete", body("{\"a\":\"\x7f\"}"), 1, -1, "control character 0x7f inside text"},
		{"C1 control character", body("{\"a\":\"\u0085\"}"), 1, -1, "control character U+0085 inside text"},
		{"tab between", body("{\"a\":\t1}"), 1, -1, "white space (byte 0x09)"},
		{"space between", body(`{"a": 1}`), 1, -1, "white space (byte 0x20)"},
		{"number with a leading zero", body(`{"a":01}`), 1, -1, `wanted "," or "}"`},
		{"number with a plus", body(`{"a":+1}`), 1, -1, "wanted a value"},
		{"number that ends in a point", body(`{"a":1.}`), 1, -1, "wanted a digit"},
		{"infinity", body(`{"a":Infinity}`), 1, -1, "wanted a value"},
		{"comma too many", body(`{"a":1,}`), 1, -1, "wanted a key"},
		{"body that is a list", body(`[]`), 1, -1, "wanted an object as body"},
		{"nested too deep", body(`{"a":` + strings.Repeat("[", 100) + strings.Repeat("]", 100) + `}`), 1, -1, "nested deeper"},
		{"too many keys", body(`{` + manyKeys(300) + `}`), 1, -1, "more than 256 keys"},
		{"wrong order", one + `{"seq":1,"prev":"` + chlog.NoPrev + "\"}\n", 1, at + 2, `wanted exactly {"prev":"`},
		{"upper-case hex", strings.Replace(two, `"prev":"`+two[at+9:at+73], `"prev":"`+strings.ToUpper(two[at+9:at+73]), 1), 1, -1, "wanted 64 lower-case"},
		{"seq with a leading zero", next(one, "01", "note", `{}`), 1, -1, "is no sequence number"},
		{"seq that is huge", next(one, "99999999999999999999", "note", `{}`), 1, -1, "is no sequence number"},
		{"seq in exponents", next(one, "1e0", "note", `{}`), 1, -1, "wanted exactly"},
		{"negative seq", next(one, "-1", "note", `{}`), 1, -1, "wanted a digit"},
		{"wrong seq", next(one, "5", "note", `{}`), 1, at, "record 5 stands where record 1 should"},
		{"line missing", strings.Replace(three, two[at:], "", 1), 1, at, "a line is missing"},
		{"line twice", two + two[at:], 2, int64(len(two)), "a line stands twice"},
		{"time without offset", strings.Replace(two, `01.000+01:00`, `01.000`, 1), 1, -1, "is no time"},
		{"time without milliseconds", strings.Replace(two, `01.000+01:00`, `01+01:00`, 1), 1, -1, "is no time"},
		{"time with a comma", strings.Replace(two, `01.000+01:00`, `01,000+01:00`, 1), 1, -1, "is no time"},
		{"time of unknown offset", strings.Replace(two, `01.000+01:00`, `01.000-00:00`, 1), 1, -1, "is no time"},
		{"thirteenth month", strings.Replace(three, `2026-12-01T09:30:01`, `2026-13-01T09:30:01`, 1), 1, -1, "is no time"},
		{"kind in capitals", next(one, "1", "Note", `{}`), 1, -1, "wanted a kind in lower case"},
		{"sixth key", next(one, "1", "note", `{},"x":1`), 1, -1, "wanted exactly }"},
		{"blank line", one + "\n" + two[at:], 1, at, "wanted exactly"},
		{"CR LF", strings.ReplaceAll(two, "\n", "\r\n"), 0, -1, "changes line ends"},
		{"byte-order mark", "\ufeff" + one, 0, 0, "wanted exactly"},
		{"first prev not zero", strings.Replace(two, "000000", "000001", 1), 0, 9, "is not 64 zeros"},
		{"second opened", next(one, "1", "opened", opened), 1, at, "a second record"},
		{"line after the seal", next(sealed, "2", "note", `{}`), 2, int64(len(sealed)), "after the seal"},
		{"first record not opened", strings.Replace(one, `"kind":"opened"`, `"kind":"note"`, 1), 0, 0, `wanted "opened"`},
		{"opened without id", first(strings.Replace(opened, "0f1e2d3c4b5a69788796a5b4c3d2e1f0", "", 1)), 0, -1, "is no log id"},
		{"opened in another mode", first(strings.Replace(opened, "site", "dream", 1)), 0, -1, `the mode is "dream"`},
		{"format damaged", first(strings.Replace(opened, "chargehand-log/1", "chargehand-lag/1", 1)) + "chargehand-log/1", 0, -1, "the format is"},
		{"middle changed", strings.Replace(three, `"text":"a"`, `"text":"c"`, 1), 1, at, "are not those that record 2 was chained to"},
		{"middle's own prev changed", strings.Replace(next(three, "3", "note", `{}`), two[at+9:at+73], strings.Repeat("1", 64), 1), 1, at + 9, "its prev is 111111111111"},
		{"last but one or last", strings.Replace(two, `"speed":1`, `"speed":2`, 1), 0, 0, "or record 1's own prev is wrong"},
		{"over-long line", body(`{"a":"` + strings.Repeat("x", chlog.MaxLine) + `"}`), 1, at + chlog.MaxLine, "longer than 4194304 bytes"},
		{"zeros at the end", two + strings.Repeat("\x00", 600), 2, int64(len(two) + 600), "the last line is not whole"},
	} {
		r := chlog.NewReader(strings.NewReader(c.log))
		var err error
		for err == nil {
			_, err = r.Next()
		}
		e, ok := errors.AsType[*chlog.DamageError](err)
		if !ok {
			t.Errorf("%s: Next = %v, want a DamageError", c.name, err)
			continue
		}
		if e.Record != c.record || e.Line != int(c.record)+1 || c.offset >= 0 && e.Offset != c.offset || !strings.Contains(e.What, c.what) {
			t.Errorf("%s: Next = %v, want record %d, byte %d, %q", c.name, err, c.record, c.offset, c.what)
		}
		if _, again := r.Next(); again != err {
			t.Errorf("%s: Next after the damage = %v, want the same error", c.name, again)
		}
	}
}

func manyKeys(n int) string {
	var b strings.Builder
	for i := range n {
		b.WriteString(`"k` + strings.Repeat("x", i) + `":1,`)
	}
	return strings.TrimSuffix(b.String(), ",")
}

func TestReaderTellsFormatsApart(t *testing.T) {
	for name, c := range map[string]struct {
		text string
		want any
	}{
		"empty":                      {"", &chlog.NotALogError{}},
		"blank line":                 {"\n", &chlog.NotALogError{}},
		"binary":                     {"\x89PNG\r\n\x1a\n\x00\x00", &chlog.NotALogError{}},
		"plain text":                 {"commissioned and fine\n", &chlog.NotALogError{}},
		"JSON of another kind":       {"{\"level\":\"info\"}\n", &chlog.NotALogError{}},
		"one line without an end":    {strings.Repeat("x", 20<<20), &chlog.NotALogError{}},
		"version 2":                  {first(strings.Replace(opened, "log/1", "log/2", 1)), &chlog.VersionError{}},
		"version 2 in another shape": {"{\"format\":\"chargehand-log/2\",\"chain\":\"sha3\"}\n", &chlog.VersionError{}},
		"version 2 without an end":   {"{\"format\":\"chargehand-log/2\",\"chain\":\"sha3\"}", &chlog.VersionError{}},
		"version zero":               {first(strings.Replace(opened, "log/1", "log/0", 1)), &chlog.DamageError{}},
		"first byte gone":            {first(opened)[1:], &chlog.DamageError{}},
		"torn first line":            {first(opened)[:100], &chlog.DamageError{}},
	} {
		_, err := chlog.NewReader(strings.NewReader(c.text)).Next()
		var ok bool
		switch c.want.(type) {
		case *chlog.NotALogError:
			_, ok = errors.AsType[*chlog.NotALogError](err)
		case *chlog.VersionError:
			_, ok = errors.AsType[*chlog.VersionError](err)
		case *chlog.DamageError:
			_, ok = errors.AsType[*chlog.DamageError](err)
		}
		if !ok {
			t.Errorf("%s: Next = %T %v, want %T", name, err, err, c.want)
		}
	}
}

// endless gives a line of a gigabyte without holding it.
type endless struct{ left int }

func (e *endless) Read(p []byte) (int, error) {
	if e.left == 0 {
		return 0, io.EOF
	}
	n := min(len(p), e.left)
	for i := range p[:n] {
		p[i] = 'x'
	}
	e.left -= n
	return n, nil
}

func TestReaderGivesUpOnALineOfAGigabyteEarly(t *testing.T) {
	tail := &endless{1 << 30}
	r := chlog.NewReader(io.MultiReader(strings.NewReader(first(opened)+`{"prev":"`), tail))
	if _, err := r.Next(); err != nil {
		t.Fatal(err)
	}
	_, err := r.Next()
	if e, ok := errors.AsType[*chlog.DamageError](err); !ok || e.Record != 1 || tail.left < 1<<30-8<<20 {
		t.Errorf("Next = %v after %d bytes, want damage in record 1 within 8 MiB", err, 1<<30-tail.left)
	}
}

// What the reader accepts, the writer would have written: the same bytes.
func FuzzReader(f *testing.F) {
	key := chlogtest.Key(f)
	f.Add(read(f, chlogtest.Sealed(f, record.RehearsalMode, key)))
	f.Add([]byte(next(first(opened), "1", "kind-of-2099", `{"a":[1.5e3,"\u00b5",{"b":null}]}`)))
	f.Add([]byte(first(strings.Replace(opened, "log/1", "log/2", 1))))
	f.Fuzz(func(t *testing.T, text []byte) {
		r := chlog.NewReader(bytes.NewReader(text))
		var back []byte
		for {
			l, err := r.Next()
			if err == io.EOF {
				break
			}
			if err != nil {
				return
			}
			line := chlog.Encode(l.Prev, l.Seq, l.At, l.Kind, l.Body)
			if own := text[r.Offset():r.End()]; !bytes.Equal(line, own) && !bytes.Contains(own, []byte(`Z","kind"`)) {
				t.Errorf("encoded again = %q, want %q", line, own)
			}
			back = append(back, text[r.Offset():r.End()]...)
			l.Decode()
		}
		if !bytes.Equal(back, text) {
			t.Errorf("the lines make %d bytes, want all %d", len(back), len(text))
		}
	})
}

// Verify says something of any file, and never more than it may: without a signature nothing passes.
func FuzzVerify(f *testing.F) {
	key := chlogtest.Key(f)
	path := chlogtest.Sealed(f, record.RehearsalMode, key)
	f.Add(read(f, path), read(f, path+".sig"))
	f.Fuzz(func(t *testing.T, log, signature []byte) {
		r := chlog.Verifier{Now: now}.VerifyReader(bytes.NewReader(log), signature)
		if r.Exit == 0 && (len(r.Signatures) != 1 || r.Signatures[0].State != chlog.Valid || !r.Sealed) {
			t.Errorf("Verify = %s without a seal and a valid signature", r)
		}
		if r.Sentence == "" || r.Rehearsal && !strings.HasPrefix(r.String(), "REHEARSAL") {
			t.Errorf("Verify = %q, want a sentence, with REHEARSAL first in a rehearsal", r)
		}
	})
}
