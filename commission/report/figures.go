package report

import (
	"math"
	"strconv"
	"strings"

	"chargehand/commission/finding"
	"chargehand/commission/record"
)

// figures are a finding's numbers for people, with digits enough to show why the verdict fell as it did.
type figures struct{ value, limit, margin string }

func figuresOf(f finding.Finding) figures {
	digits := f.Digits()
	return figures{value: spread(f.Value, f.Unit, digits, f.State), limit: limitWords(f.Limit, f.Unit, digits), margin: marginWords(f)}
}

// spread is "1.14 s (0.954 … 1.56 s)", the range left out where there is none.
func spread(v finding.Value, unit string, digits int, state finding.State) string {
	nominal := end(v.Nominal, unit, digits, state)
	low, high := end(v.Low, unit, digits, state), end(v.High, unit, digits, state)
	if low == high {
		return nominal
	}
	return nominal + " (" + between(low, high) + ")"
}

// end is one value; one that is not finite is what the state says.
func end(v float64, unit string, digits int, state finding.State) string {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		if state == finding.Never || state == finding.Unlimited {
			return string(state)
		}
		return "–"
	}
	return finding.Print(v, unit, digits)
}

// between writes the unit once where both ends have the same.
func between(low, high string) string {
	number, unit, has := strings.Cut(low, " ")
	if _, other, _ := strings.Cut(high, " "); has && unit == other {
		low = number
	}
	return low + " … " + high
}

func limitWords(l finding.Limit, unit string, digits int) string {
	switch {
	case l.Low != nil && l.High != nil && *l.Low == *l.High:
		return "= " + finding.Print(*l.Low, unit, digits)
	case l.Low != nil && l.High != nil:
		return between(finding.Print(*l.Low, unit, digits), finding.Print(*l.High, unit, digits))
	case l.Low != nil:
		return "≥ " + finding.Print(*l.Low, unit, digits)
	case l.High != nil:
		return "≤ " + finding.Print(*l.High, unit, digits)
	}
	return "none"
}

func marginWords(f finding.Finding) string {
	if !f.Limit.IsGiven() || math.IsNaN(f.Margin) {
		return ""
	}
	return finding.Print(f.Margin, f.Unit, 3)
}

// readingWords is a reading's value with its unit, or what was seen.
func readingWords(r record.Reading) string {
	if r.Value == nil {
		if r.Text != "" {
			return r.Text
		}
		return "no value (" + r.Quality + ")"
	}
	if r.Unit == "" { // a state
		return strconv.FormatFloat(*r.Value, 'g', -1, 64)
	}
	return asRead(*r.Value, r.Unit)
}

// asRead is a value that was read, with no more digits than it had: at most six, and no zeros behind the last that counts.
func asRead(v float64, unit string) string {
	number, unit, has := strings.Cut(finding.Print(v, unit, 6), " ")
	if strings.Contains(number, ".") {
		number = strings.TrimRight(strings.TrimRight(number, "0"), ".")
	}
	if !has {
		return number
	}
	return number + " " + unit
}

// sourceWords says where a reading comes from.
func sourceWords(r Reading) string {
	var words []string
	switch r.Body.Source {
	case record.FromInstrument:
		words = append(words, strings.TrimSpace("instrument "+r.Instrument))
	case record.FromDevice:
		words = append(words, "device")
	default:
		words = append(words, r.Body.Source)
	}
	if r.Body.Paper {
		words = append(words, "from paper")
	}
	if r.Body.Quality != "good" && r.Body.Quality != "" {
		words = append(words, r.Body.Quality)
	}
	if r.Body.Value != nil && r.Body.Text != "" {
		words = append(words, r.Body.Text)
	}
	return strings.Join(words, ", ")
}

// settingWords is a setting's value with the raw register number, or that it was not recorded.
func settingWords(v *float64, raw *int64, unit string) string {
	if v == nil {
		return "not recorded"
	}
	words := asRead(*v, unit)
	if raw != nil {
		words += " (raw " + strconv.FormatInt(*raw, 10) + ")"
	}
	return words
}

// clockWords is a time of the log for reading: 2026-12-01 14:04:28 +00:00.
func clockWords(at string) string {
	if len(at) < len("2026-12-01T14:04:28") {
		return at
	}
	words := at[:10] + " " + at[11:19]
	if i := strings.LastIndexAny(at[19:], "+-Z"); i >= 0 {
		words += " " + strings.Replace(at[19+i:], "Z", "+00:00", 1)
	}
	return words
}
