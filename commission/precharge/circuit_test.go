package precharge

import (
	"math"
	"testing"

	"chargehand/commission/finding/findingtest"
	"chargehand/commission/quantity"
)

func circuitOf(c findingtest.Case) Circuit {
	link := c.In("c_total_F")
	banks, _ := c.Inputs["caps"].([]any)
	for _, b := range banks {
		bank := b.(map[string]any)
		if bank["connected"] != false {
			link += bank["c_F"].(float64)
		}
	}
	return Circuit{
		EMF: quantity.Voltage(c.In("emf_V")), DiodeDrop: quantity.Voltage(c.In("v_diode_V")),
		Start: quantity.Voltage(c.In("v0_V")), Resistor: quantity.Resistance(c.In("r_pre_ohm")),
		Series:      quantity.Resistance(c.In("r_int_ohm") + c.In("r_other_ohm")),
		Capacitance: quantity.Capacitance(link), Bleeder: quantity.Resistance(c.In("r_bleed_ohm")),
		Auxiliary: quantity.Power(c.In("p_load_W")), StartsAt: quantity.Voltage(c.In("v_on_V")),
		Source: quantity.Capacitance(c.In("c_source_F")),
	}
}

func TestCircuitOnPublicCases(t *testing.T) {
	for _, c := range findingtest.Cases(t, "precharge") {
		circuit := circuitOf(c)
		difference := quantity.Voltage(c.In("dv_close_V"))
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
		if until := quantity.Seconds(c.In("t_energy_s")); until > 0 {
			v, _ := circuit.VoltageAt(until)
			got["e_res_until_t_J"], got["v_at_t_V"] = float64(circuit.EnergyUntil(until)), float64(v)
		}
		if circuit.Source > 0 {
			v, _ := circuit.VoltageAt(circuit.TimeToClose(difference))
			got["v_at_close_V"] = float64(v)
		}
		c.Check(t, findingtest.Numbers(got), "reaches_close", "stall_reason")
		if c.Expected["stall_reason"] == "cpl_equilibrium" && how != AtEquilibrium {
			t.Errorf("%s: Settled() how = %v, want equilibrium below the target", c.ID, how)
		}
	}
}
