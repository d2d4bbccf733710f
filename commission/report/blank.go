package report

import (
	"crypto/sha256"
	"fmt"
	"io"
	"path/filepath"
	"strings"
	"time"

	"chargehand/commission/capture"
	"chargehand/commission/discharge"
	"chargehand/commission/droop"
	"chargehand/commission/finding"
	"chargehand/commission/precharge"
	"chargehand/commission/quantity"
	"chargehand/commission/record"
	"chargehand/commission/site"
	"chargehand/commission/walk"
	"chargehand/commission/window"
)

// Sheet is the blank test sheet of a site: the whole walk on paper, with this site's predictions in it, for where no laptop
// may go.
type Sheet struct {
	Site     site.Site
	File     string // name of the site file
	Text     string // the site file as it was read
	Findings []finding.Finding
	At       time.Time // when it is made, for its title and the file's date
}

// WritePDF writes the sheet for print.
func (b Sheet) WritePDF(w io.Writer, paper Paper) error {
	title := b.Site.Name
	if b.Site.Reference != "" {
		title += " · " + b.Site.Reference
	}
	p, err := newSheet(paper, properties{title: "Test sheet: " + title, subject: filepath.Base(b.File), at: b.At})
	if err != nil {
		return err
	}
	d := form{p, b}
	d.cover(title)
	for number := 1; number <= walk.Stages; number++ {
		d.stage(number)
	}
	d.close()
	p.furnish(furniture{head: title, headRight: "test sheet, made " + b.At.Format("2006-01-02 15:04 -07:00"), foot: []string{
		"site file " + filepath.Base(b.File), fmt.Sprintf("SHA-256 %x", sha256.Sum256([]byte(b.Text)))}})
	return p.write(w)
}

// form is a sheet on its paper.
type form struct {
	*sheet
	blank Sheet
}

// caution is what every sheet says first.
const caution = "This sheet assists, it does not authorise. Local codes, the permit to work, the makers' instructions and licensed practice " +
	"prevail. A displayed, calculated or waited-for voltage never stands for absence of voltage. Write with a pen, never over what stands there: " +
	"strike it out and write beside it. Each entry needs value, unit, time and instrument; a hold is not passed before it is signed."

func (d form) cover(title string) {
	b := d.blank
	d.text(d.left(), d.y+6, bold, 18, heading, "Test sheet")
	d.y += 11
	d.paragraph(bold, 12, ink, title)
	if b.Site.Location != "" {
		d.paragraph(regular, 9.5, quiet, b.Site.Location)
	}
	d.gap(3)
	d.paragraph(regular, 8.4, ink, caution)
	d.gap(2)
	d.blanks("permit to work", "date, begun at", "person in charge", "abort hand at the stop")
	d.subtitle("People")
	t := d.table(column{"name", 5, regular, false}, column{"role", 3, regular, false}, column{"organisation", 4, regular, false}, column{"signature", 4, regular, false})
	for _, p := range b.Site.People {
		t.row([]cell{tall(p.Name), plain(p.Role), plain(p.Organisation), plain("")})
	}
	for range max(4-len(b.Site.People), 2) {
		t.row([]cell{tall(""), plain(""), plain(""), plain("")})
	}
	d.subtitle("Instruments")
	t = d.table(column{"no.", 0.7, regular, false}, column{"instrument", 4, regular, false}, column{"serial", 3, regular, false}, column{"calibration due", 2.4, regular, false},
		column{"rated voltage, category", 3, regular, false})
	for i, known := range b.Site.Instruments {
		due := ""
		if !known.Due.IsZero() {
			due = known.Due.Format(time.DateOnly)
		}
		t.row([]cell{tall(fmt.Sprintf("i%d", i+1)), plain(known.Name), plain(known.Serial), plain(due), plain(strings.TrimSpace(known.MaxVoltage.Text + " " + known.Category))})
	}
	for i := range 3 {
		t.row([]cell{tall(fmt.Sprintf("i%d", len(b.Site.Instruments)+i+1)), plain(""), plain(""), plain(""), plain("")})
	}
	d.attention()
}

// tall is a cell with room for handwriting.
func tall(text string) cell {
	return cell{[]styled{{text, regular, tableSize, ink}, {" ", regular, 6, ink}}}
}

// attention are the findings that do not pass on paper.
func (d form) attention() {
	d.subtitle("What does not pass on paper")
	none := true
	for _, f := range d.blank.Findings {
		if f.Verdict == finding.Pass || f.Verdict == finding.Info {
			continue
		}
		none = false
		d.paragraph(regular, 8, ink, "• "+sentence(f)+reasons(f.Because)+remedyWords(f))
	}
	if none {
		d.paragraph(regular, 8, ink, "Nothing: every finding passes.")
	}
}

func remedyWords(f finding.Finding) string {
	if f.Remedy == "" {
		return ""
	}
	return "; remedy: " + f.Remedy
}

// blanks are fields to fill in, two a line.
func (d form) blanks(names ...string) {
	half := d.inner() / 2
	for i, name := range names {
		x := d.left() + float64(i%2)*half
		if i%2 == 0 {
			d.need(9)
			d.y += 9
		}
		label := d.width(regular, 8, name) + 2
		d.text(x, d.y, regular, 8, ink, name)
		d.line(x+label, d.y+0.6, x+half-4, d.y+0.6, 0.2, ink)
	}
	d.gap(2)
}

func (d form) stage(number int) {
	d.need(75) // a stage stands above its first point
	d.title(fmt.Sprintf("%d  %s", number, walk.StageTitles[number-1]))
	for _, p := range walk.Content(d.blank.Site, d.blank.Findings) {
		if p.Stage == number {
			d.point(p)
			d.prediction(p)
		}
	}
}

// labelled is a text of a point with its word in front.
type labelled struct {
	label, text string
	look        colour
}

func (d form) point(p walk.Point) {
	texts := []labelled{{"Caution", p.Caution, verdictLook("fail")}, {"Do", p.Do, ink}, {"Expect", p.Expect, ink}, {"If not", p.Otherwise, quiet}, {"Basis", p.Basis, quiet}}
	rows := readingRows(p)
	height := 8 + 6.6*float64(len(rows)) + 11
	if p.Kind != walk.Check {
		height += 9
	}
	for _, t := range texts {
		if t.text != "" {
			height += lineHeight(7.6) * float64(len(d.wrap(regular, 7.6, d.inner()-20, t.text)))
		}
	}
	d.need(min(height, d.bottom()-topMargin))
	d.pointHead(p)
	for _, t := range texts {
		d.pointText(t)
	}
	if len(rows) > 0 {
		d.readings(rows)
	}
	d.result(p)
	d.gap(3.5)
}

func (d form) pointHead(p walk.Point) {
	d.box(d.left(), d.y, d.inner(), 6.2, shade, 0, ink)
	kind := strings.ToUpper(string(p.Kind))
	d.textRight(d.right()-2, d.y+4.3, bold, 7.4, verdictLook(map[walk.Kind]string{walk.Hold: "fail", walk.Witness: "marginal"}[p.Kind]), kind)
	id := d.short(bold, 8.6, 60, p.ID)
	d.text(d.left()+2, d.y+4.4, bold, 8.6, ink, id)
	x := d.left() + 5 + d.width(bold, 8.6, id)
	d.text(x, d.y+4.4, regular, 8.6, ink, d.short(regular, 8.6, d.right()-22-x, p.Title))
	d.y += 7.4
}

func (d form) pointText(t labelled) {
	if t.text == "" {
		return
	}
	d.need(lineHeight(7.6))
	d.text(d.left()+2, d.y+2.7, bold, 7, t.look, t.label)
	d.paragraphAt(d.left()+18, d.inner()-20, regular, 7.6, t.look, t.text)
}

// readingRow is one reading to write down, and what is accepted.
type readingRow struct{ what, by, accept string }

// readingRows are the readings that a point wants: those of the device and of instruments, each with its limits.
func readingRows(p walk.Point) []readingRow {
	var rows []readingRow
	for _, h := range p.Hand {
		rows = append(rows, readingRow{h.What + unitWords(h.Unit), "instrument", acceptWords(p, h.What)})
	}
	if p.Capture == "" {
		for _, n := range p.Signals {
			rows = append(rows, readingRow{string(n) + unitWords(n.Unit()), "device's display", acceptWords(p, string(n))})
		}
	} else {
		for _, c := range p.Accept {
			rows = append(rows, readingRow{c.What + unitWords(c.Unit), "from the curve", acceptWords(p, c.What)})
		}
	}
	if len(rows) == 0 && (p.Wants(walk.Document) || p.Wants(walk.Observation)) {
		rows = append(rows, readingRow{"seen, document, number", "", ""})
	}
	return rows
}

func unitWords(unit string) string {
	if unit == "" || unit == "1" {
		return ""
	}
	return " in " + unit
}

func acceptWords(p walk.Point, what string) string {
	for _, c := range p.Accept {
		if c.What == what && (c.Low != nil || c.High != nil) {
			return accepts(c)
		}
	}
	return ""
}

// accepts is what a reading must be, in figures as short as they are exact.
func accepts(c walk.Criterion) string {
	switch {
	case c.Low != nil && c.High != nil:
		return between(asRead(*c.Low, c.Unit), asRead(*c.High, c.Unit))
	case c.Low != nil:
		return "≥ " + asRead(*c.Low, c.Unit)
	}
	return "≤ " + asRead(*c.High, c.Unit)
}

// readings are boxes to write into.
func (d form) readings(rows []readingRow) {
	d.gap(1)
	x, w := d.left()+2, d.inner()-4
	widths := []float64{0.40 * w, 0.24 * w, 0.18 * w, 0.10 * w, 0.08 * w}
	for _, r := range rows {
		d.need(6.6)
		at := x
		d.text(at, d.y+3.9, regular, 7.2, ink, d.short(regular, 7.2, widths[0]-2, joinedBy(r.what, r.by)))
		at += widths[0]
		d.text(at, d.y+3.9, regular, 7.2, quiet, d.short(regular, 7.2, widths[1]-2, r.accept))
		at += widths[1]
		for i, label := range []string{"value", "instrument", "time"} {
			width := widths[2+i]
			d.box(at+0.5, d.y, width-1, 5.8, white, 0.2, quiet)
			d.text(at+1.2, d.y+1.9, regular, 4.4, quiet, label)
			at += width
		}
		d.y += 6.6
	}
}

func joinedBy(what, by string) string {
	if by == "" {
		return what
	}
	return what + ", " + by
}

// result are the boxes to tick, a line for a note, and for a hold or a witness point the line to sign on.
func (d form) result(p walk.Point) {
	d.need(16)
	d.gap(1.6)
	x := d.left() + 2
	choices := []string{"pass", "fail"}
	if p.MayOmit {
		choices = append(choices, "not applicable")
	}
	for _, word := range choices {
		d.box(x, d.y, 3.2, 3.2, white, 0.25, ink)
		d.text(x+4.4, d.y+2.7, regular, 7.6, ink, word)
		x += 8 + d.width(regular, 7.6, word)
	}
	d.text(x+2, d.y+2.7, regular, 7, quiet, "note")
	d.line(x+10, d.y+3.2, d.right()-2, d.y+3.2, 0.15, quiet)
	d.y += 5
	if p.Kind == walk.Check {
		return
	}
	d.y += 4.6
	x = d.left() + 2
	for _, field := range []struct {
		label string
		share float64
	}{{"name", 0.34}, {"signature", 0.40}, {"date and time", 0.26}} {
		width := field.share * (d.inner() - 4)
		d.line(x, d.y, x+width-3, d.y, 0.2, ink)
		d.text(x, d.y+2.6, regular, 5.6, quiet, field.label)
		x += width
	}
	d.y += 3
}

// prediction draws what is expected of a capture, to compare with the device's own trend by eye.
func (d form) prediction(p walk.Point) {
	s := d.blank.Site
	plot := Plot{Y: Axis{Label: "bus voltage", Unit: "V"}}
	switch p.Capture {
	case capture.Precharge:
		plot.Title, plot.X = "Predicted pre-charge from an empty bus", Axis{Label: "time since the pre-charge closed", Unit: "s"}
		predicted := precharge.Predict(s, wholeWindow(s), 0)
		plot.prechargeBand(predicted)
		if predicted.EarlyRise.At > 0 {
			plot.Caption = append(plot.Caption, fmt.Sprintf("At %s the bus must stand at %s at least: if not, open at once.",
				quantity.Engineering(predicted.EarlyRise.At.Seconds(), "s", 2), quantity.Engineering(float64(predicted.EarlyRise.AtLeast), "V", 3)))
		}
	case capture.Droop:
		plot.Title, plot.X = "Predicted droop of the commissioned converter", Axis{Label: "bus current of the converter", Unit: "A"}
		plot.droopBand(droop.Predict(s))
	case capture.Discharge:
		plot.Title, plot.X = "Predicted discharge from the highest bus", Axis{Label: "time since the bleeding began", Unit: "s"}
		plot.dischargeBand(discharge.Predict(s, quantity.Exactly(d.highestBus())))
		if t := s.Bus.TouchSafe; t != nil {
			plot.level("touch-safe voltage", float64(t.Voltage.Nominal))
		}
	default:
		return
	}
	plot.X.Low, plot.X.High = xRange(plot.Layers)
	plot.fitY()
	d.drawPlot(plot, 58)
	if p.Capture == capture.Droop {
		d.stairs()
	}
}

// highestBus is where a discharge begins: the highest steady bus, else the nominal.
func (d form) highestBus() quantity.Voltage {
	for _, f := range d.blank.Findings {
		if f.ID == "window.bus-high" && f.State == finding.Finite {
			return quantity.Voltage(f.Value.High)
		}
	}
	return d.blank.Site.Bus.Nominal.Nominal
}

// stairs is a table for the load steps, with the voltage that the line predicts at every fifth of the rated current.
func (d form) stairs() {
	p := droop.Predict(d.blank.Site)
	t := d.table(column{"step", 1, regular, false}, column{"current predicted for", 2.4, regular, false}, column{"bus predicted", 4, regular, false},
		column{"current read, A", 2.4, regular, false}, column{"bus read, V", 2.4, regular, false}, column{"other infeeds, A", 2.8, regular, false})
	for k := range 6 {
		expected, at := "", ""
		if len(p.Missing) == 0 {
			i := float64(p.Most) * float64(k) / 5
			at = quantity.Engineering(i, "A", 3)
			expected = spread(finding.Value{Low: float64(p.NoLoad.Low) - float64(p.BusSlope.High)*i, Nominal: float64(p.NoLoad.Nominal) - float64(p.BusSlope.Nominal)*i,
				High: float64(p.NoLoad.High) - float64(p.BusSlope.Low)*i}, "V", 4, finding.Finite)
		}
		t.row([]cell{tall(fmt.Sprint(k + 1)), plain(at), plain(expected), plain(""), plain(""), plain("")})
	}
	d.gap(4)
}

// close are the punch list, the deviations and the signatures under the whole.
func (d form) close() {
	d.title("Punch list, deviations, signatures")
	d.drawPlot(windowPlot(window.Table(d.blank.Site), d.onPaper), 58)
	d.subtitle("Punch list (A before energising, B before handover, C later)")
	t := d.table(column{"item", 0.8, regular, false}, column{"what", 8, regular, false}, column{"class", 1, regular, false}, column{"owner", 2.4, regular, false}, column{"due", 2, regular, false}, column{"cleared", 2, regular, false})
	for i := range 8 {
		t.row([]cell{tall(fmt.Sprintf("k%d", i+1)), plain(""), plain(""), plain(""), plain(""), plain("")})
	}
	d.subtitle("Deviations")
	t = d.table(column{"point", 2, regular, false}, column{"reason", 8, regular, false}, column{"accepted by", 4, regular, false})
	for range 4 {
		t.row([]cell{tall(""), plain(""), plain("")})
	}
	d.gap(5)
	ink := document{sheet: d.sheet}
	for _, p := range d.blank.Site.People {
		ink.inkBox(record.Person{Name: p.Name, Role: p.Role, Organisation: p.Organisation})
	}
	for range max(3-len(d.blank.Site.People), 1) {
		ink.inkBox(record.Person{})
	}
}

func (d form) onPaper(id string) (finding.Finding, bool) {
	for _, f := range d.blank.Findings {
		if f.ID == id {
			return f, true
		}
	}
	return finding.Finding{}, false
}
