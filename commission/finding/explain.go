package finding

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"unicode"
)

// Explained is the finding worked out for a reader with a pocket calculator: formula, symbols with this site's numbers, every
// step with its numbers put in, which corner governs, which input moves the result most, source and validity. Numbers
// stand in coherent SI units with twelve significant digits, so that redoing a line gives what is printed.
func (f Finding) Explained() string {
	var b strings.Builder
	name := f.ID
	if f.Subject != "" {
		name += ", " + f.Subject
	}
	fmt.Fprintf(&b, "%s: %s\n", name, f.Title)
	f.explainVerdict(&b)
	e := f.Explanation
	if e == nil {
		fmt.Fprintf(&b, "  basis     %s\n", f.Basis)
		if f.State == None {
			b.WriteString("  there is nothing to work out: it has no value here\n")
		}
		return b.String()
	}
	fmt.Fprintf(&b, "  formula   %s\n", e.Formula)
	e.writeSymbols(&b)
	e.writeSteps(&b)
	line := func(name, text string) {
		if text != "" {
			fmt.Fprintf(&b, "  %-9s %s\n", name, text)
		}
	}
	line("corner", e.Governs)
	line("moved by", e.shares())
	line("source", e.Source)
	line("valid for", e.Validity)
	return b.String()
}

func (f Finding) explainVerdict(b *strings.Builder) {
	digits := max(f.Digits(), 4)
	fmt.Fprintf(b, "  verdict   %s", f.Verdict)
	if f.State == Finite {
		fmt.Fprintf(b, ", nominal %s", f.printEnd(f.Value.Nominal, digits))
		if between := f.printRange(digits); between != "" {
			fmt.Fprintf(b, ", over all corners %s", between)
		}
	}
	if limit := f.printLimit(digits); limit != "" {
		fmt.Fprintf(b, ", limit %s, margin %s", limit, Print(f.Margin, f.Unit, 4))
	}
	b.WriteString("\n")
	for _, why := range f.Because {
		fmt.Fprintf(b, "            %s\n", why)
	}
	for _, p := range f.Parts {
		text := Print(p.Value.Nominal, p.Unit, 4)
		if p.Value.Low != p.Value.High && !math.IsNaN(p.Value.Low) {
			text += " (" + joinRange(Print(p.Value.Low, p.Unit, 4), Print(p.Value.High, p.Unit, 4)) + ")"
		}
		fmt.Fprintf(b, "  part      %s: %s\n", p.Name, text)
	}
	if f.Remedy != "" {
		fmt.Fprintf(b, "  remedy    %s\n", f.Remedy)
	}
}

func (e *Explanation) writeSymbols(b *strings.Builder) {
	if len(e.Symbols) == 0 {
		return
	}
	b.WriteString("  with\n")
	names, numbers := 0, 0
	for _, s := range e.Symbols {
		names, numbers = max(names, width(s.Name)), max(numbers, width(figure(s.Value)+" "+unitOf(s.Unit)))
	}
	for _, s := range e.Symbols {
		number := strings.TrimRight(figure(s.Value)+" "+unitOf(s.Unit), " ")
		fmt.Fprintf(b, "    %s = %s  %s\n", pad(s.Name, names), pad(number, numbers), s.Meaning)
	}
}

func (e *Explanation) writeSteps(b *strings.Builder) {
	values := map[string]float64{"pi": math.Pi}
	for _, s := range e.Symbols {
		values[s.Name] = s.Value
	}
	b.WriteString("  so\n")
	for _, s := range e.Steps {
		fmt.Fprintf(b, "    %s = %s\n", s.Name, s.Expression)
		result := strings.TrimRight(figure(s.Result)+" "+unitOf(s.Unit), " ")
		fmt.Fprintf(b, "      = %s = %s\n", substitute(s.Expression, values), result)
		values[s.Name] = s.Result
	}
}

func (e *Explanation) shares() string {
	words := make([]string, len(e.Shares))
	for i, s := range e.Shares {
		words[i] = fmt.Sprintf("%s %.0f %%", s.Input, 100*s.Share)
	}
	return strings.Join(words, ", ")
}

func unitOf(unit string) string {
	if unit == "1" {
		return ""
	}
	return unit
}

// figure writes a number for a calculator.
func figure(v float64) string { return strconv.FormatFloat(v, 'g', 12, 64) }

// substitute puts numbers in for the names of an expression; a name before a bracket is a function and stays.
func substitute(expression string, values map[string]float64) string {
	var b strings.Builder
	runes := []rune(expression)
	for i := 0; i < len(runes); {
		if !unicode.IsLetter(runes[i]) {
			// The letters of a number such as 2e3 belong to it.
			start := i
			for i < len(runes) && (unicode.IsDigit(runes[i]) || runes[i] == '.') {
				i++
			}
			i = max(i, start+1)
			b.WriteString(string(runes[start:i]))
			continue
		}
		start := i
		for i < len(runes) && (unicode.IsLetter(runes[i]) || unicode.IsDigit(runes[i]) || unicode.Is(unicode.No, runes[i]) && runes[i] != '²' || strings.ContainsRune("_'′", runes[i])) {
			i++
		}
		name := string(runes[start:i])
		v, known := values[name]
		switch {
		case !known || i < len(runes) && runes[i] == '(':
			b.WriteString(name)
		case v < 0:
			b.WriteString("(" + figure(v) + ")")
		default:
			b.WriteString(figure(v))
		}
	}
	return b.String()
}
