package window

import (
	"fmt"
	"math"

	"chargehand/commission/corner"
	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/remedy"
	"chargehand/commission/site"
)

// HardwareDuty is the least duty the hardware can make: f_sw·(least pulse + dead time). The greatest is 1 less it.
func HardwareDuty(switching quantity.Frequency, minimumPulse, deadTime quantity.Seconds) quantity.Ratio {
	return quantity.Ratio(float64(switching) * float64(minimumPulse+deadTime))
}

// DutyNeed is how far above the source the bus must stand for the least duty: V_source·D ⁄ (1 − D). It is infinite where
// the hardware cannot pulse at all (D ≥ 1).
func DutyNeed(source quantity.Voltage, leastDuty quantity.Ratio) quantity.Voltage {
	if leastDuty >= 1 {
		return quantity.Voltage(math.Inf(1))
	}
	return source * quantity.Voltage(leastDuty/(1-leastDuty))
}

func hardwareDuty(s site.Site) (quantity.Ratio, finding.Missing) {
	var missing finding.Missing
	c := converter(s)
	missing.Need("converter.switching_frequency", c.SwitchingFrequency.IsGiven())
	missing.Need("converter.minimum_pulse", c.MinimumPulse.IsGiven())
	missing.Need("converter.dead_time", c.DeadTime.IsGiven())
	return HardwareDuty(c.SwitchingFrequency.Nominal, c.MinimumPulse.Nominal, c.DeadTime.Nominal), missing
}

// converter is the site's converter; an absent one has nothing given.
func converter(s site.Site) site.Converter {
	if s.Converter == nil {
		return site.Converter{}
	}
	return *s.Converter
}

// marginFinding judges the distance between the lowest bus and the highest source voltage against the larger of margin_fail and
// what the least duty needs, and against the wanted margin.
func marginFinding(s site.Site) finding.Finding {
	f := finding.Finding{
		ID: "window.margin", Title: "Lowest bus above highest source", Unit: "V", Guards: true,
		Basis: "bus-low − source-high ≥ max(margin_fail, source-high·D_hw⁄(1 − D_hw)), wanted_margin; above the bus the freewheel diodes conduct; " + circuitTheory,
	}
	source, missing := sourceHigh(s)
	bus, more := busEnd(s, false)
	duty, yetMore := hardwareDuty(s)
	missing.Add(more...)
	missing.Add(yetMore...)
	failing, ok := s.Bus.FailingMargin()
	missing.Need("bus.wanted_margin", ok)
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	need := func(v float64) float64 { return float64(DutyNeed(quantity.Voltage(v), duty)) }
	limit := math.Max(float64(failing), need(source.values.High))
	wanted := math.Max(0, float64(s.Bus.WantedMargin.Nominal)-limit)
	f = f.Judged(finding.Value{
		Low:     bus.values.Low - source.values.High,
		Nominal: bus.values.Nominal - source.values.Nominal,
		High:    bus.values.High - source.values.Low,
	}, finding.AtLeast(limit), wanted)
	f.Parts = []finding.Part{{Name: "need of the least duty", Unit: "V", Value: finding.Value{
		Low: need(source.values.Low), Nominal: need(source.values.Nominal), High: need(source.values.High)}}}
	f.Because = marginBecause(f, float64(failing), need(source.values.High), float64(s.Bus.WantedMargin.Nominal))
	f.Explanation = marginWorking(f, source, bus, duty, float64(failing))
	if f.Verdict == finding.Fail || f.Verdict == finding.Marginal {
		f.Remedy, f.Changes = raiseBus(s, limit+wanted-f.Value.Low)
	}
	return f
}

func marginBecause(f finding.Finding, failing, need, wanted float64) []string {
	governs := fmt.Sprintf("margin_fail %.4g V governs the limit", failing)
	if need > failing {
		governs = fmt.Sprintf("the least duty needs %.4g V and governs the limit, above margin_fail %.4g V", need, failing)
	}
	because := []string{governs}
	if f.Value.Low < 0 {
		because = append(because, "the source can stand above the bus: its current then flows through the diodes and nobody controls it")
	} else if f.Verdict == finding.Marginal {
		because = append(because, fmt.Sprintf("less than the wanted margin of %.4g V", wanted))
	}
	return because
}

func marginWorking(f finding.Finding, source, bus end, duty quantity.Ratio, failing float64) *finding.Explanation {
	w := finding.Explain(f.Basis, circuitTheory+"; the figures of margin are common practice, 20 V to 30 V", "steady state")
	w.Given("V_bus_low", "lowest steady bus voltage", "V", bus.values.Nominal)
	w.Given("E_high", "rest voltage", "V", source.rest)
	w.Given("I_chg", "greatest charging current, 0 where the limits hold under current", "A", source.current)
	w.Given("R_i", "internal resistance of the source", "Ω", source.internal.Nominal)
	w.Given("e", "measurement error of the source voltage", "V", source.errorBound)
	w.Given("D_hw", "least duty of the hardware, switching frequency × (minimum pulse + dead time)", "1", float64(duty))
	w.Given("m_fail", "margin_fail", "V", failing)
	w.Step("V_source_high", "E_high + I_chg * R_i + e", "V", source.values.Nominal)
	w.Step("need", "V_source_high * D_hw / (1 - D_hw)", "V", f.Parts[0].Value.Nominal)
	w.Step("limit_nominal", "max(m_fail, need)", "V", math.Max(failing, f.Parts[0].Value.Nominal))
	w.Step("margin", "V_bus_low - V_source_high", "V", f.Value.Nominal)
	spreadOf(w, []corner.Axis{source.internal}, func(x []float64) float64 { return -source.current * x[0] })
	return w.Done()
}

// raiseBus is the remedy of lifting every infeed whose lowest voltage is less than `by` above the present lowest.
func raiseBus(s site.Site, by float64) (string, []finding.Change) {
	low, _ := busEnd(s, false)
	want := low.values.Low + by
	var changes []finding.Change
	for _, k := range s.Infeeds {
		single := s
		single.Infeeds = []site.Infeed{k}
		own, _ := busEnd(single, false)
		if short := want - own.values.Low; short > 0 {
			was := float64(k.Setpoint.Nominal)
			changes = append(changes, finding.Change{Key: "infeed.setpoint", Subject: k.Name, Unit: "V", Was: was,
				Value: beyond(was, was+short)})
		}
	}
	text := "raise the lowest bus voltage by " + fmt.Sprintf("%.4g V", by) + ": set " + remedy.Phrase(changes)
	changed, err := remedy.Apply(s, changes...)
	if err != nil {
		return "", nil
	}
	if clash := upperClash(changed); clash != "" {
		text += "; but then " + clash + ": less droop leaves more room on both sides"
	}
	return text, changes
}

// upperClash says which limit above the bus a changed site would run into, and by how much; "" where it stays clear.
func upperClash(s site.Site) string {
	high, missing := busEnd(s, true)
	if len(missing) > 0 {
		return ""
	}
	limit, name := s.Bus.OverVoltageTrip, "the over-voltage trip"
	if s.Bus.Chopper != nil && s.Bus.Chopper.On.IsGiven() {
		limit, name = s.Bus.Chopper.On, "the chopper"
	}
	if !limit.IsGiven() {
		return ""
	}
	over := high.values.High + high.busError - float64(limit.Nominal)
	if over <= 0 {
		return ""
	}
	return fmt.Sprintf("the highest bus voltage %.5g V comes within the measurement error of %s at %.5g V, %.4g V too near",
		high.values.High, name, float64(limit.Nominal), over)
}
