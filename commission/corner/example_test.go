package corner_test

import (
	"fmt"

	"chargehand/commission/corner"
)

// A resistor and a capacitor of five and twenty per cent: the time constant over its four corners, by hand
// 95 Ω·8 mF = 0.76 s to 105 Ω·12 mF = 1.26 s.
func ExampleOver() {
	axes := []corner.Axis{
		{Name: "resistance", Low: 95, Nominal: 100, High: 105},
		{Name: "capacitance", Low: 8e-3, Nominal: 10e-3, High: 12e-3},
	}
	tau := corner.Over(axes, func(x []float64) float64 { return x[0] * x[1] })
	fmt.Printf("%.2f … %.2f … %.2f s\n", tau.Low, tau.Nominal, tau.High)
	fmt.Println("greatest with", corner.Describe(axes, tau.AtHigh))
	// Output:
	// 0.76 … 1.00 … 1.26 s
	// greatest with resistance at its greatest, capacitance at its greatest
}
