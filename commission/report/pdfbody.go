package report

import (
	"fmt"
	"strconv"
	"strings"

	"chargehand/commission/finding"
	"chargehand/commission/record"
)

const plotHeight = 66.0

// comparison is what was measured against what was predicted: plots, then the findings.
func (d document) comparison() {
	s := d.story
	if len(s.Captures) > 0 {
		d.need(plotHeight + 86) // the first plot stands under the title
	}
	d.title("Measured against predicted")
	if len(s.Captures) == 0 {
		d.paragraph(regular, 9, ink, "The log holds no capture.")
	}
	for _, c := range s.Captures {
		d.captureHead(c)
		for _, p := range s.plotsOf(c) {
			d.drawPlot(p, plotHeight)
		}
	}
	for _, p := range []Plot{s.windowPlot(), s.sharePlot()} {
		d.drawPlot(p, plotHeight)
	}
	if len(s.Measured) == 0 {
		return
	}
	d.subtitle("Measured findings")
	d.findings(s.Measured)
}

func (d document) captureHead(c Capture) {
	d.need(plotHeight + 70) // it stands on the page of its plot
	d.subtitle(fmt.Sprintf("Capture %s: %s, %s", c.ID, c.What, c.Stage))
	words := fmt.Sprintf("record %d; begins %s; %d samples, %d gaps; %s", c.Seq, clockWords(c.T0), c.Samples, c.Gaps, strings.Join(c.Signals, ", "))
	if c.Problem != "" {
		words = fmt.Sprintf("record %d; its samples cannot be read: %s", c.Seq, c.Problem)
	}
	d.paragraph(regular, 7.2, quiet, words)
	d.gap(2)
}

func (d document) deskFindings() {
	d.title("Findings on paper")
	if len(d.story.Desk) == 0 {
		d.paragraph(regular, 9, ink, "The log holds no desk finding.")
		return
	}
	d.paragraph(regular, 8, quiet, "Calculated from the site file over all corners of its tolerances: nominal (least … greatest). Limits include their edges; the margin is that of the worst corner.")
	d.gap(1.5)
	d.findings(d.story.Desk)
}

func (d document) findings(all []Finding) {
	t := d.table(column{"finding", 5, regular, false}, column{"value", 4.4, regular, false}, column{"limit", 2.8, regular, false},
		column{"margin", 1.8, regular, false}, column{"verdict", 1.9, regular, false})
	for _, f := range all {
		n := figuresOf(f.Finding)
		verdict := coloured(string(f.Finding.Verdict), verdictLook(string(f.Finding.Verdict)))
		if f.Superseded {
			verdict = verdict.under("judged anew later")
		}
		title := styled{fmt.Sprintf("%s · record %d", f.Finding.Title, f.Seq), regular, 7, ink}
		t.row([]cell{strong(named(f.Finding)), plain(n.value), plain(n.limit), plain(n.margin), verdict}, append([]styled{title}, below(f.Finding)...)...)
	}
	d.gap(2)
}

// below are the small lines under a finding: why, parts, causes, basis, remedy.
func below(f finding.Finding) []styled {
	lines := note("", strings.Join(f.Because, "; "))
	var parts []string
	for _, p := range f.Parts {
		parts = append(parts, p.Name+" "+spread(p.Value, p.Unit, 4, finding.Finite))
	}
	lines = append(lines, note("with: ", strings.Join(parts, "; "))...)
	for i, c := range f.Cause {
		lines = append(lines, note(fmt.Sprintf("cause %d: ", i+1), causeWords(c))...)
	}
	lines = append(lines, note("basis: ", f.Basis)...)
	return append(lines, note("remedy: ", f.Remedy)...)
}

func causeWords(c finding.Cause) string {
	words := fmt.Sprintf("%s (score %.2f)", c.ID, c.Score)
	if len(c.Evidence) > 0 {
		words += ", because " + strings.Join(c.Evidence, "; ")
	}
	if c.Confirm != "" {
		words += "; to confirm: " + c.Confirm
	}
	return words
}

func (d document) points() {
	d.need(75) // the title does not stand alone
	d.title("Points of the walk")
	for _, stage := range d.story.Stages {
		heading := stage.Title
		if stage.Number > 0 {
			heading = fmt.Sprintf("%d  %s", stage.Number, stage.Title)
		}
		d.need(45)
		d.subtitle(heading)
		d.bookmark(heading, 1)
		if words := stageWords(stage); words != "" {
			d.paragraph(regular, 7.2, quiet, words)
			d.gap(1)
		}
		t := d.table(column{"point", 4.2, regular, false}, column{"readings: value, source, time", 6.4, regular, false},
			column{"result", 2.9, regular, false}, column{"signed", 3.4, regular, false})
		for _, p := range stage.Points {
			t.row([]cell{pointCell(p), d.readingsCell(p), d.resultCell(p), d.signedCell(p)}, pointNotes(p, d.clock)...)
		}
	}
}

func stageWords(s Stage) string {
	var words []string
	for _, e := range s.Events {
		words = append(words, e.Body+" "+clockWords(e.At))
	}
	return strings.Join(words, "; ")
}

func pointCell(p Point) cell {
	kind := p.Kind
	if kind == "" {
		kind = "point"
	}
	return strong(p.ID).under(p.Title).under(kind)
}

func (d document) readingsCell(p Point) cell {
	var c cell
	for _, r := range p.Readings {
		c.lines = append(c.lines, styled{readingLine(r), regular, 7, ink})
		c = c.under(readingSource(r, d.clock))
	}
	if len(p.Readings) == 0 {
		c = c.under("no reading")
	}
	return c
}

// readingLine is what was read: its name and value, or the words that were entered.
func readingLine(r Reading) string {
	if r.Body.Value == nil && r.Body.Text != "" {
		return r.Body.Text
	}
	return r.Body.Signal + " = " + readingWords(r.Body)
}

func readingSource(r Reading, clock func(string) string) string {
	words := fmt.Sprintf("%s, record %d, %s", sourceWords(r), r.Seq, clock(r.At))
	if r.Corrected != "" {
		words += "; " + r.Corrected
	}
	return words
}

func (d document) resultCell(p Point) cell {
	c := coloured(strings.ReplaceAll(p.Result, "-", " "), verdictLook(p.Result))
	if p.Seq != nil {
		c = c.under(d.clock(p.At)).under("record " + strconv.FormatInt(*p.Seq, 10))
	}
	return c
}

func (d document) signedCell(p Point) cell {
	var c cell
	for _, k := range p.Signatures {
		c.lines = append(c.lines, styled{clipped(k.Name+", "+k.Role, 200), regular, 7, ink})
		words := k.State
		if k.Why != "" {
			words += ": " + k.Why
		}
		c = c.under(fmt.Sprintf("%s, record %d, %s", words, k.Record, d.clock(k.At)))
	}
	if len(p.Signatures) == 0 {
		word := "not signed"
		if p.Kind == "check" {
			word = "–"
		}
		c = c.under(word)
	}
	return c
}

func pointNotes(p Point, clock func(string) string) []styled {
	lines := note("note: ", p.Note)
	if p.Deviation != nil {
		lines = append(lines, note("deviation: ", fmt.Sprintf("%s (accepted by %s)", p.Deviation.Reason, p.Deviation.AcceptedBy))...)
	}
	if p.Reopened > 0 {
		lines = append(lines, note("", fmt.Sprintf("reopened %d times", p.Reopened))...)
	}
	for _, e := range p.Earlier {
		lines = append(lines, note("earlier: ", fmt.Sprintf("%s, record %d, %s", e.Body, e.Seq, clock(e.At)))...)
	}
	if p.Expect != "" {
		lines = append(lines, note("expected: ", p.Expect)...)
	}
	return lines
}

func (d document) openItems() {
	s := d.story
	d.title("Deviations, punch list, notes")
	d.subtitle("Deviations")
	if len(s.Deviations) == 0 {
		d.paragraph(regular, 8.4, ink, "None.")
	} else {
		t := d.table(column{"record", 2, regular, false}, column{"point", 2.4, regular, false}, column{"reason", 6, regular, false}, column{"accepted by", 2.6, regular, false})
		for _, e := range s.Deviations {
			t.row([]cell{d.recordCell(e.Seq, e.At), plain(e.Body.Point), plain(e.Body.Reason), plain(s.person(e.Body.AcceptedBy))})
		}
	}
	d.subtitle("Punch list")
	if len(s.Punches) == 0 {
		d.paragraph(regular, 8.4, ink, "Empty.")
	} else {
		t := d.table(column{"item", 1, regular, false}, column{"what", 6.4, regular, false}, column{"class", 0.9, regular, false}, column{"owner", 2, regular, false},
			column{"due", 2, regular, false}, column{"state", 2.4, regular, false})
		for _, k := range s.Punches {
			state := coloured("open", verdictLook("fail"))
			if !k.IsOpen() {
				state = plain("cleared " + d.clock(k.Cleared))
			}
			t.row([]cell{strong(k.Body.ID).under(fmt.Sprintf("record %d", k.Seq)), plain(k.Body.What).under("raised " + d.clock(k.Raised)),
				plain(k.Body.Severity), plain(k.Body.Owner), plain(k.Body.Due), state})
		}
	}
	d.subtitle("Notes")
	if len(s.Notes) == 0 {
		d.paragraph(regular, 8.4, ink, "None.")
		return
	}
	t := d.table(column{"record", 2, regular, false}, column{"note", 9, regular, false})
	for _, e := range s.Notes {
		text := plain(e.Body.Text)
		if e.Body.Corrects != nil {
			text = text.under(fmt.Sprintf("corrects record %d", *e.Body.Corrects))
		}
		t.row([]cell{d.recordCell(e.Seq, e.At), text})
	}
}

func (d document) recordCell(seq int64, at string) cell {
	return strong(strconv.FormatInt(seq, 10)).under(d.clock(at))
}

// person is a person's name and role by id, or the id where no record enters it.
func (s Story) person(id string) string {
	for _, p := range s.People {
		if p.ID == id {
			return p.Name + ", " + p.Role
		}
	}
	return id
}

func (d document) plates() {
	s := d.story
	d.title("Site and nameplates, as found and as left")
	for _, f := range s.Files {
		words := fmt.Sprintf("record %d: %s file %s, SHA-256 %s", f.Seq, f.Body.Role, f.Body.Name, f.Body.SHA256)
		if f.Body.Replaces != nil {
			words += ", replaces " + *f.Body.Replaces + reasons([]string{f.Body.Why})
		}
		d.paragraph(regular, 7.4, quiet, words)
	}
	d.gap(2)
	t := d.table(column{"", 5, regular, false}, column{"as found", 4, regular, false}, column{"as left", 4, regular, false})
	t.dense = true
	group := ""
	for _, p := range s.Site.Plates {
		if p.Group != group {
			group = p.Group
			t.row([]cell{strong(group), plain(""), plain("")})
		}
		t.row([]cell{plain(p.What), plain(orAbsent(p.AsFound)), leftCell(p)})
	}
	if len(s.Settings) == 0 {
		return
	}
	d.subtitle("Device settings")
	t = d.table(column{"setting", 5, regular, false}, column{"as found", 4, regular, false}, column{"as left", 4, regular, false})
	for _, e := range s.Settings {
		t.row([]cell{plain(e.Name), plain(settingWords(e.AsFound, e.FoundRaw, e.Unit)), plain(settingWords(e.AsLeft, e.LeftRaw, e.Unit))})
	}
}

func orAbsent(text string) string {
	if text == "" {
		return "not stated"
	}
	return text
}

// leftCell stresses a value that was changed in the walk.
func leftCell(p Plate) cell {
	if p.AsLeft != p.AsFound {
		return coloured(orAbsent(p.AsLeft)+" (changed)", verdictLook("marginal"))
	}
	return plain(p.AsLeft)
}

func (d document) events() {
	rows := d.story.eventRows()
	d.title("Link, attempts and other events")
	if len(rows) == 0 {
		d.paragraph(regular, 8.4, ink, "None.")
		return
	}
	t := d.table(column{"record", 2.2, regular, false}, column{"event", 2, regular, false}, column{"what", 8, regular, false})
	for _, r := range rows {
		t.row([]cell{d.recordCell(r.Seq, r.At), strong(r.Body[0]), plain(r.Body[1])})
	}
}

func (d document) signatureBlock() {
	s := d.story
	d.title("People, instruments, signatures")
	if len(s.Instruments) > 0 {
		t := d.table(column{"instrument", 4, regular, false}, column{"serial", 3, regular, false}, column{"calibrated", 2, regular, false}, column{"due", 2, regular, false}, column{"accuracy", 4, regular, false})
		for _, i := range s.Instruments {
			t.row([]cell{strong(i.Name).under(i.ID), plain(i.Serial), plain(i.Calibrated), plain(i.Due), plain(accuracyWords(i.Accuracy))})
		}
		d.gap(4)
	}
	for _, p := range s.People {
		d.inkBox(p)
	}
	for len(s.People) < 2 { // room for a witness whom the log does not know
		s.People = append(s.People, record.Person{})
		d.inkBox(record.Person{})
	}
	if len(s.People) == 2 {
		d.inkBox(record.Person{})
	}
}

func accuracyWords(a record.InstrumentAccuracy) string {
	if a.OfReading == 0 && a.Plus == 0 {
		return "not stated"
	}
	return fmt.Sprintf("±(%s of reading + %s)", finding.Print(a.OfReading, "%", 2), finding.Print(a.Plus, a.Unit, 2))
}

// inkBox is one person with room for a signature in ink.
func (d document) inkBox(p record.Person) {
	name := p.Name
	if p.Organisation != "" {
		name += ", " + p.Organisation
	}
	lines := d.wrap(bold, 8.6, d.inner()/2-6, name)
	height := max(26, 12+lineHeight(8.6)*float64(len(lines)))
	d.need(height + 3)
	d.box(d.left(), d.y, d.inner(), height, white, 0.3, quiet)
	role := p.Role
	if role == "" {
		role = "name and role"
	}
	d.text(d.left()+3, d.y+4.4, regular, 7, quiet, d.short(regular, 7, d.inner()/2-6, role))
	for i, line := range lines {
		d.text(d.left()+3, d.y+9+lineHeight(8.6)*float64(i), bold, 8.6, ink, line)
	}
	key := "no key in the log"
	if p.Key != nil {
		key = *p.Key
	}
	if p.Name != "" {
		d.text(d.left()+3, d.y+height-3, mono, 6.4, quiet, d.short(mono, 6.4, d.inner()/2-6, key))
	}
	x := d.left() + d.inner()/2
	d.line(x, d.y+height-7, d.right()-34, d.y+height-7, 0.2, ink)
	d.text(x, d.y+height-3.6, regular, 6.6, quiet, "signature in ink")
	d.line(d.right()-30, d.y+height-7, d.right()-3, d.y+height-7, 0.2, ink)
	d.text(d.right()-30, d.y+height-3.6, regular, 6.6, quiet, "place and date")
	d.y += height + 3
}

func (d document) proof() {
	d.title("How to check the log without this program")
	for _, step := range d.story.proofSteps() {
		d.need(16)
		d.paragraph(regular, 8.6, ink, step.words)
		for _, command := range step.commands {
			d.command(command)
		}
		d.gap(2)
	}
}

// command is a line to type; it is broken only where it must be.
func (d document) command(c command) {
	d.need(9)
	lines := d.wrap(mono, 7, d.inner()-34, c.text)
	height := 3 + lineHeight(7)*float64(len(lines))
	d.need(height)
	d.box(d.left(), d.y, d.inner(), height, shade, 0, ink)
	d.text(d.left()+2, d.y+4, regular, 6.8, quiet, c.where)
	for i, line := range lines {
		d.text(d.left()+28, d.y+4+lineHeight(7)*float64(i), mono, 7, ink, line)
	}
	d.y += height + 1
}
