package walkview

import (
	"fmt"
	"time"

	"chargehand/commission"
	"chargehand/commission/capture"
	"chargehand/commission/quantity"
	"chargehand/commission/signal"
	"chargehand/commission/walk"
	"chargehand/tui/far"
	"chargehand/tui/theme"
)

// farView is the few readings that matter now, to be read from the switchboard door.
func (m Model) farView() string {
	p := m.current()
	face := far.Face{Title: p.ID + " " + theme.Clean(p.Title), Link: m.farLink(), Hint: "f or Esc: back"}
	if m.snapshot.State.IsRehearsal() {
		face.Banner = "REHEARSAL"
	}
	if alarm := m.Alarm(); alarm != "" {
		face.Banner = alarm
	}
	face.Figures = m.figures(p)
	face.Countdown = m.countdown()
	return face.View(m.theme, m.width, m.height)
}

func (m Model) farLink() far.Link {
	if m.snapshot.Link.Up {
		return far.Link{Text: fmt.Sprintf("link good %.0f/s", m.snapshot.Link.Rate), Role: theme.Normal}
	}
	return far.Link{Text: "NO LINK", Role: theme.Alarm}
}

// figures are the readings of the open point: before the bypass closes the difference across it first.
func (m Model) figures(p walk.Point) []far.Figure {
	unproved := m.unproved()
	figure := func(label string, name signal.Name, limit string) far.Figure {
		return far.Reading(m.theme, label, m.snapshot.Reading(name), unproved[name], m.snapshot.Now, m.maxAge(), limit)
	}
	if p.Stage == 5 && p.ID != "charge.source" {
		return []far.Figure{m.difference(), figure("bus", signal.BusVoltage, ""), figure("source", signal.SourceVoltage, "")}
	}
	var figures []far.Figure
	for _, name := range p.Signals {
		if name.IsState() || len(figures) == 3 {
			continue
		}
		if _, ok := m.snapshot.Live[name]; ok {
			figures = append(figures, figure(string(name), name, m.limitOf(p, name)))
		}
	}
	if len(figures) == 0 {
		figures = []far.Figure{figure("bus", signal.BusVoltage, ""), figure("source", signal.SourceVoltage, "")}
	}
	return figures
}

// difference is source less bus as one reading, as old as the older of the two.
func (m Model) difference() far.Figure {
	source, bus := m.snapshot.Reading(signal.SourceVoltage), m.snapshot.Reading(signal.BusVoltage)
	d := source
	if !bus.Quality.HasValue() {
		d = bus
	}
	if d.Quality.HasValue() {
		d.Value = source.Value - bus.Value
		if bus.At.Before(d.At) {
			d.At = bus.At
		}
	}
	limit := ""
	if closing := m.snapshot.State.Site().Precharge.ClosingDifference; closing.IsGiven() {
		limit = "closes at " + quantity.Engineering(float64(closing.Nominal), "V", 3)
	}
	unproved := m.unproved()
	figure := far.Reading(m.theme, "difference", d, unproved[signal.SourceVoltage] || unproved[signal.BusVoltage], m.snapshot.Now, m.maxAge(), limit)
	if reachedDifference(m.snapshot) {
		figure.Role = theme.Normal
	}
	return figure
}

func (m Model) limitOf(p walk.Point, name signal.Name) string {
	for _, c := range p.Accept {
		if c.What == string(name) {
			return limitWords(c)
		}
	}
	return ""
}

// countdown is the device's time-out while a pre-charge runs, the end of a discharge's longest time, or the cool-down.
func (m Model) countdown() far.Countdown {
	c := m.snapshot.Capture
	timeout := m.snapshot.State.Site().Precharge.Timeout
	switch {
	case c != nil && c.Kind == capture.Precharge && c.Phase == commission.Running && timeout.IsGiven():
		left := time.Duration(float64(timeout.Nominal)*float64(time.Second)) - c.Elapsed
		return far.Countdown{Label: "time-out in", Left: max(left, 0), Role: theme.Abnormal}
	case c != nil && c.Phase == commission.Running && c.Longest > 0:
		return far.Countdown{Label: "at the latest in", Left: max(c.Longest-c.Elapsed, 0)}
	}
	if left := m.snapshot.State.CoolsFor(m.snapshot.Now); left > 0 {
		return far.Countdown{Label: "resistor cools", Left: left, Role: theme.Abnormal}
	}
	return far.Countdown{}
}
