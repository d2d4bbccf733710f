package finding

import "math"

// Missing collects the keys of the site file that a finding needs and does not have, each once, in the order asked.
type Missing []string

// Need notes key when it is not given.
func (m *Missing) Need(key string, given bool) {
	if given {
		return
	}
	m.Add(key)
}

// Add notes keys that are missing.
func (m *Missing) Add(keys ...string) {
	for _, key := range keys {
		known := false
		for _, k := range *m {
			known = known || k == key
		}
		if !known {
			*m = append(*m, key)
		}
	}
}

// Lacking gives the finding as undecided: it has no value, and Because names the keys that would decide it.
func (f Finding) Lacking(keys ...string) Finding {
	f.State, f.Value, f.Parts, f.Limit, f.Margin, f.Verdict = None, NoValue(), nil, Limit{}, math.NaN(), Undecided
	f.Because = append([]string(nil), keys...)
	return f
}

// Judged gives the finding with a finite value, its limit and the verdict of [Judge]; wanted is the distance to the
// limit that a pass needs.
func (f Finding) Judged(v Value, limit Limit, wanted float64) Finding {
	f.State, f.Value, f.Limit = Finite, v, limit
	f.Verdict, f.Margin = Judge(v, limit, f.Guards, wanted)
	return f
}

// Stated gives the finding with a finite value and no limit.
func (f Finding) Stated(v Value) Finding { return f.Judged(v, Limit{}, 0) }

// Without gives the finding where there is no value to judge: state None, the verdict as told, and why.
func (f Finding) Without(verdict Verdict, because ...string) Finding {
	f.State, f.Value, f.Margin, f.Verdict = None, NoValue(), math.NaN(), verdict
	f.Because = append(f.Because, because...)
	return f
}

// Change is one key of the site file with the value that helps a finding to pass. Several changes belong together.
type Change struct {
	Key     string  // as in the site file, "infeed.setpoint"
	Subject string  // the infeed or instrument it belongs to, where the key stands several times
	Unit    string  // coherent SI
	Was     float64 // NaN where it was not given
	Value   float64
}

// Working collects an [Explanation] while the numbers are at hand.
type Working struct{ explanation Explanation }

// Explain begins a working: the formula in the source's symbols, where it comes from, and where it holds.
func Explain(formula, source, validity string) *Working {
	return &Working{Explanation{Formula: formula, Source: source, Validity: validity}}
}

// Given notes an input under its symbol.
func (w *Working) Given(name, meaning, unit string, value float64) {
	w.explanation.Symbols = append(w.explanation.Symbols, Symbol{Name: name, Meaning: meaning, Unit: unit, Value: value})
}

// Step notes an intermediate result and the expression that gave it, in earlier symbols and steps.
//
// An expression is written with numbers, names, + - * / ^, brackets and the functions sqrt, ln, exp, sin, abs, min, max;
// pi is a number.
func (w *Working) Step(name, expression, unit string, result float64) {
	w.explanation.Steps = append(w.explanation.Steps, Step{Name: name, Expression: expression, Unit: unit, Result: result})
}

// Spread notes which corner governs and what part of the spread each input makes by itself; inputs and moves run together.
func (w *Working) Spread(governs string, inputs []string, moves []float64) {
	w.explanation.Governs = governs
	w.explanation.Shares = SharesOf(inputs, moves)
}

// Done gives the explanation.
func (w *Working) Done() *Explanation { return &w.explanation }

// SharesOf turns what each input moves by itself into parts of the sum, the greatest first; inputs that move nothing are
// left out.
func SharesOf(inputs []string, moves []float64) []Share {
	sum := 0.0
	for _, m := range moves {
		sum += m
	}
	var shares []Share
	for i, m := range moves {
		if m > 0 && sum > 0 && !math.IsInf(sum, 0) {
			shares = append(shares, Share{inputs[i], m / sum})
		}
	}
	for i := range shares {
		for k := i; k > 0 && shares[k].Share > shares[k-1].Share; k-- {
			shares[k], shares[k-1] = shares[k-1], shares[k]
		}
	}
	return shares
}
