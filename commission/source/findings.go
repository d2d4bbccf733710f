package source

import (
	"fmt"
	"math"

	"chargehand/commission/corner"
	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/remedy"
	"chargehand/commission/site"
	"chargehand/commission/window"
)

// live is how many poles stand between a non-isolated converter and a dead source: the bus reaches both.
const live = 2

const (
	basisShort   = "prospective current E⁄R_i at the terminals; Ohm's law"
	basisIsolate = "both live poles opened, rated for the source's highest voltage and the current at full power; common practice"
	basisFault   = "E·I·t with I = E⁄R_i and I²·t the fuse's pre-arcing integral, R_i·I²t"
	validOhmic   = "ohmic source; the real current is lower where inductance limits it before the fuse melts"
	unitVolt     = "V"
	unitAmpere   = "A"
	keyInternal  = "source.internal_resistance"
	keyPreArcing = "source.fuse.pre_arcing_i2t"
)

// Findings are the source findings of a site, in the order of the catalogue.
func Findings(s site.Site) []finding.Finding {
	return []finding.Finding{shortCircuit(s), isolation(s), faultEnergy(s)}
}

func say(v float64, unit string) string { return quantity.Engineering(v, unit, 4) }

func shortCircuit(s site.Site) finding.Finding {
	f := finding.Finding{ID: "source.short-circuit", Title: "Prospective short circuit at the source", Unit: unitAmpere, Basis: basisShort, Guards: true}
	fuse, highest := s.Source.Fuse, s.Source.HighestRest()
	var m finding.Missing
	needsSource(s, &m)
	m.Need("source.fuse", fuse != nil)
	if fuse != nil {
		m.Need("source.fuse.breaking_capacity", fuse.BreakingCapacity.IsGiven())
		m.Need("source.fuse.voltage", fuse.Voltage.IsGiven())
	}
	if m != nil {
		return f.Lacking(m...)
	}
	axes := []corner.Axis{corner.Of(keyInternal, s.Source.InternalResistance)}
	over := corner.Over(axes, func(x []float64) float64 { return float64(ShortCircuit(highest, quantity.Resistance(x[0]))) })
	f = f.Judged(finding.ValueOf(over.Ends()), finding.AtMost(float64(fuse.BreakingCapacity.Nominal)), 0)
	if math.IsInf(over.High, 1) {
		f.State = finding.Unlimited
	}
	f.Parts = []finding.Part{{Name: "fuse voltage", Unit: unitVolt, Value: finding.Exactly(float64(fuse.Voltage.Nominal))}}
	w := finding.Explain("I = E/R_i", basisShort, validOhmic)
	w.Given("E", "highest rest voltage", unitVolt, float64(highest))
	w.Given("R_i", "internal resistance", "Ω", axes[0].Nominal)
	w.Step("I", "E/R_i", unitAmpere, over.Nominal)
	w.Spread("greatest with "+corner.Describe(axes, over.AtHigh), corner.Names(axes), over.Moves)
	f.Explanation = w.Done()
	var changes []finding.Change
	if f.Verdict != finding.Pass {
		f.Because = append(f.Because, fmt.Sprintf("up to %s, the fuse breaks %s", say(over.High, unitAmpere), say(*f.Limit.High, unitAmpere)))
		changes = append(changes, remedy.To("source.fuse.breaking_capacity", unitAmpere, *f.Limit.High, over.High))
	}
	if fuse.Voltage.Nominal < highest {
		f.Verdict = finding.Fail
		f.Because = append(f.Because, fmt.Sprintf("the fuse's voltage, %s, is below the source's highest, %s", say(float64(fuse.Voltage.Nominal), unitVolt), say(float64(highest), unitVolt)))
		changes = append(changes, remedy.To("source.fuse.voltage", unitVolt, float64(fuse.Voltage.Nominal), float64(highest)))
	}
	return withRemedy(f, changes)
}

func needsSource(s site.Site, m *finding.Missing) {
	m.Need(keyInternal, s.Source.InternalResistance.IsGiven())
	if s.Source.HighestRest() <= 0 {
		m.Add("source.max_voltage")
	}
}

// withRemedy asks for at least the figures in changes.
func withRemedy(f finding.Finding, changes []finding.Change) finding.Finding {
	if len(changes) > 0 {
		return remedy.Ask(f, "raise ", changes...)
	}
	return f
}

func isolation(s site.Site) finding.Finding {
	f := finding.Finding{ID: "source.isolation", Title: "Isolation of the source", Unit: "1", Basis: basisIsolate, Guards: true}
	isolator, highest := s.Source.Switch, s.Source.HighestRest()
	var m finding.Missing
	needsSource(s, &m)
	m.Need("source.switch", isolator != nil)
	if isolator != nil {
		m.Need("source.switch.poles", isolator.Poles > 0)
		m.Need("source.switch.voltage", isolator.Voltage.IsGiven())
		m.Need("source.switch.breaking_current", isolator.BreakingCurrent.IsGiven())
	}
	current, more := window.SourceCurrent(s)
	m.Add(more...)
	if m != nil {
		return f.Lacking(m...)
	}
	f = f.Judged(finding.Exactly(float64(isolator.Poles)), finding.AtLeast(live), 0)
	f.Parts = []finding.Part{
		{Name: "voltage", Unit: unitVolt, Value: finding.Exactly(float64(isolator.Voltage.Nominal))},
		{Name: "voltage needed", Unit: unitVolt, Value: finding.Exactly(float64(highest))},
		{Name: "breaking current", Unit: unitAmpere, Value: finding.Exactly(float64(isolator.BreakingCurrent.Nominal))},
		{Name: "breaking current needed", Unit: unitAmpere, Value: finding.ValueOf(float64(current.Low), float64(current.Nominal), float64(current.High))},
	}
	w := finding.Explain("poles >= 2, U >= E, I_b >= I", basisIsolate, "the current is that of window.current")
	w.Given("poles", "poles opened", "1", float64(isolator.Poles))
	w.Given("E", "highest rest voltage", unitVolt, float64(highest))
	w.Given("U", "voltage of the switch", unitVolt, float64(isolator.Voltage.Nominal))
	w.Given("I", "greatest source current at full power", unitAmpere, float64(current.High))
	w.Given("I_b", "breaking current of the switch", unitAmpere, float64(isolator.BreakingCurrent.Nominal))
	w.Step("spare_voltage", "U - E", unitVolt, float64(isolator.Voltage.Nominal-highest))
	w.Step("spare_current", "I_b - I", unitAmpere, float64(isolator.BreakingCurrent.Nominal-current.High))
	w.Step("opened", "poles", "1", float64(isolator.Poles))
	f.Explanation = w.Done()
	var changes []finding.Change
	if isolator.Poles < live {
		f.Because = append(f.Because, fmt.Sprintf("it opens %d of the %d live poles: the other stays at source or bus", isolator.Poles, live))
		changes = append(changes, finding.Change{Key: "source.switch.poles", Unit: "poles", Was: float64(isolator.Poles), Value: live})
	}
	if isolator.Voltage.Nominal < highest {
		f.Verdict = finding.Fail
		f.Because = append(f.Because, fmt.Sprintf("its voltage, %s, is below the source's highest, %s", say(float64(isolator.Voltage.Nominal), unitVolt), say(float64(highest), unitVolt)))
		changes = append(changes, remedy.To("source.switch.voltage", unitVolt, float64(isolator.Voltage.Nominal), float64(highest)))
	}
	switch {
	case math.IsNaN(float64(current.High)):
		f.Verdict = finding.Fail
		f.Because = append(f.Because, "the source cannot give the rated power at the bottom of the window, so the current to break has no bound")
	case isolator.BreakingCurrent.Nominal < current.High:
		f.Verdict = finding.Fail
		f.Because = append(f.Because, fmt.Sprintf("it breaks %s, at full power up to %s flow", say(float64(isolator.BreakingCurrent.Nominal), unitAmpere), say(float64(current.High), unitAmpere)))
		changes = append(changes, remedy.To("source.switch.breaking_current", unitAmpere, float64(isolator.BreakingCurrent.Nominal), float64(current.High)))
	}
	return withRemedy(f, changes)
}

func faultEnergy(s site.Site) finding.Finding {
	f := finding.Finding{ID: "source.fault-energy", Title: "Energy released until the fuse pre-arcs", Unit: "J", Basis: basisFault}
	fuse := s.Source.Fuse
	var m finding.Missing
	needsSource(s, &m)
	m.Need(keyPreArcing, fuse != nil && fuse.PreArcingI2t.IsGiven())
	if m != nil {
		return f.Lacking(m...)
	}
	axes := []corner.Axis{corner.Of(keyInternal, s.Source.InternalResistance), corner.Of(keyPreArcing, fuse.PreArcingI2t)}
	over := corner.Over(axes, func(x []float64) float64 {
		return float64(FaultEnergy(quantity.Resistance(x[0]), quantity.CurrentTime2(x[1])))
	})
	f = f.Stated(finding.ValueOf(over.Ends()))
	w := finding.Explain("W = R_i*I2t", basisFault, validOhmic)
	w.Given("R_i", "internal resistance", "Ω", axes[0].Nominal)
	w.Given("I2t", "pre-arcing integral of the fuse", "A²s", axes[1].Nominal)
	w.Step("W", "R_i*I2t", "J", over.Nominal)
	w.Spread("greatest with "+corner.Describe(axes, over.AtHigh), corner.Names(axes), over.Moves)
	f.Explanation = w.Done()
	return f
}
