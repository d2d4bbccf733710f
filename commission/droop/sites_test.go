package droop

import (
	"testing"

	"chargehand/commission/finding"
	"chargehand/commission/finding/findingtest"
	"chargehand/commission/site"
)

func TestWholeSites(t *testing.T) { findingtest.AsExpected(t, onPaper, "droop.", "cable.") }

func TestExplanationsOfWholeSites(t *testing.T) { findingtest.AllExplained(t, onPaper) }

// onPaper are the findings without a map of registers.
func onPaper(s site.Site) []finding.Finding { return Findings(s, nil) }
