package quantity

import (
	"fmt"
	"math"
)

// Sign is what a key accepts of a value's sign.
type Sign int

// The signs.
const (
	AnySign Sign = iota
	NotNegative
	Positive
)

// Rule is what a key accepts beside its dimension. The zero Rule takes any exact value.
type Rule struct {
	Sign      Sign    // holds at the lowest corner of the tolerance too
	Tolerance bool    // a component's value may have one; an error or a limit may not
	Least     float64 // the plausible range in the coherent unit; 0, 0 for none
	Most      float64
	Example   string // for messages; empty for the dimension's own
}

// Doubt says in words why a value is implausible under the rule, or "" where it is not. 0 is never in doubt: whether it may
// be 0 is for the rule's Sign.
func Doubt[Q Scalar](e Entered[Q], rule Rule) string {
	size := math.Abs(float64(e.Nominal))
	if !e.IsGiven() || size == 0 || rule.Least == 0 && rule.Most == 0 || size >= rule.Least && size <= rule.Most {
		return ""
	}
	d := dimensionOf[Q]()
	return fmt.Sprintf("%s is unusual here, common is %s to %s; is the unit right?", e.Text,
		Engineering(rule.Least, d.engineeringUnit(), 1), Engineering(rule.Most, d.engineeringUnit(), 1))
}

// Refusal says why a typed text is no value: what was read, what is wanted, and a text that would do.
type Refusal struct {
	Read, Wanted, Example string
	Offset                int // where it went wrong, in characters from the start of the text
}

// Error puts the three in one line.
func (r *Refusal) Error() string {
	s := "read " + r.Read + ", wanted " + r.Wanted
	if r.Example != "" {
		s += ", for example " + r.Example
	}
	return s
}
