package commission

import (
	"math"
	"strings"
	"time"

	"chargehand/commission/capture"
	"chargehand/commission/finding"
	"chargehand/commission/measured"
	"chargehand/commission/quantity"
	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/commission/walk"
)

// What a trip is held against where no setting of the site says it. All common practice: contactors follow the blocked
// pulses within half a second; pulses are blocked within a tenth of a second; a current below 2 % of the rated one is none;
// a time-out keeps its time to 2 % and a contactor takes a tenth of a second to open; an insulation monitor answers at
// 100 Ω for each volt.
const (
	contactorsWithin  = 0.5
	blockedWithin     = 0.1
	noCurrent         = 0.02
	timeOutTolerance  = 0.02
	contactorOpens    = 0.1
	insulationPerVolt = 100.0
	handTiming        = 0.2 // s, standard uncertainty of a stopwatch in a hand
)

// subjectOf is the subject of "measured.trip:subject".
func subjectOf(id string) string {
	_, subject, _ := strings.Cut(id, ":")
	return subject
}

// nextTrip is the trip that a capture at a point is of: the first that has no finding yet.
func nextTrip(state walk.State, p walk.Point) string {
	subject := ""
	for _, id := range p.Findings {
		subject = subjectOf(id)
		if len(state.Measured(id)) == 0 {
			break
		}
	}
	return subject
}

// limitsOf are the values between which a trip acts, and their unit.
func (r *Run) limitsOf(subject string) (low, high float64, unit string) {
	s := r.state.Site()
	switch subject {
	case walk.EmergencyStop:
		return 0, contactorsWithin, "s"
	case walk.SourceWithdrawn:
		rated := 0.0
		if s.Converter != nil {
			rated = noCurrent * float64(s.Converter.RatedCurrent.Nominal)
		}
		return -rated, rated, "A"
	case walk.EarthFault:
		return 0, insulationPerVolt * float64(s.Bus.Nominal.Nominal), "Ω"
	case walk.TimeOut:
		if f, ok := r.state.Finding("precharge.time-to-close"); ok && f.State == finding.Finite && !math.IsInf(f.Value.High, 0) {
			low = f.Value.High
		}
		return low, float64(s.Precharge.Timeout.Nominal)*(1+timeOutTolerance) + contactorOpens, "s"
	}
	return 0, blockedWithin, "s"
}

// trip judges one provoked trip by its capture.
func (r *Run) trip(subject string, c capture.Capture) finding.Finding {
	low, high, unit := r.limitsOf(subject)
	seen := observe(subject, c)
	seen.Unit = unit
	if unit == "s" && low == 0 {
		low, high = -seen.step, high+seen.step // what follows within one sample has no order
	}
	return measured.Trip(measured.Expectation{Name: subject, Low: low, High: high}, seen.Observation)
}

// tripByHand judges a trip by the response time that was read by hand, where no capture has decided it.
func (r *Run) tripByHand(p walk.Point, subject string) []finding.Finding {
	low, high, unit := r.limitsOf(subject)
	reading, ok := r.newest(p, walk.ResponseTime)
	if !ok || reading.Source == record.FromDevice || unit != "s" || len(r.state.Measured("measured.trip:"+subject)) > 0 {
		return nil
	}
	return []finding.Finding{measured.Trip(measured.Expectation{Name: subject, Low: low - 2*handTiming, High: high},
		measured.Observation{Value: *reading.Value, U: handTiming, Unit: unit, Acted: true, Action: "as seen"})}
}

// observation is what a capture shows of a trip; step is the time between two samples there.
type observation struct {
	measured.Observation
	step float64
}

func observe(subject string, c capture.Capture) observation {
	blocked := edge(c, signal.Running, false)
	switch subject {
	case walk.EmergencyStop:
		return between(blocked, edge(c, signal.BypassClosed, false), "contactors opened")
	case walk.BypassLost:
		seen := between(edge(c, signal.BypassClosed, false), blocked, "pulses blocked")
		if edge(c, signal.PrechargeClosed, true).ok { // the resistor was loaded
			seen.Acted = false
		}
		return seen
	case walk.TimeOut:
		return between(edge(c, signal.PrechargeClosed, true), edge(c, signal.PrechargeClosed, false), "pre-charge opened")
	case walk.SourceWithdrawn:
		return at(c, signal.SourceCurrent, blocked, -1, "pulses blocked")
	case walk.EarthFault:
		return at(c, signal.InsulationResistance, edge(c, signal.Fault, true), 0, "alarm shown")
	}
	return between(edge(c, signal.Fault, true), blocked, "pulses blocked")
}

// change is where a state bit is first seen to have changed. It happened at some time in the step before that sample, so the
// middle of the step is its best time.
type change struct {
	ok   bool
	i    int // of the sample
	at   time.Duration
	step time.Duration // since the sample before
}

// edge finds the first change of a state bit to a value after it was seen with the other.
func edge(c capture.Capture, n signal.Name, to bool) change {
	k := c.Index(n)
	var before capture.Sample
	had := false
	for i, s := range c.Samples {
		if k < 0 || k >= len(s.Values) || !s.Values[k].OK {
			continue
		}
		if on := s.Values[k].V != 0; on != to {
			before, had = s, true
		} else if had {
			return change{true, i, (before.At + s.At) / 2, s.At - before.At}
		}
	}
	return change{}
}

// between is the time from one change to another. Each is known to a sample's step, evenly spread (JCGM 100, 4.3.7).
func between(from, to change, action string) observation {
	if !from.ok || !to.ok {
		return observation{}
	}
	took := (to.at - from.at).Seconds()
	u := math.Hypot(from.step.Seconds(), to.step.Seconds()) / sqrt12
	return observation{measured.Observation{Value: took, U: u, Acted: true, Action: action, Took: to.at - from.at},
		math.Max(from.step.Seconds(), to.step.Seconds())}
}

// at is a signal's value so many samples beside a change.
func at(c capture.Capture, n signal.Name, when change, beside int, action string) observation {
	k := c.Index(n)
	i := when.i + beside
	if !when.ok || k < 0 || i < 0 || k >= len(c.Samples[i].Values) || !c.Samples[i].Values[k].OK {
		return observation{}
	}
	return observation{measured.Observation{Value: c.Samples[i].Values[k].V, U: abs(c.Channels[k].Scale) / sqrt12, Acted: true, Action: action},
		when.step.Seconds()}
}

// tripReading is what the capture shows, as a reading at the point.
func tripReading(point, subject string, f finding.Finding) []record.Reading {
	if f.State != finding.Finite || math.IsNaN(f.Value.Nominal) {
		return nil
	}
	reading := fromCapture(point, subject, f.Value.Nominal, f.Unit, 0)
	reading.Text = quantity.Engineering(f.Value.Nominal, f.Unit, 3)
	return []record.Reading{reading}
}
