package measured

import (
	"chargehand/commission/capture"
	"chargehand/commission/finding"
)

// readings looks for faults of map, link and transducers that make the capture's numbers untrue.
func (f *charge) readings() []finding.Cause { return readingCauses(f.paper, f.capture) }

func readingCauses(p paper, c capture.Capture) []finding.Cause { return nil }

// beside looks for what stands beside a charge that is good in itself.
func (f *charge) beside() []finding.Cause { return nil }
