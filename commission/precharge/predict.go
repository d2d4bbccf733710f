package precharge

import (
	"math"
	"time"

	"chargehand/commission/corner"
	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

// bandPoints is how finely a band is drawn: a straight line between two of its points misses the curve by less than 0.1 %
// of the rise.
const bandPoints = 200

// earlyShare is when, in time constants, the early rise is checked.
const earlyShare = 0.3

// Point is the bus voltage at one instant, least and greatest over all corners.
type Point struct {
	At  time.Duration
	Bus quantity.Spread[quantity.Voltage]
}

// EarlyRise is the check that tells a shorted bus from a good charge: both draw the same power, only the rise is missing.
type EarlyRise struct {
	At      time.Duration    // 0.3 time constants after the pre-charge closed
	AtLeast quantity.Voltage // half of the predicted rise by then
}

// Prediction is what one pre-charge is expected to do. Where a time never comes it is infinite.
type Prediction struct {
	Missing      []string // keys without which nothing is predicted; the rest is empty then
	Band         []Point  // ascending in time, from the start past the slowest charge or the time-out
	TimeConstant quantity.Spread[quantity.Seconds]
	Settled      quantity.Spread[quantity.Voltage]
	PeakCurrent  quantity.Spread[quantity.Current]
	TimeToClose  quantity.Spread[quantity.Seconds] // a measurement error that is not given counts as 0
	EarlyRise    EarlyRise
}

const (
	predictTau = iota
	predictSettled
	predictCurrent
	predictClose
	predictResults
)

// Predict is the pre-charge from bus voltage v0 with the source at rest at emf, over all corners of the site's tolerances
// and of emf, the auxiliary supply on and off.
func Predict(s site.Site, emf quantity.Spread[quantity.Voltage], v0 quantity.Voltage) Prediction {
	p := pathOf(s)
	var missing finding.Missing
	if p.needsCircuit(&missing); missing != nil {
		return Prediction{Missing: missing}
	}
	for _, unused := range []int{axisAmbient, axisThermal, axisThermalTime} {
		p.axes[unused] = corner.Exact(p.axes[unused].Name, p.axes[unused].Nominal)
	}
	p.axes[axisEMF] = corner.Axis{Name: "rest voltage", Low: float64(emf.Low), Nominal: float64(emf.Nominal), High: float64(emf.High)}
	p.axes[axisError] = corner.Axis{Name: "measurement errors", Low: -float64(p.errors), High: float64(p.errors)}
	starts := func(x []float64) Circuit {
		c := p.circuit(x)
		c.Start = v0
		return c
	}
	over := corner.OverAll(p.axes[:], predictResults, func(x, out []float64) {
		c := starts(x)
		settled, _ := c.Settled()
		out[predictTau], out[predictSettled] = float64(c.TimeConstant()), math.Max(float64(settled), float64(v0))
		out[predictCurrent] = float64(c.PeakCurrent())
		out[predictClose] = float64(c.TimeToClose(p.difference + quantity.Voltage(x[axisError])))
	})
	prediction := Prediction{
		TimeConstant: corner.As[quantity.Seconds](over[predictTau]),
		Settled:      corner.As[quantity.Voltage](over[predictSettled]),
		PeakCurrent:  corner.As[quantity.Current](over[predictCurrent]),
		TimeToClose:  corner.As[quantity.Seconds](over[predictClose]),
	}
	nominal := starts(p.nominal())
	at := earlyShare * nominal.TimeConstant()
	early, _ := nominal.VoltageAt(at)
	prediction.EarlyRise = EarlyRise{At: duration(at), AtLeast: v0 + (early-v0)/2}
	p.axes[axisError] = corner.Exact("measurement errors", 0)
	prediction.Band = band(p.axes[:], p.horizon(prediction), starts)
	return prediction
}

// horizon is how far a band reaches: past the slowest charge, at least to the time-out; six time constants where the charge
// may never close and no time-out is given.
func (p *path) horizon(of Prediction) quantity.Seconds {
	end := aboveSlowestCharge * of.TimeToClose.High
	if math.IsInf(float64(end), 1) {
		end = 6 * of.TimeConstant.High
	}
	if timeout := p.timeout(); timeout > end {
		return timeout
	}
	return end
}

// band takes the curve over all corners at evenly spaced instants.
func band(axes []corner.Axis, end quantity.Seconds, starts func(x []float64) Circuit) []Point {
	if end <= 0 {
		return nil
	}
	points := make([]Point, bandPoints+1)
	for i := range points {
		points[i].At = duration(end * quantity.Seconds(i) / bandPoints)
		points[i].Bus = quantity.Spread[quantity.Voltage]{Low: quantity.Voltage(math.Inf(1)), High: quantity.Voltage(math.Inf(-1))}
	}
	first := true
	corner.Over(axes, func(x []float64) float64 {
		for i, v := range starts(x).course(end) {
			b := &points[i].Bus
			b.Low, b.High = min(b.Low, v.low), max(b.High, v.high)
			if first {
				b.Nominal = (v.low + v.high) / 2
			}
		}
		first = false
		return 0
	})
	return points
}

type levels struct{ low, high quantity.Voltage }

// course is the link voltage at the instants of a band.
func (c Circuit) course(end quantity.Seconds) []levels {
	course := make([]levels, bandPoints+1)
	step := float64(end) / bandPoints
	if c.isCoupled() {
		for i, v := range c.march(step, bandPoints) {
			course[i] = levels{v, v}
		}
		return course
	}
	s := c.solve()
	for i := range course {
		l, h := s.voltageAt(step * float64(i))
		course[i] = levels{quantity.Voltage(l), quantity.Voltage(h)}
	}
	return course
}

// BusAt is the band at an instant, interpolated; false outside it.
func (p Prediction) BusAt(t time.Duration) (quantity.Spread[quantity.Voltage], bool) {
	for i := 1; i < len(p.Band); i++ {
		a, b := p.Band[i-1], p.Band[i]
		if t >= a.At && t <= b.At {
			share := quantity.Voltage(float64(t-a.At) / float64(b.At-a.At))
			return quantity.Spread[quantity.Voltage]{
				Low:     a.Bus.Low + share*(b.Bus.Low-a.Bus.Low),
				Nominal: a.Bus.Nominal + share*(b.Bus.Nominal-a.Bus.Nominal),
				High:    a.Bus.High + share*(b.Bus.High-a.Bus.High),
			}, true
		}
	}
	return quantity.Spread[quantity.Voltage]{}, false
}

func duration(s quantity.Seconds) time.Duration {
	return time.Duration(math.Round(float64(s) * float64(time.Second)))
}
