package measured

import (
	"fmt"
	"math"

	"chargehand/commission/finding"
	"chargehand/commission/fit"
	"chargehand/commission/signal"
	"chargehand/commission/site"
)

// beside looks for what stands beside a charge that may be good in itself.
func (f *charge) beside() []finding.Cause {
	var found []finding.Cause
	for _, look := range []func() []finding.Cause{f.phases3, f.insulation, f.heated, f.sourceWindow, f.sourceSag} {
		found = append(found, look()...)
	}
	return found
}

// phases3: the phases share the charging current by their resistances, so about equally.
func (f *charge) phases3() []finding.Cause {
	if len(f.phaseCurrents) != f.paper.phases || f.paper.phases < 2 || f.rise < 0.2*f.scale() {
		return nil
	}
	shares, errors := f.phaseShares()
	if shares == nil {
		return nil
	}
	equal := 1 / float64(len(shares))
	words := "phase shares"
	least, greatest, worst, at := 1.0, 0.0, 0.0, 0
	for k, s := range shares {
		words += fmt.Sprintf(" %.0f %%", 100*s)
		least, greatest = math.Min(least, s), math.Max(greatest, s)
		if d := math.Abs(s - equal); d > worst {
			worst, at = d, k
		}
	}
	phase := fmt.Sprintf("phase %d", at+1)
	switch {
	case greatest > 0.85:
		return []finding.Cause{because("upper-switch-shorted", 0.9, words, phase+" carries all without the drop of its diode, and the bus rises"), because("choke-open", 0.5, words)}
	case least < 0.25*equal:
		return []finding.Cause{because("choke-open", 0.94, words, phase+" carries nothing during the whole charge")}
	case worst > 0.15*equal+1.2*errors:
		return []finding.Cause{because("choke-unequal", 0.85, words, phase+" differs in resistance")}
	}
	return nil
}

// phaseShares are the phases' parts of the charge that went in, over the first time constant, less what each showed before
// the command; errors is the part that an offset of one resolution would make.
func (f *charge) phaseShares() (shares []float64, errors float64) {
	total := 0.0
	to := math.Min(f.end, f.start+f.tau().nominal)
	for _, p := range f.phaseCurrents {
		part := p.between(f.start, to)
		average := fit.Average(part.v)
		errors = math.Max(errors, 0.5*p.resolution)
		offset := fit.Average(p.between(math.Inf(-1), -0.05).v).Mean
		if math.IsNaN(offset) {
			offset = 0
		}
		level := average.Mean - offset
		shares = append(shares, level)
		total += level
	}
	if !(total > 10*f.phaseCurrents[0].resolution) {
		return nil, 0
	}
	for k := range shares {
		shares[k] /= total
	}
	return shares, errors / total
}

// leastInsulation per volt of the bus: common practice for insulated DC systems.
const leastInsulation = 100 // Ω⁄V

func (f *charge) insulation() []finding.Cause {
	tr := traceOf(f.capture, signal.InsulationResistance)
	least := leastInsulation * float64(f.site.Bus.Nominal.Nominal)
	if level := fit.Median(tr.v); tr.ok && level < least {
		return []finding.Cause{because("earth-fault", 0.9, fmt.Sprintf("insulation resistance %s, at least %s wanted", number(level, "Ω"), number(least, "Ω")))}
	}
	return nil
}

// heated: the resistance grows during the charge.
func (f *charge) heated() []finding.Cause {
	if f.fit.Status != fit.OK && f.fit.Status != fit.TooEarly {
		return nil
	}
	if !f.resistance.ok {
		return f.heatedByShape()
	}
	if grown, u := f.growth(); grown > 0.08 && grown > 5*u {
		evidence := []string{fmt.Sprintf("resistance grows by %.0f %% during the charge", 100*grown)}
		if f.resistor.ok {
			evidence = append(evidence, fmt.Sprintf("resistor warms from %s to %s", number(f.resistor.at(0), "°C"), number(f.resistor.greatest(), "°C")))
		}
		return []finding.Cause{because("resistor-drifts-hot", 0.9, evidence...), because("resistor-high", 0.5, evidence...)}
	}
	return nil
}

func (f *charge) sourceWindow() []finding.Cause {
	low := float64(f.site.Source.LowestRest())
	if f.emf > 0 && f.emf < low-2*f.sourceError-0.005*low {
		return []finding.Cause{because("source-low", 0.9, fmt.Sprintf("source at %s at rest, at least %s on paper", number(f.emf, "V"), number(low, "V")))}
	}
	return nil
}

// sourceSag: the source's terminals fall under the charging current by more than its resistance asks for.
func (f *charge) sourceSag() []finding.Cause {
	if !f.current.ok || f.site.Source.Kind == site.Supercapacitor || len(f.rows) < 10 {
		return nil
	}
	var x, y []float64
	for _, r := range f.rows {
		x, y = append(x, r.current), append(y, r.source)
	}
	for i, t := range f.source.t { // at rest
		if t < -0.05 {
			x, y = append(x, 0), append(y, f.source.v[i])
		}
	}
	l := fit.Line(x, y, f.source.resolution)
	if l.Status != fit.OK {
		return nil
	}
	ohms, u := -l.Slope, l.SlopeSE
	if ohms-4*u > 2*f.ri.high && ohms*f.greatestCurrent() > 5*math.Max(f.source.resolution, 0.02) {
		return []finding.Cause{because("source-soft", 0.88, fmt.Sprintf("source falls by %s ± %s per ampere, %s on paper", number(ohms, "Ω"), number(2*u, "Ω"), number(f.ri.nominal, "Ω")))}
	}
	return nil
}

func (f *charge) greatestCurrent() float64 {
	greatest := 0.0
	for _, r := range f.rows {
		greatest = math.Max(greatest, r.current)
	}
	return greatest
}
