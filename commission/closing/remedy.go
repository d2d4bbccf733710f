package closing

import (
	"math"

	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/remedy"
)

const keyDifference = "precharge.closing_difference"

func (a *assessment) difference() float64 { return float64(a.site.Precharge.ClosingDifference.Nominal) }

// remedyInrush offers a smaller closing difference where what remains of the charge permits it, else a bypass that makes
// more.
func (a *assessment) remedyInrush(f finding.Finding) finding.Finding {
	making := float64(a.site.Bypass.MakingCurrent.Nominal)
	bypass := remedy.To("bypass.making_current", "A", making, a.over[ofJudged].High)
	smaller, ok := a.smallerDifference(func(b *assessment) bool { return b.over[ofJudged].High <= making })
	if !ok {
		return remedy.Ask(f, "no closing difference is small enough and still reached: raise ", bypass)
	}
	f = remedy.Ask(f, "lower ", smaller)
	f.Remedy += ", or raise " + remedy.Phrase([]finding.Change{bypass})
	return f
}

func (a *assessment) remedyI2t(f finding.Finding) finding.Finding {
	limit := float64(a.site.Source.Fuse.PreArcingI2t.Nominal)
	fuse := remedy.To("source.fuse.pre_arcing_i2t", "A²s", limit, a.over[ofI2t].High)
	smaller, ok := a.smallerDifference(func(b *assessment) bool { return b.over[ofI2t].High <= limit })
	if !ok {
		return remedy.Ask(f, "no closing difference is small enough and still reached: raise ", fuse)
	}
	return remedy.Ask(f, "lower ", smaller)
}

// smallerDifference is the greatest closing difference below the one set that passes and lies above what remains of the
// charge.
func (a *assessment) smallerDifference(passes func(*assessment) bool) (finding.Change, bool) {
	low, _, _ := a.window()
	set := a.difference()
	value, ok := remedy.Least(set, low, func(v float64) bool {
		s := a.site
		s.Precharge.ClosingDifference.Spread = quantity.Exactly(quantity.Voltage(v))
		return passes(assess(s))
	})
	return finding.Change{Key: keyDifference, Unit: "V", Was: set, Value: value}, ok && value >= low
}

// remedyThreshold puts the closing difference into its window; without a window it says what the bypass must make.
func (a *assessment) remedyThreshold(f finding.Finding, low, high float64) finding.Finding {
	set := a.difference()
	switch {
	case low > high:
		perVolt := a.over[ofInrush].High / float64(a.bypass.missing)
		errors := float64(a.site.Source.Error() + a.site.Bus.Error())
		needed := (low + errors) * perVolt * (1 + 1e-6)
		return remedy.Ask(f, "raise ", remedy.To("bypass.making_current", "A", float64(a.site.Bypass.MakingCurrent.Nominal), needed),
			finding.Change{Key: keyDifference, Unit: "V", Was: set, Value: roundUp(low)})
	case set < low:
		return remedy.Ask(f, "raise ", remedy.To(keyDifference, "V", set, low))
	}
	return remedy.Ask(f, "lower ", remedy.To(keyDifference, "V", set, high))
}

// roundUp keeps five digits of v, upwards by less than the room that the making current above leaves.
func roundUp(v float64) float64 {
	scale := math.Pow(10, 6-math.Ceil(math.Log10(v)))
	return math.Ceil(v*scale) / scale
}

func (a *assessment) remedyLiveBus(f finding.Finding) finding.Finding {
	least := *f.Limit.High
	if f.Value.High > least {
		f = remedy.Ask(f, "raise ", remedy.To("precharge.minimum_time", "s", least, f.Value.High))
	}
	if a.site.Precharge.Compares == "source-bus" {
		words := `precharge.compares = "contactor"`
		if f.Remedy != "" {
			words += ", and " + f.Remedy
		}
		f.Remedy = words
	}
	return f
}
