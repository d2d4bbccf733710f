package window

import (
	"math"

	"chargehand/commission/corner"
	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

// Row is the window at one state of charge. A figure whose inputs are missing, or that has no operating point, is NaN in
// all three places.
type Row struct {
	StateOfCharge quantity.Ratio // NaN where the site has no table of it
	Rest          quantity.Voltage
	Terminal      quantity.Spread[quantity.Voltage] // discharging at Current
	Current       quantity.Spread[quantity.Current] // at rated power, or the greatest permitted where that is less
	Available     quantity.Spread[quantity.Power]   // on the bus, discharging, at most rated power
	Charging      quantity.Spread[quantity.Power]   // from the bus, charging, at most rated power
	Margin        quantity.Spread[quantity.Voltage] // lowest bus above this rest voltage charged at full current
}

// rows is how many steps the table has from bottom to top.
const rows = 10

// Table is the window over the state of charge, from the bottom to the top. With a table of the open-circuit voltage the
// rows stand at every tenth of its range of charge, without one at every tenth of the range of rest voltage.
func Table(s site.Site) []Row {
	low, high := float64(s.Source.LowestRest()), float64(s.Source.HighestRest())
	if low <= 0 || high < low {
		return nil
	}
	points := s.Source.StateOfCharge
	table := make([]Row, 0, rows+1)
	for k := 0; k <= rows; k++ {
		part := float64(k) / rows
		charge, rest := math.NaN(), low+part*(high-low)
		if n := len(points); n > 1 {
			first, last := float64(points[0].StateOfCharge.Nominal), float64(points[n-1].StateOfCharge.Nominal)
			charge = first + part*(last-first)
			rest = restAt(s, charge)
		}
		table = append(table, row(s, charge, rest))
	}
	return table
}

func row(s site.Site, charge, rest float64) Row {
	r := Row{StateOfCharge: quantity.Ratio(charge), Rest: quantity.Voltage(rest)}
	c := converter(s)
	axes, missing := powerAxes(s)
	limit, _, more := currentLimit(s, true)
	missing.Add(more...)
	nan := math.NaN()
	r.Terminal, r.Current = quantity.Exactly(quantity.Voltage(nan)), quantity.Exactly(quantity.Current(nan))
	r.Available, r.Charging = quantity.Exactly(quantity.Power(nan)), quantity.Exactly(quantity.Power(nan))
	r.Margin = quantity.Exactly(quantity.Voltage(nan))
	if len(missing) == 0 {
		current := func(x []float64) float64 {
			i, ok := currentAtPower(rest, x[0], x[1]/x[2])
			if !ok || i > limit {
				i = math.Min(limit, rest/(2*x[0]))
			}
			return i
		}
		r.Current = spreadAs[quantity.Current](corner.Over(axes, current))
		r.Terminal = spreadAs[quantity.Voltage](corner.Over(axes, func(x []float64) float64 { return rest - x[0]*current(x) }))
		r.Available = spreadAs[quantity.Power](corner.Over(axes, func(x []float64) float64 {
			i := current(x)
			return math.Min(x[1], x[2]*(rest-x[0]*i)*i)
		}))
	}
	if charging, ok := chargingLimit(s, c); ok && len(missing) == 0 {
		r.Charging = spreadAs[quantity.Power](corner.Over(axes, func(x []float64) float64 {
			p, _ := AvailableCharge(quantity.Voltage(rest), quantity.Resistance(x[0]), quantity.Ratio(x[2]), Limits{Source: charging})
			return math.Min(x[1], float64(p))
		}))
	}
	bus, busMissing := busEnd(s, false)
	e, sourceMissing := sourceEnd(s, quantity.Voltage(rest), s.Source.MaxChargeCurrent, "source.max_charge_current", +1, s.Source.Kind == site.FuelCell)
	if len(busMissing) == 0 && len(sourceMissing) == 0 {
		r.Margin = spread(finding.Value{Low: bus.values.Low - e.values.High, Nominal: bus.values.Nominal - e.values.Nominal, High: bus.values.High - e.values.Low})
	}
	return r
}

// chargingLimit is the least of what source and converter permit while charging; a blocking diode permits none, and then
// no limit is needed.
func chargingLimit(s site.Site, c site.Converter) (quantity.Current, bool) {
	if !s.Source.MaxChargeCurrent.IsGiven() || !c.RatedCurrent.IsGiven() || s.Source.MaxChargeCurrent.Nominal <= 0 || s.Source.BlockingDiode {
		return 0, false
	}
	return min(s.Source.MaxChargeCurrent.Nominal, c.RatedCurrent.Nominal), true
}

func spreadAs[Q quantity.Scalar](s corner.Spread) quantity.Spread[Q] {
	return quantity.Spread[Q]{Low: Q(s.Low), Nominal: Q(s.Nominal), High: Q(s.High)}
}

// stateOfCharge is the state of charge at a rest voltage of the whole source, linear between the points of its table and
// held at its ends; false without a table.
func stateOfCharge(s site.Site, rest float64) (float64, bool) {
	points := s.Source.StateOfCharge
	if len(points) == 0 || math.IsNaN(rest) {
		return math.NaN(), false
	}
	cell := rest / cells(s)
	for i, p := range points {
		v := float64(p.Cell.Nominal)
		if cell > v {
			continue
		}
		if i == 0 {
			return float64(p.StateOfCharge.Nominal), true
		}
		below := points[i-1]
		return between(cell, float64(below.Cell.Nominal), v, float64(below.StateOfCharge.Nominal), float64(p.StateOfCharge.Nominal)), true
	}
	return float64(points[len(points)-1].StateOfCharge.Nominal), true
}

// restAt is the rest voltage of the whole source at a state of charge.
func restAt(s site.Site, charge float64) float64 {
	points := s.Source.StateOfCharge
	for i, p := range points {
		c := float64(p.StateOfCharge.Nominal)
		if charge > c && i < len(points)-1 {
			continue
		}
		if i == 0 {
			return float64(p.Cell.Nominal) * cells(s)
		}
		below := points[i-1]
		return between(charge, float64(below.StateOfCharge.Nominal), c, float64(below.Cell.Nominal), float64(p.Cell.Nominal)) * cells(s)
	}
	return math.NaN()
}

func between(x, x0, x1, y0, y1 float64) float64 {
	if x1 == x0 {
		return y1
	}
	return y0 + (x-x0)/(x1-x0)*(y1-y0)
}

func cells(s site.Site) float64 { return math.Max(1, float64(s.Source.CellsInSeries)) }
