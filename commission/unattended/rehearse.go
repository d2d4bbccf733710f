package unattended

import (
	"context"
	"errors"
	"fmt"
	"strings"
	"time"

	"chargehand/commission"
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
	if err := r.bringMeter(ctx); err != nil {
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

// bringMeter enters the simulated plant's own meter where the site file names no instrument: a rehearsal goes on without one
// of its own, and the log says by what its readings were taken.
func (r *rehearsal) bringMeter(ctx context.Context) error {
	if r.instrument != "" {
		return nil
	}
	today := r.latest.Now
	if err := r.submit(ctx, walk.AddInstrument{Record: record.Instrument{Name: "simulated meter", Serial: "rehearsal",
		Calibrated: today.Format(time.DateOnly), Due: today.AddDate(1, 0, 0).Format(time.DateOnly),
		Accuracy:   record.InstrumentAccuracy{OfReading: 0.0005, Plus: 0.1, Unit: "V"},
		MaxVoltage: 2 * max(float64(r.latest.State.Site().Bus.OverVoltageTrip.Nominal), float64(r.latest.State.Site().Bus.Nominal.Nominal))}}); err != nil {
		return err
	}
	entered := r.latest.State.Instruments()
	r.instrument = entered[len(entered)-1].ID
	return nil
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
		if err := r.revisit(ctx, p); err != nil {
			return err
		}
	}
	return nil
}

// revisit goes again through what a failed point has opened before it, so that the rehearsal shows what the fault does
// further on. What was operated or captured is not done twice.
func (r *rehearsal) revisit(ctx context.Context, last walk.Point) error {
	for _, p := range r.latest.State.Points() {
		if p.ID == last.ID {
			return nil
		}
		st := r.latest.State.Status(p.ID)
		if _, operated := operations[p.ID]; operated || st.Reopened == 0 || st.Result != walk.Open {
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
	if r.latest.State.Status(p.ID).Result != walk.Open { // what was operated did not answer
		return r.sign(ctx, p)
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

// judge passes a point, or fails it and raises a punch item. A point that lacks what this way of rehearsing cannot bring
// stays open, and the walk undecided; an open hold ends it.
func (r *rehearsal) judge(ctx context.Context, p walk.Point) error {
	err := r.submit(ctx, walk.Judge{Point: p.ID, Result: walk.Passed})
	var refused *walk.RefusedError
	if err == nil || !errors.As(err, &refused) {
		return err
	}
	assessed := r.latest.State.Assess(p)
	why := strings.Join(assessed.Because, "; ")
	if why == "" {
		why = refused.Error()
	}
	switch {
	case assessed.Result != walk.Failed && p.ID == "share.share" && len(r.latest.State.Site().Peers) == 0:
		return r.submit(ctx, walk.Judge{Point: p.ID, Result: walk.NotApplicable, Note: "no other infeed's device is polled: the site file has no [[peer]]"})
	case assessed.Result != walk.Failed && p.Kind == walk.Hold:
		return fmt.Errorf("%w: %s", errHeld, why)
	case assessed.Result != walk.Failed:
		r.say(p.ID + " stays open: " + why)
		return nil
	}
	return r.fail(ctx, p, why)
}

func (r *rehearsal) fail(ctx context.Context, p walk.Point, why string) error {
	if err := r.submit(ctx, walk.Judge{Point: p.ID, Result: walk.Failed, Note: why}); err != nil {
		return err
	}
	r.say(p.ID + " fails: " + why)
	if p.Kind == walk.Hold {
		return fmt.Errorf("%w: %s", errHeld, why)
	}
	return r.submit(ctx, walk.RaisePunch{What: p.ID + ": " + why, Severity: "A", Owner: "rehearsal", Due: "before energising", Point: p.ID})
}
