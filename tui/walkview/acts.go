package walkview

import (
	"context"
	"fmt"
	"math"
	"slices"
	"strings"

	tea "github.com/charmbracelet/bubbletea"

	"chargehand/commission"
	"chargehand/commission/capture"
	"chargehand/commission/unattended"
	"chargehand/commission/walk"
)

// readMeterAct is an act of this screen's own: the plant's hand reads the meter at the open bypass while the charge has
// settled, for the point whose turn comes later.
const readMeterAct = "read the meter"

// differencePoint is where what was read at the open bypass belongs.
const differencePoint = "charge.difference"

// actsAt are what the plant's hand does at a point, in order.
func actsAt(point string) []string {
	switch point {
	case "charge.rise":
		return []string{unattended.BypassWithhold, unattended.PrechargeClose, readMeterAct, unattended.BypassRelease}
	case differencePoint:
		return nil // the capture at charge.rise has had it all
	}
	return unattended.Acts(point)
}

// actWords says an act of the simulated plant's console in the words of the walk.
func actWords(act string) string {
	words := map[string]string{
		unattended.IsolatorClose:  "close the isolator",
		unattended.PrechargeClose: "close the pre-charge",
		unattended.PrechargeOpen:  "open the pre-charge",
		unattended.BypassWithhold: "lock the bypass out",
		unattended.BypassRelease:  "let the bypass close",
		unattended.PulsesRelease:  "release the pulses",
		unattended.InfeedsOn:      "connect the other infeeds",
		unattended.InfeedsOff:     "trip the other infeeds",
		unattended.LoadOff:        "take the load off",
		unattended.Regenerate:     "feed power back",
		unattended.PowerMode:      "change to current mode",
		unattended.VoltageMode:    "change to voltage mode",
		unattended.EverythingOff:  "switch everything off",
		unattended.EarthTest:      "put the test resistor on a pole",
		unattended.EarthTestOff:   "take the test resistor off",
		unattended.SourceWithdraw: "have the battery manager withdraw",
		unattended.SourceBack:     "have the battery manager permit again",
		unattended.ReportDropped:  "take the bypass report away",
		unattended.ReportBack:     "put the bypass report back",
		unattended.OverVoltageOK:  "put the over-voltage threshold back",
		unattended.UnderVoltageOK: "put the under-voltage threshold back",
		unattended.Stop:           "press the emergency stop",
		unattended.Reset:          "reset the fault",
		readMeterAct:              "read the meter",
	}
	if w, ok := words[act]; ok {
		return w
	}
	for verb, words := range map[string]string{"over-voltage ": "move the over-voltage threshold to ", "under-voltage ": "move the under-voltage threshold to "} {
		if rest, ok := strings.CutPrefix(act, verb); ok {
			return words + rest
		}
	}
	if rest, ok := strings.CutPrefix(act, "load "); ok {
		return "put " + rest + " of the load on"
	}
	return act
}

// nextAct is what the plant's hand does at the next press, and why not now; empty where it has nothing to do.
func (m Model) nextAct() (act, wait string) {
	if m.session.Operator == nil {
		return "", ""
	}
	c := m.snapshot.Capture
	if c != nil && c.OpenNow != "" {
		return unattended.PrechargeOpen, ""
	}
	acts := actsAt(m.point)
	if m.acts >= len(acts) {
		return "", ""
	}
	act = acts[m.acts]
	p := m.current()
	armed := c != nil && c.Kind == m.captureWanted(p)
	if p.Capture == capture.Step {
		return act, waitAtTrip(act, armed)
	}
	switch {
	case m.captureWanted(p) != "" && !armed:
		if !captured(m.snapshot.State, p) && p.ID != "down.discharge" {
			return act, "arm the capture"
		}
		if p.Capture != "" {
			return "", ""
		}
	case p.Capture == capture.Discharge && c.Phase == commission.Running:
		return "", "" // down.order has switched everything off
	case act == readMeterAct && c != nil:
		if left := m.settlesIn(*c); left > 0 {
			return act, fmt.Sprintf("settles for %.0f s", math.Ceil(left))
		}
	}
	return act, ""
}

// waitAtTrip says what an act at a trip waits for: what provokes it for the armed capture, what puts the plant back for its
// end. What only prepares waits for nothing.
func waitAtTrip(act string, armed bool) string {
	switch {
	case act == unattended.VoltageMode || strings.HasPrefix(act, "load "):
		return ""
	case putsBack(act) && armed:
		return "when the plant has answered"
	case !putsBack(act) && !armed:
		return "arm the capture"
	}
	return ""
}

func putsBack(act string) bool {
	return slices.Contains([]string{unattended.EarthTestOff, unattended.SourceBack, unattended.ReportBack, unattended.OverVoltageOK,
		unattended.UnderVoltageOK, unattended.BypassRelease, unattended.Reset, unattended.PulsesRelease}, act)
}

// captureWanted is the capture during which a point's acts are done; empty where none is needed.
func (m Model) captureWanted(p walk.Point) capture.Kind {
	if p.ID == "down.order" {
		return capture.Discharge
	}
	return p.Capture
}

// settlesIn is how many seconds a running pre-charge needs until five time constants are over.
func (m Model) settlesIn(c commission.Progress) float64 {
	f, ok := m.snapshot.State.Finding("precharge.time-constant")
	if !ok || c.Phase != commission.Running {
		return 0
	}
	return 5*f.Value.Nominal - c.Elapsed.Seconds()
}

// operate has the simulated plant's hand do the next act.
func (m Model) operate() (Model, tea.Cmd) {
	if m.session.Operator == nil {
		return m.refuse("whoever operates the plant does so with its own controls"), nil
	}
	act, wait := m.nextAct()
	switch {
	case act == "":
		return m.refuse("nothing to operate at " + m.point), nil
	case wait != "" && act != readMeterAct:
		return m.refuse(wait), nil
	case act == readMeterAct:
		p, _ := m.snapshot.State.Point(differencePoint)
		m.acts++
		return m, m.readMeter(p.Hand)
	}
	if act != unattended.PrechargeOpen || m.acts < len(actsAt(m.point)) && actsAt(m.point)[m.acts] == act {
		m.acts++
	}
	operator := m.session.Operator
	return m, func() tea.Msg { return operatedMsg{act, operator.Do(context.Background(), act)} }
}

func (m Model) operated(msg operatedMsg) Model {
	if msg.err != nil {
		m.acts = max(0, m.acts-1)
		return m.refuse(msg.err.Error())
	}
	return m.say("plant: " + actWords(msg.act))
}

// metered takes what the plant's hand has read at the open bypass.
func (m Model) metered(msg measuredMsg) (Model, tea.Cmd) {
	instruments := m.snapshot.State.Instruments()
	if len(msg.values) == 0 || len(instruments) == 0 {
		return m.refuse("nothing was read: " + strings.Join(append(msg.because, "no instrument is entered")[:1], "")), nil
	}
	p, _ := m.snapshot.State.Point(differencePoint)
	return m.note(p, msg.values, instruments[0])
}
