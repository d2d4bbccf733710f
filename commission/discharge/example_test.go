package discharge_test

import (
	"fmt"

	"chargehand/commission/discharge"
)

func ExampleBus() {
	bus := discharge.Bus{Link: 11.7e-3, Filter: 0.8e-3, Held: 821.7, Bleeder: 22e3}
	fmt.Printf("%.0f from 1070 V to 60 V, %.0f at the start\n", bus.Time(1070, 60), bus.Stored(1070))
	// Output:
	// 788 s from 1070 V to 60 V, 6968 J at the start
}
