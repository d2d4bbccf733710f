package precharge

import (
	"math"

	"chargehand/commission/corner"
	"chargehand/commission/quantity"
)

// What one charge at the highest rest voltage comes to, in one corner.
const (
	ofTau = iota
	ofFinal
	ofCurrent
	ofPower
	ofEnergy
	ofPulse
	ofRepeat
	ofWithstand
	chargeResults
)

// What hangs on the rest voltage and on the measurement errors too.
const (
	ofGap = iota
	ofTimeToClose
	ofWait
	ofHiccup // 1 in a corner where the auxiliary supply hiccups
	closeResults
)

// charges takes one charge from an empty bus at the highest rest voltage over all corners.
func (p *path) charges() []corner.Spread {
	return corner.OverAll(p.axes[:], chargeResults, func(x, out []float64) {
		c := p.circuit(x)
		settled, _ := c.Settled()
		s := c.solve()
		peak := quantity.Power(s.rp * s.current0 * s.current0)
		heat := p.heat(c)
		out[ofTau], out[ofFinal] = s.tau, float64(settled)
		out[ofCurrent], out[ofPower] = s.current0, float64(peak)
		out[ofEnergy] = float64(heat.Energy())
		out[ofPulse] = p.utilisation(peak, heat, quantity.Temperature(x[axisAmbient]))
		out[ofRepeat] = p.hottestOf(heat, x)
		out[ofWithstand] = p.withstand(peak, heat, x)
		p.cool[[axisEMF]float64(x)] = p.coolDown(heat, x)
	})
}

// closes takes what the releasing of the bypass hangs on over all corners: the rest voltage lowest or highest, and the
// measurement errors adding to or taking from the closing difference. The cool-down is that of charges, which comes first:
// the axes before the rest voltage are the same.
func (p *path) closes() ([]corner.Axis, []corner.Spread) {
	axes := p.axes
	highest := float64(p.site.Source.HighestRest())
	axes[axisEMF] = corner.Axis{Name: "rest voltage", Low: float64(p.site.Source.LowestRest()), Nominal: highest, High: highest}
	axes[axisError] = corner.Axis{Name: "measurement errors", Low: -float64(p.errors), High: float64(p.errors)}
	return axes[:], corner.OverAll(axes[:], closeResults, func(x, out []float64) {
		c := p.circuit(x)
		_, remaining, how := c.rest()
		out[ofGap], out[ofHiccup] = float64(remaining), 0
		if how == Hiccups {
			out[ofHiccup] = 1
		}
		out[ofTimeToClose] = float64(c.TimeToClose(p.difference + quantity.Voltage(x[axisError])))
		out[ofWait] = math.Max(out[ofTimeToClose], p.cool[[axisEMF]float64(x)])
	})
}

// heat is what the resistor takes in one charge: until the bypass closes at the closing difference, or until the time-out
// if that never comes. The auxiliary supply adds to the energy, not to the shape. Without a time-out a charge that never
// closes has no energy: NaN.
func (p *path) heat(c Circuit) Heat {
	on, energy := c.close(p.difference, true)
	if math.IsInf(float64(on), 1) {
		on = p.timeout()
		energy = quantity.Energy(math.NaN())
		if on > 0 {
			energy = c.EnergyUntil(on)
		}
	}
	c.Auxiliary = 0
	return c.Heat(on).ScaledTo(energy)
}

// pulseTime is the duration of the rectangular pulse that stands for a charge: τ⁄2, or longer where bleeder and auxiliary
// supply add energy.
func pulseTime(tau quantity.Seconds, energy quantity.Energy, peak quantity.Power) quantity.Seconds {
	return max(tau/2, quantity.Seconds(float64(energy)/float64(peak)))
}

func (p *path) utilisation(peak quantity.Power, heat Heat, ambient quantity.Temperature) float64 {
	return float64(peak / p.rating.Permissible(pulseTime(heat.TimeConstant, heat.Energy(), peak), ambient))
}

func (p *path) bodyAt(x []float64) Body {
	return Body{quantity.Thermal(x[axisThermal]), quantity.Seconds(x[axisThermalTime])}
}

// hottestOf is the hottest temperature over the permitted attempts; without a thermal model the mean power over the
// derated rating.
func (p *path) hottestOf(heat Heat, x []float64) float64 {
	if !p.hasThermal() {
		f := p.rating.Factor(quantity.Temperature(x[axisAmbient]))
		return float64(heat.Energy()) / float64(p.interval()) / (float64(f) * float64(p.rating.Power))
	}
	b := p.bodyAt(x)
	return x[axisAmbient] + float64(b.Peak(heat, b.Before(heat, p.site.Precharge.Attempts, p.period(heat))))
}

// period is the interval from start to start; a charge that lasts longer delays the next.
func (p *path) period(heat Heat) quantity.Seconds { return max(p.interval(), heat.On) }

// withstand is how long the resistor stands the full source voltage, as hot as before the last permitted attempt.
func (p *path) withstand(power quantity.Power, heat Heat, x []float64) float64 {
	if !p.hasThermal() {
		return float64(p.rating.Withstand(power, quantity.Temperature(x[axisAmbient])))
	}
	b := p.bodyAt(x)
	start := b.Before(heat, p.site.Precharge.Attempts, p.period(heat))
	ambient := quantity.Temperature(x[axisAmbient])
	return math.Min(float64(p.rating.Withstand(power, ambient+quantity.Temperature(start))),
		float64(b.Withstand(power, start, quantity.Difference(p.hottest-ambient))))
}

// coolDown is the least period of an unlimited series by heat and by mean power.
func (p *path) coolDown(heat Heat, x []float64) float64 {
	f := p.rating.Factor(quantity.Temperature(x[axisAmbient]))
	mean := float64(heat.Energy()) / (float64(f) * float64(p.rating.Power))
	if !p.hasThermal() {
		return mean
	}
	ambient := quantity.Temperature(x[axisAmbient])
	return math.Max(mean, float64(p.bodyAt(x).LeastPeriod(heat, quantity.Difference(p.hottest-ambient))))
}
