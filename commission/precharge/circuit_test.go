package precharge

import (
	"encoding/json"
	"math"
	"os"
	"testing"

	"chargehand/commission/quantity"
)

// publicCase is one worked case of testdata/public-cases.json: closed forms confirmed there by integration to 1e-10 and by
// ngspice to 1e-4.
type publicCase struct {
	ID, Calc string
	Inputs   map[string]json.RawMessage
	Expected map[string]json.RawMessage
	Tol      struct{ Rel, Abs float64 }
}

func publicCases(t *testing.T, calculation string) []publicCase {
	t.Helper()
	raw, err := os.ReadFile("../../testdata/public-cases.json")
	if err != nil {
		t.Fatal(err)
	}
	var file struct{ Cases []publicCase }
	if err := json.Unmarshal(raw, &file); err != nil {
		t.Fatal(err)
	}
	var cases []publicCase
	for _, c := range file.Cases {
		if c.Calc == calculation {
			cases = append(cases, c)
		}
	}
	if len(cases) == 0 {
		t.Fatalf("public-cases.json has no case of %q", calculation)
	}
	return cases
}

// in is an input as a number; 0 where it is absent, which is the default of every optional input used here.
func (c publicCase) in(t *testing.T, name string) float64 {
	t.Helper()
	var v float64
	if raw, ok := c.Inputs[name]; ok {
		if err := json.Unmarshal(raw, &v); err != nil {
			t.Fatalf("%s: input %s: %v", c.ID, name, err)
		}
	}
	return v
}

// compare checks every expected number that got names, and that no expected number is left out.
func (c publicCase) compare(t *testing.T, got map[string]float64, others ...string) {
	t.Helper()
	seen := map[string]bool{}
	for _, name := range others {
		seen[name] = true
	}
	for name, raw := range c.Expected {
		g, ok := got[name]
		if !ok {
			if !seen[name] {
				t.Errorf("%s: expected %s = %s is not computed", c.ID, name, raw)
			}
			continue
		}
		if string(raw) == "null" {
			if !math.IsInf(g, 0) {
				t.Errorf("%s: %s = %v, want none", c.ID, name, g)
			}
			continue
		}
		var want float64
		if err := json.Unmarshal(raw, &want); err != nil {
			t.Fatalf("%s: expected %s: %v", c.ID, name, err)
		}
		if math.Abs(g-want) > c.Tol.Rel*math.Abs(want)+c.Tol.Abs {
			t.Errorf("%s: %s = %v, want %v", c.ID, name, g, want)
		}
	}
}

func (c publicCase) circuit(t *testing.T) Circuit {
	link := c.in(t, "c_total_F")
	if raw, ok := c.Inputs["caps"]; ok {
		var caps []struct {
			C         float64 `json:"c_F"`
			Connected *bool   `json:"connected"`
		}
		if err := json.Unmarshal(raw, &caps); err != nil {
			t.Fatal(err)
		}
		for _, b := range caps {
			if b.Connected == nil || *b.Connected {
				link += b.C
			}
		}
	}
	return Circuit{
		EMF: quantity.Voltage(c.in(t, "emf_V")), DiodeDrop: quantity.Voltage(c.in(t, "v_diode_V")),
		Start: quantity.Voltage(c.in(t, "v0_V")), Resistor: quantity.Resistance(c.in(t, "r_pre_ohm")),
		Series:      quantity.Resistance(c.in(t, "r_int_ohm") + c.in(t, "r_other_ohm")),
		Capacitance: quantity.Capacitance(link), Bleeder: quantity.Resistance(c.in(t, "r_bleed_ohm")),
		Auxiliary: quantity.Power(c.in(t, "p_load_W")), StartsAt: quantity.Voltage(c.in(t, "v_on_V")),
		Source: quantity.Capacitance(c.in(t, "c_source_F")),
	}
}

func TestCircuitOnPublicCases(t *testing.T) {
	reasons := map[string]Settling{`"none"`: AtFinal, `"bleeder"`: AtFinal, `"cpl_equilibrium"`: AtEquilibrium}
	for _, c := range publicCases(t, "precharge") {
		circuit := c.circuit(t)
		difference := quantity.Voltage(c.in(t, "dv_close_V"))
		settled, how := circuit.Settled()
		got := map[string]float64{
			"c_total_F": float64(circuit.Capacitance), "tau_s": float64(circuit.TimeConstant()),
			"i_peak_A": float64(circuit.PeakCurrent()), "p_peak_W": float64(circuit.PeakPower()),
			"t_close_s":      float64(circuit.TimeToClose(difference)),
			"t_x_s":          float64(circuit.TimeTo(0.95 * circuit.EMF)),
			"e_res_close_J":  float64(circuit.EnergyToClose(difference)),
			"pulse_t_s":      float64(circuit.TimeConstant()) / 2,
			"v_stall_V":      float64(settled),
			"p_res_stall_W":  float64(circuit.SettledPower()),
			"p_res_steady_W": float64(circuit.SettledPower()),
		}
		unloaded := circuit
		unloaded.Auxiliary = 0
		final, _ := unloaded.Settled()
		got["v_final_V"], got["v_source_final_V"] = float64(final), float64(final+unloaded.Remaining())
		if net, ok := circuit.LeastNetCurrent(circuit.EMF - difference); ok {
			got["i_net_min_A"] = float64(net)
		}
		if stable, unstable, ok := circuit.Equilibria(); ok {
			got["v_eq_stable_V"], got["v_eq_unstable_V"] = float64(stable), float64(unstable)
			got["p_cpl_max_W"] = float64(circuit.GreatestLoad())
		}
		if circuit.Bleeder == 0 && circuit.Auxiliary == 0 {
			got["e_res_total_J"] = float64(circuit.EnergyUntil(quantity.Seconds(math.Inf(1))))
		}
		if until := quantity.Seconds(c.in(t, "t_energy_s")); until > 0 {
			v, _ := circuit.VoltageAt(until)
			got["e_res_until_t_J"], got["v_at_t_V"] = float64(circuit.EnergyUntil(until)), float64(v)
		}
		if circuit.Source > 0 {
			v, _ := circuit.VoltageAt(circuit.TimeToClose(difference))
			got["v_at_close_V"] = float64(v)
		}
		c.compare(t, got, "reaches_close", "stall_reason")
		if raw, ok := c.Expected["stall_reason"]; ok && reasons[string(raw)] == AtEquilibrium && how != AtEquilibrium {
			t.Errorf("%s: Settled() how = %v, want equilibrium below the target", c.ID, how)
		}
	}
}
