package registermap_test

import (
	"fmt"

	"chargehand/protocol/registermap"
)

func ExampleRead() {
	m, err := registermap.Read("x.map.toml", []byte(`format = "chargehand-map/1"
word_order = "high-first"
[[signal]]
name = "bus-voltage"
reference = "40101"
type = "u16"
scale = 0.1
unit = "V"
`))
	if err != nil {
		fmt.Println(err)
		return
	}
	p := m.Points[0]
	fmt.Printf("%s: %.1f %s\n", p.Place(), p.Decode([]uint16{7124}).Value, p.Unit)
	// Output: holding 100, 40101: 712.4 V
}
