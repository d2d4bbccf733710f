package poll_test

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"sync"
	"testing"
	"testing/synctest"
	"time"

	"go.uber.org/goleak"

	"chargehand/commission/signal"
	"chargehand/protocol/link"
	"chargehand/protocol/link/linktest"
	"chargehand/protocol/poll"
	"chargehand/protocol/registermap"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// voltages is a small map: two voltages, a current and a power.
func voltages() registermap.Map {
	return registermap.Map{MaxBlock: 100, MaxGap: 8, Points: []registermap.Point{
		{Name: signal.BusVoltage, Table: registermap.Holding, Address: 100, Type: registermap.U16, Scale: 0.1},
		{Name: signal.SourceVoltage, Table: registermap.Holding, Address: 101, Type: registermap.U16, Scale: 0.1},
		{Name: signal.SourceCurrent, Table: registermap.Holding, Address: 103, Type: registermap.I16, Scale: 0.1,
			Missing: [][]uint16{{0x8000}}},
		{Name: signal.Power, Table: registermap.Holding, Address: 110, Type: registermap.I32},
	}}
}

// rig is a device, a proxy, a link and a poller in a time bubble.
type rig struct {
	image  *linktest.Image
	proxy  *linktest.Proxy
	link   *link.Link
	poller *poll.Poller
	kept   <-chan signal.Batch
	cancel context.CancelFunc
	done   chan error
}

func newRig(m registermap.Map, o poll.Options) *rig {
	r := &rig{image: &linktest.Image{}, done: make(chan error, 1)}
	r.proxy = linktest.NewProxy(r.image.Answer)
	r.link = link.New(link.Options{Address: "192.0.2.1:502", Gap: m.MinInterval, Dial: r.proxy.Dial})
	o.Device, o.Link, o.UnitID, o.Map = "aft string", r.link, 1, m
	o.Random = rand.NewPCG(1, 2)
	r.poller = poll.New(o)
	r.kept = r.poller.Batches()
	r.image.Set(1, 3, 100, 7124, 8150)
	r.image.Set(1, 3, 103, 0xFF6A)
	r.image.Set(1, 3, 110, 0xFFFF, 0xFF06)
	return r
}

func (r *rig) run(ctx context.Context) {
	ctx, r.cancel = context.WithCancel(ctx)
	go func() { r.done <- r.poller.Run(ctx) }()
}

func (r *rig) close(t *testing.T) {
	t.Helper()
	r.cancel()
	if err := <-r.done; !errors.Is(err, context.Canceled) {
		t.Errorf("Run = %v, want context.Canceled", err)
	}
	r.link.Close()
	r.proxy.Close()
	if n := r.proxy.Writes(); n != 0 {
		t.Errorf("%d requests were not reads", n)
	}
}

// batches gives those of the next while, by the bubble's time.
func (r *rig) batches(d time.Duration) []signal.Batch {
	var all []signal.Batch
	end := time.After(d)
	for {
		select {
		case b, ok := <-r.kept:
			if !ok {
				return all
			}
			all = append(all, b)
		case <-end:
			return all
		}
	}
}

func last(all []signal.Batch) signal.Batch { return all[len(all)-1] }

func TestBatchHoldsEverySignalInOrder(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		r := newRig(voltages(), poll.Options{})
		r.run(t.Context())
		defer r.close(t)
		all := r.batches(time.Second)
		if n := len(all); n < 19 || n > 22 {
			t.Errorf("%d batches in a second, want 20", n)
		}
		b := last(all)
		if b.Device != "aft string" || !b.Link.Up || b.Link.Peer != "192.0.2.1:502" || math.Abs(b.Link.Rate-20) > 2 {
			t.Errorf("batch = %+v, want the device's name and a link that is up at 20 polls a second", b.Link)
		}
		want := []float64{712.4, 815, -15, -250}
		for i, p := range voltages().Points {
			g := b.Readings[i]
			if g.Name != p.Name || math.Abs(g.Value-want[i]) > 1e-9 || g.Quality != signal.Good {
				t.Errorf("reading %d = %s %v %s (%s), want %s %v good", i, g.Name, g.Value, g.Quality, g.Why, p.Name, want[i])
			}
		}
		if n := len(r.proxy.Requests()); n != len(all) {
			t.Errorf("%d requests for %d batches, want one each", n, len(all))
		}
	})
}

func TestLatestWins(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		r := newRig(voltages(), poll.Options{})
		r.run(t.Context())
		defer r.close(t)
		r.batches(3 * time.Second)
		b := <-r.poller.Latest()
		if age := time.Since(b.At); age > 60*time.Millisecond {
			t.Errorf("the latest batch is %v old, want one poll at most", age)
		}
	})
}

func TestKeptBatchesAreLossless(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		r := newRig(voltages(), poll.Options{})
		r.run(t.Context())
		defer r.close(t)
		time.Sleep(60 * time.Second) // the owner is away: 256 batches wait, then polling waits
		all := r.batches(5 * time.Second)
		if len(all) < 256+90 || len(all) > 256+110 {
			t.Errorf("%d batches, want the 256 kept and 100 new ones", len(all))
		}
		answered := map[time.Time]bool{}
		for _, b := range all {
			answered[b.Find(signal.BusVoltage).At] = true
		}
		if n := len(r.proxy.Requests()); n-len(answered) > 1 {
			t.Errorf("%d answers came, %d were delivered, want all", n, len(answered))
		}
	})
}

func TestSilenceWithdrawsEveryValue(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		r := newRig(voltages(), poll.Options{MaxAge: 500 * time.Millisecond})
		began := time.Now()
		r.proxy.Script(func(int, []byte) linktest.Fault {
			if d := time.Since(began); d > 2*time.Second && d < 10*time.Second {
				return linktest.Silence
			}
			return nil
		})
		r.run(t.Context())
		defer r.close(t)
		states := map[signal.Quality]int{}
		for _, b := range r.batches(9 * time.Second) {
			g := b.Find(signal.BusVoltage)
			states[g.Quality]++
			if age := b.At.Sub(g.At); g.Quality.HasValue() && age > 500*time.Millisecond {
				t.Errorf("a value %v old is shown as %s", age, g.Quality)
			}
			if !g.Quality.HasValue() && (g.Value != 0 || g.Why == "") {
				t.Errorf("a withdrawn reading is %v, %q, want no number and a reason", g.Value, g.Why)
			}
		}
		if states[signal.Good] < 35 || states[signal.Stale] < 8 {
			t.Errorf("states = %v, want two seconds good, then stale", states)
		}
		all := r.batches(8 * time.Second)
		if b := last(all); !b.Link.Up || b.Find(signal.BusVoltage).Quality != signal.Good {
			t.Errorf("after the silence: %+v, want good again", b)
		}
	})
}

func TestLinkLossIsSaidWithTheNextTry(t *testing.T) {
	r := newRig(voltages(), poll.Options{})
	if err := r.proxy.Listen(); err != nil {
		t.Fatal(err)
	}
	l := link.New(link.Options{Address: r.proxy.Address()})
	p := poll.New(poll.Options{Device: "aft string", Link: l, UnitID: 1, Map: voltages()})
	kept := p.Batches()
	r.poller, r.kept = p, kept
	r.link.Close()
	r.link = l
	r.run(t.Context())
	defer r.close(t)
	until := func(what string, is func(signal.Batch) bool) {
		t.Helper()
		deadline := time.After(20 * time.Second)
		for {
			select {
			case b := <-kept:
				if is(b) {
					return
				}
			case <-deadline:
				t.Fatalf("no batch came with %s", what)
			}
		}
	}
	good := func(b signal.Batch) bool { return b.Link.Up && b.Find(signal.BusVoltage).Quality == signal.Good }
	until("a good value", good)
	r.proxy.Shut()
	until("the loss and the next try", func(b signal.Batch) bool {
		if !b.Link.Up {
			for _, g := range b.Readings {
				if g.Quality != signal.Stale || !strings.Contains(g.Why, "link down") {
					t.Errorf("%s while the link is down = %s (%s), want stale", g.Name, g.Quality, g.Why)
				}
			}
		}
		return !b.Link.Up && strings.Contains(b.Link.Why, "refused") && b.Link.NextTry.After(b.At)
	})
	if err := r.proxy.Listen(); err != nil {
		t.Fatal(err)
	}
	until("a good value again", func(b signal.Batch) bool { return good(b) && b.Link.Reconnects > 0 })
}

func TestQualities(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		r := newRig(voltages(), poll.Options{})
		r.run(t.Context())
		defer r.close(t)
		r.image.Set(1, 3, 103, 0x8000)
		if g := last(r.batches(time.Second)).Find(signal.SourceCurrent); g.Quality != signal.Missing || g.Raw[0] != 0x8000 {
			t.Errorf("the code for no value = %+v, want missing with its raw word", g)
		}
		r.image.Refuse(4)
		if g := last(r.batches(time.Second)).Find(signal.BusVoltage); g.Quality != signal.Bad || !strings.Contains(g.Why, "exception 4") {
			t.Errorf("under exception 4 = %s (%s), want bad, and the exception named", g.Quality, g.Why)
		}
		r.image.Refuse(0)
		if g := last(r.batches(time.Second)).Find(signal.BusVoltage); g.Quality != signal.Good {
			t.Errorf("after exception 4 = %s (%s), want good", g.Quality, g.Why)
		}
	})
}

func TestNeverBeforeTheFirstAnswer(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		r := newRig(voltages(), poll.Options{})
		r.proxy.Script(func(int, []byte) linktest.Fault { return linktest.Silence })
		r.run(t.Context())
		defer r.close(t)
		all := r.batches(5 * time.Second)
		if len(all) < 5 {
			t.Errorf("%d batches in 5 s of silence, want them to keep coming", len(all))
		}
		for _, b := range all {
			for _, g := range b.Readings {
				if g.Quality != signal.Never || g.Why == "" {
					t.Errorf("before the first answer = %s (%s), want never and why", g.Quality, g.Why)
				}
			}
		}
	})
}

// TestRefusedBlocksAreParted: a hole, a register the device has not, a limit of size. All that is there must be read, and the
// lesson kept.
func TestRefusedBlocksAreParted(t *testing.T) {
	wide := registermap.Map{MaxBlock: 100, MaxGap: 8}
	for i, n := range signal.Names[:12] {
		wide.Points = append(wide.Points, registermap.Point{Name: n, Table: registermap.Holding,
			Address: registermap.Address(200 + i), Type: registermap.U16})
	}
	tests := []struct {
		name     string
		m        registermap.Map
		spoil    func(*linktest.Image)
		absent   []signal.Name
		requests int // a poll, once learned
	}{
		{"a hole", voltages(), func(i *linktest.Image) { i.Remove(1, 3, 105) }, nil, 2},
		{"a register that is not there", voltages(), func(i *linktest.Image) { i.Remove(1, 3, 101) },
			[]signal.Name{signal.SourceVoltage}, 2},
		{"half of a wide value not there", voltages(), func(i *linktest.Image) { i.Remove(1, 3, 111) },
			[]signal.Name{signal.Power}, 1},
		{"blocks of 5 at most", wide, func(i *linktest.Image) { i.LimitBlock(5) }, nil, 4},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			synctest.Test(t, func(t *testing.T) {
				r := newRig(tt.m, poll.Options{})
				tt.spoil(r.image)
				r.run(t.Context())
				defer r.close(t)
				check := func(b signal.Batch) {
					for _, g := range b.Readings {
						if isAbsent := slices.Contains(tt.absent, g.Name); isAbsent != (g.Quality == signal.Bad) || !isAbsent && g.Quality != signal.Good {
							t.Errorf("%s = %s (%s), want absent %v, else good", g.Name, g.Quality, g.Why, isAbsent)
						}
						if g.Quality == signal.Bad && !strings.Contains(g.Why, "not in the device") {
							t.Errorf("%s says %q, want that it is not in the device", g.Name, g.Why)
						}
					}
				}
				all := r.batches(2 * time.Second)
				check(all[0])
				check(last(all))
				before := len(r.proxy.Requests())
				n := len(r.batches(2 * time.Second))
				if got := float64(len(r.proxy.Requests())-before) / float64(n); math.Abs(got-float64(tt.requests)) > 0.2 {
					t.Errorf("%.2f requests a poll once learned, want %d", got, tt.requests)
				}
			})
		})
	}
}

func TestARegisterThatComesBackIsFound(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		r := newRig(voltages(), poll.Options{})
		r.image.Remove(1, 3, 101)
		r.run(t.Context())
		defer r.close(t)
		r.batches(10 * time.Second)
		r.image.Restore(1, 3, 101)
		if g := last(r.batches(61 * time.Second)).Find(signal.SourceVoltage); g.Quality != signal.Good {
			t.Errorf("a register that came back = %s (%s) a minute later, want good", g.Quality, g.Why)
		}
	})
}

// TestOneRefusalTeachesNothing: a device that starts up refuses for a moment.
func TestOneRefusalTeachesNothing(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		r := newRig(voltages(), poll.Options{})
		r.image.Refuse(2)
		r.run(t.Context())
		defer r.close(t)
		r.batches(5 * time.Second)
		r.image.Refuse(0)
		all := r.batches(10 * time.Second)
		if b := last(all); b.Find(signal.Power).Quality != signal.Good || r.poller.Plan().Requests() != 1 {
			t.Errorf("after a start with refusals: %+v in %d requests, want good in one", b.Find(signal.Power), r.poller.Plan().Requests())
		}
	})
}

func TestFocusIsFastAndKeepsTheRestAlive(t *testing.T) {
	m := voltages()
	m.MinInterval = 10 * time.Millisecond
	m.Points = append(m.Points, registermap.Point{Name: signal.VoltageSetpoint, Table: registermap.Holding, Address: 300,
		Type: registermap.U16, Scale: 0.1})
	synctest.Test(t, func(t *testing.T) {
		r := newRig(m, poll.Options{MaxAge: 500 * time.Millisecond})
		r.run(t.Context())
		defer r.close(t)
		r.batches(time.Second)
		r.poller.Focus(signal.BusVoltage, signal.SourceVoltage)
		r.batches(100 * time.Millisecond)
		all := r.batches(2 * time.Second)
		if n := float64(len(all)) / 2; n < 80 || n > 100 {
			t.Errorf("%.0f polls a second with 10 ms between requests, want nearly 100", n)
		}
		seen := map[time.Time]bool{}
		for _, b := range all {
			seen[b.Find(signal.BusVoltage).At] = true
			if g := b.Find(signal.VoltageSetpoint); !g.Quality.HasValue() {
				t.Errorf("beside the focus: %s (%s), want it kept alive", g.Quality, g.Why)
			}
		}
		if len(seen) != len(all) {
			t.Errorf("%d samples in %d batches, want one each", len(seen), len(all))
		}
		r.poller.Focus()
		r.batches(200 * time.Millisecond)
		if n := len(r.batches(2 * time.Second)); n < 38 || n > 42 {
			t.Errorf("%d batches in 2 s after the focus, want 40", n)
		}
	})
}

// TestFocusWithoutLoss compares what a device gave with what came, for a minute at the highest rate.
func TestFocusWithoutLoss(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		r := newRig(voltages(), poll.Options{})
		r.run(t.Context())
		defer r.close(t)
		r.poller.Focus(signal.BusVoltage)
		r.batches(time.Second)
		before := len(r.proxy.Requests())
		all := r.batches(time.Minute)
		if asked := len(r.proxy.Requests()) - before; asked < 59*150 || math.Abs(float64(asked-len(all))) > 1+60*4.5 {
			t.Errorf("%d requests, %d batches in a minute, want one each but for the signals kept alive", asked, len(all))
		}
		seen := map[time.Time]bool{}
		for _, b := range all {
			seen[b.Find(signal.BusVoltage).At] = true
		}
		if len(seen) != len(all) {
			t.Errorf("%d samples in %d batches, want no poll without one", len(seen), len(all))
		}
	})
}

func TestTimesAreByThePlantsClock(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		began := time.Now()
		plant := func() time.Time { return began.Add(50 * time.Since(began)) } // fifty times faster
		r := newRig(voltages(), poll.Options{Now: plant, Pace: func() float64 { return 50 }})
		r.proxy.Script(func(int, []byte) linktest.Fault { return linktest.Late(20 * time.Millisecond) })
		r.run(t.Context())
		defer r.close(t)
		for _, b := range r.batches(time.Second) {
			g := b.Find(signal.BusVoltage)
			if g.Quality != signal.Good {
				t.Errorf("a value %v old by the plant's clock = %s (%s), want good: it is %v old", b.At.Sub(g.At), g.Quality, g.Why,
					b.At.Sub(g.At)/50)
			}
			if got, want := g.Uncertainty, 500*time.Millisecond; got != want {
				t.Errorf("uncertainty = %v, want %v: half of 20 ms, fifty times", got, want)
			}
			if got, want := b.At.Sub(g.At), 500*time.Millisecond; got != want {
				t.Errorf("a value is %v old when it comes, want %v", got, want)
			}
		}
	})
}

func TestTornValueIsHeldBack(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		r := newRig(voltages(), poll.Options{})
		var mu sync.Mutex
		n := 0
		r.proxy.Script(func(int, []byte) linktest.Fault {
			mu.Lock()
			defer mu.Unlock()
			n++
			v := int32(-20 + n%40) // small powers about zero
			high, low := uint16(uint32(v)>>16), uint16(v)
			if n == 30 || n == 60 {
				high = ^high // one register older than the other
			}
			if n > 80 {
				high++ // a real step of 65536
			}
			r.image.Set(1, 3, 110, high, low)
			return nil
		})
		r.run(t.Context())
		defer r.close(t)
		bad, believed := 0, 0
		for _, b := range r.batches(6 * time.Second) {
			g := b.Find(signal.Power)
			if g.Quality == signal.Bad {
				bad++
				continue
			}
			if g.Value > 60000 {
				believed++
			}
			if g.Value < -60000 {
				t.Errorf("a torn value of %v W was delivered as %s", g.Value, g.Quality)
			}
		}
		if bad != 3 || believed < 30 {
			t.Errorf("%d samples held back and %d of the real step believed, want 3 (two torn, one at the step) and the rest", bad, believed)
		}
	})
}

func TestStandingHeartbeatFreezesTheUnit(t *testing.T) {
	m := voltages()
	m.Points = append(m.Points, registermap.Point{Name: signal.Heartbeat, Table: registermap.Holding, Address: 112, Type: registermap.U16})
	synctest.Test(t, func(t *testing.T) {
		r := newRig(m, poll.Options{})
		began := time.Now()
		r.proxy.Script(func(int, []byte) linktest.Fault {
			if d := time.Since(began); d < 5*time.Second {
				r.image.Set(1, 3, 112, uint16(d/(100*time.Millisecond)))
			}
			return nil
		})
		r.run(t.Context())
		defer r.close(t)
		for _, b := range r.batches(5 * time.Second) {
			if g := b.Find(signal.BusVoltage); g.Quality == signal.Frozen {
				t.Errorf("a device at rest with a heartbeat = %s (%s), want good", g.Quality, g.Why)
			}
		}
		if g := last(r.batches(2 * time.Second)).Find(signal.BusVoltage); g.Quality != signal.Frozen || !strings.Contains(g.Why, "heartbeat") {
			t.Errorf("with a standing heartbeat = %s (%s), want frozen", g.Quality, g.Why)
		}
	})
}

func TestStoppedValueIsFrozenAndASettledOneIsNot(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		r := newRig(voltages(), poll.Options{})
		began := time.Now()
		noise := rand.New(rand.NewPCG(3, 4))
		r.proxy.Script(func(int, []byte) linktest.Fault {
			d := time.Since(began).Seconds()
			charge := 8150 * (1 - math.Exp(-d/0.8))
			r.image.Set(1, 3, 101, uint16(charge)) // settles in ever smaller steps
			r.image.Set(1, 3, 103, uint16(int16(100+noise.IntN(40))))
			if d < 5 {
				r.image.Set(1, 3, 100, uint16(7000+noise.IntN(200)))
			}
			return nil
		})
		r.run(t.Context())
		defer r.close(t)
		for _, b := range r.batches(5 * time.Second) {
			for _, g := range b.Readings {
				if g.Quality == signal.Frozen {
					t.Errorf("%s = frozen (%s) while all is well", g.Name, g.Why)
				}
			}
		}
		b := last(r.batches(15 * time.Second))
		if g := b.Find(signal.BusVoltage); g.Quality != signal.Frozen {
			t.Errorf("a value that stopped dead = %s, want frozen", g.Quality)
		}
		for _, n := range []signal.Name{signal.SourceVoltage, signal.SourceCurrent, signal.Power} {
			if g := b.Find(n); g.Quality != signal.Good {
				t.Errorf("%s = %s (%s), want good", n, g.Quality, g.Why)
			}
		}
	})
}

func TestRefreshPeriod(t *testing.T) {
	for _, tt := range []struct {
		period time.Duration
		known  bool
	}{ // polled every 50 ms
		{time.Second, true}, {500 * time.Millisecond, true}, {350 * time.Millisecond, true}, {200 * time.Millisecond, true},
		{110 * time.Millisecond, false}, {100 * time.Millisecond, false}, {52 * time.Millisecond, false}, {20 * time.Millisecond, false},
	} {
		synctest.Test(t, func(t *testing.T) {
			r := newRig(voltages(), poll.Options{})
			began := time.Now()
			r.proxy.Script(func(int, []byte) linktest.Fault {
				n := int(time.Since(began) / tt.period)
				r.image.Set(1, 3, 100, uint16(7000+3*(n*7919%101)))
				return nil
			})
			r.run(t.Context())
			defer r.close(t)
			r.batches(40 * time.Second)
			got := r.poller.Refresh(signal.BusVoltage)
			if got.Known != tt.known {
				t.Errorf("Refresh at %v = %+v, want known %v", tt.period, got, tt.known)
			}
			if off := (got.Period - tt.period).Abs(); got.Known && (off > got.Uncertainty || off > tt.period/100) {
				t.Errorf("Refresh at %v = %v ± %v, want it inside and within 1 %%", tt.period, got.Period, got.Uncertainty)
			}
			if still := r.poller.Refresh(signal.SourceVoltage); still.Known || still.Why == "" {
				t.Errorf("Refresh of a still value = %+v, want not known and why", still)
			}
		})
	}
}

func TestSeveralDevicesEachWithItsOwnState(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		good, bad := newRig(voltages(), poll.Options{}), newRig(voltages(), poll.Options{})
		bad.proxy.Script(func(int, []byte) linktest.Fault { return linktest.Silence })
		good.run(t.Context())
		bad.run(t.Context())
		defer good.close(t)
		defer bad.close(t)
		go bad.batches(5 * time.Second)
		all := good.batches(5 * time.Second)
		for _, b := range all {
			if g := b.Find(signal.BusVoltage); g.Quality != signal.Good {
				t.Errorf("beside a silent device = %s (%s), want good", g.Quality, g.Why)
			}
		}
		if len(all) < 95 {
			t.Errorf("%d batches in 5 s beside a silent device, want 100", len(all))
		}
	})
}
