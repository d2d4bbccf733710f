package simulator

import (
	"context"
	"testing"
	"time"

	"chargehand/commission/signal"
)

// clock is a plant clock that a test moves by hand.
type clock struct{ now time.Time }

func (c *clock) Now() time.Time { return c.now }

// bench is a simulator with its hand-moved clock.
type bench struct {
	*Simulator
	t     testing.TB
	clock *clock
}

func newBench(t testing.TB, seed int64, disturb ...string) *bench {
	t.Helper()
	c := &clock{time.Date(2026, 12, 1, 9, 0, 0, 0, time.UTC)}
	o := Options{Site: wagtail(t), Map: wagtailMap(), Now: c.Now, Seed: seed}
	for _, text := range disturb {
		d, err := ParseDisturbance(text)
		if err != nil {
			t.Fatal(err)
		}
		o.Disturb = append(o.Disturb, d)
	}
	s, err := New(o)
	if err != nil {
		t.Fatal(err)
	}
	return &bench{s, t, c}
}

// do carries acts out, and waits where a line is a duration.
func (b *bench) do(lines ...string) {
	b.t.Helper()
	for _, line := range lines {
		if d, err := time.ParseDuration(line); err == nil {
			b.wait(d)
			continue
		}
		act, err := ParseAct(line)
		if err != nil {
			b.t.Fatal(err)
		}
		if err := b.Do(context.Background(), act); err != nil {
			b.t.Fatalf("Do(%s): %v", line, err)
		}
	}
}

func (b *bench) wait(d time.Duration) {
	b.t.Helper()
	b.clock.now = b.clock.now.Add(d)
	if err := b.catchUp(); err != nil {
		b.t.Fatal(err)
	}
}

func (b *bench) state(what string) {
	b.t.Helper()
	for _, n := range []signal.Name{signal.BusVoltage, signal.SourceVoltage, signal.SourceCurrent, signal.BusCurrent, signal.Power, signal.PrechargeClosed, signal.BypassClosed, signal.Ready, signal.Running, signal.FaultCode} {
		b.t.Logf("%-10s %-20s %g", what, n, b.shown(b.t, n))
	}
}

func TestWalk(t *testing.T) {
	b := newBench(t, 1)
	b.do("1s")
	b.state("rest")
	b.do("isolator close", "1s")
	b.state("isolator")
	b.do("precharge close", "1s")
	b.state("1 s")
	b.do("6s")
	b.state("7 s")
	b.do("release", "3s")
	b.state("boost")
	b.do("infeed on", "load 50 %", "1s")
	b.state("load")
	b.do("load off", "discharge", "5s")
	b.state("discharge")
	b.do("20m")
	b.state("discharge")
}
