package report

import (
	"fmt"
	"io"
	"strconv"
	"strings"
	"time"

	"chargehand/commission/chlog"
	"chargehand/commission/finding"
	"chargehand/commission/record"
)

// WritePDF writes the report for print: A4 or Letter, plots as vectors, the same bytes for the same story.
func (s Story) WritePDF(w io.Writer, paper Paper) error {
	ended, _ := time.Parse(time.RFC3339, s.Log.Ended) // a log without an intact record has no time, and the document none
	p, err := newSheet(paper, properties{title: s.heading(), subject: "log " + s.Log.ID, author: strings.Join(s.names(), ", "), at: ended})
	if err != nil {
		return err
	}
	d := document{p, s}
	d.summary()
	d.comparison()
	d.deskFindings()
	d.points()
	d.openItems()
	d.plates()
	d.events()
	d.signatureBlock()
	d.proof()
	p.furnish(furniture{head: s.heading(), headRight: "commissioning report", marks: s.Marks, foot: []string{
		"log " + s.Log.ID + "   " + strconv.FormatInt(s.Log.Records, 10) + " records, " + clockWords(s.Log.Begun) + " to " + clockWords(s.Log.Ended),
		"hash of the last record  " + s.Log.Head}})
	return p.write(w)
}

func (s Story) heading() string {
	name := s.Site.Name
	if name == "" {
		name = s.Log.File
	}
	if s.Site.Reference != "" {
		name += " · " + s.Site.Reference
	}
	return name
}

func (s Story) names() []string {
	var names []string
	for _, p := range s.People {
		names = append(names, p.Name)
	}
	return names
}

// document is a report on its paper.
type document struct {
	*sheet
	story Story
}

// verdictLook is the colour of a verdict or a result; the word always stands beside it.
func verdictLook(verdict string) colour {
	switch verdict {
	case "pass", "valid":
		return colour{24, 108, 62}
	case "marginal", "unsigned", "unknown-key":
		return colour{146, 96, 0}
	case "fail", "foreign", "malformed", "not-permitted":
		return colour{166, 28, 28}
	case undecided, open:
		return colour{92, 66, 150}
	}
	return quiet
}

func (d document) summary() {
	s := d.story
	d.bookmark("Summary", 0)
	d.text(d.left(), d.y+6, bold, 18, heading, "Commissioning report")
	d.y += 11
	d.paragraph(bold, 12, ink, s.heading())
	if s.Site.Location != "" {
		d.paragraph(regular, 9.5, quiet, s.Site.Location)
	}
	d.gap(3)
	d.banner()
	d.gap(3)
	d.facts()
	d.gap(2)
	d.reasonsTable()
	d.summarySignatures()
	d.glance()
}

// clock is a time for a narrow column: without its offset where that is the one the log began with, which the foot of each
// page states.
func (d document) clock(at string) string {
	words, zone := clockWords(at), clockWords(d.story.Log.Begun)
	if len(words) > 19 && strings.HasSuffix(zone, words[19:]) {
		return words[:19]
	}
	return words
}

// glance is what was measured, a line each.
func (d document) glance() {
	var standing []Finding
	for _, f := range d.story.Measured {
		if !f.Superseded {
			standing = append(standing, f)
		}
	}
	if len(standing) == 0 {
		return
	}
	d.subtitle("Measured, at a glance")
	t := d.table(column{"finding", 4, regular, false}, column{"what", 4.6, regular, false}, column{"value", 4.2, regular, false}, column{"limit", 2.9, regular, false}, column{"verdict", 2, regular, false})
	t.dense = true
	for i, f := range standing {
		if i == mostAtAGlance {
			t.row([]cell{plain(fmt.Sprintf("and %d more", len(standing)-i)), plain(""), plain(""), plain(""), plain("")})
			break
		}
		n := figuresOf(f.Finding)
		t.row([]cell{plain(clipped(named(f.Finding), 60)), plain(clipped(f.Finding.Title, 80)), plain(n.value), plain(n.limit),
			coloured(string(f.Finding.Verdict), verdictLook(string(f.Finding.Verdict)))})
	}
}

// mostAtAGlance keeps the first page to one page.
const mostAtAGlance = 12

// banner is the verdict in one box, with what the log's verification says.
func (d document) banner() {
	s := d.story
	word, c := strings.ToUpper(string(s.Verdict)), verdictLook(string(s.Verdict))
	says := s.Verification.Sentence
	if s.isBroken() {
		word, c = "NO VERDICT", verdictLook("fail")
		says = "This log cannot be relied on. " + says
	}
	lines := d.wrap(regular, 8.4, d.inner()-62, says)
	height := max(17, lineHeight(8.4)*float64(len(lines))+9)
	d.box(d.left(), d.y, d.inner(), height, shade, 0, ink)
	d.box(d.left(), d.y, 54, height, c, 0, ink)
	d.textMiddle(d.left()+27, d.y+height/2+2.2, bold, min(17, 17*46/d.width(bold, 17, word)), white, word)
	d.text(d.left()+58, d.y+5, bold, 7, quiet, "THE LOG")
	for i, line := range lines {
		d.text(d.left()+58, d.y+9+lineHeight(8.4)*float64(i), regular, 8.4, ink, line)
	}
	d.y += height
}

func (s Story) isBroken() bool {
	for _, m := range s.Marks {
		if m == Broken {
			return true
		}
	}
	return false
}

// facts are the site and the walk in two columns.
func (d document) facts() {
	s := d.story
	begun, ended := clockWords(s.Log.Begun), clockWords(s.Log.Ended)
	device := s.Log.Device
	if s.Log.Mode == record.RehearsalMode {
		device += ", " + rehearsedWith(s.Log)
	}
	t := d.table(column{"", 1.1, bold, false}, column{"", 3, regular, false}, column{"", 1.1, bold, false}, column{"", 3, regular, false})
	t.headed, t.dense = true, true // rows of names and values need no head
	row := func(a, b, c, e string) { t.row([]cell{strong(a), plain(b), strong(c), plain(e)}) }
	row("begun", begun, "last record", ended)
	row("device", device, "program", "chargehand "+s.Log.Program)
	row("findings", countFindings(s.Measured)+" measured; "+countFindings(s.Desk)+" on paper", "points", s.countPoints())
	row("open punch items", strconv.Itoa(s.openPunches()), "deviations", strconv.Itoa(len(s.Deviations)))
	row("log", s.Log.File+", id "+s.Log.ID, "file SHA-256", s.Log.SHA256)
}

func rehearsedWith(l Log) string {
	words := fmt.Sprintf("rehearsed at up to %g times the speed", l.Speed)
	if len(l.Disturb) > 0 {
		words += ", disturbed by " + strings.Join(l.Disturb, ", ")
	}
	return words
}

func countFindings(all []Finding) string {
	count := map[finding.Verdict]int{}
	for _, f := range all {
		if !f.Superseded {
			count[f.Finding.Verdict]++
		}
	}
	var words []string
	for _, v := range []finding.Verdict{finding.Fail, finding.Undecided, finding.Marginal, finding.Pass, finding.Info} {
		if count[v] > 0 {
			words = append(words, fmt.Sprintf("%d %s", count[v], v))
		}
	}
	if len(words) == 0 {
		return "none"
	}
	return strings.Join(words, ", ")
}

func (s Story) countPoints() string {
	count, all := map[string]int{}, 0
	for _, stage := range s.Stages {
		for _, p := range stage.Points {
			count[p.Result]++
			all++
		}
	}
	words := fmt.Sprintf("%d", all)
	for _, r := range []string{"fail", undecided, open, "not-applicable", "pass"} {
		if count[r] > 0 {
			words += fmt.Sprintf(", %d %s", count[r], r)
		}
	}
	return words
}

func (s Story) openPunches() int {
	n := 0
	for _, p := range s.Punches {
		if p.IsOpen() {
			n++
		}
	}
	return n
}

// mostReasons is how many reasons the first page names; the rest stands where it belongs.
const mostReasons = 8

func (d document) reasonsTable() {
	because := d.story.Because
	if len(because) == 0 {
		return
	}
	d.subtitle("What needs attention")
	for i, why := range because {
		if i == mostReasons {
			d.paragraph(regular, 8, quiet, fmt.Sprintf("and %d more, marked in the findings and points below", len(because)-mostReasons))
			break
		}
		d.paragraph(regular, 8, ink, "• "+clipped(why, 320))
	}
}

// clipped keeps a first page from being filled by one long name.
func clipped(text string, most int) string {
	r := []rune(text)
	if len(r) <= most {
		return text
	}
	return string(r[:most-1]) + "…"
}

func (d document) summarySignatures() {
	d.subtitle("Signatures")
	v := d.story.Verification
	t := d.table(column{"what", 2, regular, false}, column{"who", 3, regular, false}, column{"key", 5.4, regular, false}, column{"check", 2.4, regular, false})
	for _, k := range v.Statements {
		if k.Act == chlog.ActSeal {
			t.row(d.signatureRow("seal, record "+strconv.FormatInt(k.Record, 10), who(k.Name, k.Role, k.Principal), k.Key, string(k.State), k.Why, k.At))
		}
	}
	for _, k := range v.Signatures {
		t.row(d.signatureRow("whole file, "+k.File, who(k.Name, k.Role, k.Principal), k.Key, string(k.State), k.Why, ""))
	}
	if signs := signOffs(v.Statements); signs != "" {
		t.row([]cell{plain("sign-offs"), plain(signs), plain(""), plain("")})
	}
	if !t.headed {
		d.paragraph(regular, 8.4, ink, "Nobody has signed.")
	}
}

func (d document) signatureRow(what, who, key, state, why, at string) []cell {
	if key == "" {
		key = "–"
	}
	words := signatureWords(d.story.Verification, state)
	c := plain(who)
	if at != "" {
		c = c.under("at " + clockWords(at) + ", as claimed")
	}
	return []cell{plain(clipped(what, 200)), c, {[]styled{{key, mono, 6.6, ink}}}, coloured(words, verdictLook(state)).under(why)}
}

// signatureWords is a signature's state in words; a valid one is only as good as what is known of its key.
func signatureWords(v chlog.Report, state string) string {
	if state == string(chlog.Valid) {
		if v.Outcome == chlog.Unchanged {
			return "valid, key known"
		}
		return "valid; identity not checked"
	}
	return state
}

func who(name, role, principal string) string {
	var words []string
	for _, w := range []string{name, role, principal} {
		if w != "" {
			words = append(words, clipped(w, 160))
		}
	}
	return strings.Join(words, ", ")
}

// signOffs counts the signed statements of points.
func signOffs(all []chlog.StatementCheck) string {
	valid, unsigned, bad := 0, 0, 0
	for _, k := range all {
		switch {
		case k.Act != chlog.ActSignOff:
		case k.State == chlog.Valid:
			valid++
		case k.State == chlog.Unsigned:
			unsigned++
		default:
			bad++
		}
	}
	if valid+unsigned+bad == 0 {
		return ""
	}
	words := fmt.Sprintf("%d points signed", valid)
	if unsigned > 0 {
		words += fmt.Sprintf(", %d signed off without a key", unsigned)
	}
	if bad > 0 {
		words += fmt.Sprintf(", %d whose signature does not hold", bad)
	}
	return words
}
