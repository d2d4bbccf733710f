package theme

import (
	"fmt"
	"math"
	"time"

	"chargehand/commission/finding"
	"chargehand/commission/signal"
)

// Shown is a reading as it may be shown now: its text, or why there is none.
type Shown struct {
	Number string // "412.6"; empty where there is no value
	Unit   string // "V", with its prefix
	Mark   string // "?" on an unproved value; else empty
	Why    string // how old the last answer is, or why there is none, where there is no number; else empty
	Role   Role
	Value  float64 // NaN where there is no number
}

// HasValue tells whether there is a number at all.
func (s Shown) HasValue() bool { return s.Number != "" }

// String is the whole reading in one piece: "412.6 V", "412.6 V?" or "no value, 12 s".
func (s Shown) String() string {
	switch {
	case s.Number != "" && s.Unit != "":
		return s.Number + " " + s.Unit + s.Mark
	case s.Number != "":
		return s.Number + s.Mark
	case s.Why != "":
		return "no value, " + s.Why
	}
	return "no value"
}

// Within is String in at most width columns. A number is never cut, since half a number is another number: what does not
// fit loses the age first and then gives way to a mark.
func (s Shown) Within(width int) string {
	for _, text := range []string{s.String(), "no value", "?"} {
		if Width(text) <= width && (text != "no value" || !s.HasValue()) {
			return text
		}
	}
	return ""
}

// Show gives a reading as it may be shown at now. A reading older than maxAge loses its number: an old number, however
// pale, is still read as the present one. Currents and powers carry their sign, positive from source to bus.
func (t Theme) Show(r signal.Reading, unproved bool, now time.Time, maxAge time.Duration) Shown {
	r = r.Withdrawn(now, maxAge)
	if !r.Quality.HasValue() || math.IsNaN(r.Value) || math.IsInf(r.Value, 0) {
		return Shown{Why: whyNone(r, now), Role: Withdrawn, Value: math.NaN()}
	}
	s := Shown{Role: Live, Value: r.Value}
	unit := r.Name.Unit()
	s.Number, s.Unit = t.Parts(r.Value, unit)
	if (unit == "A" || unit == "W") && r.Value > 0 && !isZero(s.Number) {
		s.Number = "+" + s.Number
	}
	if unproved {
		s.Role, s.Mark = Unproved, "?"
	}
	return s
}

// whyNone says in a word or two why a reading has no number; the full reason is in Reading.Why.
func whyNone(r signal.Reading, now time.Time) string {
	switch r.Quality {
	case signal.Never:
		return "never read"
	case signal.Missing:
		return "none sent"
	case signal.Frozen:
		return "frozen"
	case signal.Bad:
		return "bad reply"
	}
	if r.At.IsZero() {
		return ""
	}
	return Age(r.Age(now))
}

// Age writes an age with one unit: "12 ms", "3.4 s", "5 min", "2 h", "4 d". A negative age means clocks disagree.
func Age(d time.Duration) string {
	switch {
	case d < 0:
		return "from the future"
	case d < time.Second:
		return fmt.Sprintf("%d ms", d.Milliseconds())
	case d < 10*time.Second:
		return fmt.Sprintf("%.1f s", math.Floor(d.Seconds()*10)/10)
	case d < 2*time.Minute:
		return fmt.Sprintf("%d s", int(d.Seconds()))
	case d < 2*time.Hour:
		return fmt.Sprintf("%d min", int(d.Minutes()))
	case d < 48*time.Hour:
		return fmt.Sprintf("%d h", int(d.Hours()))
	}
	return fmt.Sprintf("%d d", int(d.Hours()/24))
}

// VerdictSign is the sign that stands before a verdict's word, one column wide.
func (t Theme) VerdictSign(v finding.Verdict) string {
	switch v {
	case finding.Pass:
		return t.Pick("✓", "+")
	case finding.Marginal:
		return t.Pick("≈", "~")
	case finding.Fail:
		return t.Pick("✗", "X")
	case finding.Undecided:
		return "?"
	}
	return t.Pick("·", ".")
}

// VerdictRole is the role of a verdict.
func VerdictRole(v finding.Verdict) Role {
	switch v {
	case finding.Pass:
		return Normal
	case finding.Marginal:
		return Abnormal
	case finding.Fail:
		return Danger
	case finding.Undecided:
		return Mandatory
	}
	return Faint
}

// Verdict is a verdict with its sign and word, painted: "✓ pass".
func (t Theme) Verdict(v finding.Verdict) string {
	return t.Paint(VerdictRole(v), t.VerdictSign(v)+" "+Clean(string(v)))
}

// Caution is one line of a caution before a hazardous act, cleaned, marked and painted.
func (t Theme) Caution(text string) string { return t.Paint(Hazard, " ! "+Clean(text)+" ") }
