package droop

import (
	"fmt"

	"chargehand/commission/finding"
	"chargehand/commission/remedy"
	"chargehand/commission/signal"
)

// rawNumbers fills the finding: the value is the setpoint's raw number, the parts are both.
func rawNumbers(f finding.Finding, own Source, r Registers) finding.Finding {
	setpoint, ok := r.Raw(signal.VoltageSetpoint, float64(own.NoLoad))
	if !ok {
		return f.Lacking("device.map: signal " + string(signal.VoltageSetpoint))
	}
	f = f.Stated(finding.Exactly(float64(setpoint)))
	f.Parts = []finding.Part{{Name: string(signal.VoltageSetpoint), Unit: "1", Value: finding.Exactly(float64(setpoint))}}
	f.Because = []string{fmt.Sprintf("%s is %d", remedy.Figure(float64(own.NoLoad), "V"), setpoint)}
	droop, ok := r.Raw(signal.DroopSetting, float64(own.Droop))
	if !ok {
		f.Because = append(f.Because, "the map has no "+string(signal.DroopSetting)+" that takes it: key in "+remedy.Figure(float64(own.Droop), "V/A"))
		return f
	}
	f.Parts = append(f.Parts, finding.Part{Name: string(signal.DroopSetting), Unit: "1", Value: finding.Exactly(float64(droop))})
	f.Because = append(f.Because, fmt.Sprintf("%s is %d", remedy.Figure(float64(own.Droop), "V/A"), droop))
	return f
}
