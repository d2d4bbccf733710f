package deskview

import (
	"math"

	"github.com/charmbracelet/bubbles/key"
	tea "github.com/charmbracelet/bubbletea"

	"chargehand/commission/finding"
	"chargehand/commission/window"
	"chargehand/tui/chart"
)

// windowChart is the source's voltage over its state of charge, at rest and loaded, below the lowest voltage of the bus: where
// they meet, the diodes conduct. A site without a table of the state of charge has it over the rest voltage.
func (m Model) windowChart() chart.Chart {
	picture := chart.Chart{Title: "window: source voltage below the bus", Y: chart.Scale{Label: "voltage", Unit: "V"},
		X: chart.Scale{Label: "state of charge", Unit: "%"}, Cursor: m.cursor}
	rest, band, low := chart.Series{Name: "at rest"}, chart.Band{Name: "loaded"}, chart.Series{Name: "nominal"}
	for _, row := range window.Table(m.site) {
		x := 100 * float64(row.StateOfCharge)
		if math.IsNaN(x) {
			x, picture.X = float64(row.Rest), chart.Scale{Label: "rest voltage", Unit: "V"}
		}
		rest.X, rest.Y = append(rest.X, x), append(rest.Y, float64(row.Rest))
		if !math.IsNaN(float64(row.Terminal.Nominal)) {
			low.X, low.Y = append(low.X, x), append(low.Y, float64(row.Terminal.Nominal))
			band.X, band.Low, band.High = append(band.X, x), append(band.Low, float64(row.Terminal.Low)), append(band.High, float64(row.Terminal.High))
		}
	}
	picture.Bands, picture.Nominal, picture.Fitted = []chart.Band{band}, []chart.Series{low}, []chart.Series{rest}
	for _, limit := range []struct{ id, label string }{{"window.bus-low", "lowest bus"}, {"window.source-high", "charging"}} {
		if f, ok := m.find(limit.id); ok && f.State == finding.Finite {
			at := f.Value.High
			if limit.id == "window.bus-low" {
				at = f.Value.Low
			}
			picture.Markers = append(picture.Markers, chart.Marker{Label: limit.label, At: at})
		}
	}
	if trip := m.site.Bus.UnderVoltageTrip; trip.IsGiven() {
		picture.Markers = append(picture.Markers, chart.Marker{Label: "trip", At: float64(trip.Nominal)})
	}
	return picture
}

func (m Model) find(id string) (finding.Finding, bool) {
	for _, f := range m.findings {
		if f.ID == id {
			return f, true
		}
	}
	return finding.Finding{}, false
}

// read moves the chart's cursor by a fiftieth of the axis.
func (m Model) read(press tea.KeyMsg) Model {
	rows := window.Table(m.site)
	if len(rows) < 2 {
		return m
	}
	low, high := 100*float64(rows[0].StateOfCharge), 100*float64(rows[len(rows)-1].StateOfCharge)
	if math.IsNaN(low) {
		low, high = float64(rows[0].Rest), float64(rows[len(rows)-1].Rest)
	}
	at := high
	switch {
	case key.Matches(press, m.keys.CursorLeft, m.keys.Left):
		if m.cursor != nil {
			at = max(low, *m.cursor-(high-low)/50)
		}
	case key.Matches(press, m.keys.CursorRight, m.keys.Right):
		if m.cursor != nil {
			at = min(high, *m.cursor+(high-low)/50)
		}
	default:
		return m
	}
	m.cursor = &at
	return m
}
