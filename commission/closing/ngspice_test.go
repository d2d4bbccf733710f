package closing

import (
	"math"
	"testing"

	"chargehand/commission/finding/findingtest"
)

// Both loops of the example against ngspice 39, testdata/closing.cir.
func TestLoopsAgreeWithNgspice(t *testing.T) {
	want := findingtest.Stored(t, "testdata/closing.out")
	main := Loop{Voltage: 34.1085, Resistance: 0.063, Inductance: 146e-6, Capacitance: 12.5e-3}
	filter := Loop{Voltage: 34.1085, Resistance: 0.064, Inductance: 6.04e-6, Capacitance: 0.8e-3}
	got := map[string]float64{
		"i_main": float64(main.PeakCurrent()), "i_filter": float64(filter.PeakCurrent()),
		"v_main": float64(main.Voltage + main.Beyond()), "t_end": float64(main.End()), "i2t_main": float64(main.I2t()),
	}
	for name, w := range want {
		if g, ok := got[name]; !ok || math.Abs(g-w) > 1e-4*w {
			t.Errorf("%s = %v, want %v by ngspice", name, g, w)
		}
	}
}
