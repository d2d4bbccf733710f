package report_test

import (
	"bytes"
	"encoding/json"
	"flag"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"chargehand/commission/chlog"
	"chargehand/commission/chlog/chlogtest"
	"chargehand/commission/finding"
	"chargehand/commission/record"
	"chargehand/commission/report"
)

var update = flag.Bool("update", false, "rewrite the golden files under testdata")

// rehearsal is a whole log that `chargehand rehearse --unattended` wrote, with its signature, nothing taken out. Its
// discharge is undecided, because the computer was too busy to sample it, and its punch list says so.
const rehearsal = "testdata/rehearsal.chlog"

func told(t testing.TB, path string) report.Story {
	t.Helper()
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	s, err := report.Read(f, chlog.Verifier{}.File(path))
	if err != nil {
		t.Fatalf("Read(%s) = %v", path, err)
	}
	return s
}

func textOf(t testing.TB, s report.Story) string {
	t.Helper()
	var b bytes.Buffer
	if err := s.WriteText(&b); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

func pdfOf(t testing.TB, s report.Story, paper report.Paper) []byte {
	t.Helper()
	var b bytes.Buffer
	if err := s.WritePDF(&b, paper); err != nil {
		t.Fatalf("WritePDF = %v", err)
	}
	return b.Bytes()
}

// TestTextOfARehearsal compares everything but the points, whose texts are the walk's own and tested with it.
func TestTextOfARehearsal(t *testing.T) {
	text := textOf(t, told(t, rehearsal))
	begin, end := strings.Index(text, "\nSTAGE 1:"), strings.Index(text, "\nDEVIATIONS,")
	if begin < 0 || end < begin {
		t.Fatalf("the text has no stages, or no deviations after them:\n%s", text)
	}
	var got strings.Builder
	for line := range strings.Lines(text[:begin] + text[end:]) {
		if !strings.HasPrefix(line, "points: ") {
			got.WriteString(line)
		}
	}
	const golden = "testdata/rehearsal.txt"
	if *update {
		if err := os.WriteFile(golden, []byte(got.String()), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(golden)
	if err != nil {
		t.Fatal(err)
	}
	gotLines, wantLines := strings.Split(got.String(), "\n"), strings.Split(string(want), "\n")
	for i := range min(len(gotLines), len(wantLines)) {
		if gotLines[i] != wantLines[i] {
			t.Fatalf("%s, line %d: got\n%s\nwant\n%s", golden, i+1, gotLines[i], wantLines[i])
		}
	}
	if len(gotLines) != len(wantLines) {
		t.Errorf("%s: got %d lines, want %d", golden, len(gotLines), len(wantLines))
	}
}

// TestEveryRecordIsTold holds the text against the log's own lines.
func TestEveryRecordIsTold(t *testing.T) {
	text := strings.Join(strings.Fields(textOf(t, told(t, rehearsal))), " ")
	for _, line := range linesOf(t, rehearsal) {
		body, err := line.Decode()
		if err != nil {
			t.Fatal(err)
		}
		want := ""
		switch b := body.(type) {
		case record.Opened:
			want = "id " + b.Log
		case record.File:
			want = b.SHA256
		case record.Person:
			want = b.Name + ", " + b.Role
		case record.Instrument:
			want = "serial " + b.Serial
		case record.Reading, record.SignOff, record.Hastened, record.Attempt, record.Link, record.Note, record.Finding:
			want = fmt.Sprintf("record %d", line.Seq)
		case record.Point:
			want = b.ID + ": " + b.Result
		case record.Punch:
			want = "punch item " + b.ID
		case record.Setting:
			want = "setting " + b.Name
		case record.Capture:
			want = "capture " + b.ID
		case record.Stage:
			want = strings.ToUpper(b.Stage)
		case record.Seal:
			want = fmt.Sprintf("seal: record %d", line.Seq)
		default:
			t.Fatalf("record %d is a %s: say here how it is told", line.Seq, line.Kind)
		}
		if !strings.Contains(text, want) {
			t.Errorf("text of %s: %q of record %d is not in it", rehearsal, want, line.Seq)
		}
	}
}

func linesOf(t testing.TB, path string) []chlog.Line {
	t.Helper()
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	var lines []chlog.Line
	for r := chlog.NewReader(f); ; {
		line, err := r.Next()
		if err != nil {
			return lines
		}
		lines = append(lines, line)
	}
}

func TestSameLogSameBytes(t *testing.T) {
	for _, paper := range []report.Paper{report.A4, report.Letter} {
		first, second := pdfOf(t, told(t, rehearsal), paper), pdfOf(t, told(t, rehearsal), paper)
		if !bytes.Equal(first, second) {
			t.Errorf("WritePDF(%s) twice gives %d and %d bytes that differ, want the same", paper, len(first), len(second))
		}
		if !bytes.HasPrefix(first, []byte("%PDF-")) {
			t.Errorf("WritePDF(%s) begins with %q, want %%PDF-", paper, first[:8])
		}
	}
	if err := told(t, rehearsal).WritePDF(&bytes.Buffer{}, "a3"); err == nil {
		t.Error("WritePDF on a3 = nil, want an error that names the papers there are")
	}
}

func TestJSONHoldsTheStory(t *testing.T) {
	s := told(t, rehearsal)
	var b bytes.Buffer
	if err := s.WriteJSON(&b); err != nil {
		t.Fatal(err)
	}
	if strings.Count(b.String(), "\n") != 1 {
		t.Errorf("WriteJSON writes %d lines, want 1", strings.Count(b.String(), "\n"))
	}
	var back struct {
		Format   string
		Verdict  finding.Verdict
		Log      report.Log
		Desk     []report.Finding
		Measured []report.Finding
		Captures []report.Capture
	}
	if err := json.Unmarshal(b.Bytes(), &back); err != nil {
		t.Fatal(err)
	}
	if back.Format != report.Format || back.Verdict != finding.Fail || back.Log.Records != 339 {
		t.Errorf("JSON = format %q, verdict %q, %d records, want %q, fail, 339", back.Format, back.Verdict, back.Log.Records, report.Format)
	}
	if len(back.Desk) != len(s.Desk) || len(back.Measured) != 9 || len(back.Captures) != 3 {
		t.Errorf("JSON has %d desk and %d measured findings, %d captures, want %d, 9, 3", len(back.Desk), len(back.Measured), len(back.Captures), len(s.Desk))
	}
}

func TestMarks(t *testing.T) {
	whole, err := os.ReadFile(rehearsal)
	if err != nil {
		t.Fatal(err)
	}
	signature, err := os.ReadFile(rehearsal + ".sig")
	if err != nil {
		t.Fatal(err)
	}
	seal := bytes.LastIndexByte(whole[:len(whole)-1], '\n') + 1
	changed := bytes.Replace(whole, []byte(`"value":96.15`), []byte(`"value":99.15`), 1)
	site := bytes.Replace(whole, []byte("technician"), []byte("Technician"), 1)
	for _, c := range []struct {
		name  string
		log   []byte
		marks []report.Mark
		words string
	}{
		{"as written", whole, []report.Mark{report.Rehearsal}, "consistent"},
		{"seal cut off", whole[:seal], []report.Mark{report.Rehearsal, report.Broken}, "does not hold"},
		{"cut inside a line", whole[:len(whole)/2], []report.Mark{report.Rehearsal, report.Unsealed}, "not whole"},
		{"a value changed", changed, []report.Mark{report.Rehearsal, report.Broken}, "first wrong byte"},
		{"a name changed", site, []report.Mark{report.Rehearsal, report.Broken}, "first wrong byte"},
	} {
		path := filepath.Join(t.TempDir(), "rehearsal.chlog")
		write(t, path, c.log)
		write(t, path+".sig", signature)
		s := told(t, path)
		if !slices.Equal(s.Marks, c.marks) || !strings.Contains(s.Verification.Sentence, c.words) {
			t.Errorf("%s: marks %v, %q, want %v and %q", c.name, s.Marks, s.Verification.Sentence, c.marks, c.words)
		}
		text := textOf(t, s)
		for _, m := range c.marks {
			if !strings.Contains(text[:200], string(m)) {
				t.Errorf("%s: the text begins %q, want %s in it", c.name, text[:200], m)
			}
		}
		if len(pdfOf(t, s, report.A4)) < 10000 {
			t.Errorf("%s: the PDF is too small to hold the pages", c.name)
		}
	}
}

func write(t testing.TB, path string, text []byte) {
	t.Helper()
	if err := os.WriteFile(path, text, 0o644); err != nil {
		t.Fatal(err)
	}
}

func TestReadRefusesAnotherLogThanTheVerifiedOne(t *testing.T) {
	v := chlog.Verifier{}.File(rehearsal)
	other := chlogtest.Sealed(t, record.SiteMode, chlogtest.Key(t))
	f, err := os.Open(other)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	if _, err := report.Read(f, v); err == nil || !strings.Contains(err.Error(), "changed while it was read") {
		t.Errorf("Read of another log = %v, want that it changed", err)
	}
	if _, err := report.Read(strings.NewReader("hello\n"), v); err == nil || !strings.Contains(err.Error(), "not a chargehand log") {
		t.Errorf("Read of no log = %v, want that it is none", err)
	}
}

func TestHostileTexts(t *testing.T) {
	for _, c := range []struct{ name, text, shown string }{
		{"300 letters", strings.Repeat("Wagtail", 43), strings.Repeat("Wagtail", 43)[:40]},
		{"300 letters that the fonts lack", strings.Repeat("渡船", 150), "渡船"},
		{"right to left", "דפנה בן־ארי", "דפנה"},
		{"turned direction", "A\u202Exe.fdp", "A⟨U+202E⟩xe.fdp"},
		{"beyond the basic plane", "A\U0001F6A2B", "A\U0001F6A2B"},
		{"an escape of its own", "⟨U+202E⟩", "⟨U+27E8⟩U+202E⟨U+27E9⟩"},
		{"joiners", "a\u200db\ufeffc", "a⟨U+200D⟩b⟨U+FEFF⟩c"},
		{"PDF syntax", `(\) Tj ET {nb} <</Type`, `(\) Tj ET {nb} <</Type`},
		{"empty", "", ""},
	} {
		key := chlogtest.Key(t)
		w := chlogtest.Begin(t, record.SiteMode, key)
		chlogtest.Append(t, w,
			record.Person{ID: "p2", Name: c.text, Role: c.text, Organisation: c.text},
			record.Instrument{ID: "i1", Name: c.text, Serial: c.text, Calibrated: c.text, Due: c.text},
			record.Note{Text: c.text},
			record.Punch{ID: "k1", What: c.text, Severity: "A", Owner: c.text, Due: c.text, Event: "raised"},
			record.Reading{Point: c.text, Signal: c.text, Source: record.Observed, Quality: "good", Text: c.text, Raw: []uint16{}},
			record.Point{ID: c.text, Result: c.text, Readings: []int64{}, Note: c.text},
			record.Deviation{Point: c.text, Reason: c.text, AcceptedBy: "p2"},
			record.Link{Event: c.text, Peer: c.text, Why: c.text},
			record.Capture{ID: c.text, Part: 1, Parts: 1, Stage: c.text, What: c.text, T0: c.text, Signals: []record.CaptureSignal{}, Samples: []json.RawMessage{}, Gaps: []json.RawMessage{}},
			record.Stage{Stage: c.text, Event: c.text, Invalidates: []int64{}})
		if err := w.Close(); err != nil {
			t.Fatal(err)
		}
		s := told(t, w.Path())
		text := textOf(t, s)
		if !strings.Contains(strings.ReplaceAll(text, "\n", ""), c.shown) {
			t.Errorf("%s: the text lacks %q", c.name, c.shown)
		}
		for _, r := range text {
			if r != '\n' && (r < ' ' || r >= 0x7F && r < 0xA0 || r == 0x202E || r == 0x200D || r == 0xFEFF) {
				t.Errorf("%s: the text holds %U, want it shown by its number", c.name, r)
			}
		}
		pdfOf(t, s, report.A4)
		var b bytes.Buffer
		if err := s.WriteJSON(&b); err != nil || !json.Valid(b.Bytes()) || strings.ContainsAny(b.String(), "\u202e\u200d") {
			t.Errorf("%s: WriteJSON = %v, want JSON without characters that a terminal obeys", c.name, err)
		}
		for _, table := range s.Tables() {
			if filepath.Base(table.Name) != table.Name || strings.Trim(table.Name, "abcdefghijklmnopqrstuvwxyz0123456789-.") != "" {
				t.Errorf("%s: a table is named %q, want a plain file name", c.name, table.Name)
			}
		}
	}
}

// logOf makes a log with n captures of a pre-charge, of at most so many samples, on the site and findings of the rehearsal.
func logOf(t testing.TB, n, samples int) string {
	t.Helper()
	w, err := chlog.Create(chlog.Disk{}, filepath.Join(t.TempDir(), "many.chlog"), chlogtest.Opened(record.SiteMode),
		chlog.Options{Now: chlogtest.Clock(), Program: "1.0.0"})
	if err != nil {
		t.Fatal(err)
	}
	var taken record.Capture
	for _, line := range linesOf(t, rehearsal) {
		body, err := line.Decode()
		if err != nil {
			t.Fatal(err)
		}
		switch b := body.(type) {
		case record.File, record.Finding:
			if f, ok := b.(record.Finding); ok && bytes.Contains(f.JSON, []byte(`"measured.`)) {
				continue
			}
			chlogtest.Append(t, w, b)
		case record.Capture:
			if b.What == "precharge" {
				taken = b
			}
		}
	}
	taken.Samples = taken.Samples[:min(samples, len(taken.Samples))]
	for i := range n {
		taken.ID, taken.Attempt = fmt.Sprintf("c%d", i+1), i+1
		chlogtest.Append(t, w, taken)
	}
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	return w.Path()
}

func TestManyCapturesAndNone(t *testing.T) {
	for _, n := range []int{0, 200} {
		s := told(t, logOf(t, n, 80))
		if len(s.Captures) != n || len(s.Tables()) != n+4 {
			t.Errorf("a log of %d captures tells %d with %d tables, want all and 4 more", n, len(s.Captures), len(s.Tables()))
		}
		pdf := pdfOf(t, s, report.A4)
		pages := bytes.Count(pdf, []byte("/Type /Page\n"))
		if pages < 10 || pages < n/2 {
			t.Errorf("a log of %d captures makes %d pages, want at least 10, and one for two captures", n, pages)
		}
		if text := textOf(t, s); strings.Count(text, "\ncapture c") != n {
			t.Errorf("the text of %d captures names %d", n, strings.Count(text, "\ncapture c"))
		}
	}
}

func TestEmptyOfEverything(t *testing.T) {
	w, err := chlog.Create(chlog.Disk{}, filepath.Join(t.TempDir(), "new.chlog"), chlogtest.Opened(record.SiteMode), chlogtest.Options())
	if err != nil {
		t.Fatal(err)
	}
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	s := told(t, w.Path())
	if s.Verdict != finding.Undecided || !slices.Equal(s.Marks, []report.Mark{report.Unsealed}) {
		t.Errorf("a log of one line comes to %s with marks %v, want undecided and UNSEALED", s.Verdict, s.Marks)
	}
	if text := textOf(t, s); !strings.Contains(text, "points are still open") {
		t.Errorf("the text of a log of one line does not say that points are open:\n%s", text[:400])
	}
	pdfOf(t, s, report.Letter)
}

// A sealed log whose seal says more than its records must say so.
func TestSealAgainstRecords(t *testing.T) {
	s := told(t, chlogtest.Sealed(t, record.SiteMode, chlogtest.Key(t)))
	if s.Verdict != finding.Pass || len(s.Because) == 0 || !strings.Contains(s.Because[0], "the seal says pass; the records by themselves come to") {
		t.Errorf("a seal of pass under an unfinished walk gives %s because %q, want pass with the contradiction", s.Verdict, s.Because)
	}
}

// TestCorrectionAndRevision follows what a log takes back: a reading, a result, a site file.
func TestCorrectionAndRevision(t *testing.T) {
	var site record.File
	for _, line := range linesOf(t, rehearsal) {
		if body, _ := line.Decode(); line.Kind == "file" && body.(record.File).Role == "site" {
			site = body.(record.File)
		}
	}
	key := chlogtest.Key(t)
	w := chlogtest.Begin(t, record.SiteMode, key)
	value, wrong := 100.0, int64(3)
	revised := site
	revised.Text = strings.Replace(site.Text, `"100 Ω ±5 %"`, `"110 Ω ±5 %"`, 1)
	if revised.Text == site.Text {
		t.Fatal("the site of the rehearsal has no resistance of 100 Ω")
	}
	revised.SHA256, revised.Replaces, revised.Why = strings.Repeat("1", 64), &site.SHA256, "nameplate"
	chlogtest.Append(t, w, site,
		record.Reading{Point: "dead.resistor", Signal: "pre-charge resistance", Value: &value, Unit: "Ω", Source: record.FromInstrument, Quality: "good", Raw: []uint16{}, Paper: true},
		record.Point{ID: "dead.resistor", Result: "pass", Readings: []int64{3}},
		record.Note{Text: "it was 110 Ω", Corrects: &wrong},
		revised,
		record.Stage{Stage: "Dead checks", Event: record.Reopened, Invalidates: []int64{4}},
		record.Point{ID: "dead.resistor", Result: "fail", Readings: []int64{}, Note: "wrong resistor"},
		record.Deviation{Point: "dead.resistor", Reason: "will be changed", AcceptedBy: "p1"})
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	text := strings.Join(strings.Fields(textOf(t, told(t, w.Path()))), " ")
	for _, want := range []string{"CHANGED, as left 110 Ω ±5 %", "from paper", "corrected by record 5: it was 110 Ω", "earlier: pass, record 4", "dead.resistor: fail",
		"reopened 1 times", "deviation: will be changed (accepted by p1)", "deviation at dead.resistor: will be changed; accepted by A. Example, technician"} {
		if !strings.Contains(text, want) {
			t.Errorf("the text lacks %q", want)
		}
	}
}

func BenchmarkReport(b *testing.B) {
	day := logOf(b, 20, 1000) // a long day: twenty charges
	for b.Loop() {
		s := told(b, day)
		pdfOf(b, s, report.A4)
	}
}
