package poll

import (
	"errors"
	"fmt"
	"time"

	"chargehand/commission/signal"
	"chargehand/protocol/link"
	"chargehand/protocol/registermap"
)

// pointState is what is known of one signal.
type pointState struct {
	point    registermap.Point
	unit     uint8
	reading  signal.Reading // the last that came
	real     time.Time      // of it
	before   time.Time      // of the one before, by real time
	answered bool
	failure  error // of the last request, nil when it was answered
	absent   bool
	torn     torn
	motion   motion
	refresh  refresh
}

// deviceState is what is known of the device as a whole.
type deviceState struct {
	period   time.Duration // real, to the next poll
	rate     float64       // polls a second
	lastPoll time.Time
	missed   int   // polls in a row without any answer
	why      error // of the last of them
	nextTry  time.Time
	focused  []signal.Name
}

// absorb takes in what a poll brought.
func (p *Poller) absorb(c cycle) {
	p.device.absorb(c)
	for _, o := range c.outcomes {
		for _, i := range o.block.Points {
			s := p.points[i]
			s.failure, s.absent = o.err, o.absent
			if o.err == nil {
				p.take(s, o)
			}
		}
	}
}

func (p *Poller) take(s *pointState, o outcome) {
	r := s.point.Decode(o.block.Words(s.point, o.words))
	r.At, r.Uncertainty = o.plant, o.uncertainty
	changed := s.motion.see(r, o.real)
	if s.answered {
		p.mu.Lock()
		s.refresh.see(changed, s.reading.At, r.At, o.uncertainty)
		p.mu.Unlock()
	}
	s.before, s.real = s.real, o.real
	s.answered = true
	s.reading = s.torn.check(s.point, r)
}

func (d *deviceState) absorb(c cycle) {
	if !d.lastPoll.IsZero() {
		if took := c.real.Sub(d.lastPoll).Seconds(); took > 0 {
			if d.rate == 0 {
				d.rate = 1 / took
			} else {
				d.rate = 1 / (1/d.rate + (took-1/d.rate)/8)
			}
		}
	}
	d.lastPoll, d.period, d.focused = c.real, c.period, c.focused
	if len(c.outcomes) == 0 {
		return // every block waits
	}
	for _, o := range c.outcomes {
		if o.err == nil || !isNoAnswer(o.err) && link.KindOf(o.err) != link.WrongAnswer {
			d.missed, d.why, d.nextTry = 0, nil, time.Time{}
			return
		}
	}
	d.missed++
	d.why, d.nextTry = c.outcomes[0].err, time.Time{}
	if e, ok := errors.AsType[*link.BackoffError](d.why); ok {
		d.why, d.nextTry = e.Cause, e.NextTry
	}
}

// isDown tells whether the connection is known to be lost. One silence or one wrong answer is no loss yet: the readings age.
func (d *deviceState) isDown() bool {
	switch link.KindOf(d.why) {
	case link.NoFault:
		return false
	case link.Silent, link.WrongAnswer, link.ConnectionLost:
		return d.missed > 1
	}
	return true
}

// batch gives every signal as it stands now.
func (p *Poller) batch() signal.Batch {
	now := p.options.Link.Now()
	b := signal.Batch{Device: p.options.Device, At: p.options.Now(), Link: p.linkState(now)}
	b.Readings = make([]signal.Reading, len(p.points))
	still := p.stillUnits(now)
	for i, s := range p.points {
		b.Readings[i] = p.judged(s, now, still)
	}
	return b
}

func (p *Poller) linkState(now time.Time) signal.Link {
	status := p.options.Link.Status()
	d := &p.device
	l := signal.Link{Up: d.why == nil && !d.lastPoll.IsZero() || d.why != nil && !d.isDown(), Peer: status.Peer,
		RoundTrip: status.RoundTrip, Rate: d.rate, Reconnects: status.Reconnects()}
	if l.Up {
		return l
	}
	next := d.nextTry
	if next.IsZero() {
		next = status.NextTry
	}
	if left := next.Sub(now); !next.IsZero() && left > 0 {
		l.NextTry = p.options.Now().Add(time.Duration(float64(left) * p.options.Pace()))
	}
	l.Why = "no answer yet"
	if d.why != nil {
		l.Why = d.why.Error()
	}
	return l
}

// judged gives a signal's reading with what it is worth at a real time.
func (p *Poller) judged(s *pointState, now time.Time, still map[uint8]string) signal.Reading {
	r := s.reading
	r.Name = s.point.Name
	age := now.Sub(s.real)
	refused := s.failure != nil && !isNoAnswer(s.failure) && link.KindOf(s.failure) != link.WrongAnswer
	switch {
	case refused && s.absent:
		return withdrawn(r, signal.Bad, "not in the device: "+s.failure.Error())
	case refused:
		return withdrawn(r, signal.Bad, s.failure.Error())
	case !s.answered && s.failure != nil:
		return withdrawn(r, signal.Never, s.failure.Error())
	case !s.answered:
		return withdrawn(r, signal.Never, "no answer yet")
	case p.device.isDown():
		return withdrawn(r, signal.Stale, "link down: "+p.device.why.Error())
	case age > p.options.MaxAge && s.failure != nil:
		return withdrawn(r, signal.Stale, "no newer answer: "+s.failure.Error())
	case age > p.options.MaxAge:
		return withdrawn(r, signal.Stale, "no newer answer")
	case !r.Quality.HasValue():
		return r
	}
	if why := still[s.unit]; why != "" {
		return withdrawn(r, signal.Frozen, why)
	}
	if why := p.stopped(s, now); why != "" {
		return withdrawn(r, signal.Frozen, why)
	}
	if age > p.expected(s)*3/2 {
		r.Quality, r.Why = signal.Late, fmt.Sprintf("%v old", age.Round(time.Millisecond))
	}
	return r
}

// withdrawn takes the value away and says why.
func withdrawn(r signal.Reading, q signal.Quality, why string) signal.Reading {
	r.Value, r.Quality, r.Why = 0, q, why
	return r
}

// expected is the real time between readings of a signal as things are: beside a focus, signals come as often as the block
// does.
func (p *Poller) expected(s *pointState) time.Duration {
	period := p.device.period
	if len(p.device.focused) > 0 && !s.before.IsZero() {
		period = max(period, s.real.Sub(s.before))
	}
	return period + time.Duration(float64(period)*2*dither)
}
