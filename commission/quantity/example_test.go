package quantity_test

import (
	"fmt"

	"chargehand/commission/quantity"
)

func ExampleParse() {
	r, refusal := quantity.Parse[quantity.Resistance]("33 Ω ±5 %", quantity.Rule{Sign: quantity.Positive, Tolerance: true})
	fmt.Printf("%.2f … %.2f (typed %q), %v\n", r.Low, r.High, r.Text, refusal == nil)

	_, refusal = quantity.Parse[quantity.Capacitance]("4,7 mF", quantity.Rule{})
	fmt.Println(refusal)
	// Output:
	// 31.35 Ω … 34.65 Ω (typed "33 Ω ±5 %"), true
	// read "4,7 mF", wanted a decimal point, for example 4.7 mF
}

func ExampleEngineering() {
	fmt.Println(quantity.Engineering(4280, "J", 3))
	fmt.Println(quantity.Engineering(0.2451, "V", 3))
	fmt.Println(quantity.Engineering(1034.6, "V", 3))
	// Output:
	// 4.28 kJ
	// 245 mV
	// 1035 V
}

func ExampleVoltage_Format() {
	fmt.Printf("%.1f\n", 565*quantity.Volt)
	// Output: 565.0 V
}
