package measured

import (
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"slices"
	"sort"
	"strings"
	"testing"

	"chargehand/commission/capture"
	"chargehand/commission/finding"
	"chargehand/commission/signal"
	"chargehand/commission/site"
)

// fault is one thing wrong with a plant: which cause must come first, and how.
type fault struct {
	name  string
	apply func(p *plant) bool // false where the site has nothing of the kind
}

var chargeFaults = []fault{
	{"resistor-open", func(p *plant) bool { p.rp = 1e9; return true }},
	{"resistor-high", func(p *plant) bool { p.rp *= 1.25 + 0.8*p.random.Float64(); return true }},
	{"resistor-low", func(p *plant) bool { p.rp *= 0.45 + 0.35*p.random.Float64(); return true }},
	{"resistor-drifts-hot", func(p *plant) bool {
		warms := 0.5 * (p.c + p.cFilter) * p.emf * p.emf / p.thermal // K, by one charge
		p.drift = (0.25 + 0.25*p.random.Float64()) / warms
		return true
	}},
	{"bank-missing", func(p *plant) bool { p.c *= 0.35 + 0.2*p.random.Float64(); return true }},
	{"bank-added", func(p *plant) bool { p.c *= 1.6 + 0.6*p.random.Float64(); return true }},
	{"load-left-on", func(p *plant) bool { p.load = (0.06 + 0.2*p.random.Float64()) / p.rp; return true }},
	{"auxiliary-stall", func(p *plant) bool {
		if p.random.IntN(2) == 0 { // settles where it and the resistor balance
			if p.auxiliary == 0 {
				p.vOn, p.vOff = 0.45*p.emf, 0.35*p.emf
			}
			p.auxiliary = 0.1 * 0.9 * p.emf * p.emf / p.rp
			return true
		}
		p.vOn, p.vOff = 0.5*p.emf, 0.4*p.emf
		p.auxiliary = 0.35 * p.emf * p.emf / p.rp
		return true
	}},
	{"bus-shorted", func(p *plant) bool { p.short = 50; return true }},
	{"bus-shorted-late", func(p *plant) bool { p.short, p.shortAt = 50, (0.3+0.4*p.random.Float64())*p.emf; return true }},
	{"bypass-welded", func(p *plant) bool { p.bypassWelded = true; return true }},
	{"bypass-early", func(p *plant) bool { p.early = (0.2 + 0.4*p.random.Float64()) * p.emf; return true }},
	{"bypass-never", func(p *plant) bool { p.bypassDead = true; return true }},
	{"bypass-drops-out", func(p *plant) bool { p.bypassDropsAfter = 0.8; return true }},
	{"precharge-welded", func(p *plant) bool { p.prechargeWelded = true; return true }},
	{"bus-live", func(p *plant) bool {
		p.live = float64(p.site.Bus.Nominal.Nominal) * (0.97 + 0.06*p.random.Float64())
		return true
	}},
	{"bus-still-charged", func(p *plant) bool { p.v0 = (0.2 + 0.5*p.random.Float64()) * p.emf; return true }},
	{"load-returns-early", func(p *plant) bool {
		p.lateAt, p.lateLoad = 0.7*p.emf, 0.15*p.emf*p.emf/4/p.rp*(1+p.random.Float64())
		return true
	}},
	{"fuse-open", func(p *plant) bool { p.fuseOpen = true; return true }},
	{"source-reversed", func(p *plant) bool { p.reversed = true; return true }},
	{"source-opens", func(p *plant) bool { p.sourceOpensAt = (0.5 + p.random.Float64()) * p.rp * p.c; return true }},
	{"choke-open", func(p *plant) bool { p.phaseOpen = 1 + p.random.IntN(3); return p.site.Converter.Phases != 2 }},
	{"lower-switch-shorted", func(p *plant) bool { p.lowerShorted = 1 + p.random.IntN(3); return p.site.Converter.Phases != 2 }},
	{"upper-switch-shorted", func(p *plant) bool { p.upperShorted = 1 + p.random.IntN(3); return p.site.Converter.Phases != 2 }},
	{"choke-unequal", func(p *plant) bool { p.unequal = 0.5; return p.site.Converter.Phases != 2 }},
	{"source-low", func(p *plant) bool {
		p.emf = float64(p.site.Source.LowestRest()) * (0.8 + 0.12*p.random.Float64())
		return true
	}},
	{"source-soft", func(p *plant) bool { p.ri *= 6 + 6*p.random.Float64(); return p.cSource == 0 }},
	{"earth-fault", func(p *plant) bool { p.insulation = 2e4; return true }},
	{"contact-report-false", func(p *plant) bool { p.reported = 1 - 2*p.random.IntN(2); return true }},
}

// spoiled changes one signal's values on their way.
func spoiled(names []signal.Name, change func(v float64) float64) func(p *plant) bool {
	return func(p *plant) bool {
		p.spoil = func(c *capture.Capture, _ *rand.Rand) {
			for i, ch := range c.Channels {
				if !slices.Contains(names, ch.Name) {
					continue
				}
				for k := range c.Samples {
					c.Samples[k].Values[i] = encoded(ch, change(c.Samples[k].Values[i].V))
				}
			}
		}
		return true
	}
}

var voltages = []signal.Name{signal.BusVoltage, signal.SourceVoltage, signal.StarPointVoltage}
var currents = []signal.Name{signal.SourceCurrent, signal.PhaseCurrent1, signal.PhaseCurrent2, signal.PhaseCurrent3, signal.Power}

var readingFaults = []fault{
	{"scale-tenfold", spoiled(voltages, func(v float64) float64 { return v / 10 })},
	{"scale-tenfold ", spoiled(voltages[:1], func(v float64) float64 { return v / 10 })},
	{"current-reversed", spoiled(currents, func(v float64) float64 { return -v })},
	{"missing-code-read", spoiled(currents[:1], func(float64) float64 { return 3276.7 })},
	{"sign-unsigned", func(p *plant) bool {
		p.currentOffset = -0.15 // about zero there is nothing negative to see otherwise
		return spoiled(currents[:4], func(v float64) float64 {
			if v < 0 {
				return 3276.8 + v
			}
			return v
		})(p)
	}},
	{"sensor-gain", func(p *plant) bool { p.busGain *= 1.04 + 0.03*p.random.Float64(); return true }},
	{"sensor-offset", func(p *plant) bool { p.busOffset += 25 + 15*p.random.Float64(); return true }},
	{"readings-slow", func(p *plant) bool { p.refresh = 0.7 + 0.3*p.random.Float64(); return true }},
	{"readings-frozen", func(p *plant) bool {
		at := (0.4 + 0.8*p.random.Float64()) * (p.rp + p.ri) * (p.c + p.cFilter)
		p.spoil = func(c *capture.Capture, _ *rand.Rand) {
			var held *capture.Value
			for k := range c.Samples {
				if c.Samples[k].At.Seconds() > at {
					if held == nil {
						held = &c.Samples[k].Values[0]
					}
					c.Samples[k].Values[0] = *held
				}
			}
		}
		return true
	}},
	{"gateway-repeats-old", func(p *plant) bool {
		p.spoil = func(c *capture.Capture, _ *rand.Rand) {
			for k := 1; k < len(c.Samples); k++ {
				if t := c.Samples[k].At.Seconds(); t > 0.8 && math.Mod(t, 3) > 0.8 && math.Mod(t, 3) < 2 {
					c.Samples[k].Values = c.Samples[k-1].Values
				}
			}
		}
		return true
	}},
	{"link-drops", func(p *plant) bool {
		p.spoil = func(c *capture.Capture, _ *rand.Rand) {
			kept := c.Samples[:0:0]
			for _, s := range c.Samples {
				if t := s.At.Seconds(); math.Mod(t+3, 3) < 2.3 {
					kept = append(kept, s)
				}
			}
			c.Samples = kept
		}
		return true
	}},
	{"address-shifted", func(p *plant) bool {
		by := 1 - 2*p.random.IntN(2)
		p.spoil = func(c *capture.Capture, _ *rand.Rand) {
			for k := range c.Samples {
				old := c.Samples[k].Values
				shifted := make([]capture.Value, len(old))
				for i, ch := range c.Channels {
					if from := i - by; from >= 0 && from < len(old) && !ch.Name.IsState() {
						shifted[i] = encoded(ch, float64(int16(old[from].Raw[len(old[from].Raw)-1]))*ch.Scale)
					} else {
						shifted[i] = encoded(ch, 0)
					}
				}
				c.Samples[k].Values = shifted
			}
		}
		return true
	}},
}

// blindFaults replace those that a record of voltage alone can only see beyond the tolerances of R and C together.
var blindFaults = map[string]func(p *plant) bool{
	"resistor-high": func(p *plant) bool { p.rp *= 1.7 + 0.8*p.random.Float64(); return true },
	"resistor-low":  func(p *plant) bool { p.rp *= 0.35 + 0.2*p.random.Float64(); return true },
	"bank-missing":  func(p *plant) bool { p.c *= 0.3 + 0.2*p.random.Float64(); return true },
	"bank-added":    func(p *plant) bool { p.c *= 1.8 + 0.6*p.random.Float64(); return true },
}

// tally counts how a fault was answered.
type tally struct{ right, wrong, silent, all int }

// leads tells whether the cause comes first, or stands in the group of equal score that comes first.
func leads(causes []finding.Cause, want string) bool {
	for _, c := range causes {
		if c.Score < causes[0].Score {
			return false
		}
		if c.ID == want {
			return true
		}
	}
	return false
}

func causesOf(findings []finding.Finding) []finding.Cause {
	var all []finding.Cause
	for _, f := range findings {
		all = append(all, f.Cause...)
	}
	return ranked(all)
}

// seeds of the development set are 1…50; a short run takes a few of them on each site. CHARGEHAND_EVALUATION=develop takes
// all fifty, =report the seeds 1001…1050 that nothing was developed on.
func seeds() (from, count int) {
	switch os.Getenv("CHARGEHAND_EVALUATION") {
	case "develop":
		return 1, 50
	case "report":
		return 1001, 50
	}
	return 1, 4
}

func evaluate(t *testing.T, faults []fault, sites []site.Site, judge func(*plant) []finding.Finding) {
	from, count := seeds()
	results := map[string]*tally{}
	confusion := map[string]map[string]int{}
	var all tally
	for _, f := range faults {
		results[f.name], confusion[f.name] = &tally{}, map[string]int{}
		for k := range count {
			s := sites[(from+k)%len(sites)]
			if count < 10 {
				s = sites[(from+k*3)%len(sites)]
			}
			p := healthy(s, uint64(from+k))
			if !f.apply(p) {
				continue
			}
			causes := causesOf(judge(p))
			r := results[f.name]
			r.all++
			switch {
			case len(causes) == 0:
				r.silent++
				confusion[f.name]["silent"]++
				if os.Getenv("CHARGEHAND_EVALUATION_SHOW") == f.name {
					t.Logf("seed %d on %s silent: %+v", from+k, s.Reference, judge(p))
				}
			case leads(causes, strings.TrimSpace(f.name)):
				r.right++
			default:
				r.wrong++
				confusion[f.name][causes[0].ID]++
				if os.Getenv("CHARGEHAND_EVALUATION_SHOW") == f.name {
					t.Logf("seed %d on %s: %+v", from+k, s.Reference, causes)
				}
			}
		}
		r := results[f.name]
		all.right, all.wrong, all.silent, all.all = all.right+r.right, all.wrong+r.wrong, all.silent+r.silent, all.all+r.all
	}
	var table strings.Builder
	for _, f := range faults {
		r := results[f.name]
		fmt.Fprintf(&table, "%-22s right %3d of %3d  wrong %2d  silent %2d  %s\n", f.name, r.right, r.all, r.wrong, r.silent, words(confusion[f.name]))
		least := 0.85
		if count < 10 { // of four seeds one may go wrong: more than that is no chance
			least = 0.75
		}
		if float64(r.right) < least*float64(r.all) {
			t.Errorf("%s: right cause first in %d of %d, want at least %.0f %%", f.name, r.right, r.all, 100*least)
		}
	}
	share := float64(all.right) / float64(all.all)
	fmt.Fprintf(&table, "all: right %.1f %%, wrong %d, silent %d of %d, seeds %d…%d\n", 100*share, all.wrong, all.silent, all.all, from, from+count-1)
	t.Log("\n" + table.String())
	if share < 0.95 {
		t.Errorf("right cause first in %.1f %%, want at least 95 %%", 100*share)
	}
}

func words(count map[string]int) string {
	var names []string
	for n := range count {
		names = append(names, n)
	}
	sort.Strings(names)
	for i, n := range names {
		names[i] = fmt.Sprintf("%s×%d", n, count[n])
	}
	return strings.Join(names, " ")
}

func TestCausesOfCharges(t *testing.T) {
	evaluate(t, chargeFaults, tenSites(t), func(p *plant) []finding.Finding { return Precharge(p.site, p.charge()) })
}

// Without any current the causes that need one are named in groups.
func TestCausesOfChargesWithoutCurrent(t *testing.T) {
	faults := slices.Clone(chargeFaults[:21])
	for i, f := range faults {
		if apply, ok := blindFaults[f.name]; ok {
			faults[i].apply = apply
		}
	}
	// A resistance that grows with its heat bends the curve too little to be told from the voltage in every case: about two in
	// three are found, the rest stay silent.
	faults = slices.DeleteFunc(faults, func(f fault) bool { return f.name == "resistor-drifts-hot" })
	evaluate(t, faults, tenSites(t), func(p *plant) []finding.Finding {
		for _, n := range []signal.Name{signal.SourceCurrent, signal.PhaseCurrent1, signal.PhaseCurrent2, signal.PhaseCurrent3} {
			p.lacking[n] = true
		}
		return Precharge(p.site, p.charge())
	})
}

func TestCausesInTheReadings(t *testing.T) {
	evaluate(t, readingFaults, tenSites(t), func(p *plant) []finding.Finding { return Precharge(p.site, p.charge()) })
}

func TestHealthyChargesWithoutCurrentAreSilent(t *testing.T) {
	silentRuns(t, func(p *plant) {
		for _, n := range currents[:4] {
			p.lacking[n] = true
		}
	})
}

func TestHealthyChargesAreSilent(t *testing.T) { silentRuns(t, func(*plant) {}) }

func silentRuns(t *testing.T, lessen func(*plant)) {
	sites := tenSites(t)
	runs := 40
	if _, count := seeds(); count > 10 {
		runs = 1000
	}
	failed := map[string]int{}
	for k := range runs {
		p := healthy(sites[k%len(sites)], uint64(5000+k))
		lessen(p)
		for _, f := range Precharge(p.site, p.charge()) {
			if len(f.Cause) > 0 || f.Verdict == finding.Fail {
				t.Errorf("healthy run %d on %s: %s %s, cause %v, %q", k, p.site.Reference, f.ID, f.Verdict, f.Cause, f.Because)
			}
			failed[string(f.ID)+" "+string(f.Verdict)]++
			if os.Getenv("CHARGEHAND_EVALUATION_SHOW") == string(f.Verdict) {
				t.Logf("%s %s %q", p.site.Reference, f.ID, f.Because)
			}
		}
	}
	t.Log(words(failed))
}
