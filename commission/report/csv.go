package report

import (
	"encoding/csv"
	"fmt"
	"io"
	"math"
	"regexp"
	"strconv"
	"strings"

	"chargehand/commission/finding"
)

// Table is one CSV file of a story: a name without a folder, and its rows. The first row names the columns.
type Table struct {
	Name string
	rows func(yield func([]string) bool)
}

// Write writes the table as CSV after RFC 4180: UTF-8, lines end with CR LF, fields with commas, quotes or line ends are
// quoted. Numbers have a decimal point and no unit. A text that a spreadsheet would take for a formula gets an apostrophe in
// front.
func (t Table) Write(to io.Writer) error {
	w := csv.NewWriter(to)
	w.UseCRLF = true
	for row := range t.rows {
		if err := w.Write(row); err != nil {
			return fmt.Errorf("write %s: %w", t.Name, err)
		}
	}
	w.Flush()
	return w.Error()
}

// Tables are the CSV files of a story: findings.csv, points.csv, readings.csv, punch.csv and a file for each capture. Every
// row begins with the log's id, so that files of many logs can be laid on top of one another.
func (s Story) Tables() []Table {
	tables := []Table{{"findings.csv", s.findingRows}, {"points.csv", s.pointRows}, {"readings.csv", s.readingRows}, {"punch.csv", s.punchRows}}
	taken := map[string]bool{}
	for _, c := range s.Captures {
		name := "capture-" + c.ID + ".csv"
		if !plainID.MatchString(c.ID) || taken[name] {
			name = fmt.Sprintf("capture-record-%d.csv", c.Seq)
		}
		taken[name] = true
		tables = append(tables, Table{name, s.captureRows(c)})
	}
	return tables
}

// plainID is a capture's id that can stand in a file's name everywhere.
var plainID = regexp.MustCompile(`^c[0-9]{1,9}$`)

// words makes a text from the log harmless in a spreadsheet: =, +, -, @, a tab or a carriage return at its beginning would
// start a formula, in their full-width forms too. A text that is a plain number stays one.
func words(text string) string {
	if text == "" || plainNumber.MatchString(text) {
		return text
	}
	if strings.ContainsRune("=+-@\t\r\n＝＋－＠", []rune(text)[0]) {
		return "'" + text
	}
	return text
}

var plainNumber = regexp.MustCompile(`^[+-]?[0-9]+(\.[0-9]+)?([eE][+-]?[0-9]+)?$`)

// numeral writes a number so that reading it gives the same one; nothing where there is none.
func numeral(v float64) string {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return ""
	}
	return strconv.FormatFloat(v, 'g', -1, 64)
}

func numeralAt(p *float64) string {
	if p == nil {
		return ""
	}
	return numeral(*p)
}

func whole(n int64) string { return strconv.FormatInt(n, 10) }

func (s Story) findingRows(yield func([]string) bool) {
	if !yield([]string{"log", "reference", "record", "at", "superseded", "id", "subject", "part", "title", "unit", "state", "low", "nominal", "high",
		"limit_low", "limit_high", "margin", "verdict", "because", "basis", "remedy", "captures", "cause"}) {
		return
	}
	for _, all := range [][]Finding{s.Measured, s.Desk} {
		for _, f := range all {
			for _, row := range s.rowsOf(f) {
				if !yield(row) {
					return
				}
			}
		}
	}
}

func (s Story) rowsOf(f Finding) [][]string {
	d := f.Finding
	margin := d.Margin
	if !d.Limit.IsGiven() {
		margin = math.NaN()
	}
	var causes []string
	for _, c := range d.Cause {
		causes = append(causes, c.ID)
	}
	start := []string{words(s.Log.ID), words(s.Site.Reference), whole(f.Seq), f.At, strconv.FormatBool(f.Superseded), words(d.ID), words(d.Subject)}
	row := func(part, title, unit, state string, v finding.Value, rest ...string) []string {
		r := append(append([]string{}, start...), words(part), words(title), unit, state, numeral(v.Low), numeral(v.Nominal), numeral(v.High))
		return append(r, rest...)
	}
	rows := [][]string{row("", d.Title, d.Unit, string(d.State), d.Value, numeralAt(d.Limit.Low), numeralAt(d.Limit.High), numeral(margin), string(d.Verdict),
		words(strings.Join(d.Because, "; ")), words(d.Basis), words(d.Remedy), words(strings.Join(d.Captures, " ")), words(strings.Join(causes, " ")))}
	for _, p := range d.Parts {
		rows = append(rows, row(p.Name, d.Title, p.Unit, "", p.Value, "", "", "", "", "", "", "", "", ""))
	}
	return rows
}

func (s Story) pointRows(yield func([]string) bool) {
	if !yield([]string{"log", "reference", "stage", "stage_title", "id", "kind", "title", "result", "record", "at", "signed_by", "note", "deviation",
		"accepted_by", "reopened"}) {
		return
	}
	for _, stage := range s.Stages {
		for _, p := range stage.Points {
			var signed []string
			for _, k := range p.Signatures {
				signed = append(signed, k.Name)
			}
			record, reason, by := "", "", ""
			if p.Seq != nil {
				record = whole(*p.Seq)
			}
			if p.Deviation != nil {
				reason, by = p.Deviation.Reason, s.person(p.Deviation.AcceptedBy)
			}
			if !yield([]string{words(s.Log.ID), words(s.Site.Reference), strconv.Itoa(stage.Number), words(stage.Title), words(p.ID), words(p.Kind), words(p.Title),
				words(p.Result), record, p.At, words(strings.Join(signed, "; ")), words(p.Note), words(reason), words(by), strconv.Itoa(p.Reopened)}) {
				return
			}
		}
	}
}

func (s Story) readingRows(yield func([]string) bool) {
	if !yield([]string{"log", "record", "at", "point", "signal", "value", "unit", "source", "instrument", "raw", "age_s", "u", "quality", "text", "paper", "corrected"}) {
		return
	}
	for _, stage := range s.Stages {
		for _, p := range stage.Points {
			for _, r := range p.Readings {
				b := r.Body
				var raw []string
				for _, w := range b.Raw {
					raw = append(raw, strconv.Itoa(int(w)))
				}
				if !yield([]string{words(s.Log.ID), whole(r.Seq), r.At, words(b.Point), words(b.Signal), numeralAt(b.Value), words(b.Unit), words(b.Source),
					words(r.Instrument), strings.Join(raw, " "), numeral(b.Age), numeral(b.U), words(b.Quality), words(b.Text), strconv.FormatBool(b.Paper), words(r.Corrected)}) {
					return
				}
			}
		}
	}
}

func (s Story) punchRows(yield func([]string) bool) {
	if !yield([]string{"log", "reference", "id", "what", "severity", "owner", "due", "point", "record", "raised", "cleared"}) {
		return
	}
	for _, k := range s.Punches {
		b := k.Body
		if !yield([]string{words(s.Log.ID), words(s.Site.Reference), words(b.ID), words(b.What), words(b.Severity), words(b.Owner), words(b.Due), words(b.Point),
			whole(k.Seq), k.Raised, k.Cleared}) {
			return
		}
	}
}

// captureRows are the samples of a capture: seconds since its T0, then a column for each signal, empty where it had no value.
func (s Story) captureRows(c Capture) func(yield func([]string) bool) {
	return func(yield func([]string) bool) {
		header := []string{"log", "capture", "t0", "time_s"}
		for _, ch := range c.data.Channels {
			name := string(ch.Name)
			if ch.Unit != "" {
				name += " [" + ch.Unit + "]"
			}
			header = append(header, words(name))
		}
		if !yield(header) {
			return
		}
		for _, sample := range c.data.Samples {
			row := []string{words(s.Log.ID), words(c.ID), words(c.T0), numeral(sample.At.Seconds())}
			for _, v := range sample.Values {
				if !v.OK {
					row = append(row, "")
					continue
				}
				row = append(row, numeral(v.V))
			}
			if !yield(row) {
				return
			}
		}
	}
}
