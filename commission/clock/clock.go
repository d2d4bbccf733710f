// Package clock keeps the plant's time: the clock by which readings are stamped, resistors cool and waits are counted.
//
// On a real device it is the wall clock. In a rehearsal it can run faster, so that a bus that needs minutes to discharge
// is watched in seconds; the log's own times stay those of the wall clock. Start at [Plant].
package clock

import (
	"sync"
	"time"
)

// Plant is a clock that runs at a settable multiple of the clock under it. It is safe for several goroutines.
type Plant struct {
	mu     sync.Mutex
	wall   func() time.Time
	wallAt time.Time
	at     time.Time
	factor float64
}

// NewPlant starts a plant clock at wall's present time, running with it.
func NewPlant(wall func() time.Time) *Plant {
	now := wall()
	return &Plant{wall: wall, wallAt: now, at: now, factor: 1}
}

// Now is the plant's time.
func (p *Plant) Now() time.Time {
	p.mu.Lock()
	defer p.mu.Unlock()
	return p.now()
}

func (p *Plant) now() time.Time {
	elapsed := p.wall().Sub(p.wallAt)
	return p.at.Add(time.Duration(float64(elapsed) * p.factor))
}

// Hasten makes the clock run factor times as fast as the clock under it from now on. The factor is at least 1.
func (p *Plant) Hasten(factor float64) {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.at, p.wallAt, p.factor = p.now(), p.wall(), max(factor, 1)
}

// Pace is the factor at which the clock runs.
func (p *Plant) Pace() float64 {
	p.mu.Lock()
	defer p.mu.Unlock()
	return p.factor
}
