package walk

import "chargehand/commission/signal"

// The trips and interlocks that stage 10 provokes: the subjects of measured.trip.
const (
	EmergencyStop   = "emergency-stop"
	TimeOut         = "time-out"
	BypassLost      = "bypass-lost"
	OverVoltage     = "over-voltage"
	UnderVoltage    = "under-voltage"
	SourceWithdrawn = "source-withdrawn"
	EarthFault      = "earth-fault"
)

// RawNumber is what a setting's raw number is called among a point's readings.
func RawNumber(name signal.Name) string { return string(name) + " as raw number" }

// ResponseTime is what is read by hand at a trip whose signals are not in the map: from its provocation to the response.
const ResponseTime = "response time"

// tripFindings are what binds a point of stage 10.
func tripFindings(subjects ...string) []string {
	var ids []string
	for _, subject := range subjects {
		ids = append(ids, "measured.trip:"+subject)
	}
	return ids
}
