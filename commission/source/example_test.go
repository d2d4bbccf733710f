package source_test

import (
	"fmt"

	"chargehand/commission/source"
)

func ExampleShortCircuit() {
	fmt.Printf("%.0f behind 62 mΩ, %.0f until the fuse pre-arcs\n", source.ShortCircuit(821.7, 0.062), source.FaultEnergy(0.062, 90000))
	// Output:
	// 13253 A behind 62 mΩ, 5580 J until the fuse pre-arcs
}
