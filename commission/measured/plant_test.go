package measured

import (
	"math"
	"math/rand/v2"
	"os"
	"testing"
	"time"

	"chargehand/commission/capture"
	"chargehand/commission/quantity"
	"chargehand/commission/signal"
	"chargehand/commission/site"
)

// plant is a pre-charge circuit with true values, integrated in small steps of its own: it shares no formula with the
// findings. What is wrong with it is a change of its values.
type plant struct {
	site              site.Site
	random            *rand.Rand
	emf, cSource      float64
	ri, rp, rx        float64
	drift             float64 // of rp per kelvin
	thermalR, thermal float64 // K⁄W, J⁄K
	c, cFilter        float64
	bleeder           float64 // S
	auxiliary         float64 // W
	vOn, vOff         float64
	load              float64 // S from the start
	lateLoad          float64 // W, constant power, from lateAt V on until half of it
	lateAt            float64
	short             float64 // S
	shortAt           float64 // V, 0 from the start
	choke             float64 // H, all phases in parallel with the source loop
	diode             float64 // V
	v0                float64 // V of the bus at the start of the record
	live              float64 // V that another infeed holds; 0 without
	bypassWelded      bool
	bypassDead        bool
	prechargeWelded   bool
	bypassDropsAfter  float64
	early             float64 // V, closing difference that the device really uses
	sourceOpensAt     float64
	fuseOpen          bool
	phaseOpen         int // 1…3
	lowerShorted      int
	upperShorted      int
	reversed          bool
	unequal           float64 // part of phase 1's resistance that is missing
	reported          int     // 1: bypass reports closed always, −1: open always
	insulation        float64

	busGain, busOffset, sourceOffset, currentGain, currentOffset float64
	noiseV, noiseI                                               float64
	refresh, poll, jitter                                        float64 // s
	lacking                                                      map[signal.Name]bool
	spoil                                                        func(c *capture.Capture, r *rand.Rand) // readings on their way
}

func readSite(t testing.TB, name string) site.Site {
	t.Helper()
	text, err := os.ReadFile("../../testdata/sites/" + name + ".site.toml")
	if err != nil {
		t.Fatal(err)
	}
	s, _, err := site.Read(name+".site.toml", text)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// tenSites are the three of the test data and variations of them with other numbers, with and without bleeder, auxiliary
// supply, filter and isolated banks.
func tenSites(t testing.TB) []site.Site {
	w, n, o := readSite(t, "wagtail"), readSite(t, "nightjar"), readSite(t, "ouzel")
	change := func(s site.Site, f func(*site.Site)) site.Site {
		s.Bus.Capacitances = append([]site.Bank(nil), s.Bus.Capacitances...)
		s.Bus.Bleeders = append([]site.Bleeder(nil), s.Bus.Bleeders...)
		f(&s)
		return s
	}
	scaleR := func(s *site.Site, by float64) {
		r := &s.Precharge.Resistance
		r.Low, r.Nominal, r.High = r.Low*quantity.Resistance(by), r.Nominal*quantity.Resistance(by), r.High*quantity.Resistance(by)
		s.Precharge.Timeout.Nominal *= quantity.Seconds(max(1, by)) // so that a sound charge ends before it
	}
	return []site.Site{w, n, o,
		change(w, func(s *site.Site) { s.Bus.Auxiliary = nil; scaleR(s, 0.5) }),
		change(w, func(s *site.Site) { s.Bus.Bleeders = nil; scaleR(s, 1.5) }),
		change(w, func(s *site.Site) { v := *s.Converter; v.Filter = nil; s.Converter = &v; scaleR(s, 2) }),
		change(n, func(s *site.Site) { scaleR(s, 3) }),
		change(n, func(s *site.Site) {
			s.Source.Kind, s.Source.Capacitance = site.OtherSource, quantity.Entered[quantity.Capacitance]{}
			s.Bus.Bleeders = w.Bus.Bleeders
		}),
		change(o, func(s *site.Site) {
			s.Bus.Capacitances[1].Value.Nominal *= 0.5
			s.Bus.Capacitances[1].Value.Low *= 0.5
			s.Bus.Capacitances[1].Value.High *= 0.5
		}),
		change(o, func(s *site.Site) { s.Bus.Auxiliary = w.Bus.Auxiliary; scaleR(s, 0.4) }),
	}
}

func within[Q quantity.Scalar](r *rand.Rand, s quantity.Spread[Q]) float64 {
	u := 0.9 * (2*r.Float64() - 1)
	if u < 0 {
		return float64(s.Nominal) + u*float64(s.Nominal-s.Low)
	}
	return float64(s.Nominal) + u*float64(s.High-s.Nominal)
}

func healthy(s site.Site, seed uint64) *plant {
	r := rand.New(rand.NewPCG(seed, 77))
	p := &plant{site: s, random: r, lacking: map[signal.Name]bool{}, insulation: 5e5}
	high, low := float64(s.Source.HighestRest()), float64(s.Source.LowestRest())
	p.emf = low + (high-low)*(0.3+0.65*r.Float64())
	if s.Source.Kind == site.Supercapacitor {
		p.cSource = within(r, s.Source.Capacitance.Spread)
	}
	p.ri, p.rp = within(r, s.Source.InternalResistance.Spread), within(r, s.Precharge.Resistance.Spread)
	p.choke, p.thermalR, p.thermal = 0.15e-3, 0.3, 900
	if h := s.Precharge.Thermal; h != nil {
		p.thermalR = float64(h.Resistance.Nominal)
		p.thermal = float64(h.TimeConstant.Nominal) / p.thermalR
	}
	if v := s.Converter; v != nil {
		p.rx = float64(v.ChokeResistance.Nominal) / 3
		if v.Filter != nil {
			p.cFilter = within(r, v.Filter.Capacitance.Spread)
		}
	}
	for _, b := range s.Bus.Capacitances {
		if !b.Isolated {
			p.c += within(r, b.Value.Spread)
		}
	}
	for _, b := range s.Bus.Bleeders {
		p.bleeder += 1 / within(r, b.Value.Spread)
	}
	if a := s.Bus.Auxiliary; a != nil {
		p.auxiliary, p.vOn, p.vOff = float64(a.Power.Nominal), float64(a.StartsAt.Nominal), float64(a.StopsAt.Nominal)
	}
	p.diode = 0.6 + 0.4*r.Float64()
	busError, sourceError := float64(s.Bus.Error()), float64(s.Source.Error())
	p.busGain, p.busOffset = 1+0.3*(2*r.Float64()-1)*busError/float64(s.Bus.Nominal.Nominal), 0.3*(2*r.Float64()-1)*busError
	p.sourceOffset = 0.5 * (2*r.Float64() - 1) * sourceError
	p.currentGain, p.currentOffset = 1+0.008*(2*r.Float64()-1), 0.1*(2*r.Float64()-1)
	p.noiseV, p.noiseI = 0.3*r.Float64(), 0.08*r.Float64()
	p.refresh = 0.02 + 0.08*r.Float64()
	p.poll, p.jitter = 0.02+0.04*r.Float64(), 0.015*r.Float64()
	p.early = float64(s.Precharge.ClosingDifference.Nominal)
	return p
}

// state is the circuit at one instant.
type state struct {
	t, bus, filter, emf, heat     float64
	current, star, source         float64
	precharge, bypass, isolator   bool
	auxiliary, shorted, late      bool
	inductor                      float64
	prechargeAt, bypassAt, openAt float64
}

var captureSignals = []signal.Name{signal.BusVoltage, signal.SourceVoltage, signal.StarPointVoltage, signal.SourceCurrent, signal.PhaseCurrent1,
	signal.PhaseCurrent2, signal.PhaseCurrent3, signal.Power, signal.ResistorTemperature, signal.InsulationResistance, signal.PrechargeClosed, signal.BypassClosed, signal.Heartbeat}

func (p *plant) channels() []capture.Channel {
	var out []capture.Channel
	for _, n := range captureSignals {
		if p.lacking[n] {
			continue
		}
		ch := capture.Channel{Name: n, Unit: n.Unit(), Type: "u16", Scale: 0.1}
		switch n {
		case signal.SourceCurrent, signal.PhaseCurrent1, signal.PhaseCurrent2, signal.PhaseCurrent3, signal.ResistorTemperature:
			ch.Type = "i16"
		case signal.SourceVoltage:
			ch.Type = "i16"
		case signal.Power:
			ch.Type, ch.Scale = "i32", 1
		case signal.PrechargeClosed, signal.BypassClosed:
			ch.Type, ch.Scale = "bit", 1
		case signal.InsulationResistance:
			ch.Scale = 1000
		case signal.Heartbeat:
			ch.Scale = 1
		}
		out = append(out, ch)
	}
	return out
}

// charge runs one pre-charge: half a second before the command until some time after the bypass has closed, or until the
// time-out.
func (p *plant) charge() capture.Capture {
	c := capture.Capture{ID: "c1", Kind: capture.Precharge, Attempt: 1, T0: time.Date(2026, 12, 1, 9, 0, 0, 0, time.UTC), Channels: p.channels()}
	tau := (p.rp + p.ri) * (p.c + p.cFilter)
	limit := 14*tau + 5
	if timeout := float64(p.site.Precharge.Timeout.Nominal); timeout > 0 {
		limit = timeout
	}
	s := &state{t: -0.6, bus: p.v0, emf: p.emf, isolator: true, prechargeAt: math.Inf(1), bypassAt: math.Inf(1), openAt: math.Inf(1)}
	if p.live > 0 {
		s.bus = p.live
	}
	if p.reversed {
		s.emf = -p.emf
	}
	p.settle(s)
	var registers []float64
	nextRefresh, nextPoll := s.t, s.t+0.01
	end, released := limit+0.7, math.Inf(1)
	for s.t < end {
		dt := math.Min(2e-4, tau/400)
		if s.bypass && s.t < s.bypassAt+0.05 {
			dt = 2e-5
		}
		p.operate(s, &released, &end, limit, tau)
		p.advance(s, dt)
		if s.t >= nextRefresh {
			registers = p.measure(s)
			nextRefresh += p.refresh * (1 + 0.1*(p.random.Float64()-0.5))
		}
		if s.t >= nextPoll {
			c.Samples = append(c.Samples, p.sample(c.Channels, s.t, registers))
			nextPoll += math.Max(0.004, p.poll+p.jitter*p.random.NormFloat64())
		}
	}
	if p.spoil != nil {
		p.spoil(&c, p.random)
	}
	return c
}

// settle brings a circuit with a welded contact to where it stood long before the record.
func (p *plant) settle(s *state) {
	if p.bypassWelded {
		s.bypass = true
		s.bus = math.Max(s.bus, p.emf*1.02)
	}
	if p.prechargeWelded {
		s.precharge = true
		for range 200000 {
			p.advance(s, (p.rp+p.ri)*(p.c+p.cFilter)/2000)
			if s.t > 20*(p.rp+p.ri)*(p.c+p.cFilter)-0.6 {
				break
			}
		}
		s.t = -0.6
	}
}

// operate is the device: closes, compares, releases, times out.
func (p *plant) operate(s *state, released, end *float64, limit, tau float64) {
	if s.t >= 0 && math.IsInf(s.prechargeAt, 1) {
		s.precharge, s.prechargeAt = true, s.t
	}
	if p.sourceOpensAt > 0 && s.t > p.sourceOpensAt {
		s.isolator = false
	}
	across := math.Abs(s.source - s.star)
	enough := s.t > math.Max(0.1, float64(p.site.Precharge.MinimumTime.Nominal))
	if p.early > 2*float64(p.site.Precharge.ClosingDifference.Nominal) {
		enough = s.t > 0.1
	}
	if s.precharge && s.t > 0 && enough && across < p.early && math.IsInf(*released, 1) && !p.reversed && math.Abs(s.source) > 0.3*p.emf {
		*released = s.t + 0.05
	}
	if s.t > *released && !s.bypass && !p.bypassDead && math.IsInf(s.bypassAt, 1) {
		s.bypass, s.bypassAt = true, s.t
		*end = s.t + 1.5
		if p.bypassDropsAfter > 0 {
			*end = s.t + p.bypassDropsAfter + 1.5
		}
	}
	if s.bypass && s.t > s.bypassAt+0.4 && !p.prechargeWelded {
		s.precharge = false
	}
	if p.bypassDropsAfter > 0 && s.t > s.bypassAt+p.bypassDropsAfter && !p.bypassWelded {
		s.bypass = false
	}
	if s.t > limit && !s.bypass && !p.prechargeWelded {
		s.precharge = false
	}
}

// advance integrates one step.
func (p *plant) advance(s *state, dt float64) {
	emf := s.emf
	if !s.isolator || p.fuseOpen {
		emf = 0
	}
	r := p.ri + p.rx + p.rp*(1+p.drift*s.heat)
	shorted := p.short > 0 && (s.shorted || s.bus >= p.shortAt)
	s.shorted = shorted
	legs := s.bus + p.diode
	down := emf > 0 && p.lowerShorted > 0
	i := 0.0
	switch {
	case s.bypass && emf != 0:
		s.inductor = math.Max(0, s.inductor+dt*(emf-legs-(p.ri+p.rx)*s.inductor)/p.choke)
		i = s.inductor
		s.star = emf - p.ri*i
		s.filter = s.star
	case s.precharge && emf < 0:
		i = (emf + p.diode) / r
		s.star = -p.diode
	case s.precharge && down:
		i = emf / r
		s.star = 0
	case s.precharge && s.filter < legs-3 && p.cFilter > 0:
		charging := math.Max(0, (emf-s.filter)/r)
		s.filter += dt * charging / p.cFilter
		s.star, i = s.filter, charging
		p.drain(s, 0, dt, shorted)
		s.t += dt
		p.heatUp(s, i, dt)
		s.source = emf - p.ri*i
		s.current = i
		return
	case s.precharge:
		i = math.Max(0, (emf-legs)/r)
		s.star = math.Max(math.Min(emf, legs), 0)
		if i == 0 {
			s.star = emf
		}
		s.filter = s.star
	default:
		s.inductor = 0
		s.star = s.filter
	}
	if p.upperShorted > 0 {
		s.star = s.bus
	}
	if emf == 0 {
		i, s.inductor = 0, 0
	}
	bus := i
	if i < 0 || down && !s.bypass {
		bus = 0
	}
	p.drain(s, bus, dt, shorted)
	if p.cSource > 0 {
		s.emf -= dt * i / p.cSource
	}
	s.t += dt
	p.heatUp(s, i, dt)
	s.source = emf - p.ri*i
	s.current = i
}

func (p *plant) heatUp(s *state, i, dt float64) {
	power := p.rp * (1 + p.drift*s.heat) * i * i
	if s.bypass || !s.precharge {
		power = 0
	}
	s.heat += dt * (power - s.heat/p.thermalR) / p.thermal
}

// drain is everything that hangs on the bus.
func (p *plant) drain(s *state, into, dt float64, shorted bool) {
	out := (p.bleeder + p.load + 1e-6) * s.bus
	switch {
	case p.auxiliary > 0 && s.bus > p.vOn:
		s.auxiliary = true
	case s.bus < p.vOff:
		s.auxiliary = false
	}
	if s.auxiliary && p.auxiliary > 0 {
		out += p.auxiliary / math.Max(s.bus, 1)
	}
	if p.lateLoad > 0 {
		s.late = s.late && s.bus > p.lateAt/2 || s.bus > p.lateAt
		if s.late {
			out += p.lateLoad / s.bus
		}
	}
	c := p.c
	if s.star >= s.bus { // the filter hangs in parallel while the diodes conduct
		c += p.cFilter
	}
	if shorted {
		s.bus = (s.bus*c + dt*(into-out)) / (c + dt*p.short)
		return
	}
	s.bus = math.Max(0, s.bus+dt*(into-out)/c)
	if p.live > 0 && s.bus < p.live {
		s.bus = p.live
	}
}

// measure is what the device's registers hold, in the order of captureSignals.
func (p *plant) measure(s *state) []float64 {
	noise := func(sd float64) float64 { return sd * p.random.NormFloat64() }
	i := s.current
	shares := [3]float64{1. / 3, 1. / 3, 1. / 3}
	if k := p.phaseOpen; k > 0 {
		shares = [3]float64{0.5, 0.5, 0.5}
		shares[k-1] = 0
	}
	if k := p.lowerShorted; k > 0 && !s.bypass {
		shares = [3]float64{}
		shares[k-1] = 1
	}
	if p.unequal > 0 { // 3 mΩ of choke and 1 mΩ of diode in each phase
		first, others := 1/(3e-3*(1-p.unequal)+1e-3), 1/4e-3
		shares = [3]float64{first / (first + 2*others), others / (first + 2*others), others / (first + 2*others)}
	}
	if k := p.upperShorted; k > 0 {
		shares = [3]float64{}
		shares[k-1] = 1
	}
	phase := func(k int) float64 {
		return p.currentGain*i*shares[k] + 0.4*p.currentOffset + noise(p.noiseI)
	}
	bypass := 0.0
	if s.bypass && !p.bypassWelded || s.bypass && s.t > s.bypassAt {
		bypass = 1
	}
	if p.reported != 0 {
		bypass = math.Max(0, float64(p.reported))
	}
	precharge := 0.0
	if s.precharge && (s.t >= 0 || p.prechargeWelded) {
		precharge = 1
	}
	bus := p.busGain*s.bus + p.busOffset + noise(p.noiseV)
	values := map[signal.Name]float64{
		signal.BusVoltage:           bus,
		signal.SourceVoltage:        s.source + p.sourceOffset + noise(p.noiseV),
		signal.StarPointVoltage:     s.star + p.sourceOffset + noise(p.noiseV),
		signal.SourceCurrent:        p.currentGain*i + p.currentOffset + noise(p.noiseI),
		signal.PhaseCurrent1:        phase(0),
		signal.PhaseCurrent2:        phase(1),
		signal.PhaseCurrent3:        phase(2),
		signal.Power:                0,
		signal.ResistorTemperature:  30 + s.heat + noise(0.1),
		signal.InsulationResistance: p.insulation * (1 + noise(0.02)),
		signal.PrechargeClosed:      precharge,
		signal.BypassClosed:         bypass,
		signal.Heartbeat:            math.Floor((s.t + 100) * 10),
	}
	out := make([]float64, len(captureSignals))
	for k, n := range captureSignals {
		out[k] = values[n]
	}
	return out
}

func (p *plant) sample(channels []capture.Channel, t float64, registers []float64) capture.Sample {
	s := capture.Sample{At: since(math.Round(t*1e6) / 1e6)}
	for _, ch := range channels {
		for k, n := range captureSignals {
			if n == ch.Name {
				s.Values = append(s.Values, encoded(ch, registers[k]))
			}
		}
	}
	return s
}

// encoded is a value as its register holds it.
func encoded(ch capture.Channel, v float64) capture.Value {
	raw := math.Round(v / ch.Scale)
	switch ch.Type {
	case "u16", "bit":
		raw = math.Max(0, math.Min(65535, raw))
	case "i16":
		raw = math.Max(-32768, math.Min(32767, raw))
	}
	words := []uint16{uint16(int64(raw))}
	if ch.Type == "i32" {
		words = []uint16{uint16(int64(raw) >> 16), uint16(int64(raw))}
	}
	return capture.Value{V: raw * ch.Scale, OK: true, Raw: words}
}
