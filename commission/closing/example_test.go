package closing_test

import (
	"fmt"

	"chargehand/commission/closing"
)

func ExampleLoop() {
	bypass := closing.Loop{Voltage: 25, Resistance: 0.06, Inductance: 138e-6, Capacitance: 8e-3}
	fmt.Printf("damping %.2f, peak %.1f, the link ends %.1f above the source\n", float64(bypass.Damping()), bypass.PeakCurrent(), bypass.Beyond())
	// Output:
	// damping 0.23, peak 139.0 A, the link ends 12.0 V above the source
}
