package main

import (
	"cmp"
	"context"
	"math"
	"math/rand/v2"
	"slices"
	"testing"
	"time"

	"chargehand/commission/capture"
	"chargehand/commission/discharge"
	"chargehand/commission/finding"
	"chargehand/commission/measured"
	"chargehand/commission/precharge"
	"chargehand/commission/quantity"
	"chargehand/commission/signal"
	"chargehand/commission/site"
	"chargehand/commission/unattended"
	"chargehand/protocol/registermap"
	"chargehand/protocol/simulator"
)

// bench is a simulated converter that is polled without a network, on a clock that only the bench moves.
type bench struct {
	t         testing.TB
	site      site.Site
	registers registermap.Map
	plant     *simulator.Simulator
	plan      registermap.Plan
	random    *rand.Rand
	start     time.Time
	now       time.Time
	period    time.Duration // from poll to poll
	stall     time.Time     // at which one poll comes late, zero for never
	stands    time.Duration // how late

	last      []signal.Reading // as decoded, in map order
	missed    int              // polls in a row without an answer
	beat      float64          // of the heartbeat
	beats     int
	beatSince time.Time
	window    *recording
}

func newBench(t testing.TB, s site.Site, m registermap.Map, seed int64, disturb ...simulator.Disturbance) *bench {
	t.Helper()
	b := &bench{t: t, site: s, registers: m, random: rand.New(rand.NewPCG(uint64(seed), 0x62656e6368)), start: time.Date(2026, 12, 1, 9, 0, 0, 0, time.UTC)}
	b.now, b.period = b.start, 50*time.Millisecond
	refresh := time.Duration(20+40*b.random.Float64()) * time.Millisecond
	plant, err := simulator.New(simulator.Options{Site: s, Map: m, Now: func() time.Time { return b.now }, Seed: seed, Disturb: disturb, Refresh: refresh})
	if err != nil {
		t.Fatal(err)
	}
	unit := uint8(1)
	if s.Device != nil {
		unit = s.Device.UnitID
	}
	b.plant, b.plan, b.last = plant, m.Plan(registermap.Limits{UnitID: unit}), make([]signal.Reading, len(m.Points))
	return b
}

func (b *bench) do(act string) {
	b.t.Helper()
	parsed, err := simulator.ParseAct(act)
	if err != nil {
		b.t.Fatal(err)
	}
	_ = b.plant.Do(context.Background(), parsed) // an interlock may refuse: a disturbed plant is left as it is
}

// run polls for so long; it ends early where the window has ended.
func (b *bench) run(d time.Duration) {
	b.t.Helper()
	for until := b.now.Add(d); b.now.Before(until) && (b.window == nil || !b.window.over); {
		step := float64(b.period) * (0.8 + 0.4*b.random.Float64())
		if b.random.IntN(200) == 0 {
			step += 3 * float64(b.period)
		}
		b.now = b.now.Add(time.Duration(step))
		if !b.stall.IsZero() && b.now.After(b.stall) {
			b.now, b.stall = b.now.Add(b.stands), time.Time{}
		}
		batch := b.poll()
		if b.window != nil {
			b.window.take(batch)
			if b.window.faster > 0 {
				b.period = b.window.faster
			}
		}
	}
	if err := b.plant.Err(); err != nil {
		b.t.Fatal(err)
	}
}

// poll is one round over all blocks, as the program's poller does it: values that are too old, of a link that is down or of
// a device whose heartbeat stands still are withdrawn.
func (b *bench) poll() signal.Batch {
	answered := false
	for _, block := range b.plan.Blocks {
		words, err := b.plant.Registers(block.UnitID, block.Table, block.Address, block.Quantity)
		if err != nil {
			continue
		}
		answered = true
		for _, i := range block.Points {
			r := b.registers.Points[i].Decode(block.Words(b.registers.Points[i], words))
			r.At = b.now
			b.last[i] = r
			if r.Name == signal.Heartbeat && r.Value != b.beat {
				b.beat, b.beatSince = r.Value, b.now
				b.beats++
			}
		}
	}
	b.missed++
	if answered {
		b.missed = 0
	}
	silent := b.beats > 3 && b.now.Sub(b.beatSince) > max(time.Second, 20*b.period)
	batch := signal.Batch{At: b.now, Readings: make([]signal.Reading, len(b.last))}
	for i, r := range b.last {
		if r.Quality.HasValue() && (b.missed > 1 || silent || b.now.Sub(r.At) > 500*time.Millisecond) {
			r.Quality = signal.Stale
		}
		batch.Readings[i] = r
	}
	return batch
}

// kept are the signals that the program's captures keep.
var kept = map[signal.Name]bool{signal.BusVoltage: true, signal.SourceVoltage: true, signal.StarPointVoltage: true, signal.SourceCurrent: true,
	signal.BusCurrent: true, signal.PhaseCurrent1: true, signal.PhaseCurrent2: true, signal.PhaseCurrent3: true, signal.PrechargeClosed: true,
	signal.BypassClosed: true, signal.ResistorTemperature: true, signal.Fault: true, signal.ChopperActive: true, signal.Running: true}

// recording takes batches as an armed capture of the program does.
type recording struct {
	capture                    capture.Capture
	latest, bypassAt, openedAt time.Time
	running, over              bool
	level                      float64
	hasLevel, closed, ever     bool
	bypass                     bool
	low                        int
	touch                      float64
	longest, tau               time.Duration
	faster                     time.Duration // poll period from the event on, 0 for the same
	rise                       measured.Check
	decided, missing           bool
}

func (b *bench) arm(kind capture.Kind) *recording {
	w := &recording{touch: 60}
	w.capture = capture.Capture{ID: "c1", Kind: kind, Attempt: 1, T0: b.now}
	for _, ch := range channels(b.registers) {
		if kept[ch.Name] || kind == capture.Droop && (ch.Name == signal.VoltageSetpoint || ch.Name == signal.DroopSetting || ch.Name == signal.Power) {
			w.capture.Channels = append(w.capture.Channels, ch)
		}
	}
	if t := b.site.Bus.TouchSafe; t != nil {
		w.touch = float64(t.Voltage.Nominal)
	}
	b.window = w
	return w
}

// shown is a signal as it reads now.
func (b *bench) shown(n signal.Name) float64 {
	for _, r := range b.poll().Readings {
		if r.Name == n && r.Quality.HasValue() {
			return r.Value
		}
	}
	return math.NaN()
}

func (w *recording) take(batch signal.Batch) {
	sample := capture.Sample{Values: make([]capture.Value, len(w.capture.Channels))}
	for i, ch := range w.capture.Channels {
		if r := batch.Find(ch.Name); r.Quality.HasValue() {
			sample.Values[i] = capture.Value{V: r.Value, OK: true, Raw: r.Raw}
		}
	}
	bus, at := batch.Find(signal.BusVoltage), batch.At
	if bus.Quality.HasValue() {
		at = bus.At
	}
	if !at.After(w.latest) {
		return // an answer that has been taken already
	}
	w.latest = at
	w.contacts(batch)
	if !w.running {
		w.await(bus, at)
	}
	sample.At = at.Sub(w.capture.T0)
	w.capture.Samples = append(w.capture.Samples, sample)
	for !w.running && sample.At-w.capture.Samples[0].At > 2*time.Second {
		w.capture.Samples = w.capture.Samples[1:]
	}
	if w.running && w.rise.At > 0 && !w.decided {
		r := measured.Rise(w.capture, w.rise)
		w.decided, w.missing = r.Decided, r.Missing
	}
	if bus.Quality.HasValue() {
		w.low++
		if bus.Value >= w.touch {
			w.low = 0
		}
	}
	w.end(batch.At)
}

func (w *recording) contacts(batch signal.Batch) {
	if r := batch.Find(signal.PrechargeClosed); r.Quality.HasValue() {
		if w.closed && r.Value == 0 {
			w.openedAt = batch.At
		}
		w.closed = r.Value != 0
		w.ever = w.ever || w.closed
	}
	if r := batch.Find(signal.BypassClosed); r.Quality.HasValue() {
		if !w.bypass && r.Value != 0 {
			w.bypassAt = batch.At
		}
		w.bypass = r.Value != 0
	}
}

func (w *recording) await(bus signal.Reading, at time.Time) {
	if bus.Quality.HasValue() && !w.hasLevel {
		w.level, w.hasLevel = bus.Value, true
	}
	moved := func(direction float64) bool {
		return bus.Quality.HasValue() && w.hasLevel && (bus.Value-w.level)*direction > max(0.02*math.Abs(w.level), 5)
	}
	switch w.capture.Kind {
	case capture.Precharge:
		w.running = w.closed || moved(1) || w.bypass
	case capture.Discharge:
		w.running = moved(-1)
		if w.running && w.tau > 0 {
			w.faster = max(w.tau/100, 50*time.Millisecond)
		}
	default:
		w.running = true
	}
	if !w.running {
		return
	}
	shift := at.Sub(w.capture.T0)
	w.capture.T0 = at
	for i := range w.capture.Samples {
		w.capture.Samples[i].At -= shift
	}
}

func (w *recording) end(now time.Time) {
	elapsed := now.Sub(w.capture.T0)
	switch {
	case !w.running:
	case w.capture.Kind == capture.Precharge:
		w.over = w.bypass && now.Sub(w.bypassAt) >= time.Second && elapsed >= time.Second ||
			w.ever && !w.closed && !w.bypass && now.Sub(w.openedAt) >= time.Second
	case w.capture.Kind == capture.Discharge:
		w.over = w.low >= 5
	}
	w.over = w.over || w.running && w.longest > 0 && elapsed > w.longest
}

// done gives the capture as the program keeps it.
func (b *bench) done() capture.Capture {
	c := b.window.capture
	if !b.window.running { // the program keeps no capture of what never began
		c.Samples = nil
	}
	b.window = nil
	n := len(c.Samples)
	if n < 3 {
		return c
	}
	return c.WithGaps(signal.BusVoltage, max(5*(c.Samples[n-1].At-c.Samples[0].At)/time.Duration(n-1), 100*time.Millisecond), "no new value")
}

// charge pre-charges as an unattended rehearsal does; without withholding as a plant does by itself. lead is how long the
// plant has been at rest before the command.
func (b *bench) charge(withhold bool, lead time.Duration) capture.Capture {
	watched := time.Duration(b.random.Float64() * float64(600*time.Millisecond))
	b.run(max(lead-500*time.Millisecond-watched, 0))
	b.do(unattended.IsolatorClose)
	b.run(500 * time.Millisecond)
	w := b.arm(capture.Precharge)
	source, bus := b.shown(signal.SourceVoltage), b.shown(signal.BusVoltage)
	low, high := b.site.Source.LowestRest(), b.site.Source.HighestRest()
	emf := quantity.Spread[quantity.Voltage]{Low: low, Nominal: (low + high) / 2, High: high}
	if v := quantity.Voltage(source); v > 0 {
		emf = quantity.Spread[quantity.Voltage]{Low: v - b.site.Source.Error(), Nominal: v, High: v + b.site.Source.Error()}
	}
	v0 := quantity.Voltage(math.Max(bus, 0))
	if math.IsNaN(bus) {
		v0 = 0
	}
	p := precharge.Predict(b.site, emf, v0)
	w.rise = measured.Check{At: p.EarlyRise.At, AtLeast: p.EarlyRise.AtLeast}
	longest := 1.5 * math.Max(float64(b.site.Precharge.Timeout.Nominal), finite(float64(p.TimeToClose.High)))
	if longest == 0 {
		longest = 8 * float64(p.TimeConstant.High)
	}
	w.longest = time.Duration(longest * float64(time.Second))
	b.run(watched)
	if withhold {
		b.do(unattended.BypassWithhold)
	}
	b.do(unattended.PrechargeClose)
	release := 0.8 * float64(b.site.Precharge.Timeout.Nominal)
	if seven := 7 * finite(float64(precharge.Predict(b.site, spread(low, high), 0).TimeConstant.High)); release == 0 || seven < release {
		release = seven
	}
	opened := false
	for until := b.now.Add(time.Duration(longest+5) * time.Second); !w.over && b.now.Before(until); {
		b.run(100 * time.Millisecond)
		if w.missing && !opened {
			b.do(unattended.PrechargeOpen)
			opened = true
		}
		if withhold && w.running && !opened && b.now.Sub(w.capture.T0).Seconds() >= release {
			b.do(unattended.BypassRelease)
			withhold = false
		}
	}
	return b.done()
}

func spread(low, high quantity.Voltage) quantity.Spread[quantity.Voltage] {
	return quantity.Spread[quantity.Voltage]{Low: low, Nominal: (low + high) / 2, High: high}
}

func finite(v float64) float64 {
	if math.IsInf(v, 0) || math.IsNaN(v) {
		return 0
	}
	return v
}

// stairs loads the bus in steps as an unattended rehearsal does.
func (b *bench) stairs() capture.Capture {
	b.restore(8)
	b.arm(capture.Droop)
	for _, percent := range []int{0, 20, 40, 60, 80, 50, 30, 10} {
		b.do(unattended.LoadShare(percent))
		b.run(1200 * time.Millisecond)
	}
	return b.done()
}

// discharge shuts the running plant down and watches the bus fall at a hundred samples a time constant.
func (b *bench) discharge() capture.Capture {
	b.restore(11)
	b.run(300 * time.Millisecond)
	w := b.arm(capture.Discharge)
	e := b.site.Bus.Error()
	v := quantity.Voltage(finite(b.shown(signal.BusVoltage)))
	p := discharge.Predict(b.site, quantity.Spread[quantity.Voltage]{Low: max(v-e, 0), Nominal: v, High: v + e})
	w.tau = time.Duration(finite(float64(p.TimeConstant.Nominal)) * float64(time.Second))
	w.longest = time.Duration(1.5 * finite(float64(p.TimeToTouchSafe.High)) * float64(time.Second))
	b.run(500 * time.Millisecond)
	b.do(unattended.LoadOff)
	b.do(unattended.EverythingOff)
	b.run(max(w.longest, 5*w.tau) + 10*time.Second)
	return b.done()
}

func (b *bench) restore(stage int) {
	b.t.Helper()
	if err := b.plant.Restore(stage); err != nil {
		b.t.Fatal(err)
	}
}

// judged is what the diagnosis says of a capture: all findings, and all their causes by score.
func judged(s site.Site, c capture.Capture) ([]finding.Finding, []finding.Cause) {
	var found []finding.Finding
	switch c.Kind {
	case capture.Precharge:
		found = measured.Precharge(s, c)
	case capture.Discharge:
		found = measured.Discharge(s, c)
	case capture.Droop:
		found = measured.DroopCapture(s, c)
	}
	var causes []finding.Cause
	for _, f := range found {
		causes = append(causes, f.Cause...)
	}
	slices.SortStableFunc(causes, func(a, b finding.Cause) int { return cmp.Compare(b.Score, a.Score) })
	return found, causes
}
