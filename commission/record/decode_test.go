package record_test

import (
	"encoding/json"
	"strings"
	"testing"

	"chargehand/commission/record"
)

func TestDecodeRefusesWhatPackageJSONWouldTakeForAnother(t *testing.T) {
	for _, c := range []struct{ name, kind, body, want string }{
		{"key in another case", "note", `{"Text":"a","corrects":null}`, `key "Text" differs from "text" in case`},
		{"key twice", "note", `{"text":"a","text":"b"}`, `key "text" stands twice`},
		{"unknown key twice in another case", "note", `{"text":"a","later":1,"LATER":2}`, `key "LATER" stands twice`},
		{"nested", "resumed", `{"program":"1","torn":{"bytes":1,"SHA256":"","kept_in":""}}`, `key "SHA256" differs from "sha256" in case`},
		{"inside a list", "capture", `{"id":"c1","signals":[{"Name":"bus-voltage"}]}`, `key "Name" differs from "name" in case`},
		{"long s", "capture", `{"ſignals":[]}`, `differs from "signals" in case`},
		{"inside an unknown field", "note", `{"text":"a","later":{"x":1,"x":2}}`, `key "x" stands twice`},
		{"not an object", "note", `[]`, "wanted an object"},
		{"wrong type", "note", `{"text":5}`, "cannot unmarshal number"},
		{"text after it", "note", `{"text":"a"}{}`, "text after the object"},
		{"cut", "note", `{"text":"a"`, "EOF"},
	} {
		_, err := record.Decode(c.kind, []byte(c.body))
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: Decode(%s, %s) = %v, want an error with %q", c.name, c.kind, c.body, err, c.want)
		}
	}
}

func TestDecodeKeepsWhatItDoesNotKnow(t *testing.T) {
	got, err := record.Decode("horoscope", []byte(`{"sign":"crab"}`))
	if other, ok := got.(record.Other); err != nil || !ok || other.Kind() != "horoscope" || string(other.JSON) != `{"sign":"crab"}` {
		t.Errorf("Decode of an unknown kind = %#v, %v, want it as it came", got, err)
	}
	got, err = record.Decode("note", []byte(`{"text":"a","corrects":3,"later":[1,{"x":2}]}`))
	if note, ok := got.(record.Note); err != nil || !ok || note.Text != "a" || note.Corrects == nil || *note.Corrects != 3 {
		t.Errorf("Decode of a note with an unknown field = %#v, %v, want the note", got, err)
	}
	got, err = record.Decode("finding", []byte(`{"id":"x","ID":1}`))
	if err == nil {
		t.Errorf("Decode of a finding with id and ID = %v, want an error", got)
	}
}

func TestDecodeReadsWhatMarshalWrites(t *testing.T) {
	why := "key forgotten"
	for _, body := range []record.Body{
		record.Opened{Format: record.Format, Log: strings.Repeat("0", 32), Mode: record.SiteMode, Disturb: []string{}},
		record.Reading{Point: "a", Raw: []uint16{7124}},
		record.Finding{JSON: json.RawMessage(`{"id":"precharge.energy"}`)},
		record.SignOff{Person: "p1", UnsignedBecause: &why},
		record.Resumed{Program: "1.0.0", Moved: &record.Moved{From: "a.chlog", Why: "disk full"}},
	} {
		first, err := json.Marshal(body)
		if err != nil {
			t.Fatal(err)
		}
		back, err := record.Decode(body.Kind(), first)
		if err != nil {
			t.Errorf("Decode(%s) = %v", first, err)
			continue
		}
		if second, _ := json.Marshal(back); string(second) != string(first) {
			t.Errorf("Marshal(Decode(%s)) = %s, want the same", first, second)
		}
	}
}
