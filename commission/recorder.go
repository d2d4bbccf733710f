package commission

import (
	"slices"
	"time"

	"chargehand/commission/capture"
	"chargehand/commission/signal"
	"chargehand/commission/site"
)

// Phase is how far a capture is.
type Phase string

// The phases of a capture.
const (
	Armed   Phase = "armed"   // waits for its event
	Running Phase = "running" // counts from its event
)

// quiet is how long nothing must have changed for the response to a trip to be over.
const quiet = 700 * time.Millisecond

// before is how much is kept from before the event: enough to see a bus that was not dead.
const before = 2 * time.Second

// recorder collects the readings of one armed window. It is owned by Run and asks no clock.
type recorder struct {
	point string
	site  site.Site
	phase Phase
	rise  riseWatch
	bars  bars
	band  Band
	tau   float64 // predicted time constant of a discharge, s

	capture  capture.Capture
	armedAt  time.Time
	latest   time.Time // of the last sample
	resumes  time.Time // when a hastened capture takes samples again
	level    float64   // of the bus when armed
	hasLevel bool
	closed   contact // pre-charge contactor
	bypass   contact
	bits     map[signal.Name]*contact // every state bit, for a capture that waits for one to change
	changed  time.Time                // when one did last
	low      int                      // samples in a row below the touch-safe voltage

	soFar    []string
	steps    []Settled
	line     *Line
	lookedAt time.Time

	x, y []float64 // the trace of the bus voltage (V) over time (s), or over the bus current (A) for the load stairs
}

// contact follows a state bit.
type contact struct {
	known, closed bool
	since         time.Time
	everClosed    bool
}

func (c *contact) take(r signal.Reading) (changed bool) {
	if !r.Quality.HasValue() {
		return false
	}
	now := r.Value != 0
	changed = !c.known || now != c.closed
	if changed {
		c.since = r.At
	}
	c.known, c.closed = true, now
	c.everClosed = c.everClosed || now
	return changed
}

// bars are when a capture ends at the latest, from the predictions.
type bars struct {
	longest time.Duration // after the event
	touch   float64       // V; 0 where it is not known
}

// channels are the signals that a kind of capture needs, of those the map has.
func channels(kind capture.Kind, all []capture.Channel) []capture.Channel {
	want := map[signal.Name]bool{signal.BusVoltage: true, signal.SourceVoltage: true, signal.StarPointVoltage: true,
		signal.SourceCurrent: true, signal.BusCurrent: true, signal.PhaseCurrent1: true, signal.PhaseCurrent2: true,
		signal.PhaseCurrent3: true, signal.PrechargeClosed: true, signal.BypassClosed: true, signal.ResistorTemperature: true,
		signal.Fault: true, signal.ChopperActive: true, signal.Running: true, signal.MainClosed: true}
	if kind == capture.Droop || kind == capture.Step {
		want[signal.VoltageSetpoint], want[signal.DroopSetting], want[signal.Power] = true, true, true
		want[signal.DischargeLimit] = true
	}
	if kind == capture.Step {
		want[signal.InsulationResistance] = true
	}
	var some []capture.Channel
	for _, ch := range all {
		if want[ch.Name] {
			some = append(some, ch)
		}
	}
	return some
}

// take takes one batch into the window.
func (r *recorder) take(b signal.Batch) {
	sample := capture.Sample{Values: make([]capture.Value, len(r.capture.Channels))}
	at := b.At
	for i, ch := range r.capture.Channels {
		reading := b.Find(ch.Name)
		if reading.Quality.HasValue() {
			sample.Values[i] = capture.Value{V: reading.Value, OK: true, Raw: reading.Raw}
		}
		if ch.Name == signal.BusVoltage && reading.Quality.HasValue() {
			at = reading.At
		}
	}
	if !at.After(r.latest) || at.Before(r.resumes) {
		return // an answer that has been taken already, or too near the one before a hastened stretch
	}
	r.latest = at
	r.precharge(b)
	bus := b.Find(signal.BusVoltage)
	if r.phase == Armed {
		r.await(bus, b)
	}
	sample.At = at.Sub(r.capture.T0)
	if r.phase == Armed {
		sample.At = at.Sub(r.armedAt)
		r.forget(sample.At)
	}
	r.capture.Samples = append(r.capture.Samples, sample)
	r.draw(sample, bus, b.Find(signal.BusCurrent))
	r.count(bus)
	r.rise.take(r.capture, r.phase)
	r.look()
}

// kindSlow tells whether the capture waits for minutes, so that a rehearsal may hasten it.
func (r *recorder) kindSlow() bool { return r.capture.Kind == capture.Discharge && r.tau > 0 }

func (r *recorder) precharge(b signal.Batch) {
	r.closed.take(b.Find(signal.PrechargeClosed))
	r.bypass.take(b.Find(signal.BypassClosed))
	for _, ch := range r.capture.Channels {
		if r.capture.Kind == capture.Step && ch.Name.IsState() {
			r.watch(b.Find(ch.Name))
		}
	}
}

// watch notes when a state bit changes from what it was when the capture was armed, or since.
func (r *recorder) watch(bit signal.Reading) {
	if r.bits == nil {
		r.bits = map[signal.Name]*contact{}
	}
	c := r.bits[bit.Name]
	if c == nil {
		c = &contact{}
		r.bits[bit.Name] = c
	}
	if was := c.known; c.take(bit) && was {
		r.changed = bit.At
	}
}

// await looks for the event of an armed capture and makes its instant the zero of the time axis.
func (r *recorder) await(bus signal.Reading, b signal.Batch) {
	if bus.Quality.HasValue() && !r.hasLevel {
		r.level, r.hasLevel = bus.Value, true
	}
	switch r.capture.Kind {
	case capture.Precharge:
		if contactor := b.Find(signal.PrechargeClosed); r.closed.known && r.closed.closed || r.moved(bus, +1) || r.bypass.closed {
			at := bus.At
			if r.closed.closed {
				at = contactor.At
			}
			r.begin(at)
		}
	case capture.Discharge:
		if r.moved(bus, -1) {
			r.begin(bus.At)
		}
	case capture.Step:
		if !r.changed.IsZero() {
			r.begin(r.changed)
		}
	default:
		r.begin(b.At)
	}
}

// moved tells whether the bus has left the level it had when armed by more than half a per cent of that level and 5 V, so that
// noise and the register's last digit start nothing.
func (r *recorder) moved(bus signal.Reading, direction float64) bool {
	if !bus.Quality.HasValue() || !r.hasLevel {
		return false
	}
	return (bus.Value-r.level)*direction > max(0.005*abs(r.level), 5)
}

// begin sets the zero of the time axis and moves the samples kept from before to it.
func (r *recorder) begin(at time.Time) {
	shift := at.Sub(r.armedAt)
	r.capture.T0, r.phase = at, Running
	for i := range r.capture.Samples {
		r.capture.Samples[i].At -= shift
	}
	if r.capture.Kind == capture.Droop {
		return
	}
	moved := make([]float64, len(r.x), len(r.x)+1024) // a screen may hold the old one
	for i, x := range r.x {
		moved[i] = x - shift.Seconds()
	}
	r.x = moved
}

// forget drops samples that lie too long before now while nothing has happened.
func (r *recorder) forget(now time.Duration) {
	keep := 0
	for keep < len(r.capture.Samples) && now-r.capture.Samples[keep].At > before {
		keep++
	}
	r.capture.Samples = r.capture.Samples[keep:]
	keep = min(keep, len(r.x))
	if r.capture.Kind != capture.Droop {
		r.x, r.y = r.x[keep:], r.y[keep:]
	}
}

// thin keeps of the samples so far only those that stand as far apart as the later ones of a hastened capture will, so that a
// fit does not lean on the first second.
func (r *recorder) thin(apart time.Duration) {
	var samples []capture.Sample
	var x, y []float64
	bus := r.capture.Index(signal.BusVoltage)
	for i := len(r.capture.Samples) - 1; i >= 0; i-- {
		s := r.capture.Samples[i]
		if n := len(samples); n > 0 && samples[n-1].At-s.At < apart {
			continue
		}
		samples = append(samples, s)
		if bus >= 0 && s.Values[bus].OK {
			x, y = append(x, s.At.Seconds()), append(y, s.Values[bus].V)
		}
	}
	slices.Reverse(samples)
	slices.Reverse(x)
	slices.Reverse(y)
	r.capture.Samples, r.x, r.y = samples, x, y
	r.resumes = r.latest.Add(apart / 2)
}

// draw appends to the trace; what was drawn is never changed, so that a screen may hold it.
func (r *recorder) draw(sample capture.Sample, bus, current signal.Reading) {
	if !bus.Quality.HasValue() {
		return
	}
	if r.capture.Kind != capture.Droop {
		r.x, r.y = append(r.x, sample.At.Seconds()), append(r.y, bus.Value)
	} else if current.Quality.HasValue() {
		r.x, r.y = append(r.x, current.Value), append(r.y, bus.Value)
	}
}

func (r *recorder) count(bus signal.Reading) {
	switch {
	case !bus.Quality.HasValue():
	case r.bars.touch > 0 && bus.Value < r.bars.touch:
		r.low++
	default:
		r.low = 0
	}
}

// elapsed is the time since the event, or since arming.
func (r *recorder) elapsed(now time.Time) time.Duration {
	if r.phase == Armed {
		return now.Sub(r.armedAt)
	}
	return now.Sub(r.capture.T0)
}

// ended tells whether the capture is over by itself, and why.
func (r *recorder) ended(now time.Time) (because string, done bool) {
	if r.phase == Armed {
		return "", false
	}
	elapsed := r.elapsed(now)
	switch r.capture.Kind {
	case capture.Precharge:
		if r.bypass.closed && r.latest.Sub(r.bypass.since) >= time.Second && elapsed >= time.Second {
			return "the bypass has closed", true
		}
		if r.closed.everClosed && !r.closed.closed && !r.bypass.closed && r.latest.Sub(r.closed.since) >= time.Second {
			return "the pre-charge was opened", true
		}
	case capture.Discharge:
		if r.low >= 5 {
			return "the bus is below the touch-safe voltage", true
		}
	case capture.Step:
		isCharging := r.closed.closed && !r.bypass.closed
		if !isCharging && r.latest.Sub(r.changed) >= quiet {
			return "nothing has changed any more", true
		}
	default:
		return "", false
	}
	if r.bars.longest > 0 && elapsed > r.bars.longest {
		return "the longest predicted time is over", true
	}
	return "", false
}
