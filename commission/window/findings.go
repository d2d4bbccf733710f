package window

import (
	"chargehand/commission/corner"
	"chargehand/commission/finding"
	"chargehand/commission/site"
)

// The sources of the formulas of this package.
const (
	circuitTheory    = "circuit theory"
	powerElectronics = "ideal boost converter, any textbook of power electronics"
)

// Findings are the findings of the bus monitor and of the window, in the order of the catalogue.
func Findings(s site.Site) []finding.Finding {
	return []finding.Finding{
		insulationMonitorFinding(s),
		sourceHighFinding(s),
		sourceLowFinding(s),
		busFinding(s, false),
		busFinding(s, true),
		marginFinding(s),
		thresholdsFinding(s),
		dutyFinding(s),
		currentFinding(s),
		chokePeakFinding(s),
		fullPowerFinding(s),
		uncontrolledFinding(s),
		backfeedFinding(s),
	}
}

func sourceHighFinding(s site.Site) finding.Finding {
	e, missing := sourceHigh(s)
	f := finding.Finding{
		ID: "window.source-high", Title: "Source terminal voltage at the top, charging", Unit: "V",
		Basis: "V = E_high + I_chg·R_i + e; " + circuitTheory,
	}
	return e.explained(s, f, missing, "E_high", "I_chg", "+")
}

func sourceLowFinding(s site.Site) finding.Finding {
	e, missing := sourceLow(s)
	f := finding.Finding{
		ID: "window.source-low", Title: "Source terminal voltage at the bottom, discharging", Unit: "V",
		Basis: "V = E_low − I_dis·R_i − e; " + circuitTheory,
	}
	return e.explained(s, f, missing, "E_low", "I_dis", "-")
}

func (e end) explained(s site.Site, f finding.Finding, missing finding.Missing, rest, current, sign string) finding.Finding {
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	f = f.Stated(e.values)
	w := finding.Explain(f.Basis, circuitTheory, "steady state; the error in full and in the adverse sense")
	w.Given(rest, "rest voltage", "V", e.rest)
	w.Given("e", "measurement error of the source voltage", "V", e.errorBound)
	if s.Source.LimitsUnderCurrent {
		w.Step("V", rest+" "+sign+" e", "V", e.values.Nominal)
		f.Because = append(f.Because, "the cell limits hold under current: no drop is added")
	} else {
		w.Given(current, "greatest current in this direction", "A", e.current)
		w.Given("R_i", "internal resistance of the source", "Ω", e.internal.Nominal)
		w.Step("V", rest+" "+sign+" "+current+" * R_i "+sign+" e", "V", e.values.Nominal)
		spreadOf(w, []corner.Axis{e.internal}, func(x []float64) float64 { return e.current * x[0] })
	}
	f.Explanation = w.Done()
	return f
}

// spreadOf notes the governing corner and the shares of a result over its axes.
func spreadOf(w *finding.Working, axes []corner.Axis, f func(x []float64) float64) {
	spread := corner.Over(axes, f)
	w.Spread(corner.DescribeEnds(axes, spread), corner.Names(axes), spread.Moves)
}

func busFinding(s site.Site, high bool) finding.Finding {
	f := finding.Finding{
		ID: "window.bus-low", Title: "Lowest steady bus voltage", Unit: "V",
		Basis: "V = V_set − d·I_rated − e_reg − e_bus − V_pp⁄2, least of all infeeds; " + circuitTheory,
	}
	sign := "-"
	if high {
		f.ID, f.Title, sign = "window.bus-high", "Highest steady bus voltage", "+"
		f.Basis = "V = V_set + d·I_rated + e_reg + e_bus + V_pp⁄2, greatest of all infeeds, droop where it regenerates; " + circuitTheory
	}
	e, missing := busEnd(s, high)
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	f = f.Stated(e.values)
	f.Because = append(f.Because, "set by the infeed "+e.infeed.Name)
	w := finding.Explain(f.Basis, circuitTheory, "steady state within the rated currents")
	w.Given("V_set", "no-load setpoint of "+e.infeed.Name, "V", e.setpoint)
	w.Given("dV", "droop at rated current, 0 upwards where it does not regenerate", "V", e.droop)
	w.Given("e_reg", "regulation error", "V", e.regulation)
	w.Given("e_bus", "measurement error of the bus voltage", "V", e.busError)
	w.Given("V_pp", "ripple, peak to peak", "V", e.swing)
	w.Step("V", "V_set "+sign+" dV "+sign+" e_reg "+sign+" e_bus "+sign+" V_pp / 2", "V", e.values.Nominal)
	w.Spread("errors enter in full; no tolerance enters", nil, nil)
	f.Explanation = w.Done()
	return f
}
