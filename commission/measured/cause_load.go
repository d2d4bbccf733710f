package measured

import (
	"fmt"
	"math"

	"chargehand/commission/finding"
	"chargehand/commission/fit"
)

// loaded is one way in which something may hang on the bus during a charge.
type loaded struct {
	ssr   float64
	from  float64 // V of the bus from which it draws, 0 from the start
	power float64 // W of a constant power, 0 for a resistance
	tau   float64 // R·C
}

// kindOfLoad tells a resistance that was there from the start from a constant power that came on at some voltage: the curve
// before that voltage is the unloaded one (formulas J: do not use the time constant alone).
func (f *charge) kindOfLoad(evidence []string) []finding.Cause {
	resistive := f.asResistance()
	late, at := f.asLatePower(), 0.0
	if late.ssr < 0.65*resistive.ssr {
		at = late.from
	}
	if at < 0.38*f.scale() { // lower down a power and a resistance make the same curve
		return []finding.Cause{because("load-left-on", 0.93, evidence...)}
	}
	evidence = append(evidence, fmt.Sprintf("until %s the curve is that of an unloaded bus, from there about %s are drawn", number(at, "V"), number(late.power, "W")))
	switch {
	case f.p > 0 && math.Abs(at-f.vOn) < 0.06*f.scale():
		return []finding.Cause{because("auxiliary-stall", 0.9, append(evidence, fmt.Sprintf("the auxiliary supply starts at %s", number(f.vOn, "V")))...), because("load-returns-early", 0.5, evidence...)}
	case f.p > 0:
		return []finding.Cause{because("load-returns-early", 0.9, evidence...), because("auxiliary-stall", 0.4, evidence...)}
	}
	return together(0.8, "what starts at that voltage: an auxiliary supply that the site file lacks, or a load with its own release", evidence, "load-returns-early", "auxiliary-stall")
}

// asResistance fits R·C and a resistance across the bus.
func (f *charge) asResistance() loaded {
	return f.asLoad([]float64{math.Log(f.unloadedTau()), math.Max(0.01, f.emf/f.fit.Final-1), 0}, func(x []float64, k *curve) {
		k.r, k.c = 1, math.Exp(x[0])
		k.g, k.p = x[1], 0
	})
}

// asLatePower fits R·C and a constant power from a voltage on, which is searched.
func (f *charge) asLatePower() loaded {
	best := loaded{ssr: math.Inf(1)}
	final := f.fit.Final
	power := final * (f.emf - final)
	try := func(at float64) {
		if at < 0.1*f.scale() || at > 0.98*final {
			return
		}
		l := f.asLoad([]float64{math.Log(f.tau().nominal), power, 0}, func(x []float64, k *curve) {
			k.r, k.c = 1, math.Exp(x[0])
			k.g, k.p, k.vOn, k.vOff = f.r.nominal/f.rb.nominal, math.Max(x[1], 0), at, at/2
		})
		if l.ssr < best.ssr {
			l.from = at
			best = l
		}
	}
	for step := 3; step <= 18; step++ {
		try(float64(step) * 0.05 * f.scale())
	}
	middle := best.from
	for step := -4; step <= 4; step++ {
		try(middle + float64(step)*0.01*f.scale())
	}
	best.power /= f.r.nominal
	return best
}

// asLoad fits the curve whose unknowns set applies: ln R·C, the load, and a shift of the start in volts.
func (f *charge) asLoad(x0 []float64, set func(x []float64, k *curve)) loaded {
	rows := f.thinned(60)
	t, v := make([]float64, len(rows)), make([]float64, len(rows))
	for i, r := range rows {
		t[i], v[i] = r.t-rows[0].t, r.bus
	}
	s := fit.Marquardt(x0, len(t), func(x, r []float64) bool {
		if math.Abs(x[0]-x0[0]) > 1 || x[1] < -0.5*math.Abs(x0[1])-0.05 || x[1] > 100*math.Abs(x0[1])+1 {
			return false
		}
		k := curve{emf: f.emf, v0: v[0] + x[2]}
		set(x, &k)
		for i, u := range k.at(t) {
			r[i] = u - v[i]
		}
		return true
	})
	return loaded{ssr: s.SSR, power: s.X[1], tau: math.Exp(s.X[0])}
}

func (f *charge) thinned(most int) []row {
	step := 1 + len(f.rows)/most
	var rows []row
	for i := 0; i < len(f.rows); i += step {
		rows = append(rows, f.rows[i])
	}
	return rows
}

// aboveSource: the bus settles above the source, which no charge through a resistor does. One of the two signals is wrong; a
// reading on the dead bus tells gain from offset.
func (f *charge) aboveSource(drop measurement) []finding.Cause {
	high := -drop.value
	evidence := []string{fmt.Sprintf("bus settles %s above the source, through a resistor it cannot", number(high, "V")), fmt.Sprintf("dead bus read %s", number(f.v0, "V"))}
	before := f.bus.between(math.Inf(-1), 0)
	errors := f.busError + f.sourceError
	switch {
	case before.ok && f.v0 > 0.6*high-0.3*errors && f.v0 > errors/2:
		return []finding.Cause{because("sensor-offset", 0.95, evidence...), because("sensor-gain", 0.4, evidence...)}
	case before.ok && f.v0 < 0.35*high:
		return []finding.Cause{because("sensor-gain", 0.95, evidence...), because("sensor-offset", 0.4, evidence...)}
	}
	return together(0.95, "both voltages against an instrument at two levels: same ratio is a gain, same difference an offset", evidence, "sensor-gain", "sensor-offset")
}

// heatedByShape tells a resistance that grows with the heat in it from the voltage alone: R·(1 + γ·h), h the part of the
// charge's heat that has gone in, 1 − ((E−v)⁄E)². The settled voltage is free, so that a load has its own explanation.
func (f *charge) heatedByShape() []finding.Cause {
	if f.fit.Covered < 2.5 || !(f.emf > 0) {
		return nil
	}
	rows := f.thinned(80)
	t, v := make([]float64, len(rows)), make([]float64, len(rows))
	for i, r := range rows {
		t[i], v[i] = r.t-rows[0].t, r.bus
	}
	fitted := func(growing bool) fit.Solution {
		x0 := []float64{math.Log(f.fit.Tau), 1, 0, 0}
		if !growing {
			x0 = x0[:3]
		}
		return fit.Marquardt(x0, len(t), func(x, r []float64) bool {
			gamma := 0.0
			if growing {
				gamma = x[3]
			}
			if math.Abs(x[0]-x0[0]) > 1.5 || gamma < -0.8 || gamma > 5 || math.Abs(x[1]-1) > 0.3 {
				return false
			}
			heated(math.Exp(x[0]), f.emf*x[1], gamma, v[0]+x[2], f.r.nominal/f.rb.nominal, f.p*f.r.nominal, f.vOn, t, r)
			for i := range r {
				r[i] -= v[i]
			}
			return true
		})
	}
	with, without := fitted(true), fitted(false)
	if !with.Converged || with.X[3] < 0.12 || with.X[3] < 9*with.SE[3] || with.SSR > 0.75*without.SSR {
		return nil
	}
	if drop := f.emf - f.emf*with.X[1]; math.Abs(drop) > f.busError+f.sourceError+0.01*f.emf {
		return nil
	}
	return []finding.Cause{because("resistor-drifts-hot", 0.85, fmt.Sprintf("the curve slows as if the resistance grew by %.0f ± %.0f %% with its heat", 100*with.X[3], 200*with.SE[3])), because("resistor-high", 0.4)}
}

// heated integrates R·C·(1 + γ·h)·v' = E − v less what bleeder and auxiliary supply take.
func heated(tau, emf, gamma, v0, bleeder, power, vOn float64, t, out []float64) {
	v, now := v0, 0.0
	slope := func(v float64) float64 {
		part := (emf - v) / emf
		grown := 1 + gamma*(1-part*part)
		load := bleeder * v
		if power > 0 && v > vOn {
			load += power / v
		}
		return ((emf-v)/grown - load) / tau
	}
	for i, at := range t {
		for now < at {
			h := math.Min(tau/40, at-now)
			a := slope(v)
			v += h * slope(v+a*h/2)
			now += h
		}
		out[i] = v
	}
}
