package walkview

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"chargehand/commission"
	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/commission/walk"
	"chargehand/tui/far"
	"chargehand/tui/theme"
)

// panel is the open point: a prompt, a capture's chart, or the point's text and readings.
func (m Model) panel(width, height int) []string {
	p := m.current()
	head := m.head(p, width)
	if m.prompt != nil {
		return append(head, m.promptRows(width, height-len(head))...)
	}
	height -= len(head)
	if c, ok := m.chartAt(p); ok && m.showsChart(p, c, height) {
		return append(head, m.chartRows(p, c, width, height)...)
	}
	return append(head, m.paged(m.text(p, width), height)...)
}

// showsChart tells whether a point's chart is shown or its text: the running capture always first, one that has ended where
// there is room for the caution beside it. Tab shows the other.
func (m Model) showsChart(p walk.Point, c commission.Progress, height int) bool {
	speaksForItself := !p.IsHazardous() && !m.hasTrouble(p)
	return (m.isRunning(c) || speaksForItself || height >= roomForBoth) != m.words
}

// hasTrouble tells whether a measured finding of the point is not passed: its reasons must be read.
func (m Model) hasTrouble(p walk.Point) bool {
	return slices.ContainsFunc(p.Findings, func(id string) bool {
		return slices.ContainsFunc(m.snapshot.State.Measured(id), func(f finding.Finding) bool { return f.Verdict == finding.Fail || f.Verdict == finding.Undecided })
	})
}

const roomForBoth = 20

// chartRows is a capture's chart; where there is room its point's text stands below it.
func (m Model) chartRows(p walk.Point, c commission.Progress, width, height int) []string {
	rows := m.actRows(width)
	below := m.under(p, width)
	chartHeight := min(max(height-len(rows)-len(below), height/2, leastChart), height-len(rows))
	rows = append(rows, m.captureRows(c, width, chartHeight)...)
	return append(rows, m.paged(below, height-len(rows))...)
}

const leastChart = 10

// under is what stands under a chart: the findings of a capture that has ended, then what is wanted.
func (m Model) under(p walk.Point, width int) []string {
	var rows []string
	if p.IsHazardous() && m.snapshot.Capture == nil {
		rows = append(rows, m.cautionRows(p, width)...)
	}
	rows = append(rows, m.reasonRows(p, width)...)
	rows = append(rows, m.findingRows(p, width)...)
	if m.snapshot.Capture == nil {
		rows = append(rows, m.labelled("do", p.Do, width)...)
		rows = append(rows, m.labelled("wanted", p.Expect, width)...)
		rows = append(rows, m.liveRows(p, width)...)
	}
	return append(rows, m.takenRows(p, width)...)
}

// paged shows a part of the rows, and that there is more.
func (m Model) paged(rows []string, room int) []string {
	first := min(m.page, max(0, len(rows)-room))
	shown := cut(rows[first:], room)
	if first+room < len(rows) && len(shown) > 0 {
		shown = append(slices.Clone(shown[:len(shown)-1]), m.theme.Paint(theme.Faint, m.theme.Pick("… more: PgDn", "... more: PgDn")))
	}
	return shown
}

// head is the point's name, its kind and its result.
func (m Model) head(p walk.Point, width int) []string {
	kind := strings.ToUpper(string(p.Kind))
	left := p.ID + "  " + theme.Clean(p.Title)
	status := m.statusWords(p)
	space := width - theme.Width(left) - theme.Width(kind) - theme.Width(status) - 3
	if space < 0 {
		left = m.theme.Clip(left, max(0, theme.Width(left)+space))
		space = 0
	}
	return []string{m.theme.Paint(theme.Title, left) + strings.Repeat(" ", space) + " " + m.theme.Paint(theme.Key, kind) + " " + status}
}

func (m Model) statusWords(p walk.Point) string {
	st := m.snapshot.State.Status(p.ID)
	switch st.Result {
	case walk.Passed:
		return m.theme.Verdict(finding.Pass)
	case walk.Failed:
		return m.theme.Verdict(finding.Fail)
	case walk.NotApplicable:
		return m.theme.Paint(theme.Faint, "not applicable")
	}
	return m.theme.Paint(theme.Mandatory, "open")
}

// text is everything that is said of a point.
func (m Model) text(p walk.Point, width int) []string {
	rows := m.cautionRows(p, width)
	rows = append(rows, m.reasonRows(p, width)...)
	rows = append(rows, m.actRows(width)...)
	rows = append(rows, m.labelled("do", p.Do, width)...)
	rows = append(rows, m.labelled("wanted", p.Expect, width)...)
	rows = append(rows, m.punchRows(p, width)...)
	rows = append(rows, m.liveRows(p, width)...)
	rows = append(rows, m.takenRows(p, width)...)
	rows = append(rows, m.findingRows(p, width)...)
	if a := m.next(p); a.step != stepPass && a.step != stepFail && m.snapshot.State.Status(p.ID).Result == walk.Open {
		for _, because := range m.snapshot.State.Assess(p).Because {
			rows = append(rows, m.painted(theme.Faint, m.theme.Pick("○ ", "o ")+because, width)...)
		}
	}
	rows = append(rows, m.labelled("if not", p.Otherwise, width)...)
	return append(rows, m.labelled("basis", p.Basis, width)...)
}

func (m Model) cautionRows(p walk.Point, width int) []string {
	var rows []string
	if p.IsHazardous() {
		for _, l := range wrap(theme.Clean(p.Caution), width-4) {
			rows = append(rows, m.theme.Caution(m.theme.Plain(m.theme.Fit(l, width-4))))
		}
	}
	return rows
}

// reasonRows say what is in the way, and how long a wait still takes.
func (m Model) reasonRows(p walk.Point, width int) []string {
	var rows []string
	switch a := m.next(p); {
	case m.snapshot.State.Status(p.ID).Result == walk.Open && (a.step == stepPass || a.step == stepFail):
		for _, because := range m.snapshot.State.Assess(p).Because {
			rows = append(rows, m.painted(theme.Abnormal, m.theme.Pick("○ ", "o ")+because, width)...)
		}
	case a.reason != "" && a.step != stepNothing:
		rows = append(rows, m.painted(theme.Abnormal, a.reason, width)...)
	}
	if left := m.snapshot.State.CoolsFor(m.snapshot.Now); left > 0 && p.Stage == 5 && m.snapshot.Capture == nil {
		words := "resistor cools: next attempt in " + far.Clock(left)
		if m.session.Operator != nil {
			words += ", h hastens it"
		}
		rows = append(rows, m.painted(theme.Mandatory, words, width)...)
	}
	return rows
}

// actRows say what the plant's hand does next.
func (m Model) actRows(width int) []string {
	act, wait := m.nextAct()
	if act == "" {
		return nil
	}
	words := "o: " + actWords(act)
	if wait != "" {
		words = wait + ", then o: " + actWords(act)
	}
	if acts := actsAt(m.point); m.acts < len(acts) && acts[m.acts] == act {
		words += fmt.Sprintf(" (%d/%d)", m.acts+1, len(acts))
	}
	var rows []string
	for i, l := range wrap(words, width-9) {
		rows = append(rows, m.theme.Paint(theme.Faint, m.theme.Fit(map[bool]string{true: "plant"}[i == 0], 8))+m.theme.Paint(theme.Mandatory, m.theme.Plain(l)))
	}
	return rows
}

func (m Model) painted(role theme.Role, text string, width int) []string {
	var rows []string
	for _, l := range wrap(theme.Clean(text), width-1) {
		rows = append(rows, m.theme.Paint(role, m.theme.Plain(l)))
	}
	return rows
}

func (m Model) labelled(label, text string, width int) []string {
	if text == "" {
		return nil
	}
	const indent = 8
	var rows []string
	for i, l := range wrap(theme.Clean(text), width-indent-1) {
		lead := strings.Repeat(" ", indent)
		if i == 0 {
			lead = m.theme.Paint(theme.Faint, m.theme.Fit(label, indent))
		}
		rows = append(rows, lead+m.theme.Plain(l))
	}
	return rows
}

// liveRows are the point's signals as they are now.
func (m Model) liveRows(p walk.Point, width int) []string {
	if m.snapshot.State.Status(p.ID).Result != walk.Open {
		return nil
	}
	unproved := m.unproved()
	var parts []string
	for _, name := range p.Signals {
		if _, ok := m.snapshot.Live[name]; !ok {
			continue
		}
		shown := m.theme.Show(m.snapshot.Reading(name), unproved[name], m.snapshot.Now, m.maxAge())
		text := shown.String()
		if r := m.snapshot.Reading(name); name.IsState() && shown.HasValue() {
			text = valueWords(record.Reading{Signal: string(name), Value: &r.Value})
		}
		parts = append(parts, string(name)+" "+m.theme.Paint(shown.Role, text))
	}
	return flow("now", parts, width, m.theme)
}

// flow sets parts side by side, as many to a row as fit.
func flow(label string, parts []string, width int, t theme.Theme) []string {
	const indent = 8
	rows := beside(parts, width-indent-1)
	for i := range rows {
		lead := strings.Repeat(" ", indent)
		if i == 0 {
			lead = t.Paint(theme.Faint, t.Fit(label, indent))
		}
		rows[i] = lead + rows[i]
	}
	return rows
}

// beside sets parts side by side, as many to a row of a width as fit.
func beside(parts []string, width int) []string {
	var rows []string
	row := ""
	for _, part := range parts {
		if row != "" && theme.Width(row)+2+theme.Width(part) > width {
			rows, row = append(rows, row), ""
		}
		if row != "" {
			row += "  "
		}
		row += part
	}
	if row != "" {
		rows = append(rows, row)
	}
	return rows
}

// takenRows are the readings on disk.
func (m Model) takenRows(p walk.Point, width int) []string {
	var rows []string
	for _, seq := range m.snapshot.State.Status(p.ID).Readings {
		r, ok := m.snapshot.State.Reading(seq)
		if !ok {
			continue
		}
		rows = append(rows, m.labelled(fmt.Sprintf("#%d", seq), readingWords(r), width)...)
	}
	return rows
}

func readingWords(r record.Reading) string {
	words := r.Signal
	if r.Value != nil {
		words += " " + valueWords(r)
	}
	if r.Text != "" {
		words += " " + r.Text
	}
	words += ", " + r.Source
	if r.Instrument != nil {
		words += " " + *r.Instrument
	}
	return words
}

// valueWords is a reading's value; a contact is open or closed, a count has no decimals.
func valueWords(r record.Reading) string {
	name, v := signal.Name(r.Signal), *r.Value
	switch {
	case name.IsState() && strings.HasSuffix(r.Signal, "-closed"):
		return map[bool]string{true: "closed", false: "open"}[v != 0]
	case name.IsState():
		return map[bool]string{true: "yes", false: "no"}[v != 0]
	case (r.Unit == "" || r.Unit == "1") && v == math.Trunc(v):
		return fmt.Sprintf("%.0f", v)
	}
	return quantity.Engineering(v, r.Unit, 4)
}

// punchRows are the open punch items and accepted deviations, at the points where they are read.
func (m Model) punchRows(p walk.Point, width int) []string {
	if p.ID != "leave.punch" && p.ID != "leave.handover" {
		return nil
	}
	var rows []string
	for _, k := range m.snapshot.State.Punches() {
		rows = append(rows, m.labelled(k.ID+" "+k.Severity, fmt.Sprintf("%s: %s, %s, due %s", k.Event, k.What, k.Owner, k.Due), width)...)
	}
	for _, d := range m.snapshot.State.Deviations() {
		rows = append(rows, m.labelled("accepted", d.Point+": "+d.Reason+", by "+d.AcceptedBy, width)...)
	}
	if rows == nil {
		return m.labelled("items", "no punch item, no deviation", width)
	}
	return rows
}

// findingRows are the measured findings that bind the point.
func (m Model) findingRows(p walk.Point, width int) []string {
	var rows []string
	for _, id := range p.Findings {
		for _, f := range m.snapshot.State.Measured(id) {
			rows = append(rows, m.theme.Verdict(f.Verdict)+" "+f.ID)
			for _, because := range f.Because {
				rows = append(rows, m.painted(theme.Text, "  "+because, width)...)
			}
			for i, c := range f.Cause {
				if i == 3 {
					break
				}
				rows = append(rows, m.painted(theme.Abnormal, fmt.Sprintf("%s %.0f %%: %s", c.ID, 100*c.Score, strings.Join(c.Evidence, "; ")), width)...)
				rows = append(rows, m.painted(theme.Faint, "confirm: "+c.Confirm, width)...)
			}
		}
	}
	return rows
}

// promptRows are the fields to type, what they would move, and below them what the point wants.
func (m Model) promptRows(width, height int) []string {
	p := m.prompt
	rows := m.painted(theme.Title, p.title, width)
	rows = append(rows, "")
	rows = append(rows, strings.Split(strings.TrimRight(p.form.View(m.theme, width-1, max(height-len(rows), 0)), "\n"), "\n")...)
	rows = append(rows, "")
	for _, moved := range p.previewed {
		rows = append(rows, m.painted(theme.Abnormal, moved, width)...)
	}
	rows = append(rows, m.helpRows(width)...)
	if point := m.current(); len(p.previewed) == 0 {
		rows = append(rows, m.labelled("do", point.Do, width)...)
		rows = append(rows, m.labelled("wanted", point.Expect, width)...)
	}
	return cut(rows, height)
}

// helpRows say how a prompt is filled in quickly.
func (m Model) helpRows(width int) []string {
	p := m.prompt
	var rows []string
	if len(p.phrases) > 0 {
		rows = append(rows, m.hanging("Ctrl+N", "begin with: "+p.phrases[p.phrase%len(p.phrases)], width)...)
	}
	switch {
	case len(p.meters) > 0 && p.rehearsed == "":
		rows = append(rows, m.hanging("Ctrl+T", "read the simulated plant's meter", width)...)
	case p.canFill():
		rows = append(rows, m.hanging("Ctrl+T", "fill in for the rehearsal", width)...)
	}
	return rows
}

func (m Model) hanging(label, text string, width int) []string {
	var rows []string
	for i, l := range wrap(theme.Clean(text), width-9) {
		lead := strings.Repeat(" ", 8)
		if i == 0 {
			lead = m.theme.Paint(theme.Key, m.theme.Fit(label, 8))
		}
		rows = append(rows, lead+m.theme.Paint(theme.Faint, m.theme.Plain(l)))
	}
	return rows
}
