package commission

import (
	"fmt"
	"math"
	"slices"
	"time"

	"chargehand/commission/capture"
	"chargehand/commission/discharge"
	"chargehand/commission/droop"
	"chargehand/commission/finding"
	"chargehand/commission/measured"
	"chargehand/commission/precharge"
	"chargehand/commission/quantity"
	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/commission/site"
	"chargehand/commission/walk"
)

// riseWatch asks with every sample whether the early rise of a pre-charge is missing.
type riseWatch struct {
	check  measured.Check // zero where nothing is predicted
	answer measured.Rising
	seen   float64 // the bus voltage at the decision
}

func (w *riseWatch) take(c capture.Capture, phase Phase) {
	if w.check.At == 0 || phase != Running || w.answer.Decided {
		return
	}
	w.answer = measured.Rise(c, w.check)
	if w.answer.Decided {
		_, v := c.Series(signal.BusVoltage)
		w.seen = v[len(v)-1]
	}
}

// arm starts a capture with its prediction drawn first.
func (r *Run) arm(e walk.Arm) (Recorded, error) {
	if r.recorder != nil {
		return Recorded{State: r.state}, &walk.RefusedError{What: "no capture at " + e.Point,
			Because: "the one at " + r.recorder.point + " is " + string(r.recorder.phase), Instead: "stop it first"}
	}
	recorded, err := r.write(e)
	if err != nil {
		return recorded, err
	}
	p, _ := r.state.Point(e.Point)
	now := r.opt.Clock.Now()
	rec := &recorder{point: p.ID, site: r.state.Site(), phase: Armed, armedAt: now, latest: now.Add(-time.Hour)}
	rec.capture = capture.Capture{ID: r.state.NextCapture(), Kind: p.Capture, Stage: walk.StageTitles[p.Stage-1],
		T0: now, Channels: channels(p.Capture, r.opt.Channels)}
	if p.Capture == capture.Precharge {
		rec.capture.Attempt = len(r.state.Attempts())
	}
	if t := r.state.Site().Bus.TouchSafe; t != nil {
		rec.bars.touch = float64(t.Voltage.Nominal)
	}
	r.predict(rec)
	r.recorder = rec
	if p.Capture == capture.Precharge || p.Capture == capture.Step {
		r.focus(rec.capture.Channels) // stairs and discharge last minutes, and the usual rate shows all of them
	}
	return recorded, nil
}

// focus tells the poller which signals count now.
func (r *Run) focus(channels []capture.Channel) {
	if r.opt.Focus == nil {
		return
	}
	var names []signal.Name
	for _, ch := range channels {
		names = append(names, ch.Name)
	}
	r.opt.Focus(names)
}

// predict draws what is expected before anything is measured.
func (r *Run) predict(rec *recorder) {
	s := r.state.Site()
	switch rec.capture.Kind {
	case capture.Precharge:
		rec.predictCharge(s, r.emf(s), r.busNow())
	case capture.Discharge:
		rec.predictDischarge(s, r.busNow())
	case capture.Droop:
		rec.predictDroop(s)
	case capture.Step: // a time-out that never comes is watched a good while longer
		rec.bars.longest = seconds(math.Max(10, 1.5*float64(s.Precharge.Timeout.Nominal)))
	}
}

// emf is the source's rest voltage: as read now, with its error, where the signal has a value; else anywhere in the window.
func (r *Run) emf(s site.Site) quantity.Spread[quantity.Voltage] {
	now := r.opt.Clock.Now()
	if live, ok := r.live[signal.SourceVoltage]; ok && live.Withdrawn(now, r.maxAge()).Quality.HasValue() && live.Value > 0 {
		e := s.Source.Error()
		v := quantity.Voltage(live.Value)
		return quantity.Spread[quantity.Voltage]{Low: v - e, Nominal: v, High: v + e}
	}
	low, high := s.Source.LowestRest(), s.Source.HighestRest()
	return quantity.Spread[quantity.Voltage]{Low: low, Nominal: (low + high) / 2, High: high}
}

func (r *Run) busNow() quantity.Voltage {
	now := r.opt.Clock.Now()
	if live, ok := r.live[signal.BusVoltage]; ok && live.Withdrawn(now, r.maxAge()).Quality.HasValue() {
		return quantity.Voltage(math.Max(live.Value, 0))
	}
	return 0
}

func (rec *recorder) predictCharge(s site.Site, emf quantity.Spread[quantity.Voltage], v0 quantity.Voltage) {
	p := precharge.Predict(s, emf, v0)
	for _, point := range p.Band {
		rec.band.add(point.At.Seconds(), float64(point.Bus.Low), float64(point.Bus.Nominal), float64(point.Bus.High))
	}
	if len(p.Missing) == 0 {
		rec.rise.check = measured.Check{At: p.EarlyRise.At, AtLeast: p.EarlyRise.AtLeast}
	}
	// A device opens by its own time-out; one that does not is watched a good while longer.
	longest := 1.5 * float64(s.Precharge.Timeout.Nominal)
	if slowest := 1.5 * float64(p.TimeToClose.High); !math.IsInf(slowest, 0) {
		longest = math.Max(longest, slowest)
	}
	if longest == 0 {
		longest = 8 * float64(p.TimeConstant.High)
	}
	rec.bars.longest = seconds(longest)
}

func (rec *recorder) predictDischarge(s site.Site, v0 quantity.Voltage) {
	e := s.Bus.Error()
	p := discharge.Predict(s, quantity.Spread[quantity.Voltage]{Low: max(v0-e, 0), Nominal: v0, High: v0 + e})
	for _, point := range p.Band {
		rec.band.add(point.At.Seconds(), float64(point.Bus.Low), float64(point.Bus.Nominal), float64(point.Bus.High))
	}
	rec.tau = float64(p.TimeConstant.Nominal)
	if slowest := float64(p.TimeToTouchSafe.High); !math.IsInf(slowest, 0) {
		rec.bars.longest = seconds(1.5 * slowest)
	}
}

// predictDroop draws the line of the commissioned converter at its terminals over its whole current.
func (rec *recorder) predictDroop(s site.Site) {
	p := droop.Predict(s)
	if len(p.Missing) > 0 {
		return
	}
	least := math.Max(float64(p.Least), -float64(p.Most))
	for i := range 21 {
		current := least + (float64(p.Most)-least)*float64(i)/20
		slope := p.BusSlope
		low, high := float64(slope.High)*current, float64(slope.Low)*current
		if current < 0 {
			low, high = high, low
		}
		rec.band.add(current, float64(p.NoLoad.Low)-low, float64(p.NoLoad.Nominal)-float64(slope.Nominal)*current, float64(p.NoLoad.High)-high)
	}
}

func (b *Band) add(x, low, nominal, high float64) {
	b.X, b.Low, b.Nominal, b.High = append(b.X, x), append(b.Low, low), append(b.Nominal, nominal), append(b.High, high)
}

func seconds(s float64) time.Duration { return time.Duration(s * float64(time.Second)) }

// stopCapture ends the running capture: its samples go to disk, and what they show is judged.
func (r *Run) stopCapture(because string) (Recorded, error) {
	rec := r.recorder
	if rec == nil {
		return Recorded{State: r.state}, &walk.RefusedError{What: "no capture is running", Because: "nothing is armed"}
	}
	r.recorder = nil
	r.focus(nil)
	r.opt.Clock.Hasten(1)
	if rec.phase == Armed || len(rec.capture.Samples) == 0 {
		return r.write(walk.AddNote{Text: "capture at " + rec.point + " ended before anything happened: " + because})
	}
	c := rec.capture.WithGaps(signal.BusVoltage, rec.longestGap(), "no new value")
	captured := walk.Captured{Parts: capture.Records(c), Readings: r.fromCapture(rec, c),
		Findings: slices.DeleteFunc(judged(rec.site, c), r.isKnownBetter)}
	if c.Kind == capture.Step {
		r.judgeTrip(rec.point, c, &captured)
	}
	recorded, err := r.write(captured)
	if err != nil {
		return recorded, err
	}
	return r.write(walk.AddNote{Text: "capture " + c.ID + " at " + rec.point + " ended: " + because})
}

// judgeTrip adds what a capture at a point of stage 10 shows of its trip.
func (r *Run) judgeTrip(point string, c capture.Capture, captured *walk.Captured) {
	p, _ := r.state.Point(point)
	subject := nextTrip(r.state, p)
	f := r.trip(subject, c)
	f.Captures = []string{c.ID}
	captured.Findings = append(captured.Findings, f)
	captured.Readings = append(captured.Readings, tripReading(point, subject, f)...)
}

// isKnownBetter tells whether a finding only repeats, less exactly, what an instrument has decided: the droop line's no-load
// voltage carries the whole error of the device's own sensor.
func (r *Run) isKnownBetter(f finding.Finding) bool {
	if f.ID != "measured.setpoint" || f.Verdict != finding.Undecided {
		return false
	}
	for _, known := range r.state.Measured(f.ID) {
		if known.Verdict != finding.Undecided {
			return true
		}
	}
	return false
}

// judged is the way from a capture to findings.
func judged(s site.Site, c capture.Capture) []finding.Finding {
	var found []finding.Finding
	switch c.Kind {
	case capture.Precharge:
		found = measured.Precharge(s, c)
	case capture.Discharge:
		found = measured.Discharge(s, c)
	case capture.Droop:
		found = measured.DroopCapture(s, c)
	}
	for i := range found {
		found[i].Captures = []string{c.ID}
	}
	return found
}

// longestGap is the step between samples beyond which something is missing: five times the usual one.
func (rec *recorder) longestGap() time.Duration {
	n := len(rec.capture.Samples)
	if n < 3 {
		return time.Second
	}
	span := rec.capture.Samples[n-1].At - rec.capture.Samples[0].At
	return max(5*span/time.Duration(n-1), 100*time.Millisecond)
}

// fromCapture are the readings that points take from a capture.
func (r *Run) fromCapture(rec *recorder, c capture.Capture) []record.Reading {
	switch c.Kind {
	case capture.Precharge:
		return append(rec.riseReading(), r.settled(rec, c)...)
	case capture.Droop:
		n := float64(len(measured.Steps(c)))
		return []record.Reading{fromCapture(rec.point, "settled steps", n, "1", 0)}
	case capture.Discharge:
		last := c.Samples[len(c.Samples)-1]
		if i := c.Index(signal.BusVoltage); i >= 0 && last.Values[i].OK {
			return []record.Reading{r.sampled(rec.point, c, last, i)}
		}
	}
	return nil
}

func fromCapture(point, what string, v float64, unit string, u float64) record.Reading {
	return record.Reading{Point: point, Signal: what, Value: &v, Unit: unit, Source: record.FromDevice, Raw: []uint16{}, U: u,
		Quality: string(signal.Good)}
}

// riseReading is the rise at the early check as a share of what it must be at least.
func (rec *recorder) riseReading() []record.Reading {
	if !rec.rise.answer.Decided || rec.rise.check.AtLeast <= 0 {
		return nil
	}
	return []record.Reading{fromCapture(rec.point, "rise", rec.rise.seen/float64(rec.rise.check.AtLeast), "1", 0)}
}

// settled are the device's readings while the charge stood settled: what charge.difference holds against the instrument.
func (r *Run) settled(rec *recorder, c capture.Capture) []record.Reading {
	p, ok := r.state.Point("charge.difference")
	if !ok {
		return nil
	}
	last := lastSettled(c)
	if last < 0 {
		return nil
	}
	var readings []record.Reading
	for _, name := range p.Signals {
		if i := c.Index(name); i >= 0 && c.Samples[last].Values[i].OK {
			readings = append(readings, r.sampled(p.ID, c, c.Samples[last], i))
		}
	}
	return readings
}

// reportLag is how long before its report a contact may have moved: a sample younger than that may show the closing itself.
// Common practice for an auxiliary contact behind a register that is refreshed ten times a second.
const reportLag = 300 * time.Millisecond

// lastSettled is the last sample well before the bypass was reported closed or the pre-charge open; -1 where there is none.
func lastSettled(c capture.Capture) int {
	charging := func(s capture.Sample) bool {
		return !isOn(c, s, signal.BypassClosed) && (c.Index(signal.PrechargeClosed) < 0 || isOn(c, s, signal.PrechargeClosed))
	}
	last := -1
	for i, s := range c.Samples {
		if s.At > 0 && charging(s) {
			last = i
		}
	}
	if last < 0 || last == len(c.Samples)-1 {
		return last
	}
	for ended := c.Samples[last+1].At; last > 0 && ended-c.Samples[last].At < reportLag; last-- {
		if c.Samples[last-1].At <= 0 {
			return last
		}
	}
	return last
}

func isOn(c capture.Capture, s capture.Sample, n signal.Name) bool {
	i := c.Index(n)
	return i >= 0 && s.Values[i].OK && s.Values[i].V != 0
}

// sampled is one value of a sample as a reading.
func (r *Run) sampled(point string, c capture.Capture, s capture.Sample, channel int) record.Reading {
	ch := c.Channels[channel]
	reading := fromCapture(point, string(ch.Name), s.Values[channel].V, ch.Unit, r.resolution(ch.Name))
	if s.Values[channel].Raw != nil {
		reading.Raw = s.Values[channel].Raw
	}
	reading.Text = fmt.Sprintf("from capture %s at %.3f s", c.ID, s.At.Seconds())
	return reading
}

// progress is the capture as the screen draws it.
func (rec *recorder) progress(now time.Time) *Progress {
	p := &Progress{Point: rec.point, Kind: rec.capture.Kind, Attempt: rec.capture.Attempt, Phase: rec.phase,
		Elapsed: rec.elapsed(now), Longest: rec.bars.longest, X: rec.x[:len(rec.x):len(rec.x)], Y: rec.y[:len(rec.y):len(rec.y)],
		Band: rec.band, SoFar: rec.soFar, Steps: rec.steps, Line: rec.line}
	if rec.rise.check.At > 0 {
		p.Rise = &Rise{At: rec.rise.check.At, AtLeast: float64(rec.rise.check.AtLeast)}
		if rec.rise.answer.Decided {
			seen := rec.rise.seen
			p.Rise.Seen = &seen
		}
	}
	if rec.rise.answer.Missing && !rec.hasOpened() {
		p.OpenNow = rec.rise.answer.Words
	}
	return p
}

// hasOpened tells whether the pre-charge was seen to open after it had closed.
func (rec *recorder) hasOpened() bool { return rec.closed.everClosed && !rec.closed.closed }

// look says what can be said already; it fits, so it is asked a few times a second at the most.
func (rec *recorder) look() {
	if rec.phase != Running || rec.latest.Sub(rec.lookedAt) < lookEvery {
		return
	}
	rec.lookedAt = rec.latest
	switch rec.capture.Kind {
	case capture.Precharge, capture.Discharge:
		rec.soFar = nil
		if words := measured.SoFar(rec.capture).Words; words != "" {
			rec.soFar = []string{words}
		}
	case capture.Droop:
		rec.lookAtSteps()
	}
}

// lookEvery is how long a fit on the screen stands: it is for reading, not for the verdict.
const lookEvery = time.Second

func (rec *recorder) lookAtSteps() {
	rec.steps, rec.line = nil, nil
	var x, y []float64
	for _, s := range measured.Steps(rec.capture) {
		rec.steps = append(rec.steps, Settled{float64(s.Current), float64(s.Voltage)})
		x, y = append(x, float64(s.Current)), append(y, float64(s.Voltage))
	}
	rec.line = lineThrough(x, y)
}
