package oneline

import (
	"chargehand/commission/signal"
	"chargehand/tui/theme"
)

// compact draws seven rows: the pre-charge branch, the plus rail with the bypass in it, three rows of states and readings
// below, the minus rail, and what has no node of its own.
//
//	battery          fuse 500 A  ┌─[100 Ω]───◦╱  ◦──┐  +1.7 kW         ┃ bus 412.6 V
//	  ┌──────◦━━━┽────[────]─────┴──────◦╱  ◦───────┴─┬─3×∩∩∩──[▷├]────┨ +3.2 A
func (d *drawing) compact() {
	const branch, rail, minus, foot = 0, 1, 5, 6
	spare := d.Width() - CompactWidth
	list := 15 + min(spare/2, 16)
	gap := (spare - (list - 15)) / 4

	bar := d.Width() - list - 2
	star := bar - 18 - gap
	node := 27 + 2*gap
	fuse := 17 + gap

	d.Wire(2, rail, bar, rail, theme.Wire)
	d.Wire(2, minus, bar, minus, theme.Wire)
	d.Text(0, rail, "+", theme.Faint)
	d.Text(0, minus, d.theme.Pick("−", "-"), theme.Faint)
	d.source(2, 2, rail, minus, 2)
	d.Within(0, branch, fuse-1, d.plan.kind, theme.Faint)
	d.reading(4, 4, node-6, d.show(signal.SourceVoltage))

	p, word := d.contact(signal.MainClosed)
	d.isolator(8, rail, 5, p, false)
	d.Text(6, 2, "isolator", theme.Faint)
	d.Text(6, 3, word, p.role())

	d.fuse(fuse, rail)
	d.Within(fuse-1, branch, node-fuse, d.fuseLabel(), theme.Faint)
	if d.plan.blockingDiode {
		d.diode(node-3, rail)
	}
	d.current(fuse-2, 2, node-fuse+1)

	d.compactBranch(node, star, branch, rail)
	d.compactConverter(star, bar, rail)
	if f := d.plan.filter; f != nil {
		d.compactFilter(*f, node, star, rail, minus)
	}
	d.bus(bar, 0, minus-1, list)
	d.Text(bar, minus, d.theme.Pick("╴", "-"), theme.Wire)
	d.Text(bar+1, minus, "bus "+d.theme.Pick("−", "-"), theme.Faint)
	d.footer(foot)
}

func (d *drawing) fuse(x, y int) {
	if !d.plan.hasFuse {
		return
	}
	d.Text(x, y, "[", theme.Symbol)
	d.Text(x+5, y, "]", theme.Symbol)
}

func (d *drawing) fuseLabel() string {
	if !d.plan.hasFuse {
		return "fuse ?"
	}
	return "fuse " + d.theme.Plain(d.plan.fuse)
}

// current writes the source current (or the bus current) with the direction of flow in an arrow and in words below.
func (d *drawing) current(x, y, width int) {
	name := signal.SourceCurrent
	if !d.has(name) {
		name = signal.BusCurrent
	}
	s := d.show(name)
	if !s.HasValue() {
		d.Within(x, y, width, "no value", s.Role)
		d.Within(x, y+1, width, s.Why, s.Role)
		return
	}
	d.reading(x, y, width, s)
	arrow, words, role := d.flow(d.plan)
	d.Within(x, y+1, width, arrow+" "+words, role)
}

func (d *drawing) compactBranch(node, star, branch, rail int) {
	d.Wire(node, branch, star, branch, theme.Wire)
	d.Wire(node, branch, node, rail, theme.Wire)
	d.Wire(star, branch, star, rail, theme.Wire)

	precharge, word := d.contact(signal.PrechargeClosed)
	bypass, bypassWord := d.contact(signal.BypassClosed)
	contact := star - 6
	d.Text(node+2, branch, d.theme.Clip("["+d.theme.Plain(d.plan.resistor)+"]", contact-node-2), theme.Symbol)
	d.contactor(contact, branch, 5, precharge, false)
	d.contactor((node+star)/2-2, rail, 5, bypass, false)

	x := node + 1
	if f := d.plan.filter; f != nil && !f.atStar { // its wire comes down from the node
		x++
	}
	d.stateOf(x, 2, star-x, "bypass", bypassWord, bypass)
	d.stateOf(x, 3, star+2-x, "pre-charge", word, precharge)
	if s, ok := d.difference(); ok {
		d.labelled(x, 4, star+2-x, "difference", s)
	}
}

func (d *drawing) compactConverter(star, bar, rail int) {
	number := "?×"
	if d.plan.phases > 0 && d.plan.phases < 10 {
		number = string(rune('0'+d.plan.phases)) + "×"
	}
	if d.plan.phases != 1 {
		d.Text(star+4, rail, d.theme.Plain(number), theme.Symbol)
	}
	d.arcs(star+6, rail, 3)
	d.Text(bar-7, rail, "[", theme.Symbol)
	d.diode(bar-6, rail)
	d.Text(bar-4, rail, "]", theme.Symbol)

	room := bar - star - 5
	if d.has(signal.Power) {
		d.reading(star+4, 0, room, d.show(signal.Power))
	}
	text, role := d.bridgeState()
	d.Within(star+4, 2, room, text, role)
	if d.has(signal.StarPointVoltage) {
		d.labelled(star+4, 3, room, "star", d.show(signal.StarPointVoltage))
	} else {
		d.Within(star+4, 3, room, d.mode(), theme.Text)
	}
}

func (d *drawing) compactFilter(f filter, node, star, rail, minus int) {
	label := "filter " + d.theme.Plain(f.capacitance)
	if f.atStar {
		d.shunt(star+2, rail, minus, 3, false)
		d.Within(star+4, 4, 13, label, theme.Faint)
		return
	}
	d.shunt(node, rail, minus, 3, false)
	d.Right(node, 4, 8, d.theme.Plain(f.capacitance), theme.Faint)
}
