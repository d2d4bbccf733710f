package discharge

import (
	"fmt"
	"math"

	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/remedy"
)

// label is the waiting time that a warning label must state: the slowest discharge in whole seconds, from a minute on in
// whole minutes, rounded up.
func label(slowest quantity.Seconds) quantity.Seconds {
	if slowest <= 60 {
		return quantity.Seconds(math.Ceil(float64(slowest)))
	}
	return 60 * quantity.Seconds(math.Ceil(float64(slowest)/60))
}

func waiting(t quantity.Seconds) string {
	if t <= 60 {
		return fmt.Sprintf("%d s", int(t))
	}
	return fmt.Sprintf("%d min", int(t)/60)
}

// remedyTime says what the label must read, and which bleeder would do without one, with the power that it takes at the
// highest bus voltage.
func (a *assessment) remedyTime(f finding.Finding) finding.Finding {
	needed, heat := a.bleederFor(quantity.Seconds(*f.Limit.High))
	was := math.NaN()
	if present := a.axes[axisBleeder].Nominal; present > 0 {
		was = present
	}
	f.Changes = []finding.Change{{Key: "bus.bleeder", Unit: "Ω", Was: was, Value: float64(needed)}}
	f.Remedy = fmt.Sprintf("all bleeders in parallel at most %s, which take up to %s", remedy.Figure(float64(needed), "Ω"), quantity.Engineering(float64(heat), "W", 4))
	if !math.IsInf(f.Value.High, 1) {
		f.Remedy = "a label with the waiting time of " + waiting(label(quantity.Seconds(f.Value.High))) + "; without a label " + f.Remedy
	}
	return f
}

// bleederFor is the greatest nominal resistance of all bleeders in parallel that makes the bus touch-safe within a time in
// every corner, with the tolerance of those there are, and the greatest power that it takes.
func (a *assessment) bleederFor(within quantity.Seconds) (quantity.Resistance, quantity.Power) {
	x := []float64{a.axes[axisLink].High, a.axes[axisFilter].High, 1}
	perOhm := float64(a.bus(x).Time(a.from, a.touch()))
	low, high := 1.0, 1.0
	if b := a.axes[axisBleeder]; b.Nominal > 0 {
		low, high = b.Low/b.Nominal, b.High/b.Nominal
	}
	r := float64(within) / (perOhm * high)
	r = remedy.AwayFrom(2*r, r) // rounded down
	return quantity.Resistance(r), quantity.Power(float64(a.from*a.from) / (r * low))
}
