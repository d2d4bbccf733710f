package unattended

// Acts are what the plant's hand does at a point of a rehearsal, in order, one at each press of a key; none where nothing is
// operated there.
func Acts(point string) []string {
	switch point {
	case "charge.source":
		return []string{IsolatorClose}
	case "charge.rise", "charge.difference":
		return []string{BypassWithhold, PrechargeClose, BypassRelease, PrechargeOpen}
	case "boost.first":
		return []string{PulsesRelease}
	case "boost.step":
		return []string{LoadShare(20), LoadOff}
	case "share.couple":
		return []string{InfeedsOn}
	case "share.stairs":
		return []string{LoadOff, LoadShare(20), LoadShare(40), LoadShare(60), LoadShare(80), LoadShare(50), LoadShare(30), LoadShare(10)}
	case "share.lost":
		return []string{LoadShare(50), InfeedsOff, InfeedsOn}
	case "share.regeneration":
		return []string{LoadOff, Regenerate, LoadOff}
	case "power.keyed":
		return []string{LoadShare(50), PowerMode, PowerReference(20e3)}
	case "trip.earth":
		return []string{EarthTest, EarthTestOff}
	case "trip.source":
		return []string{SourceWithdraw, SourceBack, Reset, PulsesRelease}
	case "trip.bypass-lost":
		return []string{ReportDropped, ReportBack, Reset, PulsesRelease}
	case "trip.voltage":
		return []string{OverVoltageAt(950), OverVoltageOK, Reset, PulsesRelease, UnderVoltageAt(1080), UnderVoltageOK, Reset, PulsesRelease}
	case "trip.stop":
		return []string{VoltageMode, LoadShare(20), Stop, Reset}
	case "trip.time-out":
		return []string{BypassWithhold, PrechargeClose, BypassRelease, Reset}
	case "down.order", "down.discharge":
		return []string{LoadOff, EverythingOff}
	}
	return nil
}
