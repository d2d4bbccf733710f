package circuit_test

import (
	"fmt"

	"chargehand/protocol/circuit"
)

// One time constant after the pre-charge contactor closed, 63 % of the source voltage stands on the bus.
func Example() {
	c, err := circuit.New(circuit.Parameters{
		Source:    circuit.Source{EMF: []circuit.ChargePoint{{Drawn: 0, EMF: 800}}, Resistance: 0.05},
		Precharge: circuit.Precharge{Resistor: 99.95},
		Chokes:    []circuit.Choke{{Inductance: 0.4e-3}, {Inductance: 0.4e-3}, {Inductance: 0.4e-3}},
		Bridge:    circuit.Bridge{Efficiency: 1, CurrentLag: 1e-3, DroopLag: 5e-3},
		Bus:       circuit.Bus{Capacitance: 10e-3, Leakage: 1e-9},
	})
	if err != nil {
		fmt.Println(err)
		return
	}
	c.Isolator(true)
	c.Precharge(true)
	if err := c.Step(1.0); err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("%.1f V\n", c.Read().BusVoltage)
	// Output: 505.7 V
}
