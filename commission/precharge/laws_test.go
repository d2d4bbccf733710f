package precharge

import (
	"testing"

	"chargehand/commission/corner/cornertest"
	"chargehand/commission/finding"
	"chargehand/commission/site"
)

// Every result is monotone in every input, so its corners are exact: no draw inside the tolerances leaves them.
func TestCornersHoldEveryDraw(t *testing.T) {
	for name, draws := range map[string]int{"wagtail": 10_000, "nightjar": 1_000, "ouzel": 1_000} {
		cornertest.Holds(t, load(t, name), judged, draws)
	}
}

func TestWiderTolerancesNeverNarrow(t *testing.T) {
	for _, name := range []string{"wagtail", "nightjar", "ouzel"} {
		cornertest.WidensWith(t, load(t, name), judged)
	}
}

// judged are the findings without the search for remedies.
func judged(s site.Site) []finding.Finding { return assess(s, false).findings() }
