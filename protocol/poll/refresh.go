package poll

import (
	"fmt"
	"slices"
	"time"

	"chargehand/commission/signal"
)

// Refresh is how often the device renews a signal, by the plant's clock.
type Refresh struct {
	Known       bool
	Period      time.Duration
	Uncertainty time.Duration // the period lies within this of it
	Why         string        // why it is not known
}

// change is a change that happened between two polls.
type change struct {
	after, until time.Time
}

// How much a refresh period is asked to be founded on.
const (
	mostChanges  = 400
	leastChanges = 12
	leastPolls   = 3    // poll periods in a refresh period; below, an estimate looks regular and is wrong
	jitterShare  = 0.05 // of a period, that a device's refresh may be early or late
	wantedShare  = 0.1  // of the period, that its uncertainty may be
)

// refresh collects a signal's changes.
type refresh struct {
	changes []change
	polled  time.Duration // between samples, smoothed
}

func (r *refresh) see(changed bool, before, at time.Time, u time.Duration) {
	gap := at.Sub(before)
	if gap <= 0 {
		return
	}
	if r.polled == 0 {
		r.polled = gap
	}
	r.polled += (gap - r.polled) / 16
	if gap > 3*r.polled { // a pause: what was counted before it cannot be joined to what comes after
		r.changes = r.changes[:0]
		return
	}
	if !changed {
		return
	}
	if len(r.changes) == mostChanges {
		r.changes = append(r.changes[:0], r.changes[mostChanges/4:]...)
	}
	r.changes = append(r.changes, change{before.Add(-u), at.Add(u)})
}

// Refresh estimates how often the device renews a signal, from when its value was seen to change. It is not known while the
// signal stands still, or where it is renewed faster than every third poll.
func (p *Poller) Refresh(n signal.Name) Refresh {
	p.mu.Lock()
	defer p.mu.Unlock()
	for _, s := range p.points {
		if s.point.Name == n {
			return s.refresh.estimate()
		}
	}
	return Refresh{Why: "not in the map"}
}

// estimate intersects what each change allows: the k-th renewal after the first lies k periods after it.
func (r *refresh) estimate() Refresh {
	if len(r.changes) < leastChanges {
		return Refresh{Why: fmt.Sprintf("%d changes seen, %d needed", len(r.changes), leastChanges)}
	}
	gaps := make([]time.Duration, len(r.changes)-1)
	for i := range gaps {
		gaps[i] = r.changes[i+1].middle().Sub(r.changes[i].middle())
	}
	slices.Sort(gaps)
	usual := gaps[len(gaps)/10]
	if usual < leastPolls*r.polled {
		return Refresh{Why: fmt.Sprintf("faster than %d poll periods of %v", leastPolls, r.polled.Round(time.Millisecond))}
	}
	low, high, ok := r.fit(single(gaps, usual+r.polled/2))
	if !ok {
		return Refresh{Why: "not periodic"}
	}
	period, u := (low+high)/2, (high-low)/2
	switch {
	case float64(u) > wantedShare*float64(period):
		return Refresh{Why: "watched for too short a time"}
	case period < leastPolls*r.polled:
		return Refresh{Why: fmt.Sprintf("faster than %d poll periods of %v", leastPolls, r.polled.Round(time.Millisecond))}
	}
	return Refresh{Known: true, Period: period, Uncertainty: u}
}

func (c change) middle() time.Time { return c.after.Add(c.until.Sub(c.after) / 2) }

// single gives the mean of the gaps that one renewal makes, given a rough size of it. A gap is off by a poll period at most, so
// those of two renewals lie beyond one and a half.
func single(gaps []time.Duration, rough time.Duration) time.Duration {
	sum, n := time.Duration(0), 0
	for _, g := range gaps {
		if g < rough*3/2 {
			sum += g
			n++
		}
	}
	return sum / time.Duration(max(1, n))
}

// fit narrows the possible periods, from a first guess. A change may be one of several renewals after the first; each choice
// leaves an interval of periods, and those that later changes contradict die out.
func (r *refresh) fit(usual time.Duration) (low, high time.Duration, ok bool) {
	possible := []interval{{usual - r.polled/2, usual + r.polled/2}}
	jitter := time.Duration(jitterShare * float64(usual))
	first := r.changes[0]
	for _, c := range r.changes[1:] {
		least, most := c.after.Sub(first.until)-jitter, c.until.Sub(first.after)+jitter
		var left []interval
		for _, p := range possible {
			for k := max(1, least/p.high); k <= most/p.low+1; k++ {
				if q := (interval{max(p.low, least/k), min(p.high, most/k)}); q.low <= q.high {
					left = append(left, q)
				}
			}
		}
		if len(left) == 0 {
			return 0, 0, false
		}
		possible = left[:min(len(left), mostPossible)]
	}
	low, high = possible[0].low, possible[0].high
	for _, p := range possible {
		low, high = min(low, p.low), max(high, p.high)
	}
	return low, high, true
}

// interval is a range of periods.
type interval struct {
	low, high time.Duration
}

// mostPossible bounds the intervals kept; a true period leaves a few.
const mostPossible = 256
