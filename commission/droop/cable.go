package droop

import (
	"chargehand/commission/finding"
	"chargehand/commission/site"
)

// cables state the drop of each infeed's cable at rated current.
func cables(s site.Site) []finding.Finding {
	f := finding.Finding{ID: "cable.drop", Title: "Drop in the cable at rated current", Unit: "V",
		Basis: "I_rated·2·length·R′·(1 + 0.00393·(T − 20 °C)), both conductors; IEC 60228:2004 tables 2 and 3, plain copper"}
	if len(s.Infeeds) == 0 {
		return []finding.Finding{f.Lacking("infeed")}
	}
	var all []finding.Finding
	for _, k := range s.Infeeds {
		f.Subject = k.Name
		all = append(all, cableDrop(f, k))
	}
	return all
}

func cableDrop(f finding.Finding, k site.Infeed) finding.Finding {
	resistance, lacking := CableResistance(k.Cable)
	missing := finding.Missing(lacking)
	missing.Need("infeed.rated_current", k.RatedCurrent.IsGiven())
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	at := finding.Value{Low: float64(resistance.Low), Nominal: float64(resistance.Nominal), High: float64(resistance.High)}
	rated := k.RatedCurrent
	f = f.Stated(finding.Value{Low: at.Low * float64(rated.Low), Nominal: at.Nominal * float64(rated.Nominal), High: at.High * float64(rated.High)})
	f.Parts = []finding.Part{{Name: "resistance at temperature", Unit: "Ω", Value: at}}
	w := finding.Explain(f.Basis, "IEC 60228:2004, plain copper", "greatest resistance the standard allows; sections of its table")
	w.Given("I_rated", "rated current, bus side", "A", float64(rated.Nominal))
	if k.Cable == nil {
		f.Because = append(f.Because, "no infeed.cable: taken as no resistance")
		w.Given("R", "resistance of the cable", "Ω", 0)
	} else {
		perMetre, _ := ConductorResistance(k.Cable.Section.Nominal, k.Cable.Class, 20)
		w.Given("R_20", "resistance of one conductor per metre at 20 °C", "Ω/m", perMetre)
		w.Given("length", "length one way", "m", float64(k.Cable.Length.Nominal))
		w.Given("T", "conductor temperature", "°C", float64(k.Cable.Temperature.Nominal))
		w.Step("R", "2 * length * R_20 * (1 + 0.00393 * (T - 20))", "Ω", at.Nominal)
	}
	w.Step("dV", "I_rated * R", "V", f.Value.Nominal)
	w.Spread("grows with length, temperature and current", []string{"infeed.cable"}, []float64{f.Value.High - f.Value.Low})
	f.Explanation = w.Done()
	return f
}
