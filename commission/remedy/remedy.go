// Package remedy finds what would make a finding pass, by putting other values into the site and judging again.
//
// Start at [Least], which searches the smallest change that passes, and [Apply], which puts changes into a copy of a site.
package remedy

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

// Least is the value nearest to from, on the way to limit, with which passes is true, rounded away from `from` to between
// a thousandth and a ten-thousandth of the change, so that the printed figure passes and one per cent less of the change
// does not. It is false where from passes already or limit does not. Where passes changes more than once on the way, the
// value is one of the changes, found by halving.
func Least(from, limit float64, passes func(x float64) bool) (value float64, ok bool) {
	if passes(from) || !passes(limit) {
		return 0, false
	}
	fails, good := from, limit
	for range 60 {
		middle := fails + (good-fails)/2
		if passes(middle) {
			good = middle
		} else {
			fails = middle
		}
		if math.Abs(good-fails) <= 1e-7*math.Abs(good-from) {
			break
		}
	}
	rounded := AwayFrom(from, good)
	if passes(rounded) {
		return rounded, true
	}
	return good, true
}

// AwayFrom rounds value away from `from` to between a thousandth and a ten-thousandth of their difference.
func AwayFrom(from, value float64) float64 {
	change := math.Abs(value - from)
	if change == 0 || math.IsInf(change, 0) || math.IsNaN(change) {
		return value
	}
	// value ⁄ step is an integer and step a power of ten: dividing by the reciprocal keeps 0.001 exact enough to print.
	exponent := int(math.Floor(math.Log10(change))) - 3
	round := math.Floor
	if value > from {
		round = math.Ceil
	}
	if exponent < 0 {
		scale := math.Pow10(-exponent)
		return round(value*scale) / scale
	}
	scale := math.Pow10(exponent)
	return round(value/scale) * scale
}

// Apply gives a copy of the site with the changes put in; the site handed in is not touched. It fails for a key that no
// remedy changes, and for an infeed or instrument that the site does not have.
func Apply(s site.Site, changes ...finding.Change) (site.Site, error) {
	for _, c := range changes {
		set, known := setters[c.Key]
		if !known {
			return s, fmt.Errorf("apply remedy: no setter for key %q", c.Key)
		}
		if !set(&s, c) {
			return s, fmt.Errorf("apply remedy: the site has no %s %q to change", c.Key, c.Subject)
		}
	}
	return s, nil
}

// Phrase writes changes as a person would key them in: `infeed.setpoint of "aft string" to 945.4 V (now 870 V)`.
func Phrase(changes []finding.Change) string {
	phrases := make([]string, len(changes))
	for i, c := range changes {
		phrases[i] = c.Key
		if c.Subject != "" {
			phrases[i] += fmt.Sprintf(" of %q", c.Subject)
		}
		phrases[i] += " to " + Figure(c.Value, c.Unit)
		if !math.IsNaN(c.Was) {
			phrases[i] += " (now " + Figure(c.Was, c.Unit) + ")"
		}
	}
	return strings.Join(phrases, ", ")
}

// Figure writes a number in the unit that the site file takes: ratios as per cent, small inductances and capacitances
// with their prefix, seven significant digits at most.
func Figure(value float64, unit string) string {
	scale, name := 1.0, unit
	size := math.Abs(value)
	switch {
	case unit == "1":
		scale, name = 100, "%"
	case unit == "V/A" && size < 1:
		scale, name = 1e3, "mV/A"
	case unit == "W" && size >= 1e3:
		scale, name = 1e-3, "kW"
	case unit == "H" || unit == "F":
		scale, name = 1e3, "m"+unit
		if size < 1e-3 {
			scale, name = 1e6, "µ"+unit
		}
	}
	return strconv.FormatFloat(round7(value*scale), 'f', -1, 64) + " " + name
}

func round7(v float64) float64 {
	rounded, err := strconv.ParseFloat(strconv.FormatFloat(v, 'g', 7, 64), 64)
	if err != nil {
		return v
	}
	return rounded
}

// setters put one value into a site; false where the site has no place for it.
var setters = map[string]func(s *site.Site, c finding.Change) bool{
	"bus.under_voltage_trip": func(s *site.Site, c finding.Change) bool {
		s.Bus.UnderVoltageTrip = moved(s.Bus.UnderVoltageTrip, c)
		return true
	},
	"bus.over_voltage_trip": func(s *site.Site, c finding.Change) bool {
		s.Bus.OverVoltageTrip = moved(s.Bus.OverVoltageTrip, c)
		return true
	},
	"bus.chopper.on": func(s *site.Site, c finding.Change) bool {
		if s.Bus.Chopper == nil {
			return false
		}
		chopper := *s.Bus.Chopper
		chopper.On = moved(chopper.On, c)
		s.Bus.Chopper = &chopper
		return true
	},
	"source.cell_min": func(s *site.Site, c finding.Change) bool {
		s.Source.CellMin = moved(s.Source.CellMin, c)
		return s.Source.CellsInSeries > 0
	},
	"source.min_voltage": func(s *site.Site, c finding.Change) bool {
		s.Source.MinVoltage = moved(s.Source.MinVoltage, c)
		return s.Source.CellsInSeries == 0
	},
	"converter.rated_power": func(s *site.Site, c finding.Change) bool {
		return changeConverter(s, func(v *site.Converter) { v.RatedPower = moved(v.RatedPower, c) })
	},
	"converter.choke": func(s *site.Site, c finding.Change) bool {
		return changeConverter(s, func(v *site.Converter) { v.Choke = moved(v.Choke, c) })
	},
	"converter.filter.capacitance": func(s *site.Site, c finding.Change) bool {
		if s.Converter == nil || s.Converter.Filter == nil {
			return false
		}
		filter := *s.Converter.Filter
		filter.Capacitance = moved(filter.Capacitance, c)
		return changeConverter(s, func(v *site.Converter) { v.Filter = &filter })
	},
	"load.power": func(s *site.Site, c finding.Change) bool {
		return changeLoad(s, func(v *site.Load) { v.Power = moved(v.Power, c) })
	},
	"load.regeneration": func(s *site.Site, c finding.Change) bool {
		return changeLoad(s, func(v *site.Load) { v.Regeneration = moved(v.Regeneration, c) })
	},
	"load.share_tolerance": func(s *site.Site, c finding.Change) bool {
		return changeLoad(s, func(v *site.Load) { v.ShareTolerance = moved(v.ShareTolerance, c) })
	},
	"infeed.setpoint": func(s *site.Site, c finding.Change) bool {
		return changeInfeed(s, c.Subject, func(v *site.Infeed) { v.Setpoint = moved(v.Setpoint, c) })
	},
	"infeed.setpoint_error": func(s *site.Site, c finding.Change) bool {
		return changeInfeed(s, c.Subject, func(v *site.Infeed) {
			v.SetpointError = quantity.ErrorBound{Absolute: quantity.Voltage(c.Value), Text: text(c)}
		})
	},
	"infeed.droop": func(s *site.Site, c finding.Change) bool {
		return changeInfeed(s, c.Subject, func(v *site.Infeed) {
			v.Droop = quantity.DroopSetting{PerAmpere: quantity.Droop(c.Value), Text: text(c)}
		})
	},
	"instrument.accuracy.of_reading": func(s *site.Site, c finding.Change) bool {
		i := slices.IndexFunc(s.Instruments, func(v site.Instrument) bool { return v.Name == c.Subject })
		if i < 0 {
			return false
		}
		s.Instruments = slices.Clone(s.Instruments)
		s.Instruments[i].OfReading = quantity.Ratio(c.Value)
		return true
	},
}

func changeConverter(s *site.Site, change func(*site.Converter)) bool {
	if s.Converter == nil {
		return false
	}
	converter := *s.Converter
	change(&converter)
	s.Converter = &converter
	return true
}

func changeLoad(s *site.Site, change func(*site.Load)) bool {
	if s.Load == nil {
		return false
	}
	load := *s.Load
	change(&load)
	s.Load = &load
	return true
}

func changeInfeed(s *site.Site, name string, change func(*site.Infeed)) bool {
	i := slices.IndexFunc(s.Infeeds, func(v site.Infeed) bool { return v.Name == name })
	if i < 0 {
		return false
	}
	s.Infeeds = slices.Clone(s.Infeeds)
	change(&s.Infeeds[i])
	return true
}

func text(c finding.Change) string { return strconv.FormatFloat(c.Value, 'g', -1, 64) + " " + c.Unit }

// moved keeps the relative tolerance: a choke of another size is still a choke of ten per cent.
func moved[Q quantity.Scalar](was quantity.Entered[Q], c finding.Change) quantity.Entered[Q] {
	to := quantity.Entered[Q]{Spread: quantity.Exactly(Q(c.Value)), Text: text(c)}
	if was.IsGiven() && was.Nominal > 0 {
		to.Low, to.High = was.Low/was.Nominal*to.Nominal, was.High/was.Nominal*to.Nominal
	}
	return to
}

// Offer judges the site and, where the finding does not pass, adds the remedy that mend finds by judging other sites: its
// passes judges without looking for a remedy again.
func Offer(s site.Site, judge func(site.Site) finding.Finding, mend func(f finding.Finding, passes func(site.Site) bool) (string, []finding.Change)) finding.Finding {
	f := judge(s)
	if f.Verdict == finding.Fail || f.Verdict == finding.Marginal {
		f.Remedy, f.Changes = mend(f, func(s site.Site) bool { return judge(s).Verdict == finding.Pass })
	}
	return f
}
