package report

import (
	"fmt"
	"strconv"

	"chargehand/commission/site"
)

// platesOf are the values of a site file as found and as left, side by side, as typed. Values that neither has are left out.
func platesOf(found, left site.Site) []Plate {
	before, after := typed(found), typed(left)
	var plates []Plate
	at := map[[2]string]int{}
	for _, p := range before {
		at[[2]string{p.Group, p.What}] = len(plates)
		plates = append(plates, Plate{Group: p.Group, What: p.What, AsFound: p.AsFound})
	}
	for _, p := range after {
		if i, known := at[[2]string{p.Group, p.What}]; known {
			plates[i].AsLeft = p.AsFound
			continue
		}
		plates = append(plates, Plate{Group: p.Group, What: p.What, AsLeft: p.AsFound})
	}
	return plates
}

// rows collects what a site file gives.
type rows struct {
	group string
	all   []Plate
}

func (r *rows) add(what, text string) {
	if text != "" {
		r.all = append(r.all, Plate{Group: r.group, What: what, AsFound: text})
	}
}

func (r *rows) count(what string, n int) {
	if n > 0 {
		r.add(what, strconv.Itoa(n))
	}
}

func yes(b bool) string {
	if b {
		return "yes"
	}
	return "no"
}

// typed are the values of a site in the order of its file.
func typed(s site.Site) []Plate {
	r := &rows{group: "Source"}
	r.source(s.Source)
	r.group = "Bus"
	r.bus(s.Bus)
	r.group = "Pre-charge"
	r.precharge(s.Precharge)
	if b := s.Bypass; b != nil {
		r.group = "Bypass contactor"
		r.add("making current", b.MakingCurrent.Text)
		r.add("carrying current", b.CarryingCurrent.Text)
		r.add("voltage", b.Voltage.Text)
		r.add("polarised", yes(b.Polarised))
	}
	if c := s.Converter; c != nil {
		r.group = "Converter"
		r.converter(*c)
	}
	if l := s.Load; l != nil {
		r.group = "Load"
		r.add("highest steady load", l.Power.Text)
		r.add("regeneration", l.Regeneration.Text)
		r.add("share tolerance", l.ShareTolerance.Text)
	}
	for i, f := range s.Infeeds {
		r.group = fmt.Sprintf("Infeed %d: %s", i+1, f.Name)
		r.infeed(f)
	}
	if d := s.Device; d != nil {
		r.group = "Device"
		r.add("address", d.Address)
		r.count("unit identifier", int(d.UnitID))
		r.add("greatest age of a value", d.MaxAge.Text)
	}
	return r.all
}

func (r *rows) source(s site.Source) {
	r.add("kind", string(s.Kind))
	r.count("cells in series", s.CellsInSeries)
	r.add("cell voltage, highest", s.CellMax.Text)
	r.add("cell voltage, lowest", s.CellMin.Text)
	r.add("voltage, highest", s.MaxVoltage.Text)
	r.add("voltage, lowest", s.MinVoltage.Text)
	limits := "at rest"
	if s.LimitsUnderCurrent {
		limits = "under current"
	}
	r.add("voltage limits hold", limits)
	r.add("capacitance", s.Capacitance.Text)
	r.add("capacity", s.Capacity.Text)
	r.add("internal resistance", s.InternalResistance.Text)
	r.add("inductance", s.Inductance.Text)
	r.add("charge current, highest", s.MaxChargeCurrent.Text)
	r.add("discharge current, highest", s.MaxDischargeCurrent.Text)
	r.add("ripple current, highest (RMS)", s.MaxRippleCurrent.Text)
	r.add("measurement error", s.MeasurementError.Text)
	if f := s.Fuse; f != nil {
		r.add("fuse, rating", f.Rating.Text)
		r.add("fuse, pre-arcing I²t", f.PreArcingI2t.Text)
		r.add("fuse, voltage", f.Voltage.Text)
		r.add("fuse, breaking capacity", f.BreakingCapacity.Text)
	}
	if w := s.Switch; w != nil {
		r.count("isolator, poles", w.Poles)
		r.add("isolator, voltage", w.Voltage.Text)
		r.add("isolator, breaking current", w.BreakingCurrent.Text)
	}
}

func (r *rows) bus(b site.Bus) {
	r.add("nominal voltage", b.Nominal.Text)
	r.add("under-voltage trip", b.UnderVoltageTrip.Text)
	r.add("over-voltage trip", b.OverVoltageTrip.Text)
	if c := b.Chopper; c != nil {
		r.add("chopper on", c.On.Text)
		r.add("chopper off", c.Off.Text)
		r.add("chopper power", c.Power.Text)
		r.add("chopper duration", c.Duration.Text)
	}
	r.add("capacitor rating", b.CapacitorRating.Text)
	r.add("measurement error", b.MeasurementError.Text)
	r.add("regulation error", b.RegulationError.Text)
	r.add("ripple, peak to peak", b.Ripple.Text)
	r.add("wanted margin", b.WantedMargin.Text)
	r.add("failing margin", b.MarginFail.Text)
	if t := b.TouchSafe; t != nil {
		r.add("touch-safe voltage", t.Voltage.Text)
		r.add("touch-safe within", t.Within.Text)
	}
	r.add("earthing", string(b.Earthing))
	for i, c := range b.Capacitances {
		isolated := ""
		if c.Isolated {
			isolated = ", isolated while pre-charging"
		}
		r.add(fmt.Sprintf("bank %d, %s", i+1, c.Name), c.Value.Text+isolated)
	}
	for i, d := range b.Bleeders {
		r.add(fmt.Sprintf("bleeder %d, %s", i+1, d.Name), d.Value.Text)
	}
	if a := b.Auxiliary; a != nil {
		r.add("auxiliary supply", a.Power.Text)
		r.add("auxiliary starts at", a.StartsAt.Text)
		r.add("auxiliary stops at", a.StopsAt.Text)
	}
	for i, m := range b.InsulationMonitors {
		r.add(fmt.Sprintf("insulation monitor %d, %s", i+1, m.Where), map[bool]string{true: "active", false: "switched off"}[m.Active])
	}
}

func (r *rows) precharge(p site.Precharge) {
	r.add("resistance", p.Resistance.Text)
	r.add("rated power", p.RatedPower.Text)
	r.add("ambient", p.Ambient.Text)
	if t := p.Thermal; t != nil {
		r.add("thermal resistance", t.Resistance.Text)
		r.add("thermal time constant", t.TimeConstant.Text)
		r.add("highest temperature", t.MaxTemperature.Text)
	}
	r.count("attempts", p.Attempts)
	r.add("interval", p.Interval.Text)
	r.add("closing difference", p.ClosingDifference.Text)
	r.add("device compares", string(p.Compares))
	r.add("least time", p.MinimumTime.Text)
	r.add("time-out", p.Timeout.Text)
	if c := p.Contactor; c != nil {
		r.add("contactor, voltage", c.Voltage.Text)
		r.add("contactor, breaking current", c.BreakingCurrent.Text)
	}
}

func (r *rows) converter(c site.Converter) {
	r.add("rated power", c.RatedPower.Text)
	r.add("rated current, source side", c.RatedCurrent.Text)
	r.add("efficiency", c.Efficiency.Text)
	r.count("phases", c.Phases)
	r.add("choke per phase", c.Choke.Text)
	r.add("choke resistance", c.ChokeResistance.Text)
	r.add("choke saturation", c.ChokeSaturation.Text)
	r.add("phase sharing error", c.PhaseSharingError.Text)
	r.add("switching frequency", c.SwitchingFrequency.Text)
	r.add("dead time", c.DeadTime.Text)
	r.add("least pulse", c.MinimumPulse.Text)
	if f := c.Filter; f != nil {
		r.add("filter capacitance", f.Capacitance.Text)
		r.add("filter ESR", f.ESR.Text)
		r.add("filter ESL", f.ESL.Text)
		r.add("filter position", string(f.Position))
	}
}

func (r *rows) infeed(f site.Infeed) {
	r.add("rated current, bus side", f.RatedCurrent.Text)
	r.add("no-load setpoint", f.Setpoint.Text)
	r.add("droop", f.Droop.Text)
	r.add("setpoint error", f.SetpointError.Text)
	r.add("regenerates", yes(f.Regenerates))
	if c := f.Cable; c != nil {
		r.add("cable length", c.Length.Text)
		r.add("cable section", c.Section.Text)
	}
}
