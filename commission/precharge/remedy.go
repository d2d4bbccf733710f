package precharge

import (
	"fmt"
	"math"

	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/remedy"
	"chargehand/commission/site"
)

// remedyStall takes power off the auxiliary supply where it hiccups; else it widens the closing difference to what remains.
func (a *assessment) remedyStall(f finding.Finding) finding.Finding {
	set := float64(a.difference)
	if a.hiccups() {
		was := float64(a.site.Bus.Auxiliary.Power.Nominal)
		most, ok := remedy.Least(was, 0, func(v float64) bool { return a.stallWith(v).Verdict == finding.Pass })
		if ok {
			return remedy.Ask(f, "during the charge lower ", finding.Change{Key: "bus.auxiliary.power", Unit: "W", Was: was, Value: most})
		}
		f.Remedy = "the auxiliary supply must not start before the bypass has closed"
		return f
	}
	needed := a.closing[ofGap].High + float64(a.errors)
	return remedy.Ask(f, "raise ", remedy.To("precharge.closing_difference", "V", set, needed))
}

// stallWith judges the stall with another power of the auxiliary supply.
func (a *assessment) stallWith(power float64) finding.Finding {
	s := a.site
	auxiliary := *s.Bus.Auxiliary
	was := auxiliary.Power
	auxiliary.Power.Spread = quantity.Exactly(quantity.Power(power))
	if was.Nominal > 0 {
		auxiliary.Power.Low, auxiliary.Power.High = was.Low/was.Nominal*quantity.Power(power), was.High/was.Nominal*quantity.Power(power)
	}
	s.Bus.Auxiliary = &auxiliary
	return assess(s, false).stall()
}

// remedyRepeat lengthens the interval; where even a single charge is too much it says so.
func (a *assessment) remedyRepeat(f finding.Finding) finding.Finding {
	was, limit := float64(a.interval()), *f.Limit.High
	hottest := func(interval float64) float64 {
		return assess(withInterval(a.site, interval), false).charge[ofRepeat].High
	}
	longest := 1000 * math.Max(was, float64(a.axes[axisThermalTime].High))
	if interval, ok := remedy.Least(was, longest, func(v float64) bool { return hottest(v) <= limit }); ok {
		return remedy.Ask(f, "raise ", finding.Change{Key: "precharge.interval", Unit: "s", Was: was, Value: interval})
	}
	f.Remedy = "no interval is long enough: a single charge heats it too far, it needs a resistor of more thermal mass or more ohms"
	return f
}

func withInterval(s site.Site, interval float64) site.Site {
	s.Precharge.Interval.Spread = quantity.Exactly(quantity.Seconds(interval))
	return s
}

func (a *assessment) remedyWait(f finding.Finding) finding.Finding {
	if math.IsInf(f.Value.High, 1) {
		f.Remedy = "no interval is long enough: a charge never closes, or a single one heats the resistor too far"
		return f
	}
	return remedy.Ask(f, "raise ", remedy.To("precharge.interval", "s", float64(a.interval()), f.Value.High))
}

// remedyBreaking asks for a stronger contactor, and says which resistance would spare it.
func (a *assessment) remedyBreaking(f finding.Finding) finding.Finding {
	contactor, highest := a.site.Precharge.Contactor, float64(a.site.Source.HighestRest())
	var changes []finding.Change
	if f.Value.High > *f.Limit.High {
		changes = append(changes, remedy.To("precharge.contactor.breaking_current", "A", *f.Limit.High, f.Value.High))
	}
	if float64(contactor.Voltage.Nominal) < highest {
		changes = append(changes, remedy.To("precharge.contactor.voltage", "V", float64(contactor.Voltage.Nominal), highest))
	}
	f = remedy.Ask(f, "raise ", changes...)
	if f.Value.High > *f.Limit.High {
		r := a.axes[axisResistor]
		least := (highest / *f.Limit.High - a.axes[axisSeries].Low) * r.Nominal / r.Low
		f.Remedy += fmt.Sprintf("; or raise %s", remedy.Phrase([]finding.Change{remedy.To(keyResistance, "Ω", r.Nominal, least)}))
	}
	return f
}
