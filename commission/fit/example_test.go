package fit_test

import (
	"fmt"

	"chargehand/commission/fit"
)

// A charge towards 800 V with a time constant of 1.2 s, read every 0.3 s by a register of 1 V.
func ExampleExponential() {
	t := []float64{0, 0.3, 0.6, 0.9, 1.2, 1.5, 1.8, 2.1, 2.4, 2.7, 3, 3.3, 3.6, 3.9}
	v := []float64{0, 177, 315, 422, 506, 571, 621, 661, 692, 716, 734, 749, 760, 769}
	c := fit.Exponential(t, v, fit.Options{Resolution: 1})
	fmt.Printf("%s: %.3f s ± %.3f s towards %.0f V\n", c.Status, c.Tau, fit.Coverage(c.Freedom)*c.TauSE, c.Final)
	// Output: ok: 1.200 s ± 0.003 s towards 800 V
}
