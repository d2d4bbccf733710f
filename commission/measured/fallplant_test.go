package measured

import (
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"chargehand/commission/capture"
	"chargehand/commission/finding"
	"chargehand/commission/site"
)

// fall runs a discharge of the plant: everything open, from a little below the highest bus voltage until the touch-safe
// voltage or four slowest time constants, sampled some 400 times.
func (p *plant) fall(first float64) capture.Capture {
	record := capture.Capture{ID: "c2", Kind: capture.Discharge, T0: time.Date(2026, 12, 1, 12, 0, 0, 0, time.UTC), Channels: p.channels()}
	s := &state{bus: first, emf: p.emf, filter: p.emf, isolator: true, precharge: p.prechargeWelded, bypass: p.bypassWelded, auxiliary: p.auxiliary > 0}
	tau := 1e4
	if p.site.Bus.Bleeders != nil {
		tau = (p.c + p.cFilter) / bleederOnPaper(p.site)
	}
	end := 3.5 * tau
	dt := tau / 20000
	every := end / 400
	next := 0.0
	for s.t < end && s.bus > 50 {
		joined := s.bus <= s.filter && p.cFilter > 0 && !s.bypass && !s.precharge
		out := (p.bleeder + p.load + 1e-6) * s.bus
		if s.bus < p.vOff {
			s.auxiliary = false
		}
		if s.auxiliary && p.auxiliary > 0 {
			out += p.auxiliary / s.bus
		}
		c := p.c
		if joined {
			c += p.cFilter
		}
		into := 0.0
		r := p.ri + p.rx
		if s.precharge && !s.bypass {
			r += p.rp
		}
		if (s.precharge || s.bypass) && s.emf > s.bus+p.diode {
			into = (s.emf - s.bus - p.diode) / r
			c += p.cFilter
			if k := dt / (r * c); k > 0.5 { // stiff: it follows its balance
				s.bus = s.emf - p.diode - r*out
				into, out = 0, 0
			}
		}
		s.bus += dt * (into - out) / c
		if p.live > 0 {
			s.bus = math.Max(s.bus, p.live)
		}
		if joined {
			s.filter = s.bus
		}
		s.t += dt
		s.star, s.source, s.current = s.filter, s.emf, into
		if s.precharge || s.bypass {
			s.star = math.Min(s.emf, s.bus+p.diode)
		}
		if s.t >= next {
			record.Samples = append(record.Samples, p.sample(record.Channels, s.t, p.measure(s)))
			next += every * (0.8 + 0.4*p.random.Float64())
		}
	}
	if p.spoil != nil {
		p.spoil(&record, p.random)
	}
	return record
}

func bleederOnPaper(s site.Site) float64 {
	g := 0.0
	for _, b := range s.Bus.Bleeders {
		g += 1 / float64(b.Value.Nominal)
	}
	return g
}

var fallFaults = []fault{
	{"bleeder-open", func(p *plant) bool { p.bleeder = 0; return true }},
	{"load-left-on", func(p *plant) bool { p.load = p.bleeder * (0.8 + p.random.Float64()); return true }},
	{"bank-missing", func(p *plant) bool { p.c *= 0.3 + 0.2*p.random.Float64(); return true }},
	{"bank-added", func(p *plant) bool { p.c *= 1.9 + 0.5*p.random.Float64(); return true }},
	{"bypass-welded", func(p *plant) bool { p.bypassWelded = true; return true }},
	{"precharge-welded", func(p *plant) bool { p.prechargeWelded = true; return true }},
	{"bus-live", func(p *plant) bool { p.live = 0.97 * float64(p.site.Bus.Nominal.Nominal); return true }},
	{"filter-missing", func(p *plant) bool {
		p.cFilter = 0
		return p.site.Converter.Filter != nil && p.site.Reference == "WAG-017"
	}},
	{"link-drops", func(p *plant) bool {
		p.spoil = func(c *capture.Capture, _ *rand.Rand) {
			kept := c.Samples[:0:0]
			for i, s := range c.Samples {
				if i%100 < 75 {
					kept = append(kept, s)
				}
			}
			c.Samples = kept
		}
		return true
	}},
}

// fallSites have a bleeder: without one there is nothing to judge.
func fallSites(t testing.TB) []site.Site {
	var sites []site.Site
	for _, s := range tenSites(t) {
		if len(s.Bus.Bleeders) > 0 {
			sites = append(sites, s)
		}
	}
	return sites
}

func TestCausesOfDischarges(t *testing.T) {
	evaluate(t, fallFaults, fallSites(t), func(p *plant) []finding.Finding {
		return Discharge(p.site, p.fall(float64(p.site.Bus.Nominal.Nominal)))
	})
}

func TestHealthyDischargesAreSilent(t *testing.T) {
	sites, runs := fallSites(t), 40
	if _, count := seeds(); count > 10 {
		runs = 1000
	}
	seen := map[string]int{}
	for k := range runs {
		p := healthy(sites[k%len(sites)], uint64(7000+k))
		f := Discharge(p.site, p.fall(float64(p.site.Bus.Nominal.Nominal)*(0.97+0.05*p.random.Float64())))[0]
		if len(f.Cause) > 0 || f.Verdict == finding.Fail {
			t.Errorf("healthy run %d on %s: %s, cause %v, %q", k, p.site.Reference, f.Verdict, f.Cause, f.Because)
		}
		if want := p.c / p.bleeder; f.State == finding.Finite && math.Abs(f.Value.Nominal/want-1) > 0.08 {
			t.Errorf("healthy run %d on %s: time constant %.5g s, want %.5g s", k, p.site.Reference, f.Value.Nominal, want)
		}
		seen[string(f.Verdict)]++
	}
	t.Log(words(seen))
}
