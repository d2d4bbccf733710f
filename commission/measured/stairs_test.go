package measured

import (
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"chargehand/commission/capture"
	"chargehand/commission/finding"
	"chargehand/commission/signal"
	"chargehand/commission/site"
)

// stairs is a bus with two droop-controlled infeeds and a load that climbs in steps, solved point by point: a slow circuit
// follows its balance.
type stairs struct {
	site                       site.Site
	random                     *rand.Rand
	setpoint, droop, limit     float64 // of the converter
	other, otherDroop, most    float64
	otherLostAbove             float64 // W
	hunting                    float64 // V
	emf, ri                    float64
	gainI, offsetV, noise, lag float64
	loads                      []float64 // W
	spoil                      func(c *capture.Capture)
}

func soundStairs(s site.Site, seed uint64) *stairs {
	r := rand.New(rand.NewPCG(seed, 99))
	nominal := s.Bus.Nominal.Nominal
	own, second := s.Infeeds[0], s.Infeeds[1]
	shift := func(i site.Infeed) float64 {
		return float64(i.Setpoint.Nominal) + 0.8*(2*r.Float64()-1)*float64(i.SetpointError.Of(i.Setpoint.Nominal))
	}
	p := &stairs{site: s, random: r, setpoint: shift(own), droop: float64(own.Droop.At(nominal, own.RatedCurrent.Nominal)) * (1 + 0.01*r.NormFloat64()),
		limit: float64(own.RatedCurrent.Nominal), other: shift(second), otherDroop: float64(second.Droop.At(nominal, second.RatedCurrent.Nominal)) + 0.008,
		most: float64(second.RatedCurrent.Nominal), emf: float64(s.Source.HighestRest()) * 0.9, ri: float64(s.Source.InternalResistance.Nominal),
		gainI: 1 + 0.006*r.NormFloat64(), offsetV: 0.3 * (2*r.Float64() - 1) * float64(s.Bus.Error()), noise: 0.05 + 0.2*r.Float64(), lag: 0.03}
	for k := range 6 + r.IntN(4) {
		p.loads = append(p.loads, float64(s.Load.Power.Nominal)*(0.05+0.1*float64(k)))
	}
	return p
}

// balance is bus voltage and the converter's current at one load, by bisection on the bus voltage.
func (p *stairs) balance(load float64) (bus, current float64) {
	low, high := 0.4*p.setpoint, 1.2*math.Max(p.setpoint, p.other)
	lost := p.otherLostAbove > 0 && load > p.otherLostAbove
	own := func(v float64) float64 {
		if p.droop < 1e-6 { // holds its voltage
			return math.Max(-p.limit, math.Min(p.limit, (p.setpoint-v)/2e-4))
		}
		return math.Max(-p.limit, math.Min(p.limit, (p.setpoint-v)/p.droop))
	}
	for range 80 {
		v := (low + high) / 2
		second := math.Max(0, math.Min(p.most, (p.other-v)/p.otherDroop))
		if lost {
			second = 0
		}
		if own(v)+second > load/v {
			low = v
		} else {
			high = v
		}
	}
	return low, own(low)
}

func (p *stairs) climb() capture.Capture {
	c := capture.Capture{ID: "c3", Kind: capture.Droop, T0: time.Date(2026, 12, 1, 15, 0, 0, 0, time.UTC)}
	for _, n := range []signal.Name{signal.BusVoltage, signal.SourceVoltage, signal.SourceCurrent, signal.BusCurrent, signal.Power, signal.Heartbeat} {
		ch := capture.Channel{Name: n, Unit: n.Unit(), Type: "u16", Scale: 0.1}
		switch n {
		case signal.SourceCurrent, signal.BusCurrent:
			ch.Type = "i16"
		case signal.Power:
			ch.Type, ch.Scale = "i32", 1
		case signal.Heartbeat:
			ch.Scale = 1
		}
		c.Channels = append(c.Channels, ch)
	}
	t, v, i := 0.0, p.setpoint, 0.0
	noise := func(sd float64) float64 { return sd * p.random.NormFloat64() }
	for _, load := range p.loads {
		bus, current := p.balance(load)
		for end := t + 2.5 + p.random.Float64(); t < end; {
			dt := 0.02 + 0.02*p.random.Float64()
			t += dt
			k := 1 - math.Exp(-dt/p.lag)
			v, i = v+k*(bus-v), i+k*(current-i)
			hunt := p.hunting * math.Sin(2*math.Pi*1.7*t)
			shown, i := v+hunt, i+0.6*hunt/(p.otherDroop+0.05)
			source := shown * i / 0.97 / p.emf
			values := []float64{shown + p.offsetV + noise(p.noise), p.emf - p.ri*source + noise(p.noise), p.gainI*source + noise(0.1), p.gainI*i + noise(0.1),
				p.gainI*i*shown + noise(30), math.Floor(t * 10)}
			s := capture.Sample{At: since(t)}
			for k, ch := range c.Channels {
				s.Values = append(s.Values, encoded(ch, values[k]))
			}
			c.Samples = append(c.Samples, s)
		}
	}
	if p.spoil != nil {
		p.spoil(&c)
	}
	return c
}

var stairFaults = []struct {
	name  string
	apply func(p *stairs)
}{
	{"droop-mismatch", func(p *stairs) { p.droop *= 1.5 + 0.6*p.random.Float64() }},
	{"droop-mismatch", func(p *stairs) { p.droop *= 0.4 + 0.25*p.random.Float64() }},
	{"droop-off", func(p *stairs) { p.droop = 0 }},
	{"setpoint-shifted", func(p *stairs) { p.setpoint += 0.025 * p.setpoint }},
	{"limit-too-low", func(p *stairs) { p.limit *= 0.2; extend(p) }},
	{"infeed-lost", func(p *stairs) { p.otherLostAbove = 0.45 * float64(p.site.Load.Power.Nominal); extend(p) }},
	{"bus-hunts", func(p *stairs) { p.hunting = 0.01 * p.setpoint }},
	{"source-soft", func(p *stairs) { p.ri *= 6 }},
	{"current-reversed", func(p *stairs) { p.gainI = -p.gainI }},
	{"words-swapped", func(p *stairs) {
		p.spoil = func(c *capture.Capture) {
			for k := range c.Samples {
				v := &c.Samples[k].Values[4]
				v.Raw = []uint16{v.Raw[1], v.Raw[0]}
				v.V = float64(int32(uint32(v.Raw[0])<<16 | uint32(v.Raw[1])))
			}
		}
	}},
	{"torn-words", func(p *stairs) {
		p.spoil = func(c *capture.Capture) {
			for k := 1; k < len(c.Samples); k++ {
				if p.random.IntN(4) == 0 {
					v := &c.Samples[k].Values[4]
					v.Raw = []uint16{v.Raw[0] ^ 1, v.Raw[1]}
					v.V = float64(int32(uint32(v.Raw[0])<<16 | uint32(v.Raw[1])))
				}
			}
		}
	}},
}

func extend(p *stairs) {
	p.loads = nil
	for k := range 10 {
		p.loads = append(p.loads, float64(p.site.Load.Power.Nominal)*(0.05+0.1*float64(k)))
	}
}

func TestCausesOfLoadStairs(t *testing.T) {
	sites := []site.Site{readSite(t, "wagtail"), readSite(t, "nightjar")}
	from, count := seeds()
	right, all := 0, 0
	for _, f := range stairFaults {
		of, n, confusion := 0, 0, map[string]int{}
		for k := range count {
			p := soundStairs(sites[k%2], uint64(from+k))
			if f.name == "source-soft" && p.site.Source.Kind == site.Supercapacitor {
				continue
			}
			f.apply(p)
			causes := causesOf(DroopCapture(p.site, p.climb()))
			n++
			switch {
			case len(causes) == 0:
				confusion["silent"]++
			case leads(causes, f.name):
				of++
			default:
				confusion[causes[0].ID]++
			}
		}
		right, all = right+of, all+n
		t.Logf("%-18s right %3d of %3d  %s", f.name, of, n, words(confusion))
		if float64(of) < 0.85*float64(n) {
			t.Errorf("%s: right cause first in %d of %d", f.name, of, n)
		}
	}
	t.Logf("all: right %d of %d", right, all)
	if float64(right) < 0.95*float64(all) {
		t.Errorf("right cause first in %d of %d, want at least 95 %%", right, all)
	}
}

func TestHealthyLoadStairsAreSilent(t *testing.T) {
	sites, runs := []site.Site{readSite(t, "wagtail"), readSite(t, "nightjar")}, 40
	if _, count := seeds(); count > 10 {
		runs = 1000
	}
	seen := map[string]int{}
	for k := range runs {
		p := soundStairs(sites[k%2], uint64(9000+k))
		for _, f := range DroopCapture(p.site, p.climb()) {
			if len(f.Cause) > 0 || f.Verdict == finding.Fail {
				t.Errorf("healthy stairs %d on %s: %s %s, cause %v, %q", k, p.site.Reference, f.ID, f.Verdict, f.Cause, f.Because)
			}
			seen[f.ID+" "+string(f.Verdict)]++
		}
	}
	t.Log(words(seen))
}

// The slope put in comes back, and the steps are as many as were made.
func TestStepsFindTheStairs(t *testing.T) {
	s := readSite(t, "wagtail")
	for seed := range uint64(10) {
		p := soundStairs(s, 400+seed)
		p.gainI = 1
		steps := Steps(p.climb())
		if len(steps) != len(p.loads) {
			t.Errorf("seed %d: Steps found %d, want %d", seed, len(steps), len(p.loads))
		}
		f := Droop(s, steps)[0]
		if math.Abs(f.Value.Nominal/p.droop-1) > 0.03 {
			t.Errorf("seed %d: droop %.5f V/A, want %.5f V/A", seed, f.Value.Nominal, p.droop)
		}
	}
}
