package walk

import (
	"fmt"
	"math"
	"regexp"
	"strings"

	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/signal"
	"chargehand/commission/site"
)

// Content gives all points in order with this site's numbers in them: every number in their texts and limits comes from a
// finding or from a key of the site file. The site's own points follow the others of their stage.
func Content(s site.Site, desk []finding.Finding) []Point {
	numbers := numbers{site: s, keys: keysOf(s), findings: map[string]finding.Finding{}}
	for _, f := range desk {
		if _, first := numbers.findings[f.ID]; !first {
			numbers.findings[f.ID] = f
		}
	}
	var points []Point
	for stage, chapter := range chapters {
		for _, row := range chapter(numbers) {
			row.Stage = stage + 1
			points = append(points, numbers.fill(row))
		}
		for _, own := range s.Points {
			if stageNumber(own.Stage) == stage+1 || own.Stage == fmt.Sprint(stage+1) {
				points = append(points, ownPoint(own, stage+1))
			}
		}
	}
	return points
}

var chapters = [Stages]func(numbers) []Point{
	safetyPoints, paperPoints, deadPoints, linkPoints, chargePoints, restPoints, boostPoints, sharePoints, powerPoints,
	tripPoints, downPoints, leavePoints,
}

func ownPoint(own site.OwnPoint, stage int) Point {
	p := Point{ID: own.ID, Stage: stage, Kind: Kind(own.Kind), By: []By{Observation}, Title: own.What, Do: own.What,
		Expect: own.Accept, Caution: own.Caution, Basis: own.Basis,
		Otherwise: "make safe, find the cause, enter a deviation or a punch item"}
	if p.Kind == "" {
		p.Kind = Check
	}
	if p.Basis == "" {
		p.Basis = "this site's own point"
	}
	return p
}

// numbers are what the texts draw on.
type numbers struct {
	site     site.Site
	keys     map[string]string
	findings map[string]finding.Finding
}

// placeholder is {finding.id}, {finding.id:low} or {key:name}.
var placeholder = regexp.MustCompile(`\{(key:)?([a-z0-9._-]+)(?::(low|nominal|high))?\}`)

// fill puts the numbers into a point's texts.
func (n numbers) fill(p Point) Point {
	for _, text := range []*string{&p.Caution, &p.Do, &p.Expect, &p.Otherwise} {
		*text = placeholder.ReplaceAllStringFunc(*text, func(match string) string {
			parts := placeholder.FindStringSubmatch(match)
			if parts[1] != "" {
				return n.key(parts[2])
			}
			return n.words(parts[2], parts[3])
		})
	}
	return p
}

// key is a key's text as typed in the site file.
func (n numbers) key(name string) string {
	if text := n.keys[name]; text != "" {
		return text
	}
	return "(" + name + " not stated)"
}

// words is a finding's worst corner, or the corner asked for, with its unit.
func (n numbers) words(id, corner string) string {
	v, unit, ok := n.value(id, corner)
	if !ok {
		return "(" + id + " not decided on paper)"
	}
	return quantity.Engineering(v, unit, 3)
}

// value is a finding's corner in its coherent SI unit; the worst corner where none is named.
func (n numbers) value(id, corner string) (v float64, unit string, ok bool) {
	f, found := n.findings[id]
	if !found || f.State != finding.Finite {
		return 0, "", false
	}
	switch corner {
	case "low":
		v = f.Value.Low
	case "nominal":
		v = f.Value.Nominal
	case "high":
		v = f.Value.High
	default:
		v = f.Value.High
		if f.Limit.Low != nil && f.Limit.High == nil {
			v = f.Value.Low
		}
	}
	return v, f.Unit, !math.IsNaN(v) && !math.IsInf(v, 0)
}

// within is a criterion between two bounds; an absent bound is nil.
func within(what, unit string, low, high *float64, from string) Criterion {
	return Criterion{What: what, Unit: unit, Low: low, High: high, From: from}
}

// corner is a finding's corner as a bound, or nil where the finding has none.
func (n numbers) corner(id, which string) *float64 {
	if v, _, ok := n.value(id, which); ok {
		return &v
	}
	return nil
}

// known is a value of the site file as a bound, or nil where it is not given.
func known[Q quantity.Scalar](e quantity.Entered[Q], v Q) *float64 {
	if !e.IsGiven() {
		return nil
	}
	f := float64(v)
	return &f
}

// by is how a value is read that the site file gives a range for, or only looked at where it gives none.
func (n numbers) by(ranged bool) []By {
	if ranged {
		return []By{Instrument, Observation}
	}
	return []By{Observation}
}

// readingsOf are the readings that criteria ask for.
func readingsOf(criteria []Criterion) []HandReading {
	var hand []HandReading
	for _, c := range criteria {
		hand = append(hand, HandReading{c.What, c.Unit})
	}
	return hand
}

// chokes are the inductances of the phases, each within its tolerance.
func (n numbers) chokes() []Criterion {
	c := n.site.Converter
	if c == nil || !c.Choke.IsGiven() {
		return nil
	}
	low, high := float64(c.Choke.Low), float64(c.Choke.High)
	var all []Criterion
	for phase := range c.Phases {
		all = append(all, within(fmt.Sprintf("choke %d", phase+1), "H", &low, &high, "converter.choke"))
	}
	return all
}

// bleeders is the resistance of all bleeders in parallel over their tolerances.
func (n numbers) bleeders() []Criterion {
	low, high := 0.0, 0.0 // conductances at the upper and the lower resistances
	for _, b := range n.site.Bus.Bleeders {
		low, high = low+1/float64(b.Value.High), high+1/float64(b.Value.Low)
	}
	if high == 0 {
		return nil
	}
	return []Criterion{within("bleeder resistance", "Ω", number(1/high), number(1/low), "bus.bleeder")}
}

// keyed are the raw numbers of the settings, where the map has them: read back they must stand to the digit.
func (n numbers) keyed() []Criterion {
	var all []Criterion
	for _, part := range n.findings["droop.registers"].Parts {
		raw := part.Value.Nominal
		all = append(all, within(RawNumber(signal.Name(part.Name)), "1", &raw, &raw, "droop.registers"))
	}
	return all
}

// touchSafe is the touch-safe voltage as a bound, or nil.
func (n numbers) touchSafe() *float64 {
	if n.site.Bus.TouchSafe == nil {
		return nil
	}
	return known(n.site.Bus.TouchSafe.Voltage, n.site.Bus.TouchSafe.Voltage.Nominal)
}

// keysOf are the keys that the texts name, as typed.
func keysOf(s site.Site) map[string]string {
	keys := map[string]string{
		"bus.nominal":                  s.Bus.Nominal.Text,
		"bus.under_voltage_trip":       s.Bus.UnderVoltageTrip.Text,
		"bus.over_voltage_trip":        s.Bus.OverVoltageTrip.Text,
		"bus.ripple":                   s.Bus.Ripple.Text,
		"bus.wanted_margin":            s.Bus.WantedMargin.Text,
		"bus.measurement_error":        s.Bus.MeasurementError.Text,
		"source.measurement_error":     s.Source.MeasurementError.Text,
		"source.internal_resistance":   s.Source.InternalResistance.Text,
		"source.max_charge_current":    s.Source.MaxChargeCurrent.Text,
		"source.max_discharge_current": s.Source.MaxDischargeCurrent.Text,
		"source.max_ripple_current":    s.Source.MaxRippleCurrent.Text,
		"precharge.resistance":         s.Precharge.Resistance.Text,
		"precharge.closing_difference": s.Precharge.ClosingDifference.Text,
		"precharge.timeout":            s.Precharge.Timeout.Text,
		"precharge.interval":           s.Precharge.Interval.Text,
		"precharge.minimum_time":       s.Precharge.MinimumTime.Text,
	}
	if s.Precharge.Attempts > 0 {
		keys["precharge.attempts"] = fmt.Sprint(s.Precharge.Attempts)
	}
	if t := s.Bus.TouchSafe; t != nil {
		keys["touch_safe.voltage"], keys["touch_safe.within"] = t.Voltage.Text, t.Within.Text
	}
	if c := s.Bus.Chopper; c != nil {
		keys["chopper.on"] = c.On.Text
	}
	if c := s.Converter; c != nil {
		keys["converter.choke"], keys["converter.choke_resistance"] = c.Choke.Text, c.ChokeResistance.Text
		keys["converter.efficiency"] = c.Efficiency.Text
	}
	if l := s.Load; l != nil {
		keys["load.share_tolerance"], keys["load.power"] = l.ShareTolerance.Text, l.Power.Text
	}
	if len(s.Infeeds) > 0 {
		keys["infeed.setpoint"], keys["infeed.droop"] = s.Infeeds[0].Setpoint.Text, s.Infeeds[0].Droop.Text
		keys["infeed.setpoint_error"] = s.Infeeds[0].SetpointError.Text
	}
	var banks []string
	for _, b := range s.Bus.Capacitances {
		banks = append(banks, b.Name+" "+b.Value.Text)
	}
	keys["bus.capacitance"] = strings.Join(banks, ", ")
	var bleeders []string
	for _, b := range s.Bus.Bleeders {
		bleeders = append(bleeders, b.Name+" "+b.Value.Text)
	}
	keys["bus.bleeder"] = strings.Join(bleeders, ", ")
	return keys
}
