package precharge

import (
	"math"
	"testing"

	"chargehand/commission/finding/findingtest"
	"chargehand/commission/quantity"
)

// The whole charge against ngspice 39, testdata/charge.cir: resistors, capacitor, bleeder and a 40 W sink from 350 V on.
func TestChargeAgreesWithNgspice(t *testing.T) {
	want := findingtest.Stored(t, "testdata/charge.out")
	at := func(s quantity.Seconds) float64 { v, _ := ferry.VoltageAt(s); return float64(v) }
	settled, _ := ferry.Settled()
	got := map[string]float64{
		"v_0s5": at(0.5), "v_1s": at(1), "v_2s": at(2), "v_4s": at(4), "v_settled": float64(settled),
		"t_close": float64(ferry.TimeToClose(25)), "w_close": float64(ferry.EnergyToClose(25)),
	}
	for name, w := range want {
		if g, ok := got[name]; !ok || math.Abs(g-w) > 1e-4*w {
			t.Errorf("%s = %v, want %v by ngspice", name, g, w)
		}
	}
}
