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

// enumerated is the greatest number of infeeds whose corners are enumerated where the extreme may lie between the ends.
const enumerated = 6

// Share gives the sharing with each setpoint at either end of its error, with four corners per infeed instead of 2^N. The
// current of an infeed rises with its own setpoint; the others act on it through the bus voltage alone, which rises with
// each of them and so lies between the corners with all others low and all others high. Between those the deviation turns
// at most where the infeed meets a limit or where it falls as fast as its share. Only where such a place lies between are
// the other corners tried, up to six infeeds; with more of them the corners lie densely and the place itself stands for
// the nearest. Sources that are offline take no part.
func Share(sources []Source, errors []quantity.Voltage, load Load) Sharing {
	share := Sharing{Status: Found,
		Deviation: make([]quantity.Spread[quantity.Ratio], len(sources)), Current: make([]quantity.Spread[quantity.Current], len(sources))}
	work := make([]Source, 0, len(sources))
	total := ratedSum(sources)
	for k, s := range sources {
		if s.Offline {
			continue
		}
		one := sharer{s, float64(s.Rated / total), load}
		v, status := balance(sources, load)
		if status != Found {
			share.Status = status
			return share
		}
		share.Current[k] = quantity.Exactly(quantity.Current(s.current(v)))
		share.Deviation[k] = quantity.Exactly(quantity.Ratio(one.deviation(v)))
		for _, own := range []quantity.Voltage{-1, +1} {
			one.source.NoLoad = s.NoLoad + own*errors[k]
			corner := func(others quantity.Voltage) float64 {
				work = shifted(work, sources, errors, others)
				work[k].NoLoad = one.source.NoLoad
				v, status := balance(work, load)
				if status != Found {
					share.Status = status
				}
				return v
			}
			places := []float64{corner(-1), corner(+1)}
			if share.Status != Found {
				return share
			}
			if turns := one.turns(places[0], places[1]); len(turns) > 0 {
				if len(sources) <= enumerated {
					turns = everyCorner(work, sources, errors, load, k)
				}
				places = append(places, turns...)
			}
			for _, v := range places {
				widen(&share.Current[k], quantity.Current(one.source.current(v)))
				widen(&share.Deviation[k], quantity.Ratio(one.deviation(v)))
			}
		}
	}
	return share
}

// everyCorner are the bus voltages with every other setpoint at either end; that of infeed k stays as it is in work.
func everyCorner(work, sources []Source, errors []quantity.Voltage, load Load, k int) []float64 {
	var all []float64
	for pattern := range 1 << len(sources) {
		if pattern>>k&1 == 1 {
			continue // its own place in the pattern is not used
		}
		for j := range work {
			if j != k {
				work[j].NoLoad = sources[j].NoLoad + errors[j]*quantity.Voltage(2*(pattern>>j&1)-1)
			}
		}
		if v, status := balance(work, load); status == Found {
			all = append(all, v)
		}
	}
	return all
}

// sharer is one infeed beside its share w of the load.
type sharer struct {
	source Source
	weight float64
	load   Load
}

// deviation is (I_k − w·ΣI) ⁄ I_rated at a bus voltage; the currents together are those of the load.
func (s sharer) deviation(bus float64) float64 {
	sum := float64(s.load.Power)/bus + float64(s.load.Current) + bus*s.load.conductance()
	return (s.source.current(bus) - s.weight*sum) / float64(s.source.Rated)
}

// turns are the bus voltages between low and high where the deviation may be extreme: where the infeed meets a limit, and
// where it falls as fast as its share of the load.
func (s sharer) turns(low, high float64) []float64 {
	var all []float64
	v0, r := float64(s.source.NoLoad), s.source.slope()
	for _, v := range []float64{
		v0 - r*float64(s.source.Most), v0 - r*float64(s.source.Least),
		math.Sqrt(s.weight * float64(s.load.Power) / (1/r + s.weight*s.load.conductance())),
	} {
		if v > low && v < high {
			all = append(all, v)
		}
	}
	return all
}

// widen takes a value into a spread.
func widen[Q quantity.Scalar](s *quantity.Spread[Q], v Q) {
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
