package poll

import (
	"cmp"
	"context"
	"errors"
	"math/rand/v2"
	"slices"
	"time"

	"chargehand/commission/signal"
	"chargehand/protocol/link"
	"chargehand/protocol/registermap"
)

// Waiting times after refusals. Common practice.
const (
	absentRetry   = 60 * time.Second // of a register the device has not
	firstRefusal  = time.Second      // of a block of which nothing can be read, doubling to absentRetry
	busyWait      = 100 * time.Millisecond
	mostLinkShare = 0.5 // of the time that requests may occupy the link
)

// outcome is what one block brought.
type outcome struct {
	block       registermap.Block
	words       []uint16 // bits as words of 0 or 1
	real        time.Time
	plant       time.Time
	uncertainty time.Duration // by the plant's clock
	err         error
	absent      bool // the device has not got these registers
}

// cycle is one poll.
type cycle struct {
	outcomes []outcome
	real     time.Time
	period   time.Duration // to the next poll
	focused  []signal.Name
}

// reader makes the requests. It knows how a device's answers limit them.
type reader struct {
	options Options
	poller  *Poller
	random  *rand.Rand
	units   map[uint8]link.Unit
	limits  registermap.Limits
	full    registermap.Plan
	fast    registermap.Plan // of the focus
	only    []signal.Name    // what fast was planned for
	waits   map[registermap.Span]*wait
	asked   map[registermap.Span]time.Time
	silent  map[registermap.Span]int // silences in a row
	busy    time.Duration            // round trips of one poll, smoothed
}

// wait is a block that is left alone for a while.
type wait struct {
	until    time.Time
	refusals int
	why      error
	absent   bool
}

func newReader(o Options, p *Poller) *reader {
	r := &reader{options: o, poller: p, random: rand.New(o.Random), units: map[uint8]link.Unit{},
		limits: registermap.Limits{UnitID: o.UnitID}, waits: map[registermap.Span]*wait{}, asked: map[registermap.Span]time.Time{},
		silent: map[registermap.Span]int{}}
	r.full = o.Map.Plan(r.limits)
	return r
}

// run polls on a grid of periods, each poll dithered about its own time. Polls that come too late are left out, not made up
// for.
func (r *reader) run(ctx context.Context, out chan<- cycle) {
	grid := time.Now()
	for {
		c := r.poll(ctx)
		select {
		case out <- c:
		case <-ctx.Done():
			return
		}
		grid = grid.Add(c.period)
		if now := time.Now(); grid.Before(now) {
			grid = now
		}
		off := time.Duration(float64(c.period) * dither * (2*r.random.Float64() - 1))
		if !r.sleep(ctx, time.Until(grid.Add(off))) {
			return
		}
	}
}

// sleep waits for the next poll or a new focus. False: the context ended.
func (r *reader) sleep(ctx context.Context, d time.Duration) bool {
	if d <= 0 {
		return ctx.Err() == nil
	}
	t := time.NewTimer(d)
	defer t.Stop()
	select {
	case <-t.C:
	case <-r.poller.hurry:
	case <-ctx.Done():
		return false
	}
	return true
}

// poll asks for every block that is due.
func (r *reader) poll(ctx context.Context) cycle {
	focus := r.poller.focused()
	c := cycle{focused: focus}
	gone := map[uint8]bool{} // units that gave no answer in this poll
	learned := false
	busy := time.Duration(0)
	for _, b := range r.due(focus) {
		if gone[b.UnitID] || ctx.Err() != nil {
			continue
		}
		outcomes := r.ask(ctx, b)
		c.outcomes = append(c.outcomes, outcomes...)
		for _, o := range outcomes {
			busy += 2 * o.uncertaintyReal(r.options.Pace())
			if isNoAnswer(o.err) {
				gone[b.UnitID] = true
			}
		}
		learned = learned || len(outcomes) > 1
	}
	r.judgeSilences(c.outcomes)
	if learned {
		r.replan()
	}
	r.busy += (busy - r.busy) / 4
	c.real = time.Now()
	c.period = r.period(len(focus) > 0)
	return c
}

func (o outcome) uncertaintyReal(pace float64) time.Duration {
	return time.Duration(float64(o.uncertainty) / pace)
}

func (r *reader) period(focused bool) time.Duration {
	least := time.Duration(float64(r.busy) / mostLinkShare)
	if focused {
		return max(fastestPeriod, least)
	}
	return max(r.options.Interval, least)
}

// judgeSilences keeps a block that alone stays without an answer from using up the time of the others: it is asked last, and
// from its second silence in a row on left alone for a while.
func (r *reader) judgeSilences(outcomes []outcome) {
	answered := map[uint8]bool{}
	for _, o := range outcomes {
		answered[o.block.UnitID] = answered[o.block.UnitID] || o.err == nil
	}
	for _, o := range outcomes {
		if link.KindOf(o.err) != link.Silent {
			delete(r.silent, o.block.Span)
			continue
		}
		r.silent[o.block.Span]++
		if n := r.silent[o.block.Span]; n > 1 && answered[o.block.UnitID] {
			r.waits[o.block.Span] = &wait{until: time.Now().Add(min(firstRefusal<<min(n-2, 6), absentRetry))}
		}
	}
}

// replan applies what was learned.
func (r *reader) replan() {
	r.full = r.options.Map.Plan(r.limits)
	r.only = nil
	r.poller.setPlan(r.full)
}

// due gives the blocks to ask for now.
func (r *reader) due(focus []signal.Name) []registermap.Block {
	if len(focus) == 0 {
		return r.silentLast(slices.DeleteFunc(slices.Clone(r.full.Blocks), r.isWaiting))
	}
	if !slices.Equal(focus, r.only) || r.only == nil {
		l := r.limits
		l.Only = focus
		r.fast, r.only = r.options.Map.Plan(l), focus
	}
	blocks := slices.DeleteFunc(slices.Clone(r.fast.Blocks), r.isWaiting)
	if b, ok := r.background(); ok {
		blocks = append(blocks, b)
	}
	return r.silentLast(blocks)
}

func (r *reader) silentLast(blocks []registermap.Block) []registermap.Block {
	slices.SortStableFunc(blocks, func(a, b registermap.Block) int { return cmp.Compare(r.silent[a.Span], r.silent[b.Span]) })
	return blocks
}

// background gives the block beside a focus that most needs asking, one a poll at most.
func (r *reader) background() (registermap.Block, bool) {
	var oldest registermap.Block
	age := r.options.MaxAge / 2
	found := false
	for _, b := range r.full.Blocks {
		if slices.ContainsFunc(r.fast.Blocks, func(f registermap.Block) bool { return f.Covers(b.Span) }) || r.isWaiting(b) {
			continue
		}
		if a := time.Since(r.asked[b.Span]); a > age {
			oldest, age, found = b, a, true
		}
	}
	return oldest, found
}

func (r *reader) isWaiting(b registermap.Block) bool {
	w := r.waits[b.Span]
	return w != nil && time.Now().Before(w.until)
}

// ask asks for a block. A refusal is asked about once more, since a device that starts up refuses too; one that stands makes
// the block be parted, and what was learned remembered.
func (r *reader) ask(ctx context.Context, b registermap.Block) []outcome {
	o := r.read(ctx, b)
	if !isRefusal(o.err) {
		r.afterAnswer(b, o.err)
		return []outcome{o}
	}
	if w := r.waits[b.Span]; w == nil { // a known refusal needs no second question
		if o = r.read(ctx, b); !isRefusal(o.err) {
			r.afterAnswer(b, o.err)
			return []outcome{o}
		}
	}
	parts, lesson := r.part(ctx, b)
	if !lesson.anyGood {
		r.refusedWhole(b, o.err)
		o.absent = true
		return []outcome{o}
	}
	r.learn(b, lesson)
	return parts
}

func (r *reader) afterAnswer(b registermap.Block, err error) {
	if e, ok := errors.AsType[*link.ExceptionError](err); ok && e.Class() == link.Busy {
		r.waits[b.Span] = &wait{until: time.Now().Add(busyWait), why: err}
		return
	}
	if err == nil {
		delete(r.waits, b.Span)
	}
}

// refusedWhole leaves a block alone of which nothing can be read: perhaps the device is starting up.
func (r *reader) refusedWhole(b registermap.Block, why error) {
	w := r.waits[b.Span]
	if w == nil {
		w = &wait{}
		r.waits[b.Span] = w
	}
	w.why = why
	w.until = time.Now().Add(min(firstRefusal<<min(w.refusals, 6), absentRetry))
	w.refusals++
}

// lesson is what parting a block taught.
type lesson struct {
	anyGood  bool
	absent   []registermap.Block // single values that are refused
	holes    []registermap.Span  // unused registers that made a block be refused
	largest  int                 // good part of a block that was refused for no other reason than its size
	tooLarge bool
}

// part asks for ever smaller parts of a refused block.
func (r *reader) part(ctx context.Context, b registermap.Block) ([]outcome, lesson) {
	var all []outcome
	var l lesson
	parts := r.options.Map.Split(b)
	if parts == nil {
		l.absent = append(l.absent, b)
		return nil, l
	}
	whole := true // every part was answered as it stood
	for _, p := range parts {
		o := r.read(ctx, p)
		switch {
		case o.err == nil:
			l.anyGood = true
			l.largest = max(l.largest, p.Quantity)
			all = append(all, o)
		case isRefusal(o.err):
			whole = false
			inner, more := r.part(ctx, p)
			if more.anyGood {
				all = append(all, inner...)
			} else {
				o.absent = true
				all = append(all, o)
			}
			l.merge(more)
		default:
			whole = false
			all = append(all, o)
		}
	}
	if whole {
		holes, largest := r.badHoles(ctx, parts)
		l.holes = append(l.holes, holes...)
		l.largest = max(l.largest, largest)
		l.tooLarge = len(holes) == 0
	}
	return all, l
}

// badHoles joins each two neighbours of parts that are good by themselves, to see which of the unused registers between them
// the device refuses. largest is the largest such block that was answered.
func (r *reader) badHoles(ctx context.Context, parts []registermap.Block) (bad []registermap.Span, largest int) {
	for i := 1; i < len(parts); i++ {
		a, b := parts[i-1], parts[i]
		hole := registermap.Span{UnitID: a.UnitID, Table: a.Table, Address: a.Address + registermap.Address(a.Quantity)}
		hole.Quantity = int(b.Address) - int(hole.Address)
		if hole.Quantity <= 0 {
			continue
		}
		joined := a.Span
		joined.Quantity = int(b.Address) + b.Quantity - int(a.Address)
		o := r.read(ctx, registermap.Block{Span: joined})
		if isRefusal(o.err) {
			bad = append(bad, hole)
		} else if o.err == nil {
			largest = max(largest, joined.Quantity)
		}
	}
	return bad, largest
}

func (l *lesson) merge(o lesson) {
	l.anyGood = l.anyGood || o.anyGood
	l.absent = append(l.absent, o.absent...)
	l.holes = append(l.holes, o.holes...)
	l.largest = max(l.largest, o.largest)
	l.tooLarge = l.tooLarge || o.tooLarge
}

// learn remembers a lesson for the next plan.
func (r *reader) learn(b registermap.Block, l lesson) {
	delete(r.waits, b.Span)
	r.limits.Refused = append(r.limits.Refused, l.holes...)
	for _, a := range l.absent {
		r.limits.Refused = append(r.limits.Refused, a.Span)
		r.waits[a.Span] = &wait{until: time.Now().Add(absentRetry), refusals: 6, absent: true}
	}
	if l.tooLarge && len(l.absent) == 0 && !b.Table.HasBits() {
		r.limits.MaxBlock = l.largest
	}
	if len(l.absent) == 0 && len(l.holes) == 0 && !l.tooLarge {
		r.limits.Refused = append(r.limits.Refused, b.Span)
	}
	if l.tooLarge && b.Table.HasBits() {
		r.limits.Refused = append(r.limits.Refused, b.Span)
	}
}

// read makes one request.
func (r *reader) read(ctx context.Context, b registermap.Block) outcome {
	u, ok := r.units[b.UnitID]
	if !ok {
		u = r.options.Link.Unit(b.UnitID)
		r.units[b.UnitID] = u
	}
	r.asked[b.Span] = time.Now()
	a, err := u.Read(ctx, link.Function(b.Table.FunctionCode()), int(b.Address), b.Quantity)
	if err != nil {
		return outcome{block: b, err: err}
	}
	pace := r.options.Pace()
	mid := a.Midpoint()
	since := r.options.Link.Now().Sub(mid) // real time since the value's best time, told to the plant's clock
	return outcome{
		block:       b,
		words:       asWords(a),
		real:        mid,
		plant:       r.options.Now().Add(-time.Duration(float64(since) * pace)),
		uncertainty: time.Duration(float64(a.RoundTrip()) / 2 * pace),
	}
}

func asWords(a link.Answer) []uint16 {
	if a.Bits == nil {
		return a.Words
	}
	words := make([]uint16, len(a.Bits))
	for i, b := range a.Bits {
		if b {
			words[i] = 1
		}
	}
	return words
}

// isNoAnswer tells the errors after which there is no point in asking the same unit more in this poll. A wrong answer is none:
// the next block may be answered well.
func isNoAnswer(err error) bool {
	switch link.KindOf(err) {
	case link.NoFault, link.NoRegister, link.DeviceRefuses, link.WrongAnswer:
		return false
	}
	return true
}

// isRefusal tells the exceptions by which a device says that the map asks for what it has not got.
func isRefusal(err error) bool {
	e, ok := errors.AsType[*link.ExceptionError](err)
	return ok && e.Class() == link.Configuration
}
