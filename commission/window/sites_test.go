package window

import (
	"testing"

	"chargehand/commission/finding"
	"chargehand/commission/finding/findingtest"
	"chargehand/commission/site"
)

func TestWholeSites(t *testing.T) { findingtest.AsExpected(t, Findings, "window.", "bus.") }

func TestExplanationsOfWholeSites(t *testing.T) { findingtest.AllExplained(t, Findings) }

// Every result is monotone in every input, so its corners are exact: no draw inside the tolerances leaves them. The nominal
// of window.duty is another formula than its ends: at the mean of the rest voltages and the nominal bus.
func TestCornersHoldEveryDraw(t *testing.T) { findingtest.CornersHold(t, judged) }

func TestWiderTolerancesNeverNarrow(t *testing.T) {
	findingtest.NeverNarrows(t, Findings, "window.duty")
}

func BenchmarkFindings(b *testing.B) {
	s := findingtest.Load(b, "wagtail")
	for b.Loop() {
		Findings(s)
	}
}

// judged are the findings of the window but window.duty, without the search for remedies.
func judged(s site.Site) []finding.Finding {
	return []finding.Finding{
		sourceHighFinding(s), sourceLowFinding(s), busFinding(s, false), busFinding(s, true), marginFinding(s), thresholdsFinding(s),
		current(s), chokePeak(s), fullPower(s), uncontrolledFinding(s), backfeedFinding(s),
	}
}
