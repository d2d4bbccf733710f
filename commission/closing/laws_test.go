package closing

import (
	"testing"

	"chargehand/commission/corner/cornertest"
)

// Every result is monotone in every input, so its corners are exact: no draw inside the tolerances leaves them.
func TestCornersHoldEveryDraw(t *testing.T) {
	for name, draws := range map[string]int{"wagtail": 10_000, "nightjar": 1_000, "ouzel": 1_000} {
		cornertest.Holds(t, load(t, name), Findings, draws)
	}
}

func TestWiderTolerancesNeverNarrow(t *testing.T) {
	for _, name := range []string{"wagtail", "nightjar", "ouzel"} {
		cornertest.WidensWith(t, load(t, name), Findings)
	}
}
