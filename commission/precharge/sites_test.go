package precharge

import (
	"testing"

	"chargehand/commission/finding"
	"chargehand/commission/finding/findingtest"
	"chargehand/commission/site"
)

func TestWholeSites(t *testing.T) { findingtest.AsExpected(t, Findings, "precharge.") }

func TestExplanationsOfWholeSites(t *testing.T) { findingtest.AllExplained(t, Findings) }

// Every result is monotone in every input, so its corners are exact: no draw inside the tolerances leaves them.
func TestCornersHoldEveryDraw(t *testing.T) { findingtest.CornersHold(t, judged) }

func TestWiderTolerancesNeverNarrow(t *testing.T) { findingtest.NeverNarrows(t, judged) }

// judged are the findings without the search for remedies.
func judged(s site.Site) []finding.Finding { return assess(s, false).findings() }

func BenchmarkFindings(b *testing.B) {
	s := findingtest.Load(b, "wagtail")
	for b.Loop() {
		Findings(s)
	}
}
