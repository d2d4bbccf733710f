package closing

import (
	"testing"

	"chargehand/commission/finding/findingtest"
)

func TestWholeSites(t *testing.T) { findingtest.AsExpected(t, Findings, "closing.") }

func TestExplanationsOfWholeSites(t *testing.T) { findingtest.AllExplained(t, Findings) }

// Every result is monotone in every input, so its corners are exact: no draw inside the tolerances leaves them.
func TestCornersHoldEveryDraw(t *testing.T) { findingtest.CornersHold(t, Findings) }

func TestWiderTolerancesNeverNarrow(t *testing.T) { findingtest.NeverNarrows(t, Findings) }

func BenchmarkFindings(b *testing.B) {
	s := findingtest.Load(b, "wagtail")
	for b.Loop() {
		Findings(s)
	}
}
