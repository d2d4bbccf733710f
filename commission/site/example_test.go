package site_test

import (
	"fmt"

	"chargehand/commission/site"
)

func ExampleRead() {
	_, _, err := site.Read("x.site.toml", []byte(`format = "chargehand-site/1"
[site]
name = "Ferry Example"
[source]
cells_in_series = 198
cell_max = "3.20 V"
cell_min = "4.15 V"
internal_resistance = "62"
[bus]
nominal = "1000 V"
capacitance = [ { name = "drives", value = "4,7 mF" } ]
[precharge]
resistance = "-33 Ω"
closing_difference = "25 V"
`))
	fmt.Println(err)
	// Output:
	// x.site.toml:7:12: read "4.15 V", wanted at most the cell_max of 3.20 V, for example cell_min = "3.20 V"
	// x.site.toml:8:23: read "62", wanted a unit: µΩ mΩ Ω kΩ MΩ GΩ, for example internal_resistance = "62 Ω"
	// x.site.toml:11:44: read "4,7 mF", wanted a decimal point, for example value = "4.7 mF"
	// x.site.toml:13:14: read "-33 Ω", wanted a resistance above 0, for example resistance = "100 Ω ±5 %"
}

func ExampleExample() {
	text, _ := site.Example()
	s, _, err := site.Read(site.ExampleName, []byte(text))
	fmt.Printf("%s: %.1f to %.1f, %v\n", s.Name, s.Source.LowestRest(), s.Source.HighestRest(), err)
	// Output: Ferry Pipit, forward battery string: 633.6 V to 821.7 V, <nil>
}

func ExampleRevise() {
	text, _ := site.Example()
	revised, _ := site.Revise([]byte(text), map[string]string{"precharge.resistance": "120 Ω ±5 %"})
	s, _, err := site.Read("revised", revised)
	fmt.Println(s.Precharge.Resistance.Nominal, err)
	// Output: 120 Ω <nil>
}
