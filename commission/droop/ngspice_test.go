package droop

import (
	"math"
	"testing"

	"chargehand/commission/finding/findingtest"
	"chargehand/commission/quantity"
)

// netlistCases are the buses of testdata/bus.cir, case by case.
func netlistCases(t testing.TB) map[string]Point {
	t.Helper()
	infeed := func(v0, r, least, most float64) Source {
		return Source{NoLoad: quantity.Voltage(v0), Droop: quantity.Droop(r), Least: quantity.Current(least), Most: quantity.Current(most)}
	}
	three := []Source{infeed(1000, 0.11, -200, 300), infeed(1000, 0.17, -200, 200), infeed(1004, 0.30, -100, 100)}
	wagtail, _, missing := Sources(findingtest.Load(t, "wagtail"))
	if len(missing) > 0 {
		t.Fatal(missing)
	}
	return map[string]Point{
		"v(b1)": Solve(three, Load{Power: 300e3}),
		"v(b2)": Solve(three, Load{Power: 570e3}),
		"v(b3)": Solve(wagtail, Load{Power: -120e3}),
		"v(b4)": Solve([]Source{infeed(700, 0.11, -500, 500), infeed(700, 0.13, -500, 500)}, Load{Power: 30e3, Current: 100, Resistance: 14}),
		"v(b5)": Solve(wagtail, Load{Power: 200e3}),
	}
}

func compareWithNetlist(t *testing.T, spice map[string]float64) {
	t.Helper()
	cases := netlistCases(t)
	if len(spice) != len(cases) {
		t.Fatalf("voltages = %d, want %d", len(spice), len(cases))
	}
	for node, p := range cases {
		if p.Status != Found || math.Abs(float64(p.Bus)-spice[node]) > 1e-6*spice[node] {
			t.Errorf("Solve(%s) = %s at %v, want %v V of ngspice", node, p.Status, float64(p.Bus), spice[node])
		}
	}
}

// Source: ngspice on testdata/bus.cir, its output kept in testdata/bus.ngspice with the command that made it.
func TestSolveAgainstNetlist(t *testing.T) {
	compareWithNetlist(t, findingtest.Stored(t, "testdata/bus.ngspice"))
}
