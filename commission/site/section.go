package site

import (
	"fmt"
	"math"

	"chargehand/commission/document"
	"chargehand/commission/quantity"
)

// sections are the sizes of IEC 60228:2004 in mm², from 10 to 400, of which the resistance is known here; [StandardSections]
// gives them to whoever holds the resistances, and a test there keeps both alike.
var sections = [...]float64{10, 16, 25, 35, 50, 70, 95, 120, 150, 185, 240, 300, 400}

// StandardSections are the conductor sizes that a cable's section may have, ascending.
func StandardSections() []quantity.Area {
	areas := make([]quantity.Area, len(sections))
	for k, mm2 := range sections {
		areas[k] = quantity.Area(mm2 * 1e-6)
	}
	return areas
}

// checkSection refuses a section between the sizes of the standard: no maximum resistance is laid down for it. It names the
// sizes on either side, and shows the larger, or the largest there is.
func checkSection(t *document.Table, section quantity.Entered[quantity.Area]) {
	if !section.IsGiven() {
		return
	}
	mm2 := float64(section.Nominal) * 1e6
	below, above := math.NaN(), math.NaN()
	for _, size := range sections {
		switch {
		case math.Abs(size-mm2) <= 1e-6:
			return
		case size < mm2:
			below = size
		case math.IsNaN(above):
			above = size
		}
	}
	wanted, shown := "a size of IEC 60228, 10 mm² to 400 mm²; ", above
	switch {
	case math.IsNaN(below):
		wanted += fmt.Sprintf("the smallest is %g mm²", above)
	case math.IsNaN(above):
		wanted, shown = wanted+fmt.Sprintf("the largest is %g mm²", below), below
	default:
		wanted += fmt.Sprintf("the nearest are %g mm² and %g mm²", below, above)
	}
	t.Refuse("section", wanted, fmt.Sprintf(`section = "%g mm²"`, shown))
}
