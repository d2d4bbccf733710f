package window

import (
	"testing"

	"chargehand/commission/finding/findingtest"
)

// window.duty's nominal is another formula than its ends: at the mean of the rest voltages and the nominal bus.
func judged(id string) bool { return id != "window.duty" }

func TestCornersContainDraws(t *testing.T) {
	findingtest.Contains(t, load(t, "wagtail"), 10000, Findings, judged)
	findingtest.Contains(t, load(t, "nightjar"), 2000, Findings, judged)
}

func TestWiderNeverNarrows(t *testing.T) {
	for _, name := range []string{"wagtail", "nightjar"} {
		findingtest.NeverNarrows(t, load(t, name), Findings, judged)
	}
}
