package discharge

import (
	"math"
	"time"

	"chargehand/commission/corner"
	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

// bandPoints is how finely a band is drawn.
const bandPoints = 200

// flat is how long a band without an end is drawn.
const flat = 600 * quantity.Seconds(1)

// Point is the bus voltage at one instant, least and greatest over all corners.
type Point struct {
	At  time.Duration
	Bus quantity.Spread[quantity.Voltage]
}

// Prediction is what one discharge is expected to do. Where a time never comes it is infinite.
type Prediction struct {
	Missing         []string                          // keys without which nothing is predicted; the rest is empty then
	Band            []Point                           // ascending in time, until the slowest corner is touch-safe
	TimeConstant    quantity.Spread[quantity.Seconds] // of the tail, the filter joined
	TimeToTouchSafe quantity.Spread[quantity.Seconds]
}

const (
	axisAuxiliary = axisCount + iota
	axisStopsAt
	axisHeld
	axisStart
	predictAxes
)

const (
	predictTau = iota
	predictTime
	predictResults
)

// Predict is the discharge from bus voltage v0 down to the touch-safe voltage over all corners, the auxiliary supply on
// (also in nominal) and off, and the filter joining at the lowest or the highest rest voltage (in nominal the highest).
func Predict(s site.Site, v0 quantity.Spread[quantity.Voltage]) Prediction {
	a := &assessment{site: s}
	var missing finding.Missing
	a.needsBus(&missing)
	t := s.Bus.TouchSafe
	missing.Need("bus.touch_safe.voltage", t != nil && t.Voltage.IsGiven())
	if x := s.Bus.Auxiliary; x != nil {
		missing.Need("bus.auxiliary.power", x.Power.IsGiven())
		missing.Need("bus.auxiliary.stops_at", x.StopsAt.IsGiven())
	}
	if missing != nil {
		return Prediction{Missing: missing}
	}
	axes := predictionAxes(s, v0)
	touch := t.Voltage.Nominal
	over := corner.OverAll(axes, predictResults, func(x, out []float64) {
		bus, from := cornerBus(x)
		out[predictTau], out[predictTime] = float64(bus.TimeConstant()), float64(bus.Time(from, touch))
	})
	p := Prediction{TimeConstant: corner.As[quantity.Seconds](over[predictTau]), TimeToTouchSafe: corner.As[quantity.Seconds](over[predictTime])}
	end := p.TimeToTouchSafe.High
	if math.IsInf(float64(end), 1) {
		end = flat
	}
	p.Band = band(axes, end)
	return p
}

func predictionAxes(s site.Site, v0 quantity.Spread[quantity.Voltage]) []corner.Axis {
	axes, _ := axesOf(s)
	axes = append(axes, make([]corner.Axis, predictAxes-axisCount)...)
	if x := s.Bus.Auxiliary; x != nil {
		axes[axisAuxiliary] = corner.Axis{Name: "bus.auxiliary.power", Nominal: float64(x.Power.Nominal), High: float64(x.Power.High)}
		axes[axisStopsAt] = corner.Of("bus.auxiliary.stops_at", x.StopsAt)
	}
	if s.StarFilter() != nil {
		highest := float64(s.Source.HighestRest())
		axes[axisHeld] = corner.Axis{Name: "rest voltage", Low: float64(s.Source.LowestRest()), Nominal: highest, High: highest}
	}
	axes[axisStart] = corner.Axis{Name: "bus voltage", Low: float64(v0.Low), Nominal: float64(v0.Nominal), High: float64(v0.High)}
	return axes
}

func cornerBus(x []float64) (bus Bus, from quantity.Voltage) {
	return Bus{Link: quantity.Capacitance(x[axisLink]), Filter: quantity.Capacitance(x[axisFilter]),
		Held: quantity.Voltage(x[axisHeld]), Bleeder: quantity.Resistance(x[axisBleeder]),
		Auxiliary: quantity.Power(x[axisAuxiliary]), StopsAt: quantity.Voltage(x[axisStopsAt])}, quantity.Voltage(x[axisStart])
}

// band takes the curve over all corners at evenly spaced instants.
func band(axes []corner.Axis, end quantity.Seconds) []Point {
	if end <= 0 {
		return nil
	}
	points := make([]Point, bandPoints+1)
	first := true
	corner.Over(axes, func(x []float64) float64 {
		bus, from := cornerBus(x)
		for i := range points {
			t := end * quantity.Seconds(i) / bandPoints
			v := bus.VoltageAt(from, t)
			if first {
				points[i] = Point{time.Duration(math.Round(float64(t) * float64(time.Second))), quantity.Exactly(v)}
			}
			points[i].Bus.Low, points[i].Bus.High = min(points[i].Bus.Low, v), max(points[i].Bus.High, v)
		}
		first = false
		return 0
	})
	return points
}
