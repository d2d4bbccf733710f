package document_test

import (
	"fmt"

	"chargehand/commission/document"
	"chargehand/commission/quantity"
)

func ExampleOpen() {
	const text = `format = "chargehand-note/1"
voltage = "4,7 V"
Name = "aft"
`
	f := document.Open("note.toml", []byte(text), "chargehand-note/1")
	var voltage quantity.Entered[quantity.Voltage]
	var name string
	document.Quantity(f.Root(), "voltage", &voltage, quantity.Rule{})
	f.Root().Text("name", &name, "aft string")
	fmt.Println(f.Err())
	// Output:
	// note.toml:2:11: read "4,7 V", wanted a decimal point, for example voltage = "4.7 V"
	// note.toml:3:1: read the key Name at the top of the file, wanted keys in lower case exactly: name; or the file is for a newer version of this program, for example name
}

func ExampleRevise() {
	text := []byte("[precharge]\nresistance = \"47 Ω\"  # as on paper\n")
	revised, err := document.Revise(text, map[string]string{"precharge.resistance": "100 Ω ±5 %"})
	fmt.Printf("%s%v\n", revised, err)
	// Output:
	// [precharge]
	// resistance = "100 Ω ±5 %"  # as on paper
	// <nil>
}
