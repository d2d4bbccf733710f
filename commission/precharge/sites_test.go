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
func TestCornersHoldEveryDraw(t *testing.T) { findingtest.CornersHold(t, verdicts) }

func TestWiderTolerancesNeverNarrow(t *testing.T) { findingtest.NeverNarrows(t, verdicts) }

// verdicts are the findings without workings and remedies.
func verdicts(s site.Site) []finding.Finding { return assess(s).findings() }
