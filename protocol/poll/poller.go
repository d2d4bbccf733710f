package poll

import (
	"context"
	crand "crypto/rand"
	"math/rand/v2"
	"slices"
	"sync"
	"sync/atomic"
	"time"

	"chargehand/commission/signal"
	"chargehand/protocol/link"
	"chargehand/protocol/registermap"
)

// Defaults, and the paces that are never exceeded.
const (
	defaultMaxAge   = 500 * time.Millisecond
	defaultInterval = 50 * time.Millisecond
	fastestPeriod   = 5 * time.Millisecond // between polls of a focus, whatever the device allows
	mostKept        = 256                  // batches waiting for their owner before polling waits for it
	dither          = 0.1                  // of the period, each way
)

// Options say what to poll. Link and Map are required.
type Options struct {
	Device   string // the infeed's name
	Link     *link.Link
	UnitID   uint8 // of the points that name no unit
	Map      registermap.Map
	MaxAge   time.Duration    // real time; 500 ms where 0
	Interval time.Duration    // real time from poll to poll; 50 ms where 0
	Now      func() time.Time // the plant's clock; the link's where nil
	Pace     func() float64   // plant seconds per real second; 1 where nil
	Random   rand.Source      // for the dither; any where nil
}

// Poller polls one device.
type Poller struct {
	options Options
	kept    chan signal.Batch
	latest  chan signal.Batch
	owned   atomic.Bool   // somebody takes the kept batches
	hurry   chan struct{} // a new focus: do not wait out the period
	reader  *reader       // owned by its goroutine
	points  []*pointState // owned by Run's goroutine, but for the refresh, which mu guards
	device  deviceState

	mu    sync.Mutex
	focus []signal.Name
	plan  registermap.Plan
}

// New gives a poller that does nothing before Run.
func New(o Options) *Poller {
	if o.MaxAge <= 0 {
		o.MaxAge = defaultMaxAge
	}
	if o.Interval <= 0 {
		o.Interval = defaultInterval
	}
	if o.Now == nil {
		o.Now = o.Link.Now
	}
	if o.Pace == nil {
		o.Pace = func() float64 { return 1 }
	}
	if o.Random == nil {
		var seed [32]byte
		crand.Read(seed[:])
		o.Random = rand.NewChaCha8(seed)
	}
	p := &Poller{
		options: o,
		kept:    make(chan signal.Batch, mostKept),
		latest:  make(chan signal.Batch, 1),
		hurry:   make(chan struct{}, 1),
	}
	for _, point := range o.Map.Points {
		p.points = append(p.points, &pointState{point: point, unit: unitOf(point, o.UnitID)})
	}
	p.reader = newReader(o, p)
	p.plan = p.reader.full
	return p
}

func unitOf(p registermap.Point, own uint8) uint8 {
	if p.HasUnitID {
		return p.UnitID
	}
	return own
}

// Batches gives every batch from its first call on, in order; up to 256 wait for their owner, then polling waits for it. It
// is closed when Run ends. Call it before Run.
func (p *Poller) Batches() <-chan signal.Batch {
	p.owned.Store(true)
	return p.kept
}

// Latest gives the newest batch, once; older ones are dropped. It is closed when Run ends.
func (p *Poller) Latest() <-chan signal.Batch { return p.latest }

// Focus polls only these signals from now on, as fast as is polite: with the map's quiet time after each answer, the link
// busy half of the time at most, and no faster than 200 polls a second. The others are asked for just often enough that
// they do not go stale. No names: all signals at the usual pace again.
func (p *Poller) Focus(names ...signal.Name) {
	p.mu.Lock()
	p.focus = slices.Clone(names)
	p.mu.Unlock()
	select {
	case p.hurry <- struct{}{}:
	default:
	}
}

func (p *Poller) focused() []signal.Name {
	p.mu.Lock()
	defer p.mu.Unlock()
	return p.focus
}

// Plan shows the requests of one poll of all signals, as learned from the device so far.
func (p *Poller) Plan() registermap.Plan {
	p.mu.Lock()
	defer p.mu.Unlock()
	return p.plan
}

func (p *Poller) setPlan(plan registermap.Plan) {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.plan = plan
}

// Run polls until the context ends, and gives its error. It may be called once.
func (p *Poller) Run(ctx context.Context) error {
	cycles := make(chan cycle)
	var reading sync.WaitGroup
	reading.Go(func() { p.reader.run(ctx, cycles) })
	defer func() {
		reading.Wait()
		close(p.kept)
		close(p.latest)
	}()
	overdue := time.NewTimer(p.options.MaxAge)
	defer overdue.Stop()
	for {
		select {
		case c := <-cycles:
			p.absorb(c)
		case <-overdue.C: // a request hangs; what is shown must age all the same
		case <-ctx.Done():
			return ctx.Err()
		}
		overdue.Reset(p.options.MaxAge)
		if err := p.deliver(ctx, p.batch()); err != nil {
			return err
		}
	}
}

func (p *Poller) deliver(ctx context.Context, b signal.Batch) error {
	select {
	case <-p.latest:
	default:
	}
	p.latest <- b // only this goroutine sends, so there is room
	if !p.owned.Load() {
		return nil
	}
	select {
	case p.kept <- b:
		return nil
	case <-ctx.Done():
		return ctx.Err()
	}
}
