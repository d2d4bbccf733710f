package measured

import (
	"fmt"
	"math"

	"chargehand/commission/droop"
	"chargehand/commission/finding"
	"chargehand/commission/fit"
	"chargehand/commission/site"
)

// causes of a droop line that differs from its prediction.
func (l *line) causes() []finding.Cause {
	if len(l.prediction.Missing) > 0 {
		return nil
	}
	var found []finding.Cause
	found = append(found, l.hunting()...)
	found = append(found, l.limited()...)
	if l.fit.Status == fit.OK && l.span() > 0.1*float64(l.prediction.Most) {
		found = append(found, l.slopes()...)
		found = append(found, l.shifted()...)
	}
	found = append(found, l.overShare()...)
	found = append(found, l.soft()...)
	if len(found) == 0 && l.fit.Status == fit.OK {
		found = append(found, because(notKnown, 0.4, fmt.Sprintf("slope %s, no-load %s", number(l.slope.value, "V/A"), number(l.noLoad.value, "V"))))
	}
	return ranked(found)
}

func (l *line) slopes() []finding.Cause {
	b := l.paperSlope()
	off := outside(l.slope, b)
	ratio := l.slope.value / b.nominal
	evidence := []string{fmt.Sprintf("slope %s ± %s, %s set: ratio %.2f", number(l.slope.value, "V/A"), number(l.slope.expanded(), "V/A"), number(b.nominal, "V/A"), ratio)}
	switch {
	case off == 0:
		return nil
	case l.slope.value < -l.slope.expanded() && ratio < -0.3:
		return []finding.Cause{because("current-reversed", 0.9, append(evidence, "the line rises with the current")...)}
	case math.Abs(ratio) < 0.15:
		return []finding.Cause{because("droop-off", 0.93, evidence...), because("droop-mismatch", 0.3, evidence...)}
	}
	return []finding.Cause{because("droop-mismatch", 0.92, append(evidence, l.bases(ratio)...)...)}
}

// bases says which wrong base a ratio of slopes would come from.
func (l *line) bases(ratio float64) []string {
	var words []string
	own := float64(l.site.Infeeds[0].RatedCurrent.Nominal)
	for _, in := range l.site.Infeeds[1:] {
		if q := own / float64(in.RatedCurrent.Nominal); math.Abs(ratio/q-1) < 0.03 && math.Abs(q-1) > 0.03 {
			words = append(words, "as if entered on the rating of "+in.Name)
		}
	}
	if v := l.site.Converter; v != nil && v.RatedCurrent.IsGiven() {
		if q := own / float64(v.RatedCurrent.Nominal); math.Abs(ratio/q-1) < 0.03 {
			words = append(words, "as if entered on the source-side rating")
		}
	}
	return words
}

func (l *line) shifted() []finding.Cause {
	in := l.site.Infeeds[0]
	set := float64(in.Setpoint.Nominal)
	allowed := float64(in.SetpointError.Of(in.Setpoint.Nominal)) + float64(l.site.Bus.Regulation())
	off := outside(l.noLoad, band{set - allowed, set, set + allowed})
	if off == 0 {
		return nil
	}
	evidence := fmt.Sprintf("no-load voltage %s ± %s, setpoint %s: %+.1f V", number(l.noLoad.value, "V"), number(l.noLoad.expanded(), "V"), number(set, "V"), l.noLoad.value-set)
	return together(0.8, "the bus at no load with an instrument: if it stands at the setpoint the sensor is off, else the setpoint", []string{evidence}, "setpoint-shifted", "sensor-gain", "sensor-offset")
}

// limited: two steps at one current with the voltage falling, below the limit that the site states.
func (l *line) limited() []finding.Cause {
	if len(l.off) == 0 {
		return nil
	}
	highest := math.Inf(-1)
	stated := float64(l.prediction.Most)
	for _, st := range l.off {
		highest = math.Max(highest, float64(st.Current))
	}
	if highest > 0.9*stated || highest <= 0 {
		return nil
	}
	return []finding.Cause{because("limit-too-low", 0.9, fmt.Sprintf("the current stays at %s while the bus falls, %s stated", number(highest, "A"), number(stated, "A")))}
}

func (l *line) hunting() []finding.Cause {
	swing := math.Inf(1)
	for _, st := range append(append([]Step{}, l.on...), l.off...) {
		swing = math.Min(swing, float64(st.Swing))
	}
	allowed := float64(l.site.Bus.Ripple.Nominal)/2 + 0.002*float64(l.site.Bus.Nominal.Nominal)
	if len(l.on)+len(l.off) == 0 || swing < allowed {
		return nil
	}
	return []finding.Cause{because("bus-hunts", 0.9, fmt.Sprintf("the bus swings by ± %s at every load, ± %s allowed", number(swing, "V"), number(allowed, "V")))}
}

// soft: the source's voltage falls with its current by more than its resistance asks for.
func (l *line) soft() []finding.Cause {
	var x, y []float64
	for _, st := range append(append([]Step{}, l.on...), l.off...) {
		if st.Source > 0 && st.SourceCurrent != 0 {
			x, y = append(x, float64(st.SourceCurrent)), append(y, float64(st.Source))
		}
	}
	ohms := fit.Line(x, y, 0)
	if ohms.Status != fit.OK || l.site.Source.Kind == site.Supercapacitor {
		return nil
	}
	paper := bandOf(l.site.Source.InternalResistance.Spread)
	m := measurement{value: -ohms.Slope, u: ohms.SlopeSE, freedom: ohms.Freedom, bound: math.Abs(ohms.Slope) * currentError}
	if outside(m, paper.widened(0.5)) <= 0 {
		return nil
	}
	return []finding.Cause{because("source-soft", 0.88, fmt.Sprintf("source falls by %s per ampere, %s on paper", number(m.value, "Ω"), number(paper.nominal, "Ω")))}
}

// overShare: the line is good, and yet the converter carries more than its share even of the greatest load on paper.
func (l *line) overShare() []finding.Cause {
	load := l.site.Load
	if load == nil || len(l.site.Infeeds) < 2 {
		return nil
	}
	expected, ok := l.prediction.At(droop.Load{Power: load.Power.Nominal})
	if !ok {
		return nil
	}
	greatest := math.Inf(-1)
	for _, st := range append(append([]Step{}, l.on...), l.off...) {
		greatest = math.Max(greatest, float64(st.Current))
	}
	most := float64(expected.Current.High)
	if l.fit.Status == fit.OK { // a no-load voltage that is too high takes more by itself
		most += math.Max(0, l.noLoad.value-float64(l.prediction.NoLoad.High)) / l.paperSlope().nominal
	}
	if greatest < 1.25*most+0.03*float64(l.prediction.Most) {
		return nil
	}
	if l.fit.Status == fit.OK && math.Abs(l.slope.value) < 0.3*l.paperSlope().nominal { // droop off: it takes all by itself
		return nil
	}
	return []finding.Cause{because("infeed-lost", 0.86, fmt.Sprintf("carries %s, its share of the greatest load is at most %s", number(greatest, "A"), number(most, "A")))}
}
