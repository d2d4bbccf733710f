package discharge

import (
	"math"
	"testing"

	"chargehand/commission/finding/findingtest"
)

// The discharge with a filter that joins, against ngspice 39 with a real diode, testdata/discharge.cir.
func TestDischargeAgreesWithNgspice(t *testing.T) {
	want := findingtest.Stored(t, "testdata/discharge.out")
	b := Bus{Link: 11.7e-3, Filter: 0.8e-3, Held: 821.7, Bleeder: 22e3}
	got := map[string]float64{
		"t_joint": float64(b.Time(1070, 821.7)), "t_touch": float64(b.Time(1070, 60)), "v_300s": float64(b.VoltageAt(1070, 300)),
	}
	for name, w := range want {
		if g, ok := got[name]; !ok || math.Abs(g-w) > 1e-4*w {
			t.Errorf("%s = %v, want %v by ngspice", name, g, w)
		}
	}
}
