package measured

import (
	"math"
	"time"

	"chargehand/commission/capture"
	"chargehand/commission/fit"
	"chargehand/commission/quantity"
	"chargehand/commission/signal"
)

// Step is one settled operating point of the converter on its droop line.
type Step struct {
	From, To time.Duration  // since the capture's T0; zero for a step that was read by hand
	Load     quantity.Power // of the whole bus, where it is known; 0 where not

	Current, CurrentU quantity.Current // of the converter, bus side, positive to the bus; U is the standard uncertainty
	Voltage, VoltageU quantity.Voltage // of the bus
	Source            quantity.Voltage // of the source, 0 where it was not read
	SourceCurrent     quantity.Current
	Swing             quantity.Voltage            // half the span of the bus voltage within the step, its noise included
	Others            map[string]quantity.Current // of the other infeeds by name, where they were read
	Limited           bool                        // at a current limit, or the bus at the source: no point of the droop line
}

// Steps finds the settled stretches of a droop capture: between two changes of the current, its first third left out, at
// least six samples long.
func Steps(c capture.Capture) []Step {
	current, bus := traceOf(c, signal.BusCurrent), traceOf(c, signal.BusVoltage)
	source, sourceCurrent, power := traceOf(c, signal.SourceVoltage), traceOf(c, signal.SourceCurrent), traceOf(c, signal.Power)
	if !current.ok {
		current = currentFromPower(power, bus)
	}
	if !current.ok || !bus.ok || unusable(c, signal.BusVoltage) != "" {
		return nil
	}
	limit := math.Max(traceOf(c, signal.DischargeLimit).at(math.Inf(1)), 0)
	t, v := fit.OncePerRefresh(current.t, current.v, fit.Refresh(current.t, current.v, current.resolution))
	var steps []Step
	for _, part := range atLimitSplit(plateaus(t, v, current.resolution), bus) {
		from, to := part[0]+(part[1]-part[0])/3, part[1]
		i, u := current.between(from, to), bus.between(from, to)
		if len(i.t) < 6 || len(u.t) < 6 {
			continue
		}
		s := Step{From: since(from), To: since(to)}
		meanI, meanU := fit.Average(i.v), fit.Average(u.v)
		s.Current, s.CurrentU = quantity.Current(meanI.Mean), quantity.Current(math.Max(meanI.MeanSE, i.resolution/math.Sqrt(12)/2))
		s.Voltage, s.VoltageU = quantity.Voltage(meanU.Mean), quantity.Voltage(math.Max(meanU.MeanSE, u.resolution/math.Sqrt(12)/2))
		s.Swing = quantity.Voltage(u.span() / 2)
		if p := source.between(from, to); p.ok {
			s.Source = quantity.Voltage(fit.Average(p.v).Mean)
		}
		if p := sourceCurrent.between(from, to); p.ok {
			s.SourceCurrent = quantity.Current(fit.Average(p.v).Mean)
		}
		s.Limited = limit > 0 && math.Abs(float64(s.SourceCurrent)) > 0.985*limit ||
			s.Source > 0 && s.Voltage < s.Source
		steps = append(steps, s)
	}
	return steps
}

func since(seconds float64) time.Duration { return time.Duration(seconds * float64(time.Second)) }

func currentFromPower(power, bus trace) trace {
	if !power.ok || !bus.ok {
		return trace{}
	}
	tr := trace{ok: true, t: power.t, resolution: power.resolution / math.Max(1, bus.greatest())}
	for i, p := range power.v {
		tr.v = append(tr.v, p/bus.at(power.t[i]))
	}
	return tr
}

// atLimitSplit splits a stretch of one current again where the bus voltage falls in steps: a current limit hides the steps
// of the load. A bus that hunts falls apart into short pieces, which do not count.
func atLimitSplit(parts [][2]float64, bus trace) [][2]float64 {
	const shortest = 0.8 // s
	var all [][2]float64
	for _, part := range parts {
		within := bus.between(part[0], part[1])
		t, v := fit.OncePerRefresh(within.t, within.v, fit.Refresh(within.t, within.v, within.resolution))
		finer := plateaus(t, v, math.Max(bus.resolution, 0.0001*bus.greatest()))
		sound := len(finer) > 1
		for _, f := range finer {
			sound = sound && f[1]-f[0] > shortest
		}
		if sound {
			all = append(all, finer...)
		} else {
			all = append(all, part)
		}
	}
	return all
}

// plateaus splits a record where the mean of the next 0.6 s differs from that of the last by more than the scatter within
// both explains. A bus that hunts swings several times in that time and is not split for it.
func plateaus(t, v []float64, resolution float64) [][2]float64 {
	if len(t) < 8 {
		return nil
	}
	width := int(math.Round(0.6 * float64(len(t)-1) / math.Max(t[len(t)-1]-t[0], 1e-9)))
	width = min(max(width, 4), 40, len(t)/2)
	span := trace{t: t, v: v, ok: true}.span()
	least := math.Max(8*resolution, 0.03*span)
	var parts [][2]float64
	start := t[0]
	for i := width; i+width <= len(t); i++ {
		a, b := fit.Average(v[i-width:i]), fit.Average(v[i:i+width])
		if math.Abs(a.Mean-b.Mean) < least+2*(a.SD+b.SD)/math.Sqrt(float64(width)) {
			continue
		}
		// the edge is where the difference is greatest
		best, at := 0.0, i
		for k := i; k < min(i+width+1, len(t)-width); k++ {
			if d := math.Abs(fit.Average(v[k-width:k]).Mean - fit.Average(v[k:k+width]).Mean); d > best {
				best, at = d, k
			}
		}
		if t[at-1] > start {
			parts = append(parts, [2]float64{start, t[at-1]})
		}
		start = t[at]
		i = at + width - 1
	}
	return append(parts, [2]float64{start, t[len(t)-1] + 1e-9})
}
