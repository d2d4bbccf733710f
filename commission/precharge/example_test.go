package precharge_test

import (
	"fmt"

	"chargehand/commission/precharge"
)

func ExampleCircuit() {
	charge := precharge.Circuit{EMF: 821.7, Resistor: 100, Series: 0.063, Capacitance: 12.5e-3, Bleeder: 22000}
	settled, _ := charge.Settled()
	fmt.Printf("time constant %.3f\n", charge.TimeConstant())
	fmt.Printf("settles at %.1f\n", settled)
	fmt.Printf("within 25 V after %.2f\n", charge.TimeToClose(25))
	// Output:
	// time constant 1.245 s
	// settles at 818.0 V
	// within 25 V after 4.54 s
}
