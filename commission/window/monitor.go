package window

import (
	"fmt"

	"chargehand/commission/finding"
	"chargehand/commission/site"
)

// insulationMonitorFinding counts the active insulation monitors. A non-isolated converter joins source and bus into one system,
// and in one galvanically connected insulated system exactly one may be active (IEC 61557-8 and IEC 60364-5-53, clauses
// from memory). Elsewhere the count is only stated.
func insulationMonitorFinding(s site.Site) finding.Finding {
	f := finding.Finding{
		ID: "bus.insulation-monitor", Title: "Active insulation monitors in the coupled system", Unit: "1", Guards: true,
		Basis: "one active monitor per galvanically connected insulated system; IEC 61557-8, IEC 60364-5-53, clauses from memory",
	}
	active, where := 0, ""
	w := finding.Explain("n = sum of a_k, a_k = 1 where monitor k is active", f.Basis, "source and bus joined by a non-isolated converter")
	sum := "0"
	for i, m := range s.Bus.InsulationMonitors {
		value := 0.0
		if m.Active {
			active++
			value, where = 1, m.Where
		}
		name := fmt.Sprintf("a_%d", i+1)
		w.Given(name, "active at "+m.Where, "1", value)
		sum += " + " + name
	}
	n := float64(active)
	w.Step("n", sum, "1", n)
	w.Spread("a count has no tolerance", nil, nil)
	switch s.Bus.Earthing {
	case "":
		return f.Lacking("bus.earthing")
	case site.Insulated:
		f = f.Judged(finding.Exactly(n), finding.Between(1, 1), 0)
	default:
		f = f.Stated(finding.Exactly(n))
		f.Because = append(f.Because, fmt.Sprintf("the bus is earthed (%s): no monitor is asked for", s.Bus.Earthing))
	}
	f.Explanation = w.Done()
	switch {
	case f.Verdict != finding.Fail:
	case active == 0:
		f.Remedy = "make one insulation monitor active in the coupled system"
	default:
		f.Remedy = fmt.Sprintf("make %d of the %d active monitors inactive before coupling, and keep one, for example at %s", active-1, active, where)
	}
	return f
}
