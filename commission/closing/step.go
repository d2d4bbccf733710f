package closing

import (
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

// step is the true difference across the bypass when it closes: the closing difference, and what both measurement errors
// may take from it or add to it. High is the greatest that may be expected.
func step(s site.Site) quantity.Spread[quantity.Voltage] {
	difference, errors := s.Precharge.ClosingDifference.Nominal, s.Source.Error()+s.Bus.Error()
	return quantity.Spread[quantity.Voltage]{Low: max(0, difference-errors), Nominal: difference, High: difference + errors}
}
