package remedy

import (
	"fmt"
	"math"
	"strconv"
	"strings"

	"chargehand/commission/finding"
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

// Offer judges the site and, where the finding does not pass, adds the remedy that mend finds by judging other sites: its
// passes judges without looking for a remedy again.
func Offer(s site.Site, judge func(site.Site) finding.Finding, mend func(f finding.Finding, passes func(site.Site) bool) (string, []finding.Change)) finding.Finding {
	f := judge(s)
	if f.Verdict == finding.Fail || f.Verdict == finding.Marginal {
		f.Remedy, f.Changes = mend(f, func(s site.Site) bool { return judge(s).Verdict == finding.Pass })
	}
	return f
}
