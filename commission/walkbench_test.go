package commission_test

import (
	"bytes"
	"context"
	"errors"
	"io"
	"math"
	"reflect"
	"testing"
	"testing/synctest"
	"time"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"

	"chargehand/commission"
	"chargehand/commission/capture"
	"chargehand/commission/chlog"
	"chargehand/commission/chlog/chlogtest"
	"chargehand/commission/clock"
	"chargehand/commission/desk"
	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/commission/site"
	"chargehand/commission/walk"
)

const maxAge = 500 * time.Millisecond

// bench is a walk on a source of readings that the test makes up, with its log on a disk in memory.
type bench struct {
	t       *testing.T
	run     *commission.Run
	disk    *chlogtest.Disk
	path    string
	batches chan signal.Batch
	peers   chan signal.Batch
	focus   [][]signal.Name
	wall    time.Duration // how far the wall clock was set beside the other
	plant   map[signal.Name]float64
	link    signal.Link
	clock   *clock.Plant
	polls   int
	last    commission.Snapshot
	stop    context.CancelFunc
}

// options change how a bench begins.
type options struct {
	mode   string
	speed  float64
	passed string // every point before this one is passed and signed
	change func(*commission.Options)
}

// on runs a test on a bench, in fake time.
func on(t *testing.T, o options, test func(b *bench)) {
	t.Helper()
	synctest.Test(t, func(t *testing.T) {
		b := newBench(t, o)
		defer func() {
			b.stop()
			b.run.Wait()
		}()
		test(b)
	})
}

func newBench(t *testing.T, o options) *bench {
	b := &bench{t: t, disk: chlogtest.NewDisk(), path: "walk.chlog", batches: make(chan signal.Batch), peers: make(chan signal.Batch),
		link: signal.Link{Up: true, Peer: "127.0.0.1:1502"}, plant: map[signal.Name]float64{}}
	siteText, mapText := site.Example()
	s, _, err := site.Read(site.ExampleName, []byte(siteText))
	if err != nil {
		t.Fatal(err)
	}
	if o.mode == "" {
		o.mode = record.SiteMode
	}
	began := time.Now()
	log, err := chlog.Create(b.disk, b.path, record.Opened{Mode: o.mode, Device: "bench", Speed: max(o.speed, 1)}, chlog.Options{
		Now: func() time.Time { return time.Now().Add(b.wall) }, Monotonic: func() time.Duration { return time.Since(began) }, Program: "1.0.0"})
	if err != nil {
		t.Fatal(err)
	}
	state, err := commission.Begin(log, commission.Papers{SiteName: site.ExampleName, SiteText: siteText, MapName: site.ExampleMapName, MapText: mapText,
		Findings: desk.Findings(s, nil)}, []record.Person{{ID: "p1", Name: "A. Example", Role: "technician"}})
	if err != nil {
		t.Fatal(err)
	}
	for _, p := range state.Points() {
		if o.passed == "" || p.ID == o.passed {
			break
		}
		state = b.passed(log, state, p)
	}
	b.clock = clock.NewPlant(time.Now)
	opt := commission.Options{State: state, Log: log, Unsigned: "a test", Clock: b.clock, Batches: b.batches, Peers: b.peers,
		Focus: func(names []signal.Name) { b.focus = append(b.focus, names) }, MaxAge: maxAge, Speed: max(o.speed, 1)}
	for _, n := range signal.Names {
		ch := capture.Channel{Name: n, Unit: n.Unit(), Type: "u16", Scale: 0.1}
		if n.IsState() {
			ch.Type, ch.Scale = "bit", 1
		}
		opt.Channels = append(opt.Channels, ch)
	}
	if o.change != nil {
		o.change(&opt)
	}
	ctx, stop := context.WithCancel(t.Context())
	b.stop, b.run = stop, commission.Start(ctx, opt)
	return b
}

// passed writes down that a point was passed and signed.
func (b *bench) passed(log *chlog.Writer, state walk.State, p walk.Point) walk.State {
	take := func(line chlog.Line, err error) {
		b.t.Helper()
		if err != nil {
			b.t.Fatal(err)
		}
		body, err := line.Decode()
		if err != nil {
			b.t.Fatal(err)
		}
		state = state.With(walk.Line{Seq: line.Seq, At: line.At, Body: body})
	}
	take(log.Append(record.Point{ID: p.ID, Result: "pass", Readings: []int64{}}))
	if p.Kind == walk.Hold {
		take(log.SignOff("p1", p.ID, nil, "a test"))
	}
	return state.Ready()
}

// poll hands in what the plant's signals read now; signals that the test never set are missing.
func (b *bench) poll() { b.t.Helper(); b.pollAt(b.clock.Now()) }

// pollAt hands in readings of a plant time.
func (b *bench) pollAt(now time.Time) {
	b.t.Helper()
	b.polls++
	batch := signal.Batch{Device: "forward string", At: now, Link: b.link}
	for _, n := range signal.Names {
		v, ok := b.plant[n]
		if n == signal.SourceVoltage && b.polls%2 == 0 {
			v += 0.1 // a real register's last digit moves
		}
		r := signal.Reading{Name: n, At: now, Quality: signal.Missing, Why: "not set"}
		if ok {
			r = signal.Reading{Name: n, Value: v, At: now, Quality: signal.Good, Raw: []uint16{uint16(int(math.Round(v * 10)))}}
			if n.IsState() {
				r.Raw = []uint16{uint16(v)}
			}
		}
		if !b.link.Up {
			r.Quality, r.Why = signal.Stale, "link down"
		}
		batch.Readings = append(batch.Readings, r)
	}
	b.batches <- batch
	synctest.Wait()
	b.look()
}

// look takes the newest snapshot.
func (b *bench) look() {
	select {
	case b.last = <-b.run.Snapshots():
	default:
	}
}

// during polls every 25 ms for a while, with the plant as at gives it, seconds from the beginning.
func (b *bench) during(d time.Duration, at func(t float64)) {
	b.t.Helper()
	for began := time.Now(); time.Since(began) < d; time.Sleep(25 * time.Millisecond) {
		if at != nil {
			at(time.Since(began).Seconds())
		}
		b.poll()
	}
}

func (b *bench) set(values map[signal.Name]float64) {
	for n, v := range values {
		b.plant[n] = math.Round(v*10) / 10
	}
}

func (b *bench) submit(e walk.Event) (commission.Recorded, error) {
	r, err := b.run.Submit(b.t.Context(), e)
	b.look()
	return r, err
}

func (b *bench) do(events ...walk.Event) commission.Recorded {
	b.t.Helper()
	var last commission.Recorded
	for _, e := range events {
		r, err := b.submit(e)
		if err != nil {
			b.t.Fatalf("Submit(%T%+v) = %v, want it on disk", e, e, err)
		}
		last = r
	}
	return last
}

// records are the bodies of a kind on the disk.
func records[B record.Body](b *bench) []B {
	b.t.Helper()
	var found []B
	for _, line := range b.lines() {
		body, err := line.Decode()
		if err != nil {
			b.t.Fatal(err)
		}
		if one, ok := body.(B); ok {
			found = append(found, one)
		}
	}
	return found
}

func (b *bench) lines() []chlog.Line {
	b.t.Helper()
	var lines []chlog.Line
	r := chlog.NewReader(bytes.NewReader(b.disk.Read(b.path)))
	for {
		line, err := r.Next()
		if errors.Is(err, io.EOF) {
			return lines
		}
		if err != nil {
			b.t.Fatal(err)
		}
		lines = append(lines, line)
	}
}

// replays holds the state of the run against the one that its log gives.
func (b *bench) replays() {
	b.t.Helper()
	written := b.do(walk.AddNote{Text: "the end"}).State
	again, err := commission.Replay(b.lines())
	if err != nil {
		b.t.Fatal(err)
	}
	if diff := cmp.Diff(written, again, cmp.Exporter(func(reflect.Type) bool { return true }), cmpopts.EquateNaNs(), cmpopts.EquateEmpty()); diff != "" {
		b.t.Errorf("replaying the log gives another state (-written +replayed):\n%s", diff)
	}
}

// charge is a healthy pre-charge of the example: 724 V through 100 Ω onto 11.7 mF.
func (b *bench) charge() {
	b.set(map[signal.Name]float64{signal.BusVoltage: 0, signal.SourceVoltage: 724, signal.StarPointVoltage: 0, signal.SourceCurrent: 0,
		signal.BusCurrent: 0, signal.PrechargeClosed: 0, signal.BypassClosed: 0, signal.Running: 0, signal.Fault: 0})
	b.during(300*time.Millisecond, nil)
	const tau = 1.17
	b.during(8*time.Second, func(t float64) {
		v := 724 * (1 - math.Exp(-t/tau))
		b.set(map[signal.Name]float64{signal.PrechargeClosed: 1, signal.BusVoltage: v, signal.StarPointVoltage: v, signal.SourceCurrent: (724 - v) / 100})
	})
}

func (b *bench) bypass() {
	b.set(map[signal.Name]float64{signal.BypassClosed: 1, signal.BusVoltage: 724, signal.StarPointVoltage: 724, signal.SourceCurrent: 0})
	b.during(1500*time.Millisecond, func(t float64) {
		if t > 0.5 {
			b.set(map[signal.Name]float64{signal.PrechargeClosed: 0})
		}
	})
}
