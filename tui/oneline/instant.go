package oneline

import (
	"fmt"
	"math"
	"time"

	"chargehand/commission/signal"
	"chargehand/tui/theme"
)

// instant is what is known at the moment of drawing.
type instant struct {
	live     map[signal.Name]signal.Reading
	unproved map[signal.Name]bool
	now      time.Time
	maxAge   time.Duration
	theme    theme.Theme
}

func (i instant) has(name signal.Name) bool { _, ok := i.live[name]; return ok }

// show gives a reading as it may be shown now. A signal that nothing reads says so.
func (i instant) show(name signal.Name) theme.Shown {
	r, ok := i.live[name]
	if !ok {
		return theme.Shown{Why: "not read", Role: theme.Faint, Value: math.NaN()}
	}
	r.Name = name // the unit belongs to the place where the reading is drawn
	return i.theme.Show(r, i.unproved[name], i.now, i.maxAge)
}

// position is what is known of a contact.
type position uint8

const (
	unknown position = iota
	open
	closed
)

func (p position) role() theme.Role {
	return [...]theme.Role{unknown: theme.Unknown, open: theme.Open, closed: theme.Closed}[p]
}

// contact gives a contact's position and its word. A state that is too old is unknown, whatever it was.
func (i instant) contact(name signal.Name) (position, string) {
	s := i.show(name)
	switch {
	case !i.has(name):
		return unknown, "not read"
	case !s.HasValue():
		return unknown, "unknown"
	case s.Value == 0:
		return open, "open" + s.Mark
	case s.Value == 1:
		return closed, "closed" + s.Mark
	}
	return unknown, "unknown"
}

// difference is the voltage across the bypass: source less star point, or less bus where the star point is not read (the
// freewheel diodes hold the two together while the bus charges). Both readings must be young enough.
func (i instant) difference() (shown theme.Shown, ok bool) {
	other := signal.StarPointVoltage
	if !i.has(other) {
		other = signal.BusVoltage
	}
	if !i.has(signal.SourceVoltage) || !i.has(other) {
		return theme.Shown{}, false
	}
	a, b := i.show(signal.SourceVoltage), i.show(other)
	if !a.HasValue() {
		return a, true
	}
	if !b.HasValue() {
		return b, true
	}
	older := i.live[signal.SourceVoltage]
	if i.live[other].At.Before(older.At) {
		older = i.live[other]
	}
	older.Value, older.Name = a.Value-b.Value, signal.SourceVoltage
	return i.theme.Show(older, a.Mark+b.Mark != "", i.now, i.maxAge), true
}

// flow says which way the power goes, by the first of source current, bus current and power that has a value.
func (i instant) flow(p Plan) (arrow, words string, role theme.Role) {
	for _, name := range []signal.Name{signal.SourceCurrent, signal.BusCurrent, signal.Power} {
		if !i.has(name) {
			continue
		}
		s := i.show(name)
		if !s.HasValue() {
			continue
		}
		least := float64(p.nearZero)
		if name == signal.Power {
			least *= 1000 // watts at the order of a bus of 1 kV
		}
		switch {
		case math.Abs(s.Value) < least:
			return i.theme.Pick("∙", "."), "no flow", theme.Faint
		case s.Value > 0:
			return i.theme.Pick("▸", ">"), "to bus", s.Role
		default:
			return i.theme.Pick("◂", "<"), "to source", s.Role
		}
	}
	return "?", "not known", theme.Unknown
}

// bridgeState is the converter's state in a word: a fault before all else.
func (i instant) bridgeState() (text string, role theme.Role) {
	if s := i.show(signal.Fault); s.HasValue() && s.Value != 0 {
		text = "! FAULT"
		if code := i.show(signal.FaultCode); code.HasValue() {
			text += " " + code.Number
		}
		return text, theme.Alarm
	}
	running, ready := i.show(signal.Running), i.show(signal.Ready)
	switch {
	case running.HasValue() && running.Value != 0:
		return "running" + running.Mark, theme.Normal
	case ready.HasValue() && ready.Value != 0:
		return "ready" + ready.Mark, theme.Text
	case running.HasValue():
		return "stopped" + running.Mark, theme.Text
	case ready.HasValue():
		return "not ready" + ready.Mark, theme.Text
	case i.has(signal.Running) || i.has(signal.Ready):
		return "unknown", theme.Unknown
	}
	return "not read", theme.Faint
}

func (i instant) mode() string {
	s := i.show(signal.Mode)
	if !s.HasValue() {
		return ""
	}
	switch s.Value {
	case signal.ModeOff:
		return "mode off" + s.Mark
	case signal.ModeVoltage:
		return "voltage mode" + s.Mark
	case signal.ModeCurrent:
		return "current mode" + s.Mark
	}
	return fmt.Sprintf("mode %s", s.Number)
}

// anyUnproved tells whether the legend must explain the question mark.
func (i instant) anyUnproved() bool {
	for name := range i.live {
		if i.unproved[name] && i.show(name).HasValue() {
			return true
		}
	}
	return false
}
