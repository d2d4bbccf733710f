package commission

import (
	"context"
	"errors"
	"fmt"
	"maps"
	"slices"
	"time"

	"chargehand/commission/capture"
	"chargehand/commission/chlog"
	"chargehand/commission/clock"
	"chargehand/commission/droop"
	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/commission/walk"
)

// Options is what a Run works with.
type Options struct {
	State     walk.State // as replayed from the log
	Log       *chlog.Writer
	Signer    chlog.Signer // nil: sign-offs say why they have no signature
	Unsigned  string       // that reason
	Clock     *clock.Plant
	Batches   <-chan signal.Batch       // lossless, of the converter being commissioned
	Peers     <-chan signal.Batch       // of the other infeeds' devices, all together; nil without any
	Focus     func(names []signal.Name) // tells the poller which signals a capture needs; none means all
	Channels  []capture.Channel         // every signal of the map with its scaling
	MaxAge    time.Duration             // older readings are withdrawn
	Registers droop.Registers           // the map, for findings that change; nil without one
	Moved     func(*chlog.Writer)       // told when the log goes on in another file; nil where nobody asks
	Speed     float64                   // how much faster a rehearsal waits; 1 on a real device
}

// Recorded is what Submit answers: the records are on disk.
type Recorded struct {
	Seqs  []int64
	State walk.State
}

// Snapshot is what a screen needs to draw, immutable.
type Snapshot struct {
	State   walk.State
	Now     time.Time // the plant's clock
	Link    signal.Link
	Live    map[signal.Name]signal.Reading
	Capture *Progress // nil while no capture is armed or running
	Failure error     // the log takes nothing more, and why
}

// ErrEnded is returned by Submit once the run has ended.
var ErrEnded = errors.New("the walk has ended")

// Run owns one walk.
type Run struct {
	opt       Options
	state     walk.State
	live      map[signal.Name]signal.Reading
	peers     map[string]map[signal.Name]signal.Reading // by infeed
	link      signal.Link
	linkWasUp bool
	linkKnown bool
	recorder  *recorder
	failure   error
	unwritten []record.Body // of a capture whose log failed, for the place where the log goes on
	hurrying  string        // what the clock was hastened for

	submits   chan submission
	snapshots chan Snapshot
	ended     chan struct{}
}

// submission is an event, or a place where the log goes on.
type submission struct {
	event  walk.Event
	moveTo string
	reply  chan answer
}

type answer struct {
	recorded Recorded
	err      error
}

// Start starts the owner. It ends with ctx, or when the log is sealed and ctx is cancelled; Wait waits for it.
func Start(ctx context.Context, opt Options) *Run {
	r := &Run{
		opt: opt, state: opt.State.Ready(), live: map[signal.Name]signal.Reading{},
		peers:   map[string]map[signal.Name]signal.Reading{},
		submits: make(chan submission), snapshots: make(chan Snapshot, 1), ended: make(chan struct{}),
	}
	r.publish()
	go r.loop(ctx)
	return r
}

// Snapshots gives the newest snapshot; older ones that nobody took are gone.
func (r *Run) Snapshots() <-chan Snapshot { return r.snapshots }

// Wait returns when the owner has ended.
func (r *Run) Wait() { <-r.ended }

// Submit hands in an event and returns when its records are on disk, or says why there are none.
func (r *Run) Submit(ctx context.Context, event walk.Event) (Recorded, error) {
	return r.hand(ctx, submission{event: event, reply: make(chan answer, 1)})
}

// MoveLog goes on with the log in another file, where its own place takes nothing more, and says so in it. What was
// acknowledged is all there; what was refused meanwhile has to be done again.
func (r *Run) MoveLog(ctx context.Context, path string) error {
	_, err := r.hand(ctx, submission{moveTo: path, reply: make(chan answer, 1)})
	return err
}

func (r *Run) hand(ctx context.Context, s submission) (Recorded, error) {
	select {
	case r.submits <- s:
	case <-r.ended:
		return Recorded{}, ErrEnded
	case <-ctx.Done():
		return Recorded{}, ctx.Err()
	}
	a := <-s.reply
	return a.recorded, a.err
}

func (r *Run) loop(ctx context.Context) {
	defer close(r.ended)
	batches, peers := r.opt.Batches, r.opt.Peers
	for {
		select {
		case <-ctx.Done():
			return
		case s := <-r.submits:
			recorded, err := r.serve(s)
			r.publish()
			s.reply <- answer{recorded, err}
		case b, ok := <-batches:
			if !ok {
				batches = nil
				continue
			}
			r.take(b)
			r.publish()
		case b, ok := <-peers:
			if !ok {
				peers = nil
				continue
			}
			r.takePeer(b)
		}
	}
}

func (r *Run) serve(s submission) (Recorded, error) {
	if s.event == nil {
		return Recorded{State: r.state}, r.moveLog(s.moveTo)
	}
	return r.submit(s.event)
}

func (r *Run) moveLog(path string) error {
	moved, err := r.opt.Log.MoveTo(path)
	if err != nil {
		return fmt.Errorf("go on with the log in %s: %w", path, err)
	}
	r.opt.Log, r.failure = moved, nil
	r.state = r.state.With(walk.Line{Seq: moved.Acknowledged().Lines - 1, Body: record.Resumed{}}).Ready()
	if r.opt.Moved != nil {
		r.opt.Moved(moved)
	}
	return r.writeLate()
}

// writeLate writes down the rest of a capture that the log had no place for.
func (r *Run) writeLate() error {
	late := r.unwritten
	r.unwritten = nil
	if len(late) == 0 {
		return nil
	}
	_, err := r.record(late)
	return err
}

// submit turns an event into records on disk.
func (r *Run) submit(event walk.Event) (Recorded, error) {
	switch e := event.(type) {
	case walk.TakeLive:
		return r.takeLive(e.Point)
	case walk.Arm:
		return r.arm(e)
	case walk.StopCapture:
		return r.stopCapture("stopped by hand")
	case walk.Judge:
		return r.judge(e)
	case walk.ChangeSite:
		return r.changeSite(e)
	case walk.Hastened:
		return r.hasten(e)
	case walk.Seal:
		if r.recorder != nil { // nothing measured is lost
			if recorded, err := r.stopCapture("the log is sealed"); err != nil {
				return recorded, err
			}
		}
	}
	return r.write(event)
}

// write decides an event and appends what it makes.
func (r *Run) write(event walk.Event) (Recorded, error) {
	bodies, err := r.state.Decide(event, r.opt.Clock.Now())
	if err != nil {
		return Recorded{State: r.state}, err
	}
	if r.failure != nil {
		if r.isCapture(bodies) {
			r.unwritten = append(r.unwritten, bodies...)
		}
		return Recorded{State: r.state}, r.failure
	}
	return r.record(bodies)
}

// record appends bodies one by one; each is on disk before the next.
func (r *Run) record(bodies []record.Body) (Recorded, error) {
	var recorded Recorded
	for i, body := range bodies {
		line, err := r.append(body)
		var broken *chlog.WriteError
		if err != nil && !errors.As(err, &broken) {
			return Recorded{recorded.Seqs, r.state}, err // the log is unharmed and takes the next
		}
		if err != nil {
			r.failure = fmt.Errorf("the log takes nothing more: %w", err)
			if r.isCapture(bodies) {
				r.unwritten = append(r.unwritten, bodies[i:]...)
			}
			return Recorded{recorded.Seqs, r.state}, r.failure
		}
		r.state = r.state.With(line)
		recorded.Seqs = append(recorded.Seqs, line.Seq)
	}
	r.state = r.state.Ready()
	recorded.State = r.state
	return recorded, nil
}

// isCapture tells whether the records are a capture's: nobody can do it again.
func (r *Run) isCapture(bodies []record.Body) bool {
	return slices.ContainsFunc(bodies, func(b record.Body) bool { return b.Kind() == record.Capture{}.Kind() })
}

// append writes one record; a sign-off and a seal get their statement and signature from the log, which alone knows their
// place in the chain.
func (r *Run) append(body record.Body) (walk.Line, error) {
	var line chlog.Line
	var err error
	switch b := body.(type) {
	case record.SignOff:
		line, err = r.opt.Log.SignOff(b.Person, b.Point, r.signer(b.UnsignedBecause), r.unsigned(b.UnsignedBecause))
	case record.Seal:
		line, err = r.opt.Log.Seal(b.Person, b.Verdict, r.signer(b.UnsignedBecause), r.unsigned(b.UnsignedBecause))
	default:
		line, err = r.opt.Log.Append(body)
	}
	if err != nil {
		return walk.Line{}, err
	}
	written, err := line.Decode()
	return walk.Line{Seq: line.Seq, At: line.At, Body: written}, err
}

// signer is the key that signs; none where the event says why there is none, such as a witness without a key of their own.
func (r *Run) signer(because *string) chlog.Signer {
	if because != nil {
		return nil
	}
	return r.opt.Signer
}

func (r *Run) unsigned(because *string) string {
	if because != nil {
		return *because
	}
	return r.opt.Unsigned
}

// take takes one batch in: the live values, the link, and the running capture.
func (r *Run) take(b signal.Batch) {
	for _, reading := range b.Readings {
		r.live[reading.Name] = reading
	}
	r.link = b.Link
	r.noteLink(b.Link)
	r.pacing()
	if r.recorder == nil {
		return
	}
	r.recorder.take(b)
	if because, done := r.recorder.ended(r.opt.Clock.Now()); done {
		// What went wrong in writing is kept in failure and shown; a capture has nobody to answer to.
		_, _ = r.stopCapture(because)
	}
}

// takePeer keeps what the device of another infeed says.
func (r *Run) takePeer(b signal.Batch) {
	if r.peers[b.Device] == nil {
		r.peers[b.Device] = map[signal.Name]signal.Reading{}
	}
	for _, reading := range b.Readings {
		r.peers[b.Device][reading.Name] = reading
	}
}

// noteLink writes down when the link comes and goes; the first state is a fact too.
func (r *Run) noteLink(link signal.Link) {
	if r.linkKnown && link.Up == r.linkWasUp || r.state.Sealed() != nil {
		return
	}
	event := record.Link{Event: "lost", Peer: link.Peer, Why: link.Why}
	if link.Up {
		event.Event = "up"
		if r.linkKnown {
			event.Event = "reconnected"
		}
	}
	r.linkKnown, r.linkWasUp = true, link.Up
	_, _ = r.write(walk.LinkChanged{Link: event})
}

// publish puts the newest snapshot in place of one that nobody took.
func (r *Run) publish() {
	now := r.opt.Clock.Now()
	live := make(map[signal.Name]signal.Reading, len(r.live))
	for name, reading := range r.live {
		live[name] = reading.Withdrawn(now, r.maxAge())
	}
	s := Snapshot{State: r.state, Now: now, Link: r.link, Live: live, Failure: r.failure}
	if r.recorder != nil {
		s.Capture = r.recorder.progress(now)
	}
	select {
	case <-r.snapshots:
	default:
	}
	r.snapshots <- s
}

// maxAge is how old a reading may be by the plant's clock: a hastened rehearsal reads no faster than a real walk.
func (r *Run) maxAge() time.Duration {
	return time.Duration(float64(r.opt.MaxAge) * r.opt.Clock.Pace())
}

// takeLive takes the live readings of a point's signals.
func (r *Run) takeLive(id string) (Recorded, error) {
	p, ok := r.state.Point(id)
	if !ok {
		return r.write(walk.Take{Reading: record.Reading{Point: id}})
	}
	all := Recorded{State: r.state}
	for _, name := range p.Signals {
		reading, ok := r.live[name]
		if !ok {
			continue
		}
		recorded, err := r.write(walk.Take{Reading: r.reading(id, reading)})
		if err != nil {
			return all, err
		}
		all.Seqs, all.State = append(all.Seqs, recorded.Seqs...), recorded.State
	}
	for _, reading := range r.beside(p) {
		recorded, err := r.write(walk.Take{Reading: reading})
		if err != nil {
			return all, err
		}
		all.Seqs, all.State = append(all.Seqs, recorded.Seqs...), recorded.State
	}
	if len(all.Seqs) == 0 {
		return all, &walk.RefusedError{What: "no live reading at " + id, Because: "none of its signals is in the map",
			Instead: "read an instrument and enter the value"}
	}
	return all, nil
}

// reading gives a live reading its form in the log.
func (r *Run) reading(point string, live signal.Reading) record.Reading {
	now := r.opt.Clock.Now()
	live = live.Withdrawn(now, r.maxAge())
	rec := record.Reading{Point: point, Signal: string(live.Name), Unit: live.Name.Unit(), Source: record.FromDevice,
		Raw: live.Raw, Age: live.Age(now).Seconds(), Quality: string(live.Quality)}
	if live.Quality.HasValue() {
		value := live.Value
		rec.Value = &value
	} else {
		rec.Text = live.Why
	}
	rec.U = r.resolution(live.Name)
	return rec
}

// resolution is the standard uncertainty of a register's last digit: its scale over √12 (JCGM 100, F.2.2.1).
func (r *Run) resolution(name signal.Name) float64 {
	for _, ch := range r.opt.Channels {
		if ch.Name == name {
			return abs(ch.Scale) / sqrt12
		}
	}
	return 0
}

const sqrt12 = 3.4641016151377544

func abs(v float64) float64 {
	if v < 0 {
		return -v
	}
	return v
}

// Reading gives a live reading, withdrawn where it is too old.
func (s Snapshot) Reading(n signal.Name) signal.Reading {
	if r, ok := s.Live[n]; ok {
		return r
	}
	return signal.Reading{Name: n, Quality: signal.Never, Why: "not read"}
}

// Signals lists what the snapshot has, for a screen that shows all.
func (s Snapshot) Signals() map[signal.Name]signal.Reading { return maps.Clone(s.Live) }
