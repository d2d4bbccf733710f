package droop

import (
	"fmt"
	"math"

	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/remedy"
	"chargehand/commission/site"
)

// wantedStability is the ratio that leaves half of the stiffness in hand.
const wantedStability = 0.5

// stabilityFinding judges whether the droop holds the bus against the negative incremental resistance of the constant-power load,
// at load.power. That is the static condition: necessary, and not sufficient against the dynamics of lines and regulators.
func stabilityFinding(s site.Site) finding.Finding {
	return remedy.Offer(s, stability, func(_ finding.Finding, passes func(site.Site) bool) (string, []finding.Change) {
		return easeLoad(s, false, passes)
	})
}

func stability(s site.Site) finding.Finding {
	f := finding.Finding{ID: "droop.stability", Title: "Load's negative conductance against the infeeds'", Unit: "1", Guards: true,
		Basis: "(P⁄V²)⁄(G + 1⁄R_L) ≤ 1, G of the infeeds that are at no limit; incremental resistance of constant-power loads, from memory"}
	p := plan(s)
	missing := p.missing
	missing.Need("load.power", loadOf(s).Power.IsGiven())
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	limit := finding.AtMost(1)
	l := Load{Power: loadOf(s).Power.Nominal}
	value, status := stabilityOver(p, l)
	if status != Found {
		f = f.Without(finding.Fail, status.why("at load.power"))
		f.Limit = limit
		return f
	}
	f = f.Judged(value, limit, 1-wantedStability)
	w := finding.Explain(f.Basis, "incremental resistance of constant-power loads, from memory", "static; inductance of the lines and the regulators' speed ask for more")
	workings(w, p.sources, names(s), l, "W")
	if value.Nominal > 0 {
		w.Step("ratio", "P / V^2 / G", "1", value.Nominal)
	} else {
		w.Step("ratio", "0 * P", "1", 0)
	}
	p.spread(w, s, errorsGovern, func(sources []Source) float64 {
		return Solve(sources, l).StabilityRatio
	})
	f.Explanation = w.Done()
	return f
}

// stabilityOver is the ratio over the corners of the setpoint errors: all of one sign, which move the voltage most, and one
// against all others, which bring one infeed to its limit and take its conductance away.
func stabilityOver(p planned, l Load) (finding.Value, Status) {
	nominal := Solve(p.sources, l)
	if nominal.Status != Found {
		return finding.NoValue(), nominal.Status
	}
	value := finding.Exactly(nominal.StabilityRatio)
	work := make([]Source, 0, len(p.sources))
	for k := range p.sources {
		for _, own := range []quantity.Voltage{-1, +1} {
			for _, others := range []quantity.Voltage{-1, +1} {
				work = shifted(work, p.sources, p.errors, others)
				work[k].NoLoad = p.sources[k].NoLoad + own*p.errors[k]
				bus, status := balance(work, l)
				if status != Found {
					return finding.NoValue(), status
				}
				g := 0.0
				for _, source := range work {
					if source.stateAt(bus) == Free {
						g += 1 / source.slope()
					}
				}
				one := ratio(float64(l.Power)/(bus*bus), g)
				value.Low, value.High = math.Min(value.Low, one), math.Max(value.High, one)
			}
		}
	}
	return value, Found
}

// instrumentFindings judge whether each hand instrument can prove the sharing asked for: its error at bus.nominal against the
// setpoint error that the share tolerance leaves, share_tolerance·ΔV ⁄ (2(1 − w_min)), with the least droop voltage of the
// infeeds.
func instrumentFindings(s site.Site) []finding.Finding {
	f := finding.Finding{ID: "droop.instrument", Title: "Error of the instrument at bus.nominal", Unit: "V",
		Basis: "e ≤ share_tolerance·ΔV⁄(2(1 − w_min)); " + ownDerivation}
	p := plan(s)
	missing := p.missing
	missing.Need("load.share_tolerance", loadOf(s).ShareTolerance.IsGiven())
	able := false
	for _, i := range s.Instruments {
		able = able || i.HasAccuracy
	}
	missing.Need("instrument.accuracy", able)
	if len(missing) > 0 {
		return []finding.Finding{f.Lacking(missing...)}
	}
	var all []finding.Finding
	for _, i := range s.Instruments {
		if i.HasAccuracy {
			f.Subject = i.Name
			all = append(all, instrumentFinding(s, p, f, i))
		}
	}
	return all
}

func instrumentFinding(s site.Site, p planned, f finding.Finding, i site.Instrument) finding.Finding {
	errorAt := float64(i.ErrorAt(s.Bus.Nominal.Nominal))
	x := float64(loadOf(s).ShareTolerance.Nominal)
	dV, smallest := math.Inf(1), math.Inf(1)
	for _, source := range p.sources {
		dV = math.Min(dV, float64(source.Droop)*float64(source.Rated))
		smallest = math.Min(smallest, float64(source.Rated))
	}
	weight := smallest / float64(ratedSum(p.sources))
	w := finding.Explain(f.Basis, ownDerivation, "constant load current; the instrument sets and reads the setpoints")
	w.Given("of_reading", "error of the reading", "1", float64(i.OfReading))
	w.Given("plus", "error besides", "V", float64(i.Plus.Nominal))
	w.Given("V_nom", "nominal bus voltage", "V", float64(s.Bus.Nominal.Nominal))
	w.Spread("an error has no tolerance", nil, nil)
	if weight >= 1 {
		f = f.Stated(finding.Exactly(errorAt))
		f.Because = append(f.Because, "a single infeed shares with nobody")
	} else {
		limit := x * dV / (2 * (1 - weight))
		f = f.Judged(finding.Exactly(errorAt), finding.AtMost(limit), 0)
		w.Given("x", "load.share_tolerance", "1", x)
		w.Given("dV", "least droop voltage at rated current", "V", dV)
		w.Given("w_min", "the smallest infeed's part of the ratings", "1", weight)
		w.Step("e_limit", "x * dV / (2 * (1 - w_min))", "V", limit)
		f = mendInstrument(s, f, i, limit)
	}
	w.Step("e", "of_reading * V_nom + plus", "V", errorAt)
	f.Explanation = w.Done()
	return f
}

func mendInstrument(s site.Site, f finding.Finding, i site.Instrument, limit float64) finding.Finding {
	if f.Verdict == finding.Pass {
		return f
	}
	f.Remedy = fmt.Sprintf("use an instrument with an error of at most %.4g V at %.5g V", limit, float64(s.Bus.Nominal.Nominal))
	if room := limit - float64(i.Plus.Nominal); room > 0 {
		was := float64(i.OfReading)
		f.Changes = []finding.Change{{Key: "instrument.accuracy.of_reading", Subject: i.Name, Unit: "1", Was: was,
			Value: remedy.AwayFrom(was, room/float64(s.Bus.Nominal.Nominal))}}
		f.Remedy += ": " + remedy.Phrase(f.Changes)
	}
	return f
}

// registers give setpoint and droop of the commissioned converter as the raw numbers to key in.
func registers(s site.Site, r Registers) finding.Finding {
	f := finding.Finding{ID: "droop.registers", Title: "Setpoint and droop as raw register numbers", Unit: "1",
		Basis: "raw = (value − offset)⁄scale of the map's voltage-setpoint and droop-setting"}
	p := plan(s)
	missing := p.missing
	if len(missing) == 0 && r == nil {
		missing.Add("device.map")
	}
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	return rawNumbers(f, p.sources[0], r)
}
