package finding

import "math"

// Verdict is what a finding comes to. The order of the constants is from harmless to grave, but for [Info].
type Verdict string

// The verdicts of design 6.
const (
	Info      Verdict = "info"      // no limit
	Pass      Verdict = "pass"      // every corner inside the limit
	Marginal  Verdict = "marginal"  // nominal inside, a corner outside or too near
	Undecided Verdict = "undecided" // an input is missing
	Fail      Verdict = "fail"      // nominal outside; where it guards life or equipment, any corner outside
)

func (v Verdict) rank() int {
	switch v {
	case Fail:
		return 4
	case Undecided:
		return 3
	case Marginal:
		return 2
	case Pass:
		return 1
	}
	return 0
}

// Worst is the gravest of the verdicts in the order fail, undecided, marginal, pass; Pass when there is none or only info.
func Worst(verdicts ...Verdict) Verdict {
	worst := Pass
	for _, v := range verdicts {
		if v.rank() > worst.rank() {
			worst = v
		}
	}
	return worst
}

// IsWorseThan orders verdicts for "what needs attention first".
func (v Verdict) IsWorseThan(other Verdict) bool { return v.rank() > other.rank() }

// State tells whether the value is a number.
type State string

// The states of a value.
const (
	Finite    State = "finite"
	Never     State = "never"     // the time never comes
	Unlimited State = "unlimited" // no bound: stands it for ever
	None      State = "none"      // there is no value
)

// Value is a result over all corners in a coherent SI unit. A component that is not finite is NaN or ±Inf and is written
// as null.
type Value struct{ Low, Nominal, High float64 }

// Exactly is a value without spread.
func Exactly(v float64) Value { return Value{v, v, v} }

// ValueOf is a value from its three components in rising order.
func ValueOf(low, nominal, high float64) Value { return Value{low, nominal, high} }

// NoValue has no number at all.
func NoValue() Value { return Value{math.NaN(), math.NaN(), math.NaN()} }

// Limit is the permitted range; an absent side is nil. Both edges belong to the range.
type Limit struct{ Low, High *float64 }

// AtMost and AtLeast and Between are the three shapes of a limit.
func AtMost(v float64) Limit          { return Limit{High: &v} }
func AtLeast(v float64) Limit         { return Limit{Low: &v} }
func Between(low, high float64) Limit { return Limit{Low: &low, High: &high} }

// IsGiven tells whether there is a limit on either side.
func (l Limit) IsGiven() bool { return l.Low != nil || l.High != nil }

// MarginOf is the signed distance of v to the nearest edge, negative outside, and false where there is no limit.
func (l Limit) MarginOf(v float64) (margin float64, ok bool) {
	margin = math.Inf(1)
	if l.Low != nil {
		margin = math.Min(margin, v-*l.Low)
	}
	if l.High != nil {
		margin = math.Min(margin, *l.High-v)
	}
	return margin, l.IsGiven()
}

// Part is a further result that belongs to a finding.
type Part struct {
	Name, Unit string
	Value      Value
}

// Finding is one judged result, as design 6 defines it.
type Finding struct {
	ID      string
	Subject string // the infeed, bank or cable where an ID stands several times
	Title   string
	Unit    string // coherent SI, "1" for a ratio, "°C" for a temperature
	State   State
	Value   Value
	Parts   []Part
	Limit   Limit
	Margin  float64 // of the worst corner to the nearest edge; NaN without a limit
	Verdict Verdict
	Because []string // why the verdict fell so, or which keys would decide it
	Basis   string   // the formula's name and source
	Remedy  string   // what would make it pass
	Changes []Change // the same as values of keys; not part of the JSON form

	// Guards tells that it guards life or equipment: one corner outside its limit fails it.
	Guards bool
	// Explanation is the calculation with this site's numbers; nil where there is none.
	Explanation *Explanation
	// Cause ranks what may lie behind a measured finding that differs from its prediction.
	Cause []Cause
	// Captures names the captures a measured finding rests on.
	Captures []string
}

// Cause is one explanation of a difference between prediction and measurement.
type Cause struct {
	ID       string   `json:"id"`
	Score    float64  `json:"score"` // 0…1
	Evidence []string `json:"evidence"`
	Confirm  string   `json:"confirm"` // what would confirm it, or part it from its rivals
}

// Explanation is a calculation that a reader can redo with a pocket calculator.
type Explanation struct {
	Formula  string   // in the symbols below
	Symbols  []Symbol // every symbol of the formula with this site's number
	Steps    []Step   // intermediate results, in order; the last is the value
	Governs  string   // which corner governs
	Shares   []Share  // which input moves the result most
	Source   string
	Validity string
}

// Symbol is one input of a formula.
type Symbol struct {
	Name, Meaning, Unit string
	Value               float64
}

// Step is one line of working: "name = expression" in earlier symbols and steps, and its result.
type Step struct {
	Name, Expression, Unit string
	Result                 float64
}

// Share is the part of the spread that one input makes by itself.
type Share struct {
	Input string
	Share float64 // of the sum over all inputs, 0…1
}

// Judge gives the verdict for a value against a limit: pass when every corner is inside by at least wanted, marginal
// when the nominal is inside and a corner is outside or nearer than wanted, fail when the nominal is outside or, where
// the finding guards life or equipment, any corner. It also gives the margin of the worst corner.
func Judge(v Value, limit Limit, guards bool, wanted float64) (Verdict, float64) {
	if !limit.IsGiven() {
		return Info, math.NaN()
	}
	nominal, _ := limit.MarginOf(v.Nominal)
	worst := nominal
	for _, corner := range []float64{v.Low, v.High} {
		m, _ := limit.MarginOf(corner)
		worst = math.Min(worst, m)
	}
	switch {
	case math.IsNaN(worst):
		return Undecided, worst
	case nominal < 0, guards && worst < 0:
		return Fail, worst
	case worst < wanted:
		return Marginal, worst
	}
	return Pass, worst
}
