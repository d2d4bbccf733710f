package ripple

import (
	"testing"

	"chargehand/commission/finding/findingtest"
)

func TestWholeSites(t *testing.T) { findingtest.AsExpected(t, Findings, "ripple.") }

func TestExplanationsOfWholeSites(t *testing.T) { findingtest.AllExplained(t, Findings) }

func BenchmarkFindings(b *testing.B) {
	s := findingtest.Load(b, "wagtail")
	for b.Loop() {
		Findings(s)
	}
}
