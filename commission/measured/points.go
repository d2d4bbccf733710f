package measured

import (
	"fmt"
	"math"
	"time"

	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/signal"
	"chargehand/commission/site"
)

// Comparison is one reading of the device beside one of an instrument, taken together.
type Comparison struct {
	Device, Instrument quantity.Voltage
	Error              quantity.Voltage // of the instrument at this reading
}

// Sensor judges a voltage signal of the device against an instrument, at one level or at several: measured.sensor with the
// signal as its subject. At two levels that lie far enough apart a gain is told from an offset.
func Sensor(s site.Site, n signal.Name, comparisons ...Comparison) finding.Finding {
	out := verdictFinding("measured.sensor", "reading of the device against an instrument", "V", "difference of two readings taken together; limit is the signal's measurement error, guard band the instrument's")
	out.Subject = string(n)
	allowed := float64(s.Bus.Error())
	if n == signal.SourceVoltage || n == signal.StarPointVoltage {
		allowed = float64(s.Source.Error())
	}
	if len(comparisons) == 0 {
		return cannot(out, "nothing was compared")
	}
	out.Verdict = finding.Pass
	worst := math.Inf(-1)
	for _, c := range comparisons {
		d := float64(c.Device - c.Instrument)
		if math.IsNaN(d) || math.IsInf(d, 0) {
			return cannot(out, "a reading is not a number")
		}
		m := measurement{value: d, bound: float64(c.Error)}
		b := band{-allowed, 0, allowed}
		verdict, text := judge(m, b, fmt.Sprintf("at %s the device reads", number(float64(c.Instrument), "V")), "V")
		if math.Abs(d) > worst {
			worst = math.Abs(d)
			parts, because := out.Parts, out.Because
			kept := out.Verdict
			out = withMeasurement(out, m, b)
			out.Parts, out.Because, out.Verdict = parts, because, kept
		}
		out.Verdict = finding.Worst(out.Verdict, verdict)
		out.Because = append(out.Because, text)
	}
	if out.Verdict == finding.Fail {
		out.Cause = sensorCauses(comparisons, allowed)
	}
	return out
}

// sensorCauses tells gain, offset and a wrong scale apart where the levels allow it.
func sensorCauses(comparisons []Comparison, allowed float64) []finding.Cause {
	low, high := comparisons[0], comparisons[0]
	for _, c := range comparisons {
		if math.Abs(float64(c.Instrument)) < math.Abs(float64(low.Instrument)) {
			low = c
		}
		if math.Abs(float64(c.Instrument)) > math.Abs(float64(high.Instrument)) {
			high = c
		}
	}
	ratio := float64(high.Device) / float64(high.Instrument)
	difference := float64(high.Device - high.Instrument)
	evidence := []string{fmt.Sprintf("device %s, instrument %s: ratio %.3f, difference %s", number(float64(high.Device), "V"), number(float64(high.Instrument), "V"), ratio, number(difference, "V"))}
	decades := math.Log10(math.Abs(ratio))
	if math.Abs(decades) > 0.9 && math.Abs(decades-math.Round(decades)) < 0.02 {
		return []finding.Cause{because("scale-tenfold", 0.95, evidence...)}
	}
	atLow := float64(low.Device - low.Instrument)
	apart := math.Abs(float64(high.Instrument-low.Instrument)) > 0.3*math.Abs(float64(high.Instrument))
	if !apart {
		return together(0.8, "the same comparison at another level: same ratio is a gain, same difference an offset", evidence, "sensor-gain", "sensor-offset")
	}
	evidence = append(evidence, fmt.Sprintf("difference %s at %s", number(atLow, "V"), number(float64(low.Instrument), "V")))
	if math.Abs(atLow) > 0.6*math.Abs(difference) {
		return []finding.Cause{because("sensor-offset", 0.9, evidence...), because("sensor-gain", 0.3, evidence...)}
	}
	return []finding.Cause{because("sensor-gain", 0.9, evidence...), because("sensor-offset", 0.3, evidence...)}
}

// Window judges source and bus at rest: the bus must stand above the source by margin_fail, wanted wanted_margin; both
// errors are the guard band. measured.window.
func Window(s site.Site, source, bus quantity.Voltage, sourceError, busError quantity.Voltage) finding.Finding {
	out := verdictFinding("measured.window", "bus above source as measured", "V", "bus less source voltage; guard band from both measuring errors")
	fails, ok := s.Bus.FailingMargin()
	if !ok {
		return cannot(out, "the site states no wanted_margin")
	}
	d := float64(bus - source)
	if math.IsNaN(d) || math.IsInf(d, 0) {
		return cannot(out, "a reading is not a number")
	}
	b := band{float64(fails), float64(s.Bus.WantedMargin.Nominal), math.Inf(1)}
	m := measurement{value: d, bound: math.Hypot(float64(sourceError), float64(busError))}
	verdict, text := judge(m, b, "bus above source", "V")
	out = withMeasurement(out, m, b)
	if verdict == finding.Pass && d < float64(s.Bus.WantedMargin.Nominal) {
		verdict, text = finding.Marginal, text+fmt.Sprintf(": less than the %s wanted", number(float64(s.Bus.WantedMargin.Nominal), "V"))
	}
	out.Verdict, out.Because = verdict, append(out.Because, text)
	low, high := float64(s.Source.LowestRest()), float64(s.Source.HighestRest())
	sensor := float64(sourceError)
	if v := float64(source); v < low-2*sensor || v > high+2*sensor {
		evidence := fmt.Sprintf("source at %s, %s … %s on paper", number(v, "V"), number(low, "V"), number(high, "V"))
		out.Verdict = finding.Fail
		out.Because = append(out.Because, evidence)
		if v < 0 {
			out.Cause = []finding.Cause{because("source-reversed", 0.95, evidence)}
		} else if v < low {
			out.Cause = []finding.Cause{because("source-low", 0.85, evidence), because("sensor-gain", 0.4, evidence)}
		} else {
			out.Cause = []finding.Cause{because("sensor-gain", 0.6, evidence), because(notKnown, 0.3, evidence)}
		}
	}
	return out
}

// CurrentMode judges the power of the converter against its reference; both positive from source to bus. tolerance is of
// the rated power: common practice 2 %. measured.current-mode.
func CurrentMode(s site.Site, reference, measured, u quantity.Power, chargeLimit *quantity.Current) finding.Finding {
	out := verdictFinding("measured.current-mode", "power against its reference", "W", "measured power less reference; limit 2 % of the rated power (common practice); guard band from scatter and current error")
	if s.Converter == nil || !s.Converter.RatedPower.IsGiven() {
		return cannot(out, "the site states no converter.rated_power")
	}
	rated := float64(s.Converter.RatedPower.Nominal)
	if math.IsNaN(float64(measured)) || math.IsNaN(float64(reference)) {
		return cannot(out, "a reading is not a number")
	}
	b := band{float64(reference) - 0.02*rated, float64(reference), float64(reference) + 0.02*rated}
	m := measurement{value: float64(measured), u: float64(u), freedom: 10, bound: currentError / 4 * math.Abs(float64(measured))}
	verdict, text := judge(m, b, "power", "W")
	out = withMeasurement(out, m, b)
	out.Verdict, out.Because = verdict, append(out.Because, text)
	if verdict == finding.Fail {
		out.Cause = powerCauses(reference, measured, chargeLimit, rated)
	}
	return out
}

func powerCauses(reference, measured quantity.Power, chargeLimit *quantity.Current, rated float64) []finding.Cause {
	evidence := []string{fmt.Sprintf("%s asked, %s flow", number(float64(reference), "W"), number(float64(measured), "W"))}
	ratio := float64(measured) / float64(reference)
	switch {
	case reference < 0 && math.Abs(float64(measured)) < 0.03*rated:
		if chargeLimit != nil && *chargeLimit < 1 {
			evidence = append(evidence, fmt.Sprintf("charge limit %s", number(float64(*chargeLimit), "A")))
		}
		return []finding.Cause{because("charger-refuses", 0.9, evidence...)}
	case ratio < -0.8 && ratio > -1.25:
		return []finding.Cause{because("current-reversed", 0.9, evidence...)}
	case ratio > 0 && ratio < 0.95:
		return []finding.Cause{because("limit-too-low", 0.7, evidence...), because(notKnown, 0.4, evidence...)}
	}
	return []finding.Cause{because(notKnown, 0.5, evidence...)}
}

// Observation is what a trip did: at which value it acted, and how long after.
type Observation struct {
	Value, U float64 // in the unit of the trip, U the standard uncertainty
	Unit     string  // "V", "A", "s"
	Acted    bool
	Action   string // what opened or blocked, in words
	Took     time.Duration
}

// Expectation is what a trip should do.
type Expectation struct {
	Name      string
	Low, High float64 // between which it acts
	Within    time.Duration
}

// Trip judges one trip or interlock: measured.trip with its name as subject.
func Trip(expected Expectation, observed Observation) finding.Finding {
	out := verdictFinding("measured.trip", "trip as observed", observed.Unit, "observed against its setting; guard band U = 2·u")
	out.Subject = expected.Name
	if !observed.Acted {
		out.Verdict = finding.Fail
		out.Because = append(out.Because, fmt.Sprintf("%s did not act", expected.Name))
		return out
	}
	b := band{expected.Low, (expected.Low + expected.High) / 2, expected.High}
	m := measurement{value: observed.Value, u: observed.U, freedom: 60}
	verdict, text := judge(m, b, "acted at", observed.Unit)
	out = withMeasurement(out, m, b)
	out.Verdict, out.Because = verdict, append(out.Because, text)
	if expected.Within > 0 {
		words := fmt.Sprintf("%s after %v, within %v wanted", observed.Action, observed.Took, expected.Within)
		out.Because = append(out.Because, words)
		if observed.Took > expected.Within {
			out.Verdict = finding.Fail
		}
	}
	return out
}
