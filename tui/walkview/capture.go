package walkview

import (
	"fmt"
	"slices"
	"strings"

	"chargehand/commission"
	"chargehand/commission/capture"
	"chargehand/commission/quantity"
	"chargehand/commission/walk"
	"chargehand/tui/chart"
	"chargehand/tui/theme"
)

// chartAt is the capture that a point shows: the one under way, or the last one that the point rests on.
func (m Model) chartAt(p walk.Point) (commission.Progress, bool) {
	if c := m.snapshot.Capture; c != nil && (c.Point == p.ID || c.Kind == kindOf(p) || p.Stage == m.stageOf(c.Point)) {
		return *c, true
	}
	c, ok := m.kept[kindOf(p)]
	return c, ok
}

// kindOf is the kind of capture that a point arms or rests on.
func kindOf(p walk.Point) capture.Kind {
	rests := func(id string) bool { return slices.Contains(p.Findings, id) }
	switch {
	case p.Capture != "":
		return p.Capture
	case rests("measured.precharge"), rests("measured.closing"), p.ID == differencePoint:
		return capture.Precharge
	case rests("measured.droop"), rests("measured.share"):
		return capture.Droop
	case rests("measured.discharge"), p.ID == "down.order":
		return capture.Discharge
	}
	return ""
}

func (m Model) isRunning(c commission.Progress) bool {
	now := m.snapshot.Capture
	return now != nil && now.Point == c.Point && now.Kind == c.Kind
}

func (m Model) stageOf(point string) int {
	p, _ := m.snapshot.State.Point(point)
	return p.Stage
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

// captureWords are the lines under the chart: how far it is, the early check, the fit so far.
func (m Model) captureWords(c commission.Progress, width int) []string {
	lead := fmt.Sprintf("%s %.1f s", c.Phase, c.Elapsed.Seconds())
	switch {
	case !m.isRunning(c):
		lead = fmt.Sprintf("captured %.1f s", c.Elapsed.Seconds())
	case c.Phase == commission.Armed:
		lead = "armed, waits for the plant"
	}
	if c.Attempt > 0 {
		lead = fmt.Sprintf("attempt %d: %s", c.Attempt, lead)
	}
	parts := []string{m.theme.Paint(theme.Mandatory, lead)}
	if r := c.Rise; r != nil {
		parts = append(parts, m.riseWords(*r))
	}
	if n := len(c.Steps); c.Kind == capture.Droop {
		parts = append(parts, fmt.Sprintf("%d settled steps", n))
	}
	if c.Line != nil {
		parts = append(parts, fmt.Sprintf("no load %.1f V, droop %s", c.Line.NoLoad, quantity.Engineering(c.Line.Droop, "V/A", 3)))
	}
	for _, s := range c.SoFar {
		parts = append(parts, theme.Clean(s))
	}
	return beside(parts, width-1)
}

// riseWords is the early check: what is wanted, then what was seen.
func (m Model) riseWords(r commission.Rise) string {
	wanted := fmt.Sprintf("%s %.0f V at %.2f s", m.theme.Pick("≥", ">="), r.AtLeast, r.At.Seconds())
	switch {
	case r.Seen == nil:
		return "early rise " + wanted
	case *r.Seen >= r.AtLeast:
		return m.theme.Paint(theme.Normal, fmt.Sprintf("%s rise %.0f V %s", m.theme.Pick("✓", "+"), *r.Seen, wanted))
	}
	return m.theme.Paint(theme.Danger, fmt.Sprintf("%s rise %.0f V, wanted %s", m.theme.Pick("✗", "X"), *r.Seen, wanted))
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
	if touch := m.snapshot.State.Site().Bus.TouchSafe; c.Kind == capture.Discharge && touch != nil {
		picture.Markers = append(picture.Markers, chart.Marker{Label: "touch-safe", At: float64(touch.Voltage.Nominal)})
	}
	return picture
}

func (m Model) droopChart(picture chart.Chart, c commission.Progress) chart.Chart {
	picture.X = chart.Scale{Label: "bus current", Unit: "A"}
	picture.Points = []chart.Series{{Name: "measured", X: c.X, Y: c.Y}}
	if len(c.Steps) > 0 { // the settled steps tell more than the ways between them
		points := chart.Series{Name: "settled steps"}
		for _, s := range c.Steps {
			points.X, points.Y = append(points.X, s.Current), append(points.Y, s.Voltage)
		}
		picture.Points = []chart.Series{points}
	}
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
