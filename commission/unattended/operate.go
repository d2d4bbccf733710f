package unattended

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strings"
	"time"

	"chargehand/commission"
	"chargehand/commission/capture"
	"chargehand/commission/finding"
	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/commission/walk"
)

// notRehearsed are points that this way of rehearsing does not provoke: they are left out by name, never ticked.
var notRehearsed = map[string]string{
	"trip.control-loss": "the simulated converter has no control supply to take away",
	"boost.ripple":      "the simulated converter has no switching ripple to look at",
	"power.heat":        "the simulated converter has no joints to warm",
	"charge.live-bus":   "the bus was dead before the charge",
}

// operations are what the plant's hand does at a point before its readings are taken.
var operations = map[string]func(*rehearsal, context.Context, walk.Point) error{
	"charge.source":      acts(IsolatorClose),
	"charge.rise":        (*rehearsal).charge,
	"boost.first":        acts(PulsesRelease),
	"boost.step":         acts(LoadShare(20)),
	"share.couple":       acts(LoadOff, InfeedsOn),
	"share.stairs":       (*rehearsal).stairs,
	"share.lost":         acts(LoadShare(50), InfeedsOff),
	"share.regeneration": acts(InfeedsOn, LoadOff, Regenerate),
	"power.keyed":        (*rehearsal).power,
	"trip.earth":         (*rehearsal).earth,
	"trip.voltage":       (*rehearsal).voltage,
	"trip.source":        provoked(SourceWithdraw, SourceBack, Reset, PulsesRelease),
	"trip.bypass-lost":   provoked(ReportDropped, ReportBack, Reset, PulsesRelease),
	"trip.stop":          provoked(Stop, Reset),
	"trip.time-out":      (*rehearsal).timeOut,
	"down.order":         (*rehearsal).shutDown,
	"down.discharge":     (*rehearsal).discharge,
}

// acts does acts in order and waits until the bus is steady.
func acts(acts ...string) func(*rehearsal, context.Context, walk.Point) error {
	return func(r *rehearsal, ctx context.Context, _ walk.Point) error { return r.operate(ctx, acts...) }
}

func (r *rehearsal) do(ctx context.Context, acts ...string) error {
	for _, act := range acts {
		if err := r.op.Do(ctx, act); err != nil {
			return fmt.Errorf("operate %q: %w", act, err)
		}
	}
	return nil
}

// operate does acts in order and lets the plant follow.
func (r *rehearsal) operate(ctx context.Context, acts ...string) error {
	if err := r.do(ctx, acts...); err != nil {
		return err
	}
	return r.steady(ctx)
}

// How a plant is known to have followed: the bus has moved by less than steadyWithin over steadyFor, after a first pause in
// which nothing may have begun to move yet.
const (
	steadyPause  = 120 * time.Millisecond
	steadyFor    = 200 * time.Millisecond
	steadyWithin = 0.6 // V
	steadyAtMost = 5 * time.Second
)

// steady waits until the bus moves no more.
func (r *rehearsal) steady(ctx context.Context) error {
	began := time.Time{}
	var at []time.Time
	var volts []float64
	_, err := r.await(ctx, steadyAtMost, func(s commission.Snapshot) bool {
		if began.IsZero() {
			began = s.Now
		}
		bus := s.Reading(signal.BusVoltage)
		if s.Now.Sub(began) < steadyPause || !bus.Quality.HasValue() || len(at) > 0 && !bus.At.After(at[len(at)-1]) {
			return false
		}
		at, volts = append(at, bus.At), append(volts, bus.Value)
		first := len(at) - 1
		low, high := bus.Value, bus.Value
		for first > 0 && bus.At.Sub(at[first]) < steadyFor {
			first--
			low, high = math.Min(low, volts[first]), math.Max(high, volts[first])
		}
		return bus.At.Sub(at[first]) >= steadyFor && high-low < steadyWithin
	})
	return err
}

// charge arms the capture, has the pre-charge closed with the bypass withheld, opens it again at once where the rise is
// missing, measures the settled difference, and releases the bypass.
func (r *rehearsal) charge(ctx context.Context, p walk.Point) error {
	if err := r.attempt(ctx, p); err != nil {
		return err
	}
	release := r.releaseAfter()
	opened := false
	over, err := r.await(ctx, release+time.Minute, func(s commission.Snapshot) bool {
		if s.Capture == nil {
			return true
		}
		if s.Capture.OpenNow != "" && !opened {
			r.say("open now: " + s.Capture.OpenNow)
			opened = r.op.Do(ctx, PrechargeOpen) == nil
		}
		return s.Capture.Phase == commission.Running && (s.Capture.Elapsed >= release || r.hasSettled(*s.Capture)) && !opened
	})
	if err != nil || !over || r.latest.Capture == nil {
		return err
	}
	r.met = map[string]float64{}
	for _, what := range []string{string(signal.BusVoltage), "difference across the bypass"} {
		if v, _, err := r.op.Measure(ctx, what); err == nil {
			r.met["charge.difference "+what] = v
		}
	}
	// The device's settled reading is one from a while before the bypass closed; the meter's must not be younger where the bus
	// still moves.
	if _, err := r.await(ctx, meterBefore, func(commission.Snapshot) bool { return false }); err != nil {
		return err
	}
	if err := r.op.Do(ctx, BypassRelease); err != nil {
		return err
	}
	return r.untilCaptured(ctx, time.Minute)
}

// meterBefore is how long before its release the bypass finds the meter read.
const meterBefore = 280 * time.Millisecond

// attempt begins a pre-charge with the bypass withheld: what the last one failed of is entered and the resistor has cooled.
func (r *rehearsal) attempt(ctx context.Context, p walk.Point) error {
	if r.latest.State.CauseIsMissing() {
		if err := r.submit(ctx, walk.EnterCause{Cause: r.causeOfLast()}); err != nil {
			return err
		}
	}
	if err := r.cool(ctx); err != nil {
		return err
	}
	if err := r.arm(ctx, p); err != nil {
		return err
	}
	return r.do(ctx, BypassWithhold, PrechargeClose)
}

// causeOfLast is what the last attempt was found to fail of; without a finding it was broken off by the program's end.
func (r *rehearsal) causeOfLast() string {
	for _, id := range []string{"measured.precharge", "measured.closing"} {
		for _, f := range r.latest.State.Measured(id) {
			if f.Verdict == finding.Fail && len(f.Cause) > 0 {
				return "rehearsed as found: " + f.Cause[0].ID + ", " + strings.Join(f.Cause[0].Evidence, "; ")
			}
		}
	}
	return "broken off: the program ended during the attempt"
}

// releaseAfter is how long the bypass is withheld so that the curve can be judged: seven time constants, but no longer than
// four fifths of the time-out.
func (r *rehearsal) releaseAfter() time.Duration {
	seconds := 0.8 * float64(r.latest.State.Site().Precharge.Timeout.Nominal)
	if f, ok := r.latest.State.Finding("precharge.time-constant"); ok && f.State == finding.Finite {
		if seven := 7 * f.Value.High; seconds == 0 || seven < seconds {
			seconds = seven
		}
	}
	return time.Duration(seconds * float64(time.Second))
}

// arm starts a capture and waits until it has its first samples.
func (r *rehearsal) arm(ctx context.Context, p walk.Point) error {
	if err := r.submit(ctx, walk.Arm{Point: p.ID}); err != nil {
		return err
	}
	_, err := r.await(ctx, 80*time.Millisecond, func(commission.Snapshot) bool { return false })
	return err
}

// hasSettled tells whether a charge is over before its time: four of the slowest time constants have passed, and the bus has
// moved by less than half a volt in the last 0.4 s.
func (r *rehearsal) hasSettled(c commission.Progress) bool {
	tau, ok := r.latest.State.Finding("precharge.time-constant")
	if !ok || tau.State != finding.Finite || c.Elapsed.Seconds() < 4*tau.Value.High {
		return false
	}
	last := len(c.X) - 1
	first := last
	for first > 0 && c.X[last]-c.X[first] < 0.4 {
		first--
	}
	return last > 0 && math.Abs(c.Y[last]-c.Y[first]) < 0.5
}

func (r *rehearsal) untilCaptured(ctx context.Context, limit time.Duration) error {
	over, err := r.await(ctx, limit, func(s commission.Snapshot) bool { return s.Capture == nil })
	if err == nil && !over {
		err = r.submit(ctx, walk.StopCapture{})
	}
	return err
}

// stairs loads the bus in six steps up and down and stops the capture. Each lasts long enough for two dozen samples.
func (r *rehearsal) stairs(ctx context.Context, p walk.Point) error {
	if err := r.submit(ctx, walk.Arm{Point: p.ID}); err != nil {
		return err
	}
	for _, percent := range []int{0, 20, 40, 60, 80, 50, 30, 10} {
		if err := r.do(ctx, LoadShare(percent)); err != nil {
			return err
		}
		if _, err := r.await(ctx, 700*time.Millisecond, func(commission.Snapshot) bool { return false }); err != nil {
			return err
		}
	}
	return r.submit(ctx, walk.StopCapture{})
}

// power goes over to current mode with a tenth of the rated power from source to bus.
func (r *rehearsal) power(ctx context.Context, _ walk.Point) error {
	watts := 10e3
	if c := r.latest.State.Site().Converter; c != nil && c.RatedPower.IsGiven() {
		watts = float64(c.RatedPower.Nominal) / 10
	}
	return r.operate(ctx, LoadShare(50), PowerMode, PowerReference(watts))
}

// tripWithin is how long a provoked trip is waited for.
const tripWithin = 8 * time.Second

// provoked arms a capture, does the act that provokes a trip, and brings the plant back once the response is over.
func provoked(provoke string, back ...string) func(*rehearsal, context.Context, walk.Point) error {
	return func(r *rehearsal, ctx context.Context, p walk.Point) error {
		return r.provoke(ctx, p, []string{provoke}, back...)
	}
}

func (r *rehearsal) provoke(ctx context.Context, p walk.Point, acts []string, back ...string) error {
	before := len(r.latest.State.Measured("measured.trip"))
	if err := r.arm(ctx, p); err != nil {
		return err
	}
	if err := r.do(ctx, acts...); err != nil {
		return err
	}
	if err := r.untilCaptured(ctx, tripWithin); err != nil {
		return err
	}
	if err := r.do(ctx, back...); err != nil {
		r.say("the plant does not come back: " + err.Error())
	}
	if len(r.latest.State.Measured("measured.trip")) == before && r.latest.State.Status(p.ID).Result == walk.Open {
		return r.fail(ctx, p, fmt.Sprintf("nothing followed %q within %v", acts[len(acts)-1], tripWithin))
	}
	return r.steady(ctx)
}

func (r *rehearsal) earth(ctx context.Context, p walk.Point) error {
	if err := r.operate(ctx, VoltageMode, LoadShare(20)); err != nil {
		return err
	}
	return r.provoke(ctx, p, []string{EarthTest}, EarthTestOff)
}

// voltage moves each threshold past the bus, one after the other.
func (r *rehearsal) voltage(ctx context.Context, p walk.Point) error {
	bus := r.latest.Reading(signal.BusVoltage)
	if !bus.Quality.HasValue() {
		return r.fail(ctx, p, "no bus voltage to move a threshold past")
	}
	if err := r.provoke(ctx, p, []string{OverVoltageAt(bus.Value - 15)}, OverVoltageOK, Reset, PulsesRelease); err != nil {
		return err
	}
	if r.latest.State.Status(p.ID).Result != walk.Open {
		return nil
	}
	return r.provoke(ctx, p, []string{UnderVoltageAt(bus.Value + 30)}, UnderVoltageOK, Reset, PulsesRelease)
}

// timeOut withholds the bypass until the device gives up: an attempt of its own, so the resistor cools first.
func (r *rehearsal) timeOut(ctx context.Context, p walk.Point) error {
	if err := r.attempt(ctx, p); err != nil {
		return err
	}
	if err := r.hasten(ctx, "time-out", timeOutPace); err != nil {
		return err
	}
	limit := time.Duration(2 * float64(r.latest.State.Site().Precharge.Timeout.Nominal) * float64(time.Second))
	if err := r.untilCaptured(ctx, limit+tripWithin); err != nil {
		return err
	}
	return r.operate(ctx, BypassRelease, Reset)
}

// timeOutPace keeps a hastened time-out sampled every tenth of a second of the plant's time, and well enough where a busy
// computer polls half as fast.
const timeOutPace = 3

// cool waits until the resistor may be charged through again.
func (r *rehearsal) cool(ctx context.Context) error {
	wait := r.latest.State.CoolsFor(r.latest.Now)
	if wait <= 0 {
		return nil
	}
	r.say(fmt.Sprintf("the resistor cools for %v", wait.Round(time.Second)))
	if err := r.hasten(ctx, "cool-down", r.latest.State.Opened().Speed); err != nil {
		return err
	}
	_, err := r.await(ctx, wait+time.Minute, func(s commission.Snapshot) bool { return s.State.CoolsFor(s.Now) <= 0 })
	return err
}

// hasten lets the plant's clock run faster, where the rehearsal may.
func (r *rehearsal) hasten(ctx context.Context, what string, factor float64) error {
	factor = math.Min(factor, r.latest.State.Opened().Speed)
	if factor <= 1 {
		return nil
	}
	return r.submit(ctx, walk.Hastened{Hastened: record.Hastened{What: what, Factor: factor}})
}

// shutDown arms the discharge before anything is opened.
func (r *rehearsal) shutDown(ctx context.Context, _ walk.Point) error {
	p, ok := r.latest.State.CaptureOf(capture.Discharge)
	if !ok {
		return nil
	}
	err := r.arm(ctx, p)
	var refused *walk.RefusedError
	if err != nil && !errors.As(err, &refused) {
		return err
	}
	if err := r.do(ctx, LoadOff, EverythingOff); err != nil {
		return err
	}
	_, err = r.await(ctx, 500*time.Millisecond, func(commission.Snapshot) bool { return false })
	return err
}

func (r *rehearsal) discharge(ctx context.Context, _ walk.Point) error {
	limit := 3 * time.Minute
	if f, ok := r.latest.State.Finding("discharge.touch-safe"); ok && f.State == finding.Never {
		limit = 5 * time.Second // nothing discharges this bus, which the desk has said already
	}
	return r.untilCaptured(ctx, limit)
}
