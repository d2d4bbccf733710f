package findingtest

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"unicode"

	"chargehand/commission/finding"
)

// Evaluate works out an expression with + − · ⁄ ^, brackets, numbers, names and functions. It is written apart from the
// program, so that a printed calculation can be redone.
func Evaluate(expression string, names map[string]float64) (float64, error) {
	c := &calculator{text: []rune(expression), names: names}
	v := c.sum()
	c.space()
	if c.err == nil && c.at < len(c.text) {
		c.err = fmt.Errorf("evaluate %q: left over %q", expression, string(c.text[c.at:]))
	}
	return v, c.err
}

// Redo works through an explanation: every step must come out as printed, within a part in 10⁹, and the last step must be
// the value.
func Redo(e *finding.Explanation, value float64) error {
	names := map[string]float64{}
	for _, s := range e.Symbols {
		if _, twice := names[s.Name]; twice {
			return fmt.Errorf("symbol %s stands twice", s.Name)
		}
		names[s.Name] = s.Value
	}
	last := math.NaN()
	for _, s := range e.Steps {
		got, err := Evaluate(s.Expression, names)
		if err != nil {
			return err
		}
		if !near(got, s.Result) {
			return fmt.Errorf("step %s = %s: calculator %v, printed %v", s.Name, s.Expression, got, s.Result)
		}
		if _, twice := names[s.Name]; twice {
			return fmt.Errorf("step %s stands twice", s.Name)
		}
		names[s.Name], last = s.Result, s.Result
	}
	if len(e.Steps) == 0 {
		return fmt.Errorf("no steps")
	}
	if !near(last, value) {
		return fmt.Errorf("last step %v, value %v", last, value)
	}
	return nil
}

func near(a, b float64) bool {
	return a == b || math.IsNaN(a) && math.IsNaN(b) || math.Abs(a-b) <= 1e-9*math.Max(math.Abs(a), math.Abs(b))+1e-12
}

type calculator struct {
	text  []rune
	at    int
	names map[string]float64
	err   error
}

func (c *calculator) space() {
	for c.at < len(c.text) && unicode.IsSpace(c.text[c.at]) {
		c.at++
	}
}

// take reads one of the runes if it comes next.
func (c *calculator) take(any string) bool {
	c.space()
	if c.at < len(c.text) && strings.ContainsRune(any, c.text[c.at]) {
		c.at++
		return true
	}
	return false
}

func (c *calculator) sum() float64 {
	v := c.product()
	for {
		switch {
		case c.take("+"):
			v += c.product()
		case c.take("-−"):
			v -= c.product()
		default:
			return v
		}
	}
}

func (c *calculator) product() float64 {
	v := c.signed()
	for {
		switch {
		case c.take("*·×"):
			v *= c.signed()
		case c.take("/⁄÷"):
			v /= c.signed()
		default:
			return v
		}
	}
}

func (c *calculator) signed() float64 {
	if c.take("-−") {
		return -c.signed()
	}
	v := c.atom()
	if c.take("²") {
		v *= v
	}
	if c.take("^") {
		return math.Pow(v, c.signed())
	}
	return v
}

func (c *calculator) atom() float64 {
	switch {
	case c.err != nil:
		return math.NaN()
	case c.take("√"):
		return math.Sqrt(c.atom())
	case c.take("("):
		v := c.sum()
		c.close()
		return v
	}
	c.space()
	start := c.at
	if c.at < len(c.text) && unicode.IsDigit(c.text[c.at]) {
		return c.number(start)
	}
	for c.at < len(c.text) && named(c.text[c.at]) {
		c.at++
	}
	name := string(c.text[start:c.at])
	if name == "" {
		c.err = fmt.Errorf("evaluate %q: nothing at %d", string(c.text), start)
		return math.NaN()
	}
	if c.take("(") {
		return c.call(name)
	}
	if v, ok := c.names[name]; ok {
		return v
	}
	if name == "pi" || name == "π" {
		return math.Pi
	}
	c.err = fmt.Errorf("evaluate %q: unknown name %q", string(c.text), name)
	return math.NaN()
}

func named(r rune) bool {
	return unicode.IsLetter(r) || unicode.IsDigit(r) || unicode.Is(unicode.No, r) && r != '²' || strings.ContainsRune("_'′", r)
}

func (c *calculator) number(start int) float64 {
	for c.at < len(c.text) && (unicode.IsDigit(c.text[c.at]) || c.text[c.at] == '.') {
		c.at++
	}
	if c.at+1 < len(c.text) && (c.text[c.at] == 'e' || c.text[c.at] == 'E') {
		next := c.text[c.at+1]
		if unicode.IsDigit(next) || (next == '-' || next == '+') {
			c.at += 2
			for c.at < len(c.text) && unicode.IsDigit(c.text[c.at]) {
				c.at++
			}
		}
	}
	v, err := strconv.ParseFloat(string(c.text[start:c.at]), 64)
	if err != nil && c.err == nil {
		c.err = err
	}
	return v
}

func (c *calculator) close() {
	if !c.take(")") && c.err == nil {
		c.err = fmt.Errorf("evaluate %q: a bracket is open", string(c.text))
	}
}

func (c *calculator) call(name string) float64 {
	args := []float64{c.sum()}
	for c.take(",;") {
		args = append(args, c.sum())
	}
	c.close()
	one := map[string]func(float64) float64{"sqrt": math.Sqrt, "ln": math.Log, "log": math.Log, "log10": math.Log10, "exp": math.Exp, "sin": math.Sin,
		"cos": math.Cos, "tan": math.Tan, "atan": math.Atan, "abs": math.Abs, "sinh": math.Sinh, "cosh": math.Cosh, "artanh": math.Atanh, "atanh": math.Atanh, "floor": math.Floor}
	two := map[string]func(a, b float64) float64{"min": math.Min, "max": math.Max, "pow": math.Pow, "atan2": math.Atan2}
	switch {
	case one[name] != nil && len(args) == 1:
		return one[name](args[0])
	case two[name] != nil:
		v := args[0]
		for _, a := range args[1:] {
			v = two[name](v, a)
		}
		return v
	}
	if c.err == nil {
		c.err = fmt.Errorf("evaluate %q: no function %s of %d", string(c.text), name, len(args))
	}
	return math.NaN()
}
