package droop

import (
	"fmt"
	"math"
	"strings"

	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/signal"
	"chargehand/commission/site"
)

// Registers tells how a register map writes a value: the raw number to key in. It is false for a signal the map lacks.
type Registers interface {
	Raw(name signal.Name, value float64) (raw int64, ok bool)
}

const (
	circuitTheory = "circuit theory, piecewise quadratic balance; constant-power loads by their incremental resistance"
	ownDerivation = "own derivation, checked against all corners"
)

// Findings are the findings of the droop and of the cables, in the order of the catalogue. Without registers (nil) the
// register numbers stay undecided.
func Findings(s site.Site, r Registers) []finding.Finding {
	p := plan(s)
	all := []finding.Finding{adviceFinding(s, p), busRangeFinding(s), sharingFinding(s)}
	all = append(all, lostInfeeds(s)...)
	all = append(all, regenerationFinding(s), stabilityFinding(s))
	all = append(all, instrumentFindings(s)...)
	all = append(all, registers(s, r))
	return append(all, cables(s)...)
}

// planned is what the findings of one site share: its sources, the errors of their setpoints, its loads.
type planned struct {
	sources []Source
	errors  []quantity.Voltage
	missing finding.Missing
}

func plan(s site.Site) planned {
	sources, errors, missing := Sources(s)
	return planned{sources, errors, missing}
}

func loadOf(s site.Site) site.Load {
	if s.Load == nil {
		return site.Load{}
	}
	return *s.Load
}

// upperLimit is where the chopper acts, or the over-voltage trip where there is no chopper.
func upperLimit(s site.Site) (limit float64, name string, missing finding.Missing) {
	if c := s.Bus.Chopper; c != nil {
		missing.Need("bus.chopper.on", c.On.IsGiven())
		return float64(c.On.Nominal), "bus.chopper.on", missing
	}
	missing.Need("bus.over_voltage_trip", s.Bus.OverVoltageTrip.IsGiven())
	return float64(s.Bus.OverVoltageTrip.Nominal), "bus.over_voltage_trip", missing
}

// thresholds are the limits that the bus must stay within.
func thresholds(s site.Site) (finding.Limit, finding.Missing) {
	upper, _, missing := upperLimit(s)
	missing.Need("bus.under_voltage_trip", s.Bus.UnderVoltageTrip.IsGiven())
	return finding.Between(float64(s.Bus.UnderVoltageTrip.Nominal), upper), missing
}

// why puts the two ways of having no operating point into words.
func (s Status) why(what string) string {
	if s == Runaway {
		return what + ": nobody takes what is fed in, the bus runs upwards"
	}
	return what + ": the infeeds cannot carry the load, the bus collapses"
}

// workings writes the balance of the nominal operating point of some sources as steps that can be redone: the voltage from
// the sums over the free infeeds and those at a limit.
func workings(w *finding.Working, sources []Source, names []string, l Load, unit string) float64 {
	p := Solve(sources, l)
	if p.Status != Found {
		return math.NaN()
	}
	var conductance, amperes []string
	g, a := 0.0, 0.0
	for k, s := range sources {
		if s.Offline {
			continue
		}
		n := k + 1
		if p.Limit[k] != Free {
			name := fmt.Sprintf("I_%d", n)
			w.Given(name, "current of "+names[k]+", at its limit", "A", float64(p.Current[k]))
			amperes = append(amperes, name)
			a += float64(p.Current[k])
			continue
		}
		v0, r := fmt.Sprintf("V0_%d", n), fmt.Sprintf("r_%d", n)
		w.Given(v0, "no-load setpoint of "+names[k], "V", float64(s.NoLoad))
		w.Given(r, "droop and cable of "+names[k], "V/A", s.slope())
		conductance, amperes = append(conductance, "1 / "+r), append(amperes, v0+" / "+r)
		g += 1 / s.slope()
		a += float64(s.NoLoad) / s.slope()
	}
	w.Given("P", "constant power of the load, negative for regeneration", unit, float64(l.Power))
	w.Step("G", sumOf(conductance), "A/V", g)
	w.Step("A", sumOf(amperes), "A", a)
	switch {
	case g == 0 && a == 0:
		w.Given("V0_highest", "highest no-load setpoint: nothing flows, and that infeed holds the bus", "V", float64(p.Bus))
		w.Step("V", "V0_highest", "V", float64(p.Bus))
	case g == 0:
		w.Step("V", "P / A", "V", float64(p.Bus))
	default:
		w.Step("V", "(A + sqrt(A^2 - 4 * G * P)) / (2 * G)", "V", float64(p.Bus))
	}
	return float64(p.Bus)
}

func sumOf(terms []string) string {
	if len(terms) == 0 {
		return "0"
	}
	return strings.Join(terms, " + ")
}

// spread notes the corner that governs and what each infeed's setpoint error moves by itself, the others exact.
func (p planned) spread(w *finding.Working, s site.Site, governs string, f func(sources []Source) float64) {
	keys, moves := make([]string, len(p.sources)), make([]float64, len(p.sources))
	work := append([]Source(nil), p.sources...)
	for k := range work {
		work[k].NoLoad = p.sources[k].NoLoad - p.errors[k]
		low := f(work)
		work[k].NoLoad = p.sources[k].NoLoad + p.errors[k]
		keys[k], moves[k] = "infeed.setpoint_error of "+s.Infeeds[k].Name, math.Abs(f(work)-low)
		work[k].NoLoad = p.sources[k].NoLoad
	}
	w.Spread(governs, keys, moves)
}

// busAt is the bus voltage of sources at a load, for [planned.spread].
func busAt(l Load, lost int) func(sources []Source) float64 {
	return func(sources []Source) float64 {
		if lost >= 0 {
			sources = append([]Source(nil), sources...)
			sources[lost].Offline = true
		}
		v, _ := balance(sources, l)
		return v
	}
}

func names(s site.Site) []string {
	all := make([]string, len(s.Infeeds))
	for k, i := range s.Infeeds {
		all[k] = i.Name
	}
	return all
}

const errorsGovern = "least with every setpoint at its error below, greatest with every one above; between two infeeds the extremes lie with one against all others"
