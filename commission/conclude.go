package commission

import (
	"math"
	"slices"
	"strings"
	"time"

	"chargehand/commission/capture"
	"chargehand/commission/desk"
	"chargehand/commission/finding"
	"chargehand/commission/fit"
	"chargehand/commission/measured"
	"chargehand/commission/quantity"
	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/commission/site"
	"chargehand/commission/walk"
)

// lineThrough fits a straight line to settled steps; nil where there are too few.
func lineThrough(current, voltage []float64) *Line {
	if len(current) < 3 {
		return nil
	}
	l := fit.Line(current, voltage, 0)
	if l.Status != fit.OK {
		return nil
	}
	return &Line{NoLoad: l.Intercept, Droop: -l.Slope, At: l.At, StandardErrorAt: l.SEAt, NoLoadSE: l.InterceptSE, DroopSE: l.SlopeSE}
}

// judge gives a point its result. A pass is preceded by the measured findings that the point's readings decide, and at the
// points about settings by the settings themselves.
func (r *Run) judge(e walk.Judge) (Recorded, error) {
	p, ok := r.state.Point(e.Point)
	if !ok || e.Result != walk.Passed {
		return r.write(e)
	}
	if found := slices.DeleteFunc(r.conclude(p), r.hasConcluded); len(found) > 0 {
		if _, held := r.state.HeldBy(p); !held {
			if recorded, err := r.write(walk.Captured{Findings: found}); err != nil {
				return recorded, err
			}
		}
	}
	if _, err := r.state.Decide(e, r.opt.Clock.Now()); err != nil {
		return Recorded{State: r.state}, err
	}
	if recorded, err := r.keepSettings(p.ID); err != nil {
		return recorded, err
	}
	return r.write(e)
}

// conclude makes the measured findings that bind a point: from its readings, or from the capture that it rests on where the
// finding fell with a point that was opened again.
func (r *Run) conclude(p walk.Point) []finding.Finding {
	var found []finding.Finding
	for _, id := range p.Findings {
		name, subject, _ := strings.Cut(id, ":")
		switch name {
		case "measured.sensor":
			found = append(found, r.sensors(p)...)
		case "measured.window":
			found = append(found, r.windows(p)...)
		case "measured.setpoint":
			found = append(found, r.setpoint(p)...)
		case "measured.current-mode":
			found = append(found, r.currentMode(p)...)
		case "measured.share":
			found = append(found, r.share(p)...)
		case "measured.trip":
			found = append(found, r.tripByHand(p, subject)...)
		case "measured.precharge", "measured.closing", "measured.droop", "measured.discharge":
			found = append(found, r.again(id)...)
		}
	}
	return found
}

// again judges the latest capture anew for a finding that does not stand any more.
func (r *Run) again(id string) []finding.Finding {
	if len(r.state.Measured(id)) > 0 {
		return nil
	}
	found := rejudged(r.state.Site(), r.state)
	return slices.DeleteFunc(found, func(f finding.Finding) bool { return f.ID != id })
}

// rejudged are the findings of a state's latest captures by the predictions of a site file.
func rejudged(s site.Site, state walk.State) []finding.Finding {
	var found []finding.Finding
	for _, kind := range []capture.Kind{capture.Precharge, capture.Droop, capture.Discharge} {
		c, err := capture.FromRecords(state.Captured(kind))
		if err != nil {
			continue // none of this kind
		}
		found = append(found, judged(s, c)...)
	}
	return found
}

// hasConcluded tells whether the same finding stands in the log already, so that a point judged twice says it once.
func (r *Run) hasConcluded(f finding.Finding) bool {
	for _, m := range r.state.Measured(f.ID) {
		if m.Subject == f.Subject && m.Value == f.Value && m.Verdict == f.Verdict {
			return true
		}
	}
	return false
}

// value is the newest value of what at a point from a source.
func (r *Run) value(p walk.Point, source string, name signal.Name) (record.Reading, bool) {
	readings := r.state.Status(p.ID).Readings
	for i := len(readings) - 1; i >= 0; i-- {
		reading, ok := r.state.Reading(readings[i])
		if ok && reading.Source == source && reading.Signal == string(name) && reading.Value != nil {
			return reading, true
		}
	}
	return record.Reading{}, false
}

// errorOf is the error bound of an instrument's reading in volts.
func (r *Run) errorOf(reading record.Reading) quantity.Voltage {
	for _, i := range r.state.Instruments() {
		if reading.Instrument != nil && i.ID == *reading.Instrument {
			return quantity.Voltage(i.Accuracy.OfReading*math.Abs(*reading.Value) + i.Accuracy.Plus)
		}
	}
	return 0
}

func (r *Run) sensors(p walk.Point) []finding.Finding {
	var found []finding.Finding
	for _, name := range p.Signals {
		device, seen := r.value(p, record.FromDevice, name)
		hand, held := r.value(p, record.FromInstrument, name)
		if seen && held {
			found = append(found, measured.Sensor(r.state.Site(), name, measured.Comparison{
				Device: quantity.Voltage(*device.Value), Instrument: quantity.Voltage(*hand.Value), Error: r.errorOf(hand)}))
		}
	}
	return found
}

// windows holds the source at rest against the lowest bus that any infeed may hold; that figure has its errors in it.
func (r *Run) windows(p walk.Point) []finding.Finding {
	source, seen := r.value(p, record.FromDevice, signal.SourceVoltage)
	lowest, known := r.state.Finding("window.bus-low")
	if !seen || !known || lowest.State != finding.Finite {
		return nil
	}
	s := r.state.Site()
	return []finding.Finding{measured.Window(s, quantity.Voltage(*source.Value), quantity.Voltage(lowest.Value.Low), s.Source.Error(), 0)}
}

// setpoint judges the no-load voltage by the instrument where it was read with one, else by the device's own reading.
func (r *Run) setpoint(p walk.Point) []finding.Finding {
	s := r.state.Site()
	if hand, ok := r.value(p, record.FromInstrument, signal.BusVoltage); ok {
		return []finding.Finding{measured.Setpoint(s, quantity.Voltage(*hand.Value), 0, 0, r.errorOf(hand))}
	}
	if device, ok := r.value(p, record.FromDevice, signal.BusVoltage); ok {
		return []finding.Finding{measured.Setpoint(s, quantity.Voltage(*device.Value), quantity.Voltage(device.U), 30, s.Bus.Error())}
	}
	return nil
}

func (r *Run) currentMode(p walk.Point) []finding.Finding {
	reference, set := r.value(p, record.FromDevice, signal.PowerReference)
	power, seen := r.value(p, record.FromDevice, signal.Power)
	if !set || !seen {
		return nil
	}
	return []finding.Finding{measured.CurrentMode(r.state.Site(), quantity.Power(*reference.Value), quantity.Power(*power.Value),
		quantity.Power(power.U), nil)}
}

// settings are the device settings that are kept as found and as left.
var settings = []signal.Name{signal.VoltageSetpoint, signal.DroopSetting, signal.PowerReference, signal.ChargeLimit, signal.DischargeLimit}

// keepSettings writes down the device's settings when the point about them is passed: the as-found ones before anything is
// touched, the as-left ones at the end. A setting as found is the first one; one that was never found has no as-left.
func (r *Run) keepSettings(point string) (Recorded, error) {
	when := map[string]string{"paper.settings": "as-found", "leave.settings": "as-left"}[point]
	now := r.opt.Clock.Now()
	for _, name := range settings {
		live, ok := r.live[name]
		if when == "" || !ok || !live.Withdrawn(now, r.maxAge()).Quality.HasValue() || r.wasFound(name) != (when == "as-left") {
			continue
		}
		setting := record.Setting{Name: string(name), When: when, Value: live.Value, Unit: name.Unit(), Source: record.FromDevice}
		if raw, ok := r.rawNumber(live); ok {
			setting.Raw = &raw
		}
		if recorded, err := r.write(walk.Keep{Setting: setting}); err != nil {
			return recorded, err
		}
	}
	return Recorded{State: r.state}, nil
}

func (r *Run) wasFound(name signal.Name) bool {
	return slices.ContainsFunc(r.state.Settings(), func(k record.Setting) bool {
		return k.Name == string(name) && k.When == "as-found"
	})
}

// rawNumber is the number to key in for a value: what the register holds, whatever its words.
func (r *Run) rawNumber(live signal.Reading) (int64, bool) {
	for _, ch := range r.opt.Channels {
		if ch.Name == live.Name && ch.Scale != 0 && live.Quality.HasValue() {
			return int64(math.Round((live.Value - ch.Offset) / ch.Scale)), true
		}
	}
	return 0, false
}

// changeSite takes a new revision of the site file, calculates every finding anew, the measured ones by the new predictions
// too, and notes which have moved.
func (r *Run) changeSite(e walk.ChangeSite) (Recorded, error) {
	s, _, err := site.Read(e.Name, []byte(e.Text))
	if err != nil {
		return Recorded{State: r.state}, err
	}
	found := desk.Check(s, r.opt.Registers).Findings
	before := append(slices.Clone(r.state.Desk()), r.state.Measured("")...)
	again := rejudged(s, r.state)
	e.Findings = append(slices.Clone(found), again...)
	recorded, err := r.write(e)
	if err != nil {
		return recorded, err
	}
	noted, err := r.write(walk.AddNote{Text: words(Moved(before, e.Findings))})
	return Recorded{append(recorded.Seqs, noted.Seqs...), noted.State}, err
}

// hasten lets the plant's clock run faster until what is waited for is over; only a rehearsal has such a clock.
func (r *Run) hasten(e walk.Hastened) (Recorded, error) {
	recorded, err := r.write(e)
	if err == nil {
		r.opt.Clock.Hasten(e.Hastened.Factor)
		r.hurrying = e.Hastened.What
	}
	return recorded, err
}

// pacing keeps a rehearsal's clock at the pace that what is going on allows: a discharge runs as fast as it can still be
// sampled well, a cool-down until it is over.
func (r *Run) pacing() {
	now := r.opt.Clock.Now()
	switch rec := r.recorder; {
	case !r.state.IsRehearsal() || r.opt.Speed <= 1:
	case rec != nil && rec.phase == Running && rec.kindSlow() && r.opt.Clock.Pace() == 1:
		factor := math.Floor(math.Min(r.opt.Speed, rec.tau/(samplesPerTau*slowPeriod.Seconds())))
		if factor > 1 {
			_, _ = r.hasten(walk.Hastened{Hastened: record.Hastened{What: "discharge", Factor: factor}})
			rec.thin(time.Duration(factor) * slowPeriod)
		}
	case rec == nil && r.hurrying == coolDown && r.state.CoolsFor(now) == 0:
		r.opt.Clock.Hasten(1)
		r.hurrying = ""
	}
}

const (
	coolDown      = "cool-down"
	samplesPerTau = 100                   // of a hastened discharge, at least
	slowPeriod    = 50 * time.Millisecond // of a poller on a busy computer; one at leisure is twice as fast
)
