package unattended

import (
	"context"
	"errors"
	"fmt"
	"strings"
	"time"

	"chargehand/commission"
	"chargehand/commission/capture"
	"chargehand/commission/finding"
	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/commission/walk"
)

// Rehearse goes the whole walk on a simulated plant whose hand is op, by the same rules as a person: what fails is failed
// and raised as a punch item, and a hold that cannot be passed ends the walk there. It seals the log and gives the
// verdict. say is told in a line what it does; person is the id of whoever signs.
func Rehearse(ctx context.Context, run *commission.Run, op Operator, person, instrument, unsigned string, say func(string)) (finding.Verdict, error) {
	r := &rehearsal{hand: hand{run: run, say: say}, op: op, person: person, instrument: instrument, unsigned: unsigned}
	if _, err := r.await(ctx, 10*time.Second, func(s commission.Snapshot) bool { return s.Link.Up }); err != nil {
		return "", err
	}
	for stage := r.latest.State.Stage(); stage <= walk.Stages; stage++ {
		if err := r.stage(ctx, stage); err != nil {
			var refused *walk.RefusedError
			if !errors.As(err, &refused) && !errors.Is(err, errHeld) {
				return "", err
			}
			say("the walk ends in stage " + fmt.Sprint(stage) + ": " + err.Error())
			break
		}
	}
	if err := r.submit(ctx, walk.Seal{Person: person, UnsignedBecause: unsigned}); err != nil {
		return "", fmt.Errorf("seal the log: %w", err)
	}
	return r.latest.State.Verdict(), nil
}

// errHeld ends the walk at a hold that is not passed.
var errHeld = errors.New("a hold point is not passed")

type rehearsal struct {
	hand
	op                           Operator
	person, instrument, unsigned string
	met                          map[string]float64 // what the meter showed while a capture ran, by point and place
}

func (r *rehearsal) stage(ctx context.Context, stage int) error {
	if err := r.submit(ctx, walk.Enter{Stage: stage}); err != nil {
		return err
	}
	r.say(fmt.Sprintf("stage %d, %s", stage, walk.StageTitles[stage-1]))
	for _, p := range r.latest.State.InStage(stage) {
		if r.latest.State.IsDone(p) {
			continue
		}
		if err := r.point(ctx, p); err != nil {
			return fmt.Errorf("point %s: %w", p.ID, err)
		}
	}
	return nil
}

// point operates what belongs to a point, takes its readings, judges and signs it.
func (r *rehearsal) point(ctx context.Context, p walk.Point) error {
	if because, ok := notRehearsed[p.ID]; ok {
		if err := r.submit(ctx, walk.Judge{Point: p.ID, Result: walk.NotApplicable, Note: because}); err != nil {
			return err
		}
		return r.sign(ctx, p)
	}
	if operate, ok := operations[p.ID]; ok {
		if err := operate(r, ctx, p); err != nil {
			return err
		}
	}
	if err := r.readings(ctx, p); err != nil {
		return err
	}
	if err := r.judge(ctx, p); err != nil {
		return err
	}
	return r.sign(ctx, p)
}

func (r *rehearsal) sign(ctx context.Context, p walk.Point) error {
	if p.Kind != walk.Hold {
		return nil
	}
	return r.submit(ctx, walk.Sign{Point: p.ID, Person: r.person, UnsignedBecause: r.unsigned})
}

func (r *rehearsal) readings(ctx context.Context, p walk.Point) error {
	for _, by := range p.By {
		var err error
		switch by {
		case walk.Live:
			err = r.takeLive(ctx, p)
		case walk.Instrument:
			err = r.measure(ctx, p)
		case walk.Observation, walk.Document:
			err = r.observe(ctx, p)
		}
		if err != nil {
			return err
		}
	}
	return nil
}

func (r *rehearsal) takeLive(ctx context.Context, p walk.Point) error {
	if p.Capture != "" || len(p.Signals) == 0 || len(r.latest.State.Status(p.ID).Readings) > 0 {
		return nil // the capture has brought them
	}
	err := r.submit(ctx, walk.TakeLive{Point: p.ID})
	var refused *walk.RefusedError
	if errors.As(err, &refused) {
		return nil // nothing of it is in the map: the point stays open for another way
	}
	return err
}

// measure reads the hand instrument wherever the point wants it; a place it cannot reach leaves the point open.
func (r *rehearsal) measure(ctx context.Context, p walk.Point) error {
	for _, h := range p.Hand {
		value, ok := r.met[p.ID+" "+h.What]
		if !ok {
			var err error
			if value, _, err = r.op.Measure(ctx, h.What); err != nil {
				r.say("not measured: " + err.Error())
				continue
			}
		}
		err := r.submit(ctx, walk.Take{Reading: record.Reading{Point: p.ID, Signal: h.What, Value: &value, Unit: h.Unit,
			Source: record.FromInstrument, Instrument: &r.instrument, Quality: string(signal.Good)}})
		if err != nil {
			return err
		}
	}
	return nil
}

// observe enters what was seen; where the point proves signals by the device's own display, each of them.
func (r *rehearsal) observe(ctx context.Context, p walk.Point) error {
	for _, name := range p.Proves {
		if p.Wants(walk.Instrument) {
			break
		}
		value, unit, err := r.op.Measure(ctx, string(name))
		if err != nil {
			continue // the simulated device has no such display
		}
		if err := r.submit(ctx, walk.Take{Reading: record.Reading{Point: p.ID, Signal: string(name), Value: &value, Unit: unit,
			Source: record.Observed, Quality: string(signal.Good), Text: "as the device's display shows"}}); err != nil {
			return err
		}
	}
	return r.submit(ctx, walk.Take{Reading: record.Reading{Point: p.ID, Signal: "seen", Source: record.Observed,
		Quality: string(signal.Good), Text: "rehearsed: " + strings.ToLower(p.Title)}})
}

func (r *rehearsal) judge(ctx context.Context, p walk.Point) error {
	judged := walk.Judge{Point: p.ID, Result: walk.Passed}
	err := r.submit(ctx, judged)
	var refused *walk.RefusedError
	if err == nil || !errors.As(err, &refused) {
		return err
	}
	assessed := r.latest.State.Assess(p)
	judged.Note = strings.Join(assessed.Because, "; ")
	if judged.Note == "" {
		judged.Note = refused.Error()
	}
	if assessed.Result != walk.Failed && p.MayOmit {
		judged.Result = walk.NotApplicable
		return r.submit(ctx, judged)
	}
	judged.Result = walk.Failed
	if err := r.submit(ctx, judged); err != nil {
		return err
	}
	r.say(p.ID + " fails: " + judged.Note)
	if p.Kind == walk.Hold {
		return fmt.Errorf("%w: %s", errHeld, judged.Note)
	}
	return r.submit(ctx, walk.RaisePunch{What: p.ID + ": " + judged.Note, Severity: "A", Owner: "rehearsal", Due: "before energising", Point: p.ID})
}

// notRehearsed are points that this way of rehearsing does not provoke: they are left out by name, never ticked.
var notRehearsed = map[string]string{
	"trip.stop":         notProvoked,
	"trip.time-out":     notProvoked,
	"trip.bypass-lost":  notProvoked,
	"trip.voltage":      notProvoked,
	"trip.source":       notProvoked,
	"trip.earth":        notProvoked,
	"trip.control-loss": notProvoked,
	"boost.ripple":      "the simulated converter has no switching ripple to look at",
	"power.heat":        "the simulated converter has no joints to warm",
	"charge.live-bus":   "the bus was dead before the charge",
}

const notProvoked = "not provoked in an unattended rehearsal"

// operations are what the plant's hand does at a point before its readings are taken.
var operations = map[string]func(*rehearsal, context.Context, walk.Point) error{
	"charge.source": func(r *rehearsal, ctx context.Context, _ walk.Point) error {
		return r.operate(ctx, 500*time.Millisecond, IsolatorClose)
	},
	"charge.rise": (*rehearsal).charge,
	"boost.first": func(r *rehearsal, ctx context.Context, _ walk.Point) error {
		return r.operate(ctx, 2*time.Second, PulsesRelease)
	},
	"boost.step": func(r *rehearsal, ctx context.Context, _ walk.Point) error {
		return r.operate(ctx, time.Second, LoadShare(20))
	},
	"share.couple": func(r *rehearsal, ctx context.Context, _ walk.Point) error {
		return r.operate(ctx, time.Second, LoadOff, InfeedsOn)
	},
	"share.stairs": (*rehearsal).stairs,
	"share.lost": func(r *rehearsal, ctx context.Context, _ walk.Point) error {
		return r.operate(ctx, time.Second, LoadShare(50), InfeedsOff)
	},
	"share.regeneration": func(r *rehearsal, ctx context.Context, _ walk.Point) error {
		return r.operate(ctx, time.Second, InfeedsOn, LoadOff, Regenerate)
	},
	"power.sign":     (*rehearsal).power,
	"down.order":     (*rehearsal).shutDown,
	"down.discharge": (*rehearsal).discharge,
}

// operate does acts in order and lets the plant and the link follow (plant time that passes as wall time).
func (r *rehearsal) operate(ctx context.Context, settle time.Duration, acts ...string) error {
	for _, act := range acts {
		if err := r.op.Do(ctx, act); err != nil {
			return fmt.Errorf("operate %q: %w", act, err)
		}
	}
	_, err := r.await(ctx, settle, func(commission.Snapshot) bool { return false })
	return err
}

// charge arms the capture, has the pre-charge closed with the bypass withheld, opens it again at once where the rise is
// missing, measures the settled difference, and releases the bypass.
func (r *rehearsal) charge(ctx context.Context, p walk.Point) error {
	if err := r.submit(ctx, walk.Arm{Point: p.ID}); err != nil {
		return err
	}
	if err := r.operate(ctx, 300*time.Millisecond, BypassWithhold, PrechargeClose); err != nil {
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
		return s.Capture.Phase == commission.Running && s.Capture.Elapsed >= release && !opened
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
	if err := r.op.Do(ctx, BypassRelease); err != nil {
		return err
	}
	return r.untilCaptured(ctx, time.Minute)
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

func (r *rehearsal) untilCaptured(ctx context.Context, limit time.Duration) error {
	over, err := r.await(ctx, limit, func(s commission.Snapshot) bool { return s.Capture == nil })
	if err == nil && !over {
		err = r.submit(ctx, walk.StopCapture{})
	}
	return err
}

// stairs loads the bus in six steps up and down and stops the capture.
func (r *rehearsal) stairs(ctx context.Context, p walk.Point) error {
	if err := r.submit(ctx, walk.Arm{Point: p.ID}); err != nil {
		return err
	}
	for _, percent := range []int{0, 20, 40, 60, 80, 50, 30, 10} {
		if err := r.operate(ctx, 1200*time.Millisecond, LoadShare(percent)); err != nil {
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
	return r.operate(ctx, 1500*time.Millisecond, LoadShare(50), PowerMode, PowerReference(watts))
}

// shutDown arms the discharge before anything is opened.
func (r *rehearsal) shutDown(ctx context.Context, _ walk.Point) error {
	p, ok := r.latest.State.CaptureOf(capture.Discharge)
	if !ok {
		return nil
	}
	if err := r.submit(ctx, walk.Arm{Point: p.ID}); err != nil {
		return err
	}
	return r.operate(ctx, 500*time.Millisecond, LoadOff, EverythingOff)
}

func (r *rehearsal) discharge(ctx context.Context, _ walk.Point) error {
	return r.untilCaptured(ctx, 3*time.Minute)
}
