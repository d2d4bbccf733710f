package walkview

import (
	"fmt"
	"strings"

	"chargehand/commission"
	"chargehand/commission/capture"
	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/record"
	"chargehand/commission/walk"
	"chargehand/tui/chart"
	"chargehand/tui/theme"
)

// panel is the open point: a prompt, a capture's chart, or the point's text and readings.
func (m Model) panel(width, height int) []string {
	p := m.current()
	head := m.head(p, width)
	if m.prompt != nil {
		return append(head, m.promptRows(width, height-len(head))...)
	}
	if c := m.snapshot.Capture; c != nil && (c.Point == p.ID || c.Kind == p.Capture || p.Stage == m.stageOf(c.Point)) {
		return append(head, m.captureRows(*c, width, height-len(head))...)
	}
	rows := m.text(p, width)
	room := height - len(head)
	first := min(m.page, max(0, len(rows)-room))
	shown := cut(rows[first:], room)
	if first+room < len(rows) && len(shown) > 0 {
		shown[len(shown)-1] = m.theme.Paint(theme.Faint, m.theme.Pick("… PgDn", "... PgDn"))
	}
	return append(head, shown...)
}

func (m Model) stageOf(point string) int {
	p, _ := m.snapshot.State.Point(point)
	return p.Stage
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
	var rows []string
	if p.IsHazardous() {
		for _, l := range wrap(theme.Clean(p.Caution), width-3) {
			rows = append(rows, m.theme.Caution(l))
		}
	}
	if a := next(m.snapshot, p); a.reason != "" {
		rows = append(rows, m.painted(theme.Abnormal, a.reason, width)...)
	}
	rows = append(rows, m.labelled("do", p.Do, width)...)
	rows = append(rows, m.labelled("wanted", p.Expect, width)...)
	rows = append(rows, m.liveRows(p, width)...)
	rows = append(rows, m.takenRows(p, width)...)
	rows = append(rows, m.findingRows(p, width)...)
	if a := m.snapshot.State.Assess(p); a.Result != walk.Passed && m.snapshot.State.Status(p.ID).Result == walk.Open {
		for _, because := range a.Because {
			rows = append(rows, m.painted(theme.Faint, m.theme.Pick("○ ", "o ")+because, width)...)
		}
	}
	rows = append(rows, m.labelled("if not", p.Otherwise, width)...)
	return append(rows, m.labelled("basis", p.Basis, width)...)
}

func (m Model) painted(role theme.Role, text string, width int) []string {
	var rows []string
	for _, l := range wrap(theme.Clean(text), width-1) {
		rows = append(rows, m.theme.Paint(role, l))
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
		parts = append(parts, string(name)+" "+m.theme.Paint(shown.Role, shown.String()))
	}
	return flow("now", parts, width, m.theme)
}

// flow sets parts side by side, as many to a row as fit.
func flow(label string, parts []string, width int, t theme.Theme) []string {
	const indent = 8
	var rows []string
	row := ""
	for _, part := range parts {
		if row != "" && theme.Width(row)+2+theme.Width(part) > width-indent-1 {
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
	for i := range rows {
		lead := strings.Repeat(" ", indent)
		if i == 0 {
			lead = t.Paint(theme.Faint, t.Fit(label, indent))
		}
		rows[i] = lead + rows[i]
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
		words += " " + quantity.Engineering(*r.Value, r.Unit, 4)
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

// captureRows is the chart of a capture and what can be said already.
func (m Model) captureRows(c commission.Progress, width, height int) []string {
	words := m.captureWords(c, width)
	chartHeight := height - len(words)
	if chartHeight < chart.LeastHeight {
		return cut(words, height)
	}
	return append(strings.Split(m.chartOf(c).View(m.theme, width-1, chartHeight), "\n"), words...)
}

func (m Model) captureWords(c commission.Progress, width int) []string {
	lead := fmt.Sprintf("%s %.1f s", c.Phase, c.Elapsed.Seconds())
	if c.Attempt > 0 {
		lead = fmt.Sprintf("attempt %d %s", c.Attempt, lead)
	}
	if c.Phase == commission.Armed {
		lead += ", waits for the plant"
	}
	parts := append([]string{lead}, c.SoFar...)
	if r := c.Rise; r != nil {
		check := fmt.Sprintf("rise at %.2f s at least %.0f V", r.At.Seconds(), r.AtLeast)
		if r.Seen != nil {
			check += fmt.Sprintf(": %.0f V", *r.Seen)
		}
		parts = append(parts, check)
	}
	if c.Line != nil {
		parts = append(parts, fmt.Sprintf("%d steps, no load %.1f V, droop %s", len(c.Steps), c.Line.NoLoad, quantity.Engineering(c.Line.Droop, "V/A", 3)))
	}
	return flow("", parts, width+8, m.theme)
}

// chartOf is a capture as a chart.
func (m Model) chartOf(c commission.Progress) chart.Chart {
	picture := chart.Chart{Y: chart.Scale{Label: "bus", Unit: "V"}, X: chart.Scale{Label: "time", Unit: "s"}, Cursor: m.cursor}
	if len(c.Band.X) > 0 {
		picture.Bands = []chart.Band{{Name: "predicted", X: c.Band.X, Low: c.Band.Low, High: c.Band.High}}
		picture.Nominal = []chart.Series{{Name: "nominal", X: c.Band.X, Y: c.Band.Nominal}}
	}
	if c.Kind == capture.Droop {
		return m.droopChart(picture, c)
	}
	picture.Traces = []chart.Series{{Name: "measured", X: c.X, Y: c.Y, MaxStep: gapOf(c.X)}}
	if r := c.Rise; r != nil && r.Seen == nil {
		picture.Markers = append(picture.Markers, chart.Marker{Label: "half rise", At: r.At.Seconds(), Upright: true})
	}
	return picture
}

func (m Model) droopChart(picture chart.Chart, c commission.Progress) chart.Chart {
	picture.X = chart.Scale{Label: "bus current", Unit: "A"}
	picture.Points = []chart.Series{{Name: "measured", X: c.X, Y: c.Y}}
	if c.Line == nil || len(c.Steps) < 3 {
		return picture
	}
	low, high := c.Steps[0].Current, c.Steps[0].Current
	for _, s := range c.Steps {
		low, high = min(low, s.Current), max(high, s.Current)
	}
	line := chart.Series{Name: "fitted"}
	confidence := chart.Band{Name: "confidence"}
	for i := range 21 {
		x := low + (high-low)*float64(i)/20
		line.X, line.Y = append(line.X, x), append(line.Y, c.Line.At(x))
		u := 2 * c.Line.StandardErrorAt(x)
		confidence.X = append(confidence.X, x)
		confidence.Low, confidence.High = append(confidence.Low, c.Line.At(x)-u), append(confidence.High, c.Line.At(x)+u)
	}
	picture.Fitted, picture.Bands = []chart.Series{line}, append(picture.Bands, confidence)
	return picture
}

// gapOf is the step between samples beyond which a trace is broken: five times the usual one.
func gapOf(x []float64) float64 {
	if len(x) < 3 {
		return 0
	}
	return 5 * (x[len(x)-1] - x[0]) / float64(len(x)-1)
}

// promptRows are the fields to type, and below them what the point wants.
func (m Model) promptRows(width, height int) []string {
	rows := append([]string{""}, m.painted(theme.Title, m.prompt.title, width)...)
	rows = append(rows, "")
	rows = append(rows, strings.Split(m.prompt.form.View(m.theme, width-1, max(height-len(rows), 0)), "\n")...)
	if m.prompt.meter != "" {
		rows = append(rows, "", m.theme.Paint(theme.Faint, "Ctrl+T fills in what the simulated plant's meter shows"))
	}
	if p := m.current(); p.Expect != "" {
		rows = append(rows, "")
		rows = append(rows, m.labelled("wanted", p.Expect, width)...)
	}
	return cut(rows, height)
}
