package simulator

import (
	"context"
	"errors"
	"fmt"
	"math/rand/v2"
	"sync"
	"time"

	"chargehand/commission/site"
	"chargehand/protocol/circuit"
	"chargehand/protocol/registermap"
)

// tick is the grid on which the device looks at its plant.
const tick = 2 * time.Millisecond

// slice is how much plant time passes at most while the lock is held once.
const slice = 250 * time.Millisecond

// Options say what is simulated.
type Options struct {
	Site       site.Site
	Map        registermap.Map
	Now        func() time.Time // the plant's clock; may run faster than the wall clock
	Seed       int64
	Disturb    []Disturbance
	Refresh    time.Duration // period of the register image by the plant's clock; 0: 20 ms
	ReplyDelay time.Duration // typical time until a reply, by the wall clock; 0: 500 µs; below 0: none
	Peers      []Peer        // devices of other infeeds, answered by the same server
}

// Peer is the device of another infeed.
type Peer struct {
	Infeed string // its name in the site
	UnitID uint8
	Map    registermap.Map
}

// Simulator is one simulated plant with its device.
type Simulator struct {
	options Options

	mu      sync.Mutex
	truth   truth
	plant   *circuit.Circuit
	device  device
	images  []*image
	noise   *rand.Rand
	started time.Time     // plant time 0 by the plant's clock
	elapsed time.Duration // how far the plant has been advanced
	broken  error

	link server
}

// New makes a plant at rest: isolator open, bus dead, pulses blocked.
func New(o Options) (*Simulator, error) {
	if o.Now == nil {
		return nil, errors.New("simulate: no clock given")
	}
	if o.Refresh == 0 {
		o.Refresh = 20 * time.Millisecond
	}
	if o.ReplyDelay == 0 {
		o.ReplyDelay = 500 * time.Microsecond
	}
	s := &Simulator{options: o}
	if err := s.reset(); err != nil {
		return nil, err
	}
	return s, nil
}

// reset puts the plant back to rest, with the same true values.
func (s *Simulator) reset() error {
	t, err := newTruth(s.options)
	if err != nil {
		return fmt.Errorf("simulate %s: %w", s.options.Site.Name, err)
	}
	plant, err := circuit.New(t.plant)
	if err != nil {
		return fmt.Errorf("simulate %s: %w", s.options.Site.Name, err)
	}
	plant.SetDrawn(t.drawn)
	plant.SetBusVoltage(t.busAtStart)
	if t.fuseOpen {
		plant.BlowFuse()
	}
	s.truth, s.plant, s.elapsed = t, plant, 0
	s.noise = rand.New(rand.NewPCG(uint64(s.options.Seed), 0x6e6f697365))
	s.device = newDevice(&s.truth)
	s.device.apply(plant, &s.truth)
	for k := range t.liveFromStart {
		plant.Infeed(k, t.liveFromStart[k])
	}
	if s.images, err = newImages(s.options); err != nil {
		return fmt.Errorf("simulate %s: %w", s.options.Site.Name, err)
	}
	s.started = s.options.Now()
	s.refresh()
	return nil
}

// catchUp advances the plant to what its clock says now. It gives the lock back between slices.
func (s *Simulator) catchUp() error {
	target := s.options.Now()
	for {
		s.mu.Lock()
		behind := target.Sub(s.started) - s.elapsed
		err := s.advance(min(behind, slice))
		s.mu.Unlock()
		if err != nil || behind <= slice {
			return err
		}
	}
}

// Behind is how far the plant lags behind its clock: more than a few ticks when the clock runs faster than this machine
// can compute.
func (s *Simulator) Behind() time.Duration {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.options.Now().Sub(s.started) - s.elapsed
}

// advance moves the plant by whole ticks, at most d. The caller holds the lock.
func (s *Simulator) advance(d time.Duration) error {
	for ; d >= tick && s.broken == nil; d -= tick {
		if err := s.plant.Step(tick.Seconds()); err != nil {
			s.broken = fmt.Errorf("simulate %s: %w", s.options.Site.Name, err)
			break
		}
		s.elapsed += tick
		s.device.look(s.plant, &s.truth, s.elapsed)
		s.refresh()
	}
	return s.broken
}

// Do is the operator's hand: it carries out one act now and says why it was refused. It does not wait for what follows.
func (s *Simulator) Do(ctx context.Context, act Act) error {
	if err := ctx.Err(); err != nil {
		return err
	}
	if err := s.catchUp(); err != nil {
		return err
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.carryOut(act)
}

// Truth are the true values of the plant, for tests only: farads, ohms, volts, amperes under the names of the site's keys.
func (s *Simulator) Truth() map[string]float64 {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.truth.values(s.plant)
}

// Close ends the server and the plant.
func (s *Simulator) Close() error { return s.link.close() }
