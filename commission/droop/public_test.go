package droop

import (
	"math"
	"testing"

	"chargehand/commission/finding/findingtest"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

func sourcesOf(c findingtest.Case) []Source {
	var sources []Source
	for _, one := range c.Inputs["sources"].([]any) {
		m := one.(map[string]any)
		number := func(name string, otherwise float64) float64 {
			if v, ok := m[name].(float64); ok {
				return v
			}
			return otherwise
		}
		enabled, given := m["enabled"].(bool)
		sources = append(sources, Source{NoLoad: quantity.Voltage(number("v0_V", 0)), Droop: quantity.Droop(number("droop_V_A", 0)),
			Cable: quantity.Resistance(number("r_cable_ohm", 0)), Least: quantity.Current(number("i_min_A", math.Inf(-1))),
			Most: quantity.Current(number("i_max_A", math.Inf(1))), Rated: quantity.Current(number("i_rated_A", 0)), Offline: given && !enabled})
	}
	return sources
}

func loadOfCase(c findingtest.Case) Load {
	return Load{Power: quantity.Power(c.In("p_load_W")), Current: quantity.Current(c.In("i_load_A")), Resistance: quantity.Resistance(c.In("r_load_ohm"))}
}

func plain[Q quantity.Scalar](q Q) float64 { return float64(q) }

// Source of the figures: public-cases.json, piecewise quadratic and independent scanning, ngspice to 6e-7.
func TestPublicDroopSolve(t *testing.T) {
	for _, c := range findingtest.Cases(t, "droop_solve") {
		p := Solve(sourcesOf(c), loadOfCase(c))
		c.Check(t, map[string]any{"status": string(p.Status), "v_bus_V": float64(p.Bus), "i_A": findingtest.List(p.Current, plain),
			"limit":        findingtest.List(p.Limit, func(s LimitState) string { return string(s) }),
			"v_terminal_V": findingtest.List(p.Terminal, plain), "stability_ratio": p.StabilityRatio})
	}
}

// Source: public-cases.json, all 2^N corners.
func TestPublicDroopSharing(t *testing.T) {
	for _, c := range findingtest.Cases(t, "droop_sharing") {
		sources, load := sourcesOf(c), loadOfCase(c)
		e := quantity.Voltage(c.In("e_set_V"))
		errors := make([]quantity.Voltage, len(sources))
		var linear, part []any
		for k, s := range sources {
			errors[k] = e
			d := float64(LinearDeviation(sources, e, k))
			linear, part = append(linear, d), append(part, d/float64(s.Rated))
		}
		share := Share(sources, errors, load)
		bus := bandOf(sources, errors, load)
		c.Check(t, map[string]any{"di_lin_A": linear, "di_lin_frac": part,
			"i_nominal_A":            findingtest.List(share.Current, func(s quantity.Spread[quantity.Current]) float64 { return float64(s.Nominal) }),
			"i_max_A":                findingtest.List(share.Current, func(s quantity.Spread[quantity.Current]) float64 { return float64(s.High) }),
			"i_min_A":                findingtest.List(share.Current, func(s quantity.Spread[quantity.Current]) float64 { return float64(s.Low) }),
			"nominal_share_err_frac": findingtest.List(share.Deviation, func(s quantity.Spread[quantity.Ratio]) float64 { return float64(s.Nominal) }),
			"v_bus_min_V":            bus.value.Low, "v_bus_max_V": bus.value.High})
	}
}

func TestPublicDroopRecommend(t *testing.T) {
	for _, c := range findingtest.Cases(t, "droop_recommend") {
		v := func(name string, otherwise float64) quantity.Voltage {
			return quantity.Voltage(c.Input(name, otherwise))
		}
		w := Wish{SourceHigh: v("v_src_max_V", 0), LowerMargin: v("margin_lo_V", 0), LowestBus: v("v_bus_min_allowed_V", math.Inf(-1)), UpperLimit: v("v_ov_V", 0),
			UpperMargin: v("margin_hi_V", 0), SetpointError: v("e_meas_V", 0), ShareTolerance: quantity.Ratio(c.In("share_err_max_frac")),
			Ripple: v("ripple_pp_V", 0), LoadFraction: quantity.Ratio(c.Input("load_frac", 1)), RegenerationShare: quantity.Ratio(c.Input("regen_frac", 1))}
		for _, i := range c.Inputs["i_rated_A"].([]any) {
			w.Rated = append(w.Rated, quantity.Current(i.(float64)))
		}
		a := Advise(w)
		c.Check(t, map[string]any{"dv_min_V": float64(a.Least), "dv_max_V": float64(a.Greatest), "feasible": a.Feasible,
			"v_set_lo_V": float64(a.SetpointLow), "v_set_hi_V": float64(a.SetpointHigh), "droop_rec_V_A": findingtest.List(a.Droop, plain),
			"share_err_frac": 2 * float64(w.SetpointError) * (1 - a.SmallestShareWeight) / float64(a.Least)})
		// At the greatest error the room is used up exactly.
		w.SetpointError = w.GreatestError()
		if a := Advise(w); math.Abs(float64(a.Least-a.Greatest)) > 1e-9 {
			t.Errorf("%s: Advise(greatest error) = least %v, greatest %v, want them equal", c.ID, a.Least, a.Greatest)
		}
	}
}

// Two sources, hand calculation (textbook example of droop sharing): 700 V, 0.1 Ω each, cables 0.01 Ω and 0.03 Ω, 200 A.
func TestTwoSourcesByHand(t *testing.T) {
	both := []Source{
		{NoLoad: 700, Droop: 0.1, Cable: 0.01, Least: quantity.Current(math.Inf(-1)), Most: quantity.Current(math.Inf(1))},
		{NoLoad: 700, Droop: 0.1, Cable: 0.03, Least: quantity.Current(math.Inf(-1)), Most: quantity.Current(math.Inf(1))},
	}
	p := Solve(both, Load{Current: 200})
	for k, want := range []quantity.Current{108.333, 91.667} {
		if math.Abs(float64(p.Current[k]-want)) > 1e-3 {
			t.Errorf("Solve(two sources, 200 A).Current[%d] = %v, want %v", k, p.Current[k], want)
		}
	}
	if math.Abs(float64(p.Bus)-688.083) > 1e-3 {
		t.Errorf("Solve(two sources, 200 A).Bus = %v, want 688.083 V", p.Bus)
	}
}

// Published figure: to share within 10 % the voltage must be set within 0.35 % (Irving and Jovanovic, APEC 2000, abstract). The
// droop behind it is not in the abstract; 0.35⁄10 corresponds to 3.5 % for two equal infeeds of a bus: x = 2e(1 − ½)⁄ΔV = e⁄ΔV.
func TestPublishedSetpointAccuracy(t *testing.T) {
	a := Advise(Wish{Rated: []quantity.Current{100, 100}, SetpointError: 0.0035 * 1000, ShareTolerance: 0.1, UpperLimit: 2000, LoadFraction: 1, RegenerationShare: 1, LowestBus: quantity.Voltage(math.Inf(-1))})
	if math.Abs(float64(a.Least)-35) > 1e-9 {
		t.Errorf("Advise(0.35 %%, 10 %%).Least = %v, want 35 V of 1000 V", a.Least)
	}
}

func TestPercentIsTheInverseOfAt(t *testing.T) {
	d := quantity.DroopSetting{Percent: 0.03, Text: "3 %"}
	perAmpere := d.At(1000, 220)
	if want := quantity.Droop(30. / 220); math.Abs(float64(perAmpere-want)) > 1e-15 {
		t.Errorf("At(3 %% of 1000 V at 220 A) = %v, want %v", perAmpere, want)
	}
	if got := Percent(perAmpere, 1000, 220); math.Abs(float64(got)-0.03) > 1e-15 {
		t.Errorf("Percent(%v) = %v, want 3 %%", perAmpere, got)
	}
}

// IEC 60228:2004, and the standard's temperature form 254.5⁄(234.5 + t) of copper, which 1 + 0.00393·(t − 20) follows to
// within 0.02 %: 95 mm² class 5 at 70 °C is 0.24647 Ω/km by it.
func TestConductorResistance(t *testing.T) {
	for _, row := range []struct {
		mm2         float64
		class       int
		temperature quantity.Temperature
		want        float64 // Ω/km
	}{{95, 5, 20, 0.206}, {95, 5, 70, 0.24647}, {95, 5, 90, 0.26266}, {120, 2, 20, 0.153}, {120, 0, 20, 0.153}, {50, 5, 20, 0.386}, {50, 2, 20, 0.387}, {400, 2, 20, 0.0470}} {
		got, ok := ConductorResistance(quantity.Area(row.mm2*1e-6), row.class, row.temperature)
		if !ok || math.Abs(got*1000-row.want) > 3e-4*row.want {
			t.Errorf("ConductorResistance(%v mm², class %d, %v) = %v Ω/m, %v, want %v Ω/km", row.mm2, row.class, row.temperature, got, ok, row.want)
		}
	}
	for _, section := range []quantity.Area{11e-6, 500e-6, 0, quantity.Area(math.NaN())} {
		if _, ok := ConductorResistance(section, 2, 20); ok {
			t.Errorf("ConductorResistance(%v) = a figure, want none: not a size of the table", section)
		}
	}
	if _, ok := ConductorResistance(95e-6, 1, 20); ok {
		t.Error("ConductorResistance(class 1) = a figure, want none")
	}
}

// Every size that a site file may name has its resistance in both classes, and no other.
func TestConductorsAreTheSectionsOfASite(t *testing.T) {
	sections := site.StandardSections()
	if len(sections) != len(conductors) {
		t.Errorf("conductors = %d, want the %d sections of a site", len(conductors), len(sections))
	}
	for _, section := range sections {
		for _, class := range []int{2, 5} {
			if _, ok := ConductorResistance(section, class, 20); !ok {
				t.Errorf("ConductorResistance(%v, class %d) = none, want one: a site file may name it", section, class)
			}
		}
	}
}
