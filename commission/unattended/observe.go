package unattended

import (
	"context"
	"fmt"
	"math"
	"time"

	"chargehand/commission"
	"chargehand/commission/capture"
	"chargehand/commission/finding"
	"chargehand/commission/signal"
	"chargehand/commission/walk"
)

// Observe watches a real plant that others operate: it arms the capture of the pre-charge, of the loaded bus and of the
// discharge one after the other, lets each end by what the device shows, and seals the log. It ends when all three have
// been seen, when limit is over (0: no limit), or with ctx; what it did not see stays undecided.
func Observe(ctx context.Context, run *commission.Run, person, unsigned string, limit time.Duration, say func(string)) (finding.Verdict, error) {
	o := &observer{hand: hand{run: run, say: say}}
	watching := ctx
	if limit > 0 {
		var cancel context.CancelFunc
		watching, cancel = context.WithTimeout(ctx, limit)
		defer cancel()
	}
	if _, err := o.await(watching, time.Minute, func(s commission.Snapshot) bool { return s.Link.Up }); err != nil && ctx.Err() != nil {
		return "", err
	}
	for _, kind := range []capture.Kind{capture.Precharge, capture.Droop, capture.Discharge} {
		if err := o.watch(watching, kind); err != nil && watching.Err() == nil {
			return "", err
		}
	}
	if watching.Err() != nil {
		say("the time to watch is over")
	}
	// The seal is written even when the watching was cut short: what was seen is kept.
	sealing, cancel := context.WithTimeout(context.WithoutCancel(ctx), 10*time.Second)
	defer cancel()
	if o.latest.Capture != nil {
		if err := o.submit(sealing, walk.StopCapture{}); err != nil {
			return "", err
		}
	}
	if err := o.submit(sealing, walk.Seal{Person: person, UnsignedBecause: unsigned}); err != nil {
		return "", fmt.Errorf("seal the log: %w", err)
	}
	return o.latest.State.Verdict(), nil
}

type observer struct{ hand }

// watch arms one capture and waits for its end.
func (o *observer) watch(ctx context.Context, kind capture.Kind) error {
	switch {
	case kind == capture.Precharge && isTied(o.latest):
		o.say("the bypass is closed already: the charge was before the watch")
		return nil
	case kind == capture.Droop:
		if _, err := o.await(ctx, ever, isBoosting); err != nil {
			return err
		}
	}
	p, ok := o.latest.State.CaptureOf(kind)
	if !ok {
		return nil
	}
	if err := o.submit(ctx, walk.Arm{Point: p.ID, Observing: true}); err != nil {
		return err
	}
	o.say("armed: " + p.Title)
	alarmed := false
	_, err := o.await(ctx, ever, func(s commission.Snapshot) bool {
		if s.Capture != nil && s.Capture.OpenNow != "" && !alarmed {
			alarmed = true
			o.say("OPEN NOW: " + s.Capture.OpenNow)
		}
		return s.Capture == nil || kind == capture.Droop && s.Link.Up && !isBoosting(s)
	})
	if err == nil && o.latest.Capture != nil {
		err = o.submit(ctx, walk.StopCapture{})
	}
	return err
}

// ever is how long a plant that others operate is waited for: the caller's context and limit end the watch.
const ever = time.Duration(math.MaxInt64)

// isTied tells whether the bypass is closed by the device's own word.
func isTied(s commission.Snapshot) bool {
	bypass := s.Reading(signal.BypassClosed)
	return bypass.Quality.HasValue() && bypass.Value != 0
}

// isBoosting tells whether the converter holds the bus: by its own word, or by a bus that stands above the source.
func isBoosting(s commission.Snapshot) bool {
	if running := s.Reading(signal.Running); running.Quality.HasValue() {
		return running.Value != 0
	}
	bus, source := s.Reading(signal.BusVoltage), s.Reading(signal.SourceVoltage)
	return bus.Quality.HasValue() && source.Quality.HasValue() && bus.Value > 1.02*source.Value
}
