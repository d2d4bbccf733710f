package oneline

import (
	"fmt"
	"strings"

	"chargehand/commission/signal"
	"chargehand/tui/theme"
)

// bus draws the bus bar at column x over the rows top to bottom and what hangs on it to the right, in width columns.
func (d *drawing) bus(x, top, bottom, width int) {
	d.Bar(x, top, x, bottom, theme.Symbol)
	y := top
	d.labelled(x+2, y, width, "bus", d.show(signal.BusVoltage))
	y++
	if d.has(signal.BusCurrent) {
		d.reading(x+2, y, width, d.show(signal.BusCurrent))
		y++
	}
	list, more := d.plan.within(bottom+1-y, d.chopperWorks())
	for _, h := range list {
		d.hanger(x, y, width, h)
		y++
	}
	if more > 0 {
		d.Within(x+2, y, width, fmt.Sprintf("and %d more", more), theme.Faint)
	}
}

// chopperWorks tells whether the chopper burns power at this moment, which must be seen wherever there is one row left.
func (d *drawing) chopperWorks() bool {
	s := d.show(signal.ChopperActive)
	return s.HasValue() && s.Value != 0
}

func (d *drawing) hanger(x, y, width int, h hanger) {
	role := theme.Symbol
	name := h.name
	if h.class == choppers && d.has(signal.ChopperActive) {
		switch s := d.show(signal.ChopperActive); {
		case !s.HasValue():
			name, role = "chopper unknown", theme.Unknown
		case d.chopperWorks():
			name, role = "chopper ON", theme.Abnormal
		default:
			name = "chopper off"
		}
	}
	d.Text(x+1, y, d.theme.Pick(h.symbol[0], h.symbol[1]), role)
	value := d.theme.Plain(h.value)
	room := width - 4
	if theme.Width(name)+1+theme.Width(value) > room && theme.Width(value) < room/2 && width > 20 {
		name = d.theme.Clip(name, room-1-theme.Width(value))
	}
	text := name
	if theme.Width(name)+1+theme.Width(value) <= room {
		text += " " + value
	}
	if role == theme.Symbol {
		role = theme.Text
	}
	d.Within(x+6, y, room, text, role)
}

// elsewhere are the readings that have no node in the drawing.
var elsewhere = []struct {
	name  signal.Name
	label string
}{
	{signal.ResistorTemperature, "resistor"},
	{signal.HeatsinkTemperature, "heatsink"},
	{signal.InsulationResistance, "insulation"},
}

// footer writes the readings without a node, and what the marks mean.
func (d *drawing) footer(y int) {
	legend := d.legend()
	room := d.Width() - theme.Width(legend) - 1
	x := 0
	for _, e := range elsewhere {
		if !d.has(e.name) {
			continue
		}
		s := d.show(e.name)
		text := e.label + " " + s.String()
		if x+3+theme.Width(text) > room {
			break
		}
		if x > 0 {
			x = d.Text(x, y, d.theme.Pick(" · ", " | "), theme.Faint)
		}
		x = d.Text(x, y, e.label+" ", theme.Faint)
		x = d.Text(x, y, s.String(), s.Role)
	}
	d.Right(d.Width(), y, d.Width()-x, legend, theme.Faint)
}

func (d *drawing) legend() string {
	if d.anyUnproved() {
		return "? not yet proved"
	}
	return ""
}

// words writes states and readings one after another, for a screen too small to draw on.
func (d *drawing) words() {
	bypass, bypassWord := d.contact(signal.BypassClosed)
	precharge, prechargeWord := d.contact(signal.PrechargeClosed)
	state, stateRole := d.bridgeState()
	_, flow, flowRole := d.flow(d.plan)
	pieces := []struct {
		text string
		role theme.Role
	}{
		{"source " + d.show(signal.SourceVoltage).String(), d.show(signal.SourceVoltage).Role},
		{"bus " + d.show(signal.BusVoltage).String(), d.show(signal.BusVoltage).Role},
		{"pre-charge " + prechargeWord, precharge.role()},
		{"bypass " + bypassWord, bypass.role()},
		{"converter " + strings.TrimPrefix(state, "! "), stateRole},
		{"current " + d.show(signal.SourceCurrent).String(), d.show(signal.SourceCurrent).Role},
		{"flow " + strings.TrimPrefix(flow, "flow "), flowRole},
	}
	x, y := 0, 0
	for _, p := range pieces {
		if x > 0 && x+2+theme.Width(p.text) > d.Width() {
			x, y = 0, y+1
		}
		if x > 0 {
			x += 2
		}
		x = d.Within(x, y, d.Width()-x, p.text, p.role)
	}
}
