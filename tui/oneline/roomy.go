package oneline

import (
	"fmt"

	"chargehand/commission/signal"
	"chargehand/tui/theme"
)

// roomy draws twelve rows and a legend: resistor and fuse as boxes, raised blades, each phase with its own choke and
// current.
func (d *drawing) roomy() {
	const rail, minus, foot = 4, 10, 11
	spare := d.Width() - RoomyWidth
	list := 29 + min(spare/2, 16)
	gap := (spare - (list - 29)) / 4

	bar := d.Width() - list - 2
	bridge := bar - 16
	split := bridge - 18 - gap
	star := split - 16 - gap
	node := 36 + gap
	fuse := 23 + gap/2

	d.Wire(4, rail, split, rail, theme.Wire)
	d.Wire(4, minus, bar, minus, theme.Wire)
	d.Text(2, rail, "+", theme.Faint)
	d.Text(2, minus, d.theme.Pick("−", "-"), theme.Faint)
	d.source(4, 6, rail, minus, 3)
	d.Within(0, 2, 14, d.plan.kind, theme.Faint)
	d.reading(9, 8, node-10, d.show(signal.SourceVoltage))

	p, word := d.contact(signal.MainClosed)
	d.isolator(11, rail, 7, p, true)
	d.Text(11, 5, "isolator", theme.Faint)
	d.Text(11, 6, word, p.role())

	if d.plan.hasFuse {
		d.Box(fuse, rail-1, fuse+9, rail+1, theme.Symbol)
	}
	d.Within(fuse, 2, node-fuse, d.fuseLabel(), theme.Faint)
	if d.plan.blockingDiode {
		d.diode(node-4, rail)
	}
	d.current(fuse, 6, node-fuse-1)

	d.roomyBranch(node, star, rail)
	d.roomyConverter(star, split, bridge, bar, rail, minus)
	if f := d.plan.filter; f != nil {
		x, y := star+6, 7
		if !f.atStar { // below the words on the direction of flow
			x, y = node-2, 8
		}
		d.shunt(x, rail, minus, y, true)
		d.Text(x+4, 9, d.theme.Plain("filter "+f.capacitance), theme.Faint)
	}
	d.bus(bar, 0, minus-1, list)
	d.Text(bar, minus, d.theme.Pick("╴", "-"), theme.Wire)
	d.Text(bar+1, minus, "bus "+d.theme.Pick("−", "-"), theme.Faint)
	d.footer(foot)
}

func (d *drawing) roomyBranch(node, star, rail int) {
	const branch = 2
	d.Wire(node, branch, star, branch, theme.Wire)
	d.Wire(node, branch, node, rail, theme.Wire)
	d.Wire(star, branch, star, rail, theme.Wire)

	label := d.theme.Clip(d.theme.Plain(d.plan.resistor), 12)
	width := theme.Width(label) + 3
	d.Box(node+3, branch-1, node+3+width, branch+1, theme.Symbol)
	d.Text(node+4, branch, " "+label+" ", theme.Symbol)

	precharge, word := d.contact(signal.PrechargeClosed)
	bypass, bypassWord := d.contact(signal.BypassClosed)
	d.contactor(star-10, branch, 7, precharge, true)
	d.contactor(star-10, rail, 7, bypass, true)
	d.stateOf(node+3, 0, star-node-3, "pre-charge", word, precharge)
	d.stateOf(star-12, rail+1, 14, "bypass", bypassWord, bypass)
	if s, ok := d.difference(); ok {
		d.labelled(star-16, rail+2, 19, "difference", s)
	}
}

func (d *drawing) roomyConverter(star, split, bridge, bar, rail, minus int) {
	d.Within(star+2, rail-2, split-star-3, "star point", theme.Faint)
	if d.has(signal.StarPointVoltage) {
		d.reading(star+2, rail-1, split-star-3, d.show(signal.StarPointVoltage))
	}

	d.phases(split, bridge, rail)
	d.Box(bridge, rail-3, bridge+11, rail+3, theme.Symbol)
	d.Within(bridge, 0, 12, "bridge", theme.Faint)
	d.Wire(bridge+11, rail, bar, rail, theme.Wire)
	d.Wire(bridge+1, rail+3, bridge+1, minus, theme.Wire)
	text, role := d.bridgeState()
	end := d.Within(bridge+3, rail+4, bar-bridge-4, text, role)
	if mode := d.mode(); mode != "" && theme.Width(mode) < bar-end-1 {
		d.Text(end, rail+4, ", "+mode, theme.Text)
	} else {
		d.Within(bridge-len(mode)-1, rail+4, len(mode), mode, theme.Text)
	}
	if d.has(signal.Power) {
		d.reading(bridge+3, rail+5, bar-bridge-4, d.show(signal.Power))
	}
}

var phaseCurrents = []signal.Name{signal.PhaseCurrent1, signal.PhaseCurrent2, signal.PhaseCurrent3}

// phases draws the chokes between the star point and the bridge, three at most; the number is written above them.
func (d *drawing) phases(split, bridge, rail int) {
	rows := []int{rail - 2, rail, rail + 2}
	switch d.plan.phases {
	case 0, 1:
		rows = rows[1:2]
	case 2:
		rows = []int{rail - 2, rail + 2}
	}
	label := d.plan.chokes()
	if d.plan.choke != "" {
		label += " " + d.theme.Plain(d.plan.choke)
	}
	d.Within(split, 0, bridge-split, label, theme.Faint)
	for i, y := range rows {
		d.Wire(split, y, bridge, y, theme.Wire)
		d.Wire(split, y, split, rail, theme.Wire)
		d.arcs(split+3, y, 5)
		d.diode(bridge+5, y)
		d.Wire(bridge+2, y, bridge+4, y, theme.Wire)
		d.Wire(bridge+7, y, bridge+9, y, theme.Wire)
		if d.has(phaseCurrents[i]) {
			d.labelled(split+2, y-1, bridge-split-2, fmt.Sprintf("phase %d", i+1), d.show(phaseCurrents[i]))
		}
	}
}
