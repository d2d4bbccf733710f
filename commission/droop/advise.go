package droop

import (
	"math"

	"chargehand/commission/quantity"
)

// Wish is what the advice has to meet: a common droop voltage at rated current for all infeeds and a no-load setpoint.
type Wish struct {
	Rated             []quantity.Current
	SourceHigh        quantity.Voltage // highest source voltage
	LowerMargin       quantity.Voltage // above it
	LowestBus         quantity.Voltage // lowest permitted bus, −∞ for none
	UpperLimit        quantity.Voltage // chopper or over-voltage trip
	UpperMargin       quantity.Voltage // below it
	SetpointError     quantity.Voltage // e, the largest
	ShareTolerance    quantity.Ratio   // of rating
	Ripple            quantity.Voltage // peak to peak
	LoadFraction      quantity.Ratio   // of rated current, highest steady load
	RegenerationShare quantity.Ratio   // of rated current, highest regeneration
}

// Advice is what meets the wish. Droop voltages are at rated current, cable included.
type Advice struct {
	Least, Greatest     quantity.Voltage // droop voltage that sharing needs, that the window leaves
	Lowest, Highest     quantity.Voltage // V_lo and V_hi: where the bus may stand, errors and ripple taken off
	SetpointLow         quantity.Voltage // setpoint interval at Least
	SetpointHigh        quantity.Voltage
	Droop               []quantity.Droop // per infeed at Least, cable included
	Feasible            bool
	SmallestShareWeight float64 // w_min, the smallest infeed's part of the sum of the ratings
}

// Advise gives the least droop voltage that shares within the tolerance, ΔV_min = 2e·(1 − w_min) ⁄ x, and the room for it:
// V_lo + ΔV·l_load ≤ V_set ≤ V_hi − ΔV·l_regen. The smallest infeed is the worst off. Derived for constant load current
// and equal droop voltage at rated current (formulas G, own derivation checked against enumeration).
func Advise(w Wish) Advice {
	sum, smallest := 0.0, math.Inf(1)
	for _, i := range w.Rated {
		sum += float64(i)
		smallest = math.Min(smallest, float64(i))
	}
	a := Advice{SmallestShareWeight: smallest / sum}
	if len(w.Rated) > 1 { // a single infeed shares with nobody
		a.Least = quantity.Voltage(2 * float64(w.SetpointError) * (1 - a.SmallestShareWeight) / float64(w.ShareTolerance))
	}
	a.Lowest = max(w.SourceHigh+w.LowerMargin, w.LowestBus) + w.SetpointError + w.Ripple/2
	a.Highest = w.UpperLimit - w.UpperMargin - w.SetpointError - w.Ripple/2
	a.Greatest = (a.Highest - a.Lowest) / quantity.Voltage(w.LoadFraction+w.RegenerationShare)
	a.SetpointLow = a.Lowest + a.Least*quantity.Voltage(w.LoadFraction)
	a.SetpointHigh = a.Highest - a.Least*quantity.Voltage(w.RegenerationShare)
	for _, i := range w.Rated {
		a.Droop = append(a.Droop, quantity.Droop(float64(a.Least)/float64(i)))
	}
	a.Feasible = a.Least <= a.Greatest
	return a
}

// GreatestError is the largest setpoint error for which any droop meets the wish: H ⁄ (2(1 − w_min)(l_load + l_regen) ⁄ x + 2)
// with H the room without errors. Negative where even an exact setpoint has none.
func (w Wish) GreatestError() quantity.Voltage {
	exact := w
	exact.SetpointError = 0
	a := Advise(exact)
	room := float64(a.Highest - a.Lowest)
	return quantity.Voltage(room / (2*(1-a.SmallestShareWeight)*float64(w.LoadFraction+w.RegenerationShare)/float64(w.ShareTolerance) + 2))
}

// Percent is a droop in per cent of the nominal bus voltage at the infeed's own rated current on the bus side, as a
// fraction; [quantity.DroopSetting.At] is the other direction. Per cents of different nominal voltages or rated currents
// do not compare.
func Percent(d quantity.Droop, nominal quantity.Voltage, rated quantity.Current) quantity.Ratio {
	return quantity.Ratio(float64(d) * float64(rated) / float64(nominal))
}
