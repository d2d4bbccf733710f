package precharge

import (
	"math"
	"testing"

	"chargehand/commission/corner"
	"chargehand/commission/finding/findingtest"
	"chargehand/commission/quantity"
)

// The calculation "precharge_corners" of public-cases.json: every extreme over all corners of EMF, resistor, bank, bleeder
// and of the load being on or off, enumerated there and here.
func TestCornersOnPublicCases(t *testing.T) {
	cases := findingtest.Cases(t, "precharge_corners")
	if len(cases) == 0 {
		t.Fatal("public-cases.json has no precharge_corners")
	}
	for _, c := range cases {
		low, high := connected(c)
		axes := []corner.Axis{
			{Name: "EMF", Low: c.In("emf_min_V"), Nominal: c.In("emf_max_V"), High: c.In("emf_max_V")},
			tolerated("R", c.In("r_pre_ohm"), c.In("r_pre_tol")),
			{Name: "C", Low: low, Nominal: (low + high) / 2, High: high},
			tolerated("R_b", c.In("r_bleed_ohm"), c.In("r_bleed_tol")),
			{Name: "P", Low: 0, Nominal: c.In("p_load_W"), High: c.In("p_load_W")},
		}
		over := func(result func(Circuit) float64) corner.Spread {
			return corner.Over(axes, func(x []float64) float64 {
				return result(Circuit{EMF: quantity.Voltage(x[0]), Resistor: quantity.Resistance(x[1]), Capacitance: quantity.Capacitance(x[2]),
					Bleeder: quantity.Resistance(x[3]), Auxiliary: quantity.Power(x[4]), StartsAt: quantity.Voltage(c.In("v_on_V"))})
			})
		}
		difference := quantity.Voltage(c.In("dv_close_V"))
		closing := over(func(k Circuit) float64 { return float64(k.TimeToClose(difference)) })
		tau := over(func(k Circuit) float64 { return float64(k.TimeConstant()) })
		got := map[string]any{
			"t_close_max_s": closing.High, "t_close_min_s": closing.Low, "any_corner_stalls": math.IsInf(closing.High, 1),
			"p_peak_max_W":      over(func(k Circuit) float64 { return float64(k.PeakPower()) }).High,
			"i_peak_max_A":      over(func(k Circuit) float64 { return float64(k.PeakCurrent()) }).High,
			"e_res_close_max_J": over(func(k Circuit) float64 { return float64(k.EnergyToClose(difference)) }).High,
			"tau_max_s":         tau.High,
			"tau_min_s":         tau.Low,
			"c_min_F":           low,
			"c_max_F":           high,
		}
		c.Check(t, got)
	}
}

func tolerated(name string, nominal, tolerance float64) corner.Axis {
	return corner.Axis{Name: name, Low: nominal * (1 - tolerance), Nominal: nominal, High: nominal * (1 + tolerance)}
}

// connected is the least and the greatest capacitance of the banks that are on the bus.
func connected(c findingtest.Case) (low, high float64) {
	for _, entry := range c.Inputs["caps"].([]any) {
		bank := entry.(map[string]any)
		if on, stated := bank["connected"].(bool); stated && !on {
			continue
		}
		value := bank["c_F"].(float64)
		tolerance, _ := bank["tol_frac"].(float64)
		low, high = low+value*(1-tolerance), high+value*(1+tolerance)
	}
	return low, high
}
