package simulator

import (
	"errors"
	"fmt"
	"math"
	"strings"
	"time"

	"chargehand/commission/quantity"
	"chargehand/protocol/circuit"
)

// Verb is what an act does.
type Verb string

// The verbs.
const (
	Isolator       Verb = "isolator"
	Precharge      Verb = "precharge"
	Bypass         Verb = "bypass"
	Release        Verb = "release"
	Block          Verb = "block"
	SetMode        Verb = "mode"
	Setpoint       Verb = "setpoint"
	Droop          Verb = "droop"
	PowerReference Verb = "power"
	ChargeLimit    Verb = "charge-limit"
	DischargeLimit Verb = "discharge-limit"
	Load           Verb = "load"
	Resistive      Verb = "resistive"
	Regenerate     Verb = "regenerate"
	Infeed         Verb = "infeed"
	Discharge      Verb = "discharge"
	EmergencyStop  Verb = "stop"
	Reset          Verb = "reset"
	Withhold       Verb = "withhold"
	DropReport     Verb = "drop-report"
	Withdraw       Verb = "withdraw"
	EarthTest      Verb = "earth-test"
	OverVoltage    Verb = "over-voltage"
	UnderVoltage   Verb = "under-voltage"
)

// Act is one thing that the operator does.
type Act struct {
	Verb     Verb
	On       bool    // close, on, withhold; voltage mode for SetMode
	Value    float64 // in V, V/A, W, A or Ω; a fraction where Fraction is set
	Fraction bool    // Value is a part of load.power or load.regeneration
	Target   string  // the infeed; empty: all
}

// grammar is one line of the operator's vocabulary.
type grammar struct {
	verb    Verb
	form    string
	example string
	does    string
	read    func(rest string) (Act, error)
}

// switched reads one of two words.
func switched(yes, no string) func(string) (Act, error) {
	return func(rest string) (Act, error) {
		switch rest {
		case yes:
			return Act{On: true}, nil
		case no:
			return Act{}, nil
		}
		return Act{}, fmt.Errorf("read %q, wanted %s or %s", rest, yes, no)
	}
}

// bare takes nothing.
func bare(rest string) (Act, error) {
	if rest != "" {
		return Act{}, fmt.Errorf("read %q, wanted nothing more", rest)
	}
	return Act{On: true}, nil
}

// amount reads a quantity.
func amount[Q quantity.Scalar](rest string) (Act, error) {
	e, refusal := quantity.Parse[Q](rest, quantity.Rule{})
	if refusal != nil {
		return Act{}, fmt.Errorf("read %s, wanted %s, for example %s", refusal.Read, refusal.Wanted, refusal.Example)
	}
	return Act{On: true, Value: float64(e.Nominal)}, nil
}

// amountOr reads a quantity or one word that stands for 0.
func amountOr[Q quantity.Scalar](word string) func(string) (Act, error) {
	return func(rest string) (Act, error) {
		if rest == word {
			return Act{}, nil
		}
		return amount[Q](rest)
	}
}

// powerOrShare reads a power or a percentage.
func powerOrShare(rest string) (Act, error) {
	if strings.HasSuffix(rest, "%") {
		a, err := amount[quantity.Ratio](rest)
		a.Fraction = true
		return a, err
	}
	if rest == "off" || rest == "0" {
		return Act{}, nil
	}
	return amount[quantity.Power](rest)
}

func infeed(rest string) (Act, error) {
	word, name, _ := strings.Cut(rest, " ")
	a, err := switched("on", "off")(word)
	a.Target = strings.TrimSpace(name)
	return a, err
}

func vocabulary() []grammar {
	return []grammar{
		{Isolator, "isolator close|open", "isolator close", "moves the source isolator", switched("close", "open")},
		{Precharge, "precharge close|open", "precharge close", "starts the pre-charge, or breaks it off", switched("close", "open")},
		{Bypass, "bypass close|open", "bypass open", "moves the bypass by hand; closing is refused above the closing difference", switched("close", "open")},
		{Release, "release", "release", "lets the bridge pulse in the mode that is set", bare},
		{Block, "block", "block", "stops the pulses; the diodes stay", bare},
		{SetMode, "mode voltage|current", "mode voltage", "sets what the bridge regulates", switched("voltage", "current")},
		{Setpoint, "setpoint VOLTAGE", "setpoint 1030 V", "sets the no-load voltage", amount[quantity.Voltage]},
		{Droop, "droop VOLTS-PER-AMPERE", "droop 136 mV/A", "sets the droop", amount[quantity.Droop]},
		{PowerReference, "power POWER", "power -50 kW", "sets the power to the bus in current mode", amount[quantity.Power]},
		{ChargeLimit, "charge-limit CURRENT", "charge-limit 100 A", "limits the current into the source", amount[quantity.Current]},
		{DischargeLimit, "discharge-limit CURRENT", "discharge-limit 100 A", "limits the current out of the source", amount[quantity.Current]},
		{Load, "load POWER|PER-CENT|off", "load 50 %", "sets the load, in per cent of load.power", powerOrShare},
		{Resistive, "resistive RESISTANCE|off", "resistive 20 Ω", "switches a load resistor on the bus", amountOr[quantity.Resistance]("off")},
		{Regenerate, "regenerate POWER|PER-CENT|off", "regenerate 50 %", "feeds power back into the bus, in per cent of load.regeneration", powerOrShare},
		{Infeed, "infeed on|off [NAME]", "infeed on shore rectifier", "switches one other infeed, or all", infeed},
		{Discharge, "discharge", "discharge", "shuts down in order: load and pulses off, bypass, infeeds and isolator open", bare},
		{EmergencyStop, "stop", "stop", "emergency stop: pulses, then contactors", bare},
		{Reset, "reset", "reset", "clears a fault; nothing starts by itself", bare},
		{Withhold, "withhold on|off", "withhold on", "keeps the device from closing the bypass", switched("on", "off")},
		{DropReport, "drop-report on|off", "drop-report on", "takes the bypass's report away", switched("on", "off")},
		{Withdraw, "withdraw on|off", "withdraw on", "the source's manager withdraws its permission: current to zero, then its contactor opens", switched("on", "off")},
		{EarthTest, "earth-test RESISTANCE|off", "earth-test 20 kΩ", "puts a test resistor from a pole to earth", amountOr[quantity.Resistance]("off")},
		{OverVoltage, "over-voltage VOLTAGE|restore", "over-voltage 1000 V", "moves the over-voltage trip", amountOr[quantity.Voltage]("restore")},
		{UnderVoltage, "under-voltage VOLTAGE|restore", "under-voltage 1040 V", "moves the under-voltage trip", amountOr[quantity.Voltage]("restore")},
	}
}

// ParseAct reads an act from a line of text, as [ActHelp] lists them.
func ParseAct(text string) (Act, error) {
	verb, rest, _ := strings.Cut(strings.TrimSpace(text), " ")
	rest = strings.TrimSpace(rest)
	for _, g := range vocabulary() {
		if string(g.verb) != verb {
			continue
		}
		a, err := g.read(rest)
		if err != nil {
			return Act{}, fmt.Errorf("act %q: %w; %s", verb, err, g.form)
		}
		a.Verb = g.verb
		return a, nil
	}
	return Act{}, fmt.Errorf("act %q is not known, type help", verb)
}

// ActHelp is a line for each act: its form and what it does.
func ActHelp() []string {
	var lines []string
	for _, g := range vocabulary() {
		lines = append(lines, fmt.Sprintf("%-32s %s", g.form, g.does))
	}
	return lines
}

// ErrRefused is within the error of an act that the device's interlocks refuse.
var ErrRefused = errors.New("refused by the device")

func refuse(why string) error { return fmt.Errorf("%w: %s", ErrRefused, why) }

// carryOut does an act. The caller holds the lock.
func (s *Simulator) carryOut(a Act) error {
	c, d, t := s.plant, &s.device, &s.truth
	d.now = s.elapsed
	r := c.Read()
	switch a.Verb {
	case Isolator:
		c.Isolator(a.On)
	case Precharge:
		if !a.On {
			c.Precharge(false)
			return nil
		}
		if d.fault != noFault && d.fault != faultEarth {
			return refuse("a fault stands, reset it first")
		}
		d.manualBypass = false
		c.Precharge(true)
	case Bypass:
		if a.On && t.difference(r) > t.closingDifference {
			return refuse(fmt.Sprintf("difference %.0f V above %.0f V", t.difference(r), t.closingDifference))
		}
		d.manualBypass = !a.On
		c.Bypass(a.On)
	case Release:
		if !d.ready(r) {
			return refuse("not ready: bypass not reported closed, or a fault stands")
		}
		c.Release(d.mode)
	case Block:
		c.Block()
	case SetMode:
		d.mode = circuit.CurrentMode
		if a.On {
			d.mode = circuit.VoltageMode
		}
		if r.Released {
			c.Release(d.mode)
		}
	case Setpoint:
		d.setpoint = a.Value
		d.apply(c, t)
	case Droop:
		d.droop = a.Value
		d.apply(c, t)
	case PowerReference:
		d.power = a.Value
		d.apply(c, t)
	case ChargeLimit:
		d.charge = math.Max(0, math.Min(a.Value, t.chargeLimit))
		d.apply(c, t)
	case DischargeLimit:
		d.discharge = math.Max(0, math.Min(a.Value, t.dischargeLimit))
		d.apply(c, t)
	case Load, Regenerate, Resistive:
		return s.setLoad(a)
	case Infeed:
		return s.switchInfeed(a)
	case Discharge:
		s.shutDown(100 * time.Millisecond)
	case EmergencyStop:
		c.Block()
		d.dropLoad(c)
		d.fault = faultEmergencyStop
		d.later(30*time.Millisecond, func(c *circuit.Circuit) { c.Bypass(false); c.Precharge(false) })
	case Reset:
		d.fault = noFault
		c.ClearTrip()
	case Withhold:
		d.bypassWithheld = a.On
	case DropReport:
		report := t.bypassReport
		if a.On {
			open := false
			report = &open
		}
		c.ForceReport(report)
	case Withdraw:
		s.withdraw(a.On)
	case EarthTest:
		d.earthTest = a.Value
	case OverVoltage:
		d.protection.OverVoltage = t.plant.Protection.OverVoltage
		if a.On {
			d.protection.OverVoltage = a.Value
		}
		d.apply(c, t)
	case UnderVoltage:
		d.protection.UnderVoltage = t.plant.Protection.UnderVoltage
		if a.On {
			d.protection.UnderVoltage = a.Value
		}
		d.apply(c, t)
	default:
		return fmt.Errorf("act %q is not known", a.Verb)
	}
	return nil
}

// setLoad sets the load on the bus; a resistor takes the place of a load of constant power and the other way round.
func (s *Simulator) setLoad(a Act) error {
	full, back := 0.0, 0.0
	if l := s.truth.site.Load; l != nil {
		full, back = float64(l.Power.Nominal), float64(l.Regeneration.Nominal)
	}
	w := a.Value
	switch {
	case a.Verb == Resistive:
		g := 0.0
		if w > 0 {
			g = 1 / w
		}
		s.device.dropLoad(s.plant)
		s.plant.SetLoad(0, g)
		return nil
	case a.Fraction && a.Verb == Load:
		w *= full
	case a.Fraction:
		w *= back
	}
	if a.Fraction && a.Value != 0 && w == 0 {
		return errors.New("per cent of what? the site gives neither load.power nor load.regeneration: say a power")
	}
	if a.Verb == Regenerate {
		w = -w
	}
	d := &s.device
	if d.load == 0 && d.loadNow == 0 {
		s.plant.SetLoad(0, 0) // a load resistor goes when a drive comes
	}
	d.load = w
	d.loadStep = math.Max(full, math.Max(math.Abs(w), math.Abs(d.loadNow))) * tick.Seconds() / loadRamp.Seconds()
	return nil
}

func (s *Simulator) switchInfeed(a Act) error {
	found := false
	for k := range s.truth.plant.Infeeds {
		if name := s.infeedName(k); a.Target == "" || a.Target == name {
			s.plant.Infeed(k, a.On)
			found = true
		}
	}
	if !found && a.Target != "" {
		return fmt.Errorf("no other infeed is called %q", a.Target)
	}
	return nil
}

// infeedName is the name of the k-th other infeed.
func (s *Simulator) infeedName(k int) string {
	if k+1 < len(s.truth.site.Infeeds) {
		return s.truth.site.Infeeds[k+1].Name
	}
	return "other infeed"
}

// shutDown takes everything off in order, with a pause between the steps.
func (s *Simulator) shutDown(pause time.Duration) {
	d := &s.device
	d.dropLoad(s.plant)
	s.plant.Block()
	d.pending = nil
	d.manualBypass = true
	d.later(pause, func(c *circuit.Circuit) { c.Bypass(false); c.Precharge(false) })
	infeeds := len(s.truth.plant.Infeeds)
	d.later(2*pause, func(c *circuit.Circuit) {
		for k := range infeeds {
			c.Infeed(k, false)
		}
	})
	d.later(3*pause, func(c *circuit.Circuit) { c.Isolator(false) })
}

func (s *Simulator) withdraw(on bool) {
	c, d := s.plant, &s.device
	if !on {
		c.DisconnectSource(false)
		d.apply(c, &s.truth)
		return
	}
	c.SetLimits(0, 0)
	d.later(300*time.Millisecond, func(c *circuit.Circuit) { c.Block(); d.fault = faultSource })
	d.later(500*time.Millisecond, func(c *circuit.Circuit) { c.DisconnectSource(true) })
}
