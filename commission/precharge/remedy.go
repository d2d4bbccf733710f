package precharge

import (
	"fmt"
	"math"

	"chargehand/commission/finding"
	"chargehand/commission/remedy"
	"chargehand/commission/site"
)

// remedyStall takes power off the auxiliary supply where it hiccups; else it widens the closing difference to what remains.
func (a *assessment) remedyStall(f finding.Finding) finding.Finding {
	set := float64(a.difference)
	if a.hiccups() {
		lower := finding.Change{Key: "bus.auxiliary.power", Unit: "W", Was: float64(a.site.Bus.Auxiliary.Power.Nominal)}
		lower, ok := remedy.LeastChange(a.site, lower, 0, func(s site.Site) bool { return assess(s).stall().Verdict == finding.Pass })
		if ok {
			return remedy.Ask(f, "during the charge lower ", lower)
		}
		f.Remedy = "the auxiliary supply must not start before the bypass has closed"
		return f
	}
	needed := a.closing[ofGap].High + float64(a.errors)
	return remedy.Ask(f, "raise ", remedy.To("precharge.closing_difference", "V", set, needed))
}

// remedyRepeat lengthens the interval; where even a single charge is too much it says so.
func (a *assessment) remedyRepeat(f finding.Finding) finding.Finding {
	was, limit := float64(a.interval()), *f.Limit.High
	longest := 1000 * math.Max(was, float64(a.axes[axisThermalTime].High))
	longer := finding.Change{Key: "precharge.interval", Unit: "s", Was: was}
	longer, ok := remedy.LeastChange(a.site, longer, longest, func(s site.Site) bool { return assess(s).charge[ofRepeat].High <= limit })
	if ok {
		return remedy.Ask(f, "raise ", longer)
	}
	f.Remedy = "no interval is long enough: a single charge heats it too far, it needs a resistor of more thermal mass or more ohms"
	return f
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
