package droop

import (
	"math"

	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

// Sources are the site's infeeds as the bus sees them, exact setpoints, cables at their nominal resistance; beside them the
// error of each setpoint, its tolerance included. Where keys are missing they are named instead.
func Sources(s site.Site) (sources []Source, errors []quantity.Voltage, missing finding.Missing) {
	missing.Need("infeed", len(s.Infeeds) > 0)
	missing.Need("bus.nominal", s.Bus.Nominal.Nominal > 0)
	for _, k := range s.Infeeds {
		missing.Need("infeed.setpoint", k.Setpoint.IsGiven())
		missing.Need("infeed.droop", k.Droop.IsGiven())
		missing.Need("infeed.rated_current", k.RatedCurrent.Nominal > 0)
		missing.Need("infeed.setpoint_error", k.SetpointError.IsGiven())
		cable, lacking := CableResistance(k.Cable)
		missing.Add(lacking...)
		rated := k.RatedCurrent.Nominal
		one := Source{NoLoad: k.Setpoint.Nominal, Droop: k.Droop.At(s.Bus.Nominal.Nominal, rated), Cable: cable.Nominal, Most: rated, Rated: rated}
		if k.Regenerates {
			one.Least = -rated
		}
		sources = append(sources, one)
		tolerance := max(k.Setpoint.High-k.Setpoint.Nominal, k.Setpoint.Nominal-k.Setpoint.Low)
		errors = append(errors, k.SetpointError.Of(k.Setpoint.Nominal)+tolerance)
	}
	if len(missing) > 0 {
		return nil, nil, missing
	}
	return sources, errors, nil
}

// shifted gives the sources with every setpoint moved by sign times its error, written into `into`.
func shifted(into, sources []Source, errors []quantity.Voltage, sign quantity.Voltage) []Source {
	into = append(into[:0], sources...)
	for k := range into {
		into[k].NoLoad += sign * errors[k]
	}
	return into
}

// band is the bus voltage over all setpoint errors. The bus rises with every setpoint, so the two corners with all errors
// of one sign are its ends: no enumeration of 2^N. Any corner without a stable point makes status not Found.
type band struct {
	value  finding.Value
	status Status
}

func bandOf(sources []Source, errors []quantity.Voltage, load Load) band {
	var buffer [16]Source
	work := buffer[:0]
	b := band{status: Found}
	at := func(sign quantity.Voltage) float64 {
		work = shifted(work, sources, errors, sign)
		v, status := balance(work, load)
		if status != Found {
			b.status = status
		}
		return v
	}
	b.value = finding.Value{Low: at(-1), Nominal: at(0), High: at(+1)}
	if b.status != Found {
		b.value = finding.NoValue()
	}
	return b
}

// Sharing is how far each infeed stands from its share by rating, in terms of its own rating, over all setpoint errors.
type Sharing struct {
	Deviation []quantity.Spread[quantity.Ratio] // (I_k − w_k·ΣI) ⁄ I_rated,k, w_k its part of the sum of the ratings
	Current   []quantity.Spread[quantity.Current]
	Status    Status
}

// Share gives the sharing over all setpoint errors with at most four corners per infeed instead of 2^N: the current of an
// infeed rises with its own setpoint and falls with every other one, so its extremes lie where its own error stands
// against all others. At a limit the total current still moves with the others, so both signs of the others are tried
// with either sign of its own. Sources that are offline take no part.
func Share(sources []Source, errors []quantity.Voltage, load Load) Sharing {
	share := Sharing{Status: Found,
		Deviation: make([]quantity.Spread[quantity.Ratio], len(sources)), Current: make([]quantity.Spread[quantity.Current], len(sources))}
	total := 0.0
	for _, s := range sources {
		if !s.Offline {
			total += float64(s.Rated)
		}
	}
	work := make([]Source, 0, len(sources))
	take := func(k int, own, others quantity.Voltage, first bool) {
		work = shifted(work, sources, errors, others)
		work[k].NoLoad = sources[k].NoLoad + own*errors[k]
		v, status := balance(work, load)
		if status != Found {
			share.Status = status
			return
		}
		i, sum := 0.0, 0.0
		for j, s := range work {
			if s.Offline {
				continue
			}
			c := s.current(v)
			sum += c
			if j == k {
				i = c
			}
		}
		deviation := (i - float64(sources[k].Rated)/total*sum) / float64(sources[k].Rated)
		widen(&share.Deviation[k], quantity.Ratio(deviation), first)
		widen(&share.Current[k], quantity.Current(i), first)
	}
	for k, s := range sources {
		if s.Offline {
			continue
		}
		take(k, 0, 0, true)
		for _, own := range []quantity.Voltage{-1, +1} {
			take(k, own, -own, false)
			take(k, own, own, false)
		}
	}
	return share
}

// widen takes a value into a spread; the first one is the nominal.
func widen[Q quantity.Scalar](s *quantity.Spread[Q], v Q, first bool) {
	if first {
		*s = quantity.Exactly(v)
		return
	}
	s.Low, s.High = min(s.Low, v), max(s.High, v)
}

// WorstDeviation is the greatest deviation of any infeed either way: nominal with exact setpoints, high over all corners,
// low a bound that no combination of errors goes below.
func (s Sharing) WorstDeviation() finding.Value {
	var worst finding.Value
	for _, d := range s.Deviation {
		low, high := math.Abs(float64(d.Low)), math.Abs(float64(d.High))
		least := math.Min(low, high)
		if d.Low < 0 && d.High > 0 {
			least = 0
		}
		worst.Low = math.Max(worst.Low, least)
		worst.Nominal = math.Max(worst.Nominal, math.Abs(float64(d.Nominal)))
		worst.High = math.Max(worst.High, math.Max(low, high))
	}
	return worst
}

// LinearDeviation is the sharing deviation of infeed k by the usual estimate, 2e·g_k·(G − g_k) ⁄ G with g = 1 ⁄ r: constant
// load current and no limits. The finding uses the exact corners; this shows where they come from.
func LinearDeviation(sources []Source, errorBound quantity.Voltage, k int) quantity.Current {
	sum := 0.0
	for _, s := range sources {
		if !s.Offline {
			sum += 1 / s.slope()
		}
	}
	g := 1 / sources[k].slope()
	return quantity.Current(2 * float64(errorBound) * g * (sum - g) / sum)
}
