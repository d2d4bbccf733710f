package window

import (
	"testing"

	"chargehand/commission/finding/findingtest"
)

func TestWholeSites(t *testing.T) { findingtest.AsExpected(t, Findings, "window.", "bus.") }

func TestExplanationsOfWholeSites(t *testing.T) { findingtest.AllExplained(t, Findings) }

// Every result is monotone in every input, so its corners are exact: no draw inside the tolerances leaves them. The nominal
// of window.duty is another formula than its ends: at the mean of the rest voltages and the nominal bus.
func TestCornersHoldEveryDraw(t *testing.T) { findingtest.CornersHold(t, Findings, "window.duty") }

func TestWiderTolerancesNeverNarrow(t *testing.T) {
	findingtest.NeverNarrows(t, Findings, "window.duty")
}

func BenchmarkFindings(b *testing.B) {
	s := findingtest.Load(b, "wagtail")
	for b.Loop() {
		Findings(s)
	}
}
