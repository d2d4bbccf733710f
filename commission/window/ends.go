package window

import (
	"math"

	"chargehand/commission/corner"
	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

// HighestTerminal is the terminal voltage of a source that is charged at full current, as a meter may show it at worst:
// rest + current·resistance + error.
func HighestTerminal(rest quantity.Voltage, charging quantity.Current, internal quantity.Resistance, errorBound quantity.Voltage) quantity.Voltage {
	return rest + quantity.Voltage(float64(charging)*float64(internal)) + errorBound
}

// LowestTerminal is the same for discharging at full current: rest − current·resistance − error.
func LowestTerminal(rest quantity.Voltage, discharging quantity.Current, internal quantity.Resistance, errorBound quantity.Voltage) quantity.Voltage {
	return rest - quantity.Voltage(float64(discharging)*float64(internal)) - errorBound
}

// LowestBus is the lowest steady voltage that an infeed holds: setpoint − droop at rated current − regulation − error −
// half the ripple. HighestBus is the same upwards.
func LowestBus(setpoint, droop, regulation, errorBound, ripple quantity.Voltage) quantity.Voltage {
	return setpoint - droop - regulation - errorBound - ripple/2
}

// HighestBus is the highest steady voltage: setpoint + droop at full regeneration + regulation + error + half the ripple.
func HighestBus(setpoint, droop, regulation, errorBound, ripple quantity.Voltage) quantity.Voltage {
	return setpoint + droop + regulation + errorBound + ripple/2
}

// SourceHigh is the highest terminal voltage of the site's source over the tolerance of its internal resistance, or the
// keys that are missing for it.
func SourceHigh(s site.Site) (quantity.Spread[quantity.Voltage], finding.Missing) {
	end, missing := sourceHigh(s)
	return spread(end.values), missing
}

// BusHigh is the highest steady bus voltage over all infeeds, or the keys that are missing for it.
func BusHigh(s site.Site) (quantity.Spread[quantity.Voltage], finding.Missing) {
	end, missing := busEnd(s, true)
	return spread(end.values), missing
}

func spread(v finding.Value) quantity.Spread[quantity.Voltage] {
	return quantity.Spread[quantity.Voltage]{Low: quantity.Voltage(v.Low), Nominal: quantity.Voltage(v.Nominal), High: quantity.Voltage(v.High)}
}

// end is one end of the ladder with what it was made of. A bus end has the infeed that governs it.
type end struct {
	values                                       finding.Value
	rest, current, errorBound                    float64 // of the source, V, A, V
	internal                                     corner.Axis
	infeed                                       site.Infeed
	setpoint, droop, regulation, busError, swing float64 // of the bus, V
}

func sourceHigh(s site.Site) (end, finding.Missing) {
	return sourceEnd(s, s.Source.HighestRest(), s.Source.MaxChargeCurrent, "source.max_charge_current", +1, s.Source.Kind == site.FuelCell)
}

func sourceLow(s site.Site) (end, finding.Missing) {
	return sourceEnd(s, s.Source.LowestRest(), s.Source.MaxDischargeCurrent, "source.max_discharge_current", -1, false)
}

// sourceEnd adds the drop under current in the given sense, but where the limits hold under current already. A fuel cell
// cannot be charged: its missing charge current is 0.
func sourceEnd(s site.Site, rest quantity.Voltage, current quantity.Entered[quantity.Current], key string, sense float64, absentIsZero bool) (end, finding.Missing) {
	var missing finding.Missing
	missing.Need("source.internal_resistance", s.Source.InternalResistance.IsGiven())
	missing.Need("source.measurement_error", s.Source.MeasurementError.IsGiven())
	if rest <= 0 {
		missing.Add(restKeys(s, sense)...)
	}
	e := end{rest: float64(rest), errorBound: float64(s.Source.Error()), internal: internal(s)}
	if s.Source.LimitsUnderCurrent {
		e.values = finding.Exactly(e.rest + sense*e.errorBound)
		return e, missing
	}
	missing.Need(key, current.IsGiven() || absentIsZero)
	axes := []corner.Axis{e.internal, corner.Of(key, current)}
	spread := corner.Over(axes, func(x []float64) float64 { return e.rest + sense*(x[1]*x[0]+e.errorBound) })
	e.current = float64(current.Nominal)
	e.values = finding.ValueOf(spread.Ends())
	return e, missing
}

func restKeys(s site.Site, sense float64) []string {
	cell, whole := "source.cell_min", "source.min_voltage"
	if sense > 0 {
		cell, whole = "source.cell_max", "source.max_voltage"
	}
	if s.Source.CellsInSeries > 0 {
		return []string{cell}
	}
	return []string{"source.cells_in_series", whole}
}

func internal(s site.Site) corner.Axis {
	return corner.Of("source.internal_resistance", s.Source.InternalResistance)
}

// busEnd is the lowest or the highest over all infeeds. Upwards the droop counts only for those that regenerate. All
// errors enter in full, so the three values differ only where a setpoint was entered with a tolerance.
func busEnd(s site.Site, high bool) (end, finding.Missing) {
	var missing finding.Missing
	missing.Need("infeed", len(s.Infeeds) > 0)
	missing.Need("bus.nominal", s.Bus.Nominal.IsGiven())
	missing.Need("bus.regulation_error", s.Bus.RegulationError.IsGiven())
	missing.Need("bus.measurement_error", s.Bus.MeasurementError.IsGiven())
	missing.Need("bus.ripple", s.Bus.Ripple.IsGiven())
	for _, k := range s.Infeeds {
		needDroop(&missing, k, !high || k.Regenerates)
	}
	if len(missing) > 0 {
		return end{}, missing
	}
	return worstEnd(s, high), nil
}

func needDroop(missing *finding.Missing, k site.Infeed, droop bool) {
	missing.Need("infeed.setpoint", k.Setpoint.IsGiven())
	if droop {
		missing.Need("infeed.droop", k.Droop.IsGiven())
		missing.Need("infeed.rated_current", k.RatedCurrent.Nominal > 0)
	}
}

func worstEnd(s site.Site, high bool) end {
	e := end{
		regulation: float64(s.Bus.Regulation()), busError: float64(s.Bus.Error()), swing: float64(s.Bus.Ripple.Nominal),
		values: finding.Exactly(math.Inf(1)),
	}
	if high {
		e.values = finding.Exactly(math.Inf(-1))
	}
	for _, k := range s.Infeeds {
		droop := 0.0
		if !high || k.Regenerates {
			droop = ratedDroop(s, k)
		}
		at := func(setpoint quantity.Voltage) float64 {
			if high {
				return float64(HighestBus(setpoint, quantity.Voltage(droop), s.Bus.Regulation(), s.Bus.Error(), s.Bus.Ripple.Nominal))
			}
			return float64(LowestBus(setpoint, quantity.Voltage(droop), s.Bus.Regulation(), s.Bus.Error(), s.Bus.Ripple.Nominal))
		}
		v := finding.Value{Low: at(k.Setpoint.Low), Nominal: at(k.Setpoint.Nominal), High: at(k.Setpoint.High)}
		if high == (v.Nominal > e.values.Nominal) && v.Nominal != e.values.Nominal {
			e.infeed, e.setpoint, e.droop = k, float64(k.Setpoint.Nominal), droop
		}
		pick := math.Min
		if high {
			pick = math.Max
		}
		e.values = finding.Value{Low: pick(e.values.Low, v.Low), Nominal: pick(e.values.Nominal, v.Nominal), High: pick(e.values.High, v.High)}
	}
	return e
}

// ratedDroop is the droop voltage of an infeed at its own rated current.
func ratedDroop(s site.Site, k site.Infeed) float64 {
	return float64(k.Droop.At(s.Bus.Nominal.Nominal, k.RatedCurrent.Nominal)) * float64(k.RatedCurrent.Nominal)
}
