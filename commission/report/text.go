package report

import (
	"fmt"
	"io"
	"strings"
	"unicode/utf8"
)

// textWidth is the length of a line: what a mail shows without breaking it.
const textWidth = 96

// WriteText writes the report for a mail or a screen reader: every line says what it is about, nothing is drawn, and the
// order is that of the pages.
func (s Story) WriteText(w io.Writer) error {
	t := &text{}
	t.summary(s)
	t.measured(s)
	t.section("Findings on paper")
	for _, f := range s.Desk {
		t.finding(f)
	}
	t.points(s)
	t.open(s)
	t.plates(s)
	t.events(s)
	t.people(s)
	t.proof(s)
	_, err := io.WriteString(w, t.b.String())
	return err
}

// text is a report in lines.
type text struct{ b strings.Builder }

// line writes a line with an indent; longer ones are broken at blanks and carried on two columns further in.
func (t *text) line(indent int, format string, args ...any) {
	rest := clean(fmt.Sprintf(format, args...), anyRune)
	pad := strings.Repeat(" ", indent)
	for {
		if utf8.RuneCountInString(rest) <= textWidth-len(pad) {
			t.b.WriteString(strings.TrimRight(pad+rest, " ") + "\n")
			return
		}
		cut := breakAt(rest, textWidth-len(pad))
		t.b.WriteString(pad + strings.TrimRight(rest[:cut], " ") + "\n")
		rest = strings.TrimLeft(rest[cut:], " ")
		pad = strings.Repeat(" ", indent+2)
	}
}

// breakAt is the byte before which a text is broken so that at most so many letters stand on the line: behind a blank where
// there is one in reach.
func breakAt(text string, most int) int {
	count, last, end := 0, 0, len(text)
	for i, r := range text {
		if count == most {
			end = i
			break
		}
		count++
		if r == ' ' {
			last = i + 1
		}
	}
	if last > most/3 {
		return last
	}
	return end
}

func (t *text) section(title string) {
	t.b.WriteString("\n")
	t.line(0, "%s", strings.ToUpper(title))
}

func (t *text) summary(s Story) {
	for _, m := range s.Marks {
		t.line(0, "%s", m)
	}
	t.line(0, "Commissioning report: %s", s.heading())
	if s.Site.Location != "" {
		t.line(0, "location: %s", s.Site.Location)
	}
	if s.isBroken() {
		t.line(0, "verdict: none, this log cannot be relied on")
	} else {
		t.line(0, "verdict: %s", s.Verdict)
	}
	t.line(0, "log: %s", s.Verification.Sentence)
	for _, n := range s.Verification.Notes {
		t.line(2, "%s", n)
	}
	for _, why := range s.Because {
		t.line(2, "attention: %s", why)
	}
	t.line(0, "begun: %s, last record: %s", clockWords(s.Log.Begun), clockWords(s.Log.Ended))
	t.line(0, "device: %s; program: chargehand %s", s.Log.Device, s.Log.Program)
	if len(s.Log.Disturb) > 0 {
		t.line(0, "disturbed by: %s", strings.Join(s.Log.Disturb, ", "))
	}
	t.line(0, "findings: %s measured; %s on paper", countFindings(s.Measured), countFindings(s.Desk))
	t.line(0, "points: %s", s.countPoints())
	t.line(0, "open punch items: %d; deviations: %d", s.openPunches(), len(s.Deviations))
	t.line(0, "log file: %s, id %s, %d records", s.Log.File, s.Log.ID, s.Log.Records)
	t.line(0, "SHA-256 of the file: %s", s.Log.SHA256)
	t.line(0, "SHA-256 of the last record: %s", s.Log.Head)
}

func (t *text) measured(s Story) {
	t.section("Measured against predicted")
	for _, c := range s.Captures {
		t.line(0, "capture %s: %s, %s; record %d, begins %s, %d samples, %d gaps", c.ID, c.What, c.Stage, c.Seq, clockWords(c.T0), c.Samples, c.Gaps)
		if c.Problem != "" {
			t.line(2, "its samples cannot be read: %s", c.Problem)
		}
	}
	if len(s.Captures) == 0 {
		t.line(0, "no capture")
	}
	for _, f := range s.Measured {
		t.finding(f)
	}
}

func (t *text) finding(f Finding) {
	n := figuresOf(f.Finding)
	words := fmt.Sprintf("%s: %s; value %s", named(f.Finding), f.Finding.Verdict, n.value)
	if f.Finding.Limit.IsGiven() {
		words += "; limit " + n.limit
	}
	if n.margin != "" {
		words += "; margin " + n.margin
	}
	if f.Superseded {
		words += "; judged anew later"
	}
	t.line(0, "%s", words)
	t.line(4, "%s (record %d)", f.Finding.Title, f.Seq)
	for _, l := range below(f.Finding) {
		t.line(4, "%s", l.text)
	}
}

func (t *text) points(s Story) {
	for _, stage := range s.Stages {
		t.section(fmt.Sprintf("Stage %d: %s", stage.Number, stage.Title))
		if words := stageWords(stage); words != "" {
			t.line(0, "%s", words)
		}
		for _, p := range stage.Points {
			t.point(p)
		}
	}
}

func (t *text) point(p Point) {
	words := fmt.Sprintf("%s: %s; %s, %s", p.ID, p.Result, p.Kind, p.Title)
	if p.At != "" {
		words += "; " + clockWords(p.At)
	}
	t.line(0, "%s", words)
	for _, r := range p.Readings {
		t.line(4, "reading: %s; %s", readingLine(r), readingSource(r, clockWords))
	}
	for _, k := range p.Signatures {
		words := fmt.Sprintf("signed: %s, %s; %s, record %d, %s", k.Name, k.Role, k.State, k.Record, clockWords(k.At))
		if k.Why != "" {
			words += "; " + k.Why
		}
		t.line(4, "%s", words)
	}
	for _, l := range pointNotes(p, clockWords) {
		t.line(4, "%s", l.text)
	}
}

func (t *text) open(s Story) {
	t.section("Deviations, punch list, notes")
	for _, e := range s.Deviations {
		t.line(0, "deviation at %s: %s; accepted by %s, record %d, %s", e.Body.Point, e.Body.Reason, s.person(e.Body.AcceptedBy), e.Seq, clockWords(e.At))
	}
	for _, k := range s.Punches {
		state := "open"
		if !k.IsOpen() {
			state = "cleared " + clockWords(k.Cleared)
		}
		t.line(0, "punch item %s: %s; class %s, owner %s, due %s; %s", k.Body.ID, k.Body.What, k.Body.Severity, k.Body.Owner, k.Body.Due, state)
	}
	for _, e := range s.Notes {
		words := e.Body.Text
		if e.Body.Corrects != nil {
			words += fmt.Sprintf(" (corrects record %d)", *e.Body.Corrects)
		}
		t.line(0, "note, record %d, %s: %s", e.Seq, clockWords(e.At), words)
	}
	if len(s.Deviations)+len(s.Punches)+len(s.Notes) == 0 {
		t.line(0, "none")
	}
}

func (t *text) plates(s Story) {
	t.section("Site and nameplates, as found and as left")
	for _, f := range s.Files {
		t.line(0, "%s file %s: SHA-256 %s, record %d", f.Body.Role, f.Body.Name, f.Body.SHA256, f.Seq)
	}
	for _, p := range s.Site.Plates {
		left := "as left the same"
		if p.AsLeft != p.AsFound {
			left = "CHANGED, as left " + orAbsent(p.AsLeft)
		}
		t.line(0, "%s, %s: as found %s; %s", p.Group, p.What, orAbsent(p.AsFound), left)
	}
	for _, e := range s.Settings {
		t.line(0, "setting %s: as found %s; as left %s", e.Name, settingWords(e.AsFound, e.FoundRaw, e.Unit), settingWords(e.AsLeft, e.LeftRaw, e.Unit))
	}
}

func (t *text) events(s Story) {
	t.section("Link, attempts and other events")
	rows := s.eventRows()
	for _, r := range rows {
		t.line(0, "%s, record %d, %s: %s", r.Body[0], r.Seq, clockWords(r.At), r.Body[1])
	}
	if len(rows) == 0 {
		t.line(0, "none")
	}
}

func (t *text) people(s Story) {
	t.section("People, instruments, signatures")
	for _, p := range s.People {
		key := "no key"
		if p.Key != nil {
			key = "key " + *p.Key
		}
		t.line(0, "%s: %s, %s, %s; %s", p.ID, p.Name, p.Role, orAbsent(p.Organisation), key)
	}
	for _, i := range s.Instruments {
		t.line(0, "%s: %s, serial %s, calibrated %s, due %s, accuracy %s", i.ID, i.Name, orAbsent(i.Serial), orAbsent(i.Calibrated), orAbsent(i.Due), accuracyWords(i.Accuracy))
	}
	for _, k := range s.Verification.Statements {
		if k.Act == "seal" {
			t.line(0, "seal: record %d, %s, claimed %s; key %s; %s", k.Record, who(k.Name, k.Role, k.Principal), clockWords(k.At), orAbsent(k.Key),
				joined(signatureWords(s.Verification, string(k.State)), k.Why))
		}
	}
	for _, k := range s.Verification.Signatures {
		t.line(0, "signature of the whole file: %s, %s; key %s; %s", k.File, who(k.Name, k.Role, k.Principal), orAbsent(k.Key),
			joined(signatureWords(s.Verification, string(k.State)), k.Why))
	}
}

func (t *text) proof(s Story) {
	t.section("How to check the log without this program")
	for _, step := range s.proofSteps() {
		t.line(0, "%s", step.words)
		for _, c := range step.commands {
			t.b.WriteString("  " + c.where + ":  " + clean(c.text, anyRune) + "\n") // never broken: it is to be copied
		}
	}
}
