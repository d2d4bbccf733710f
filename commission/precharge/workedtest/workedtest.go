// Package workedtest reads the worked cases of testdata/public-cases.json and compares them.
//
// Start at [Cases].
package workedtest

import (
	"encoding/json"
	"math"
	"os"
	"testing"
)

// path is the file as seen from a family's package.
const path = "../../testdata/public-cases.json"

// Case is one worked case of testdata/public-cases.json: closed forms confirmed there by integration to 1e-10 and by
// ngspice to 1e-4.
type Case struct {
	ID, Calc string
	Inputs   map[string]json.RawMessage
	Expected map[string]json.RawMessage
	Tol      struct{ Rel, Abs float64 }
}

// Cases are the worked cases of one calculation.
func Cases(t testing.TB, calculation string) []Case {
	t.Helper()
	raw, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	var file struct{ Cases []Case }
	if err := json.Unmarshal(raw, &file); err != nil {
		t.Fatal(err)
	}
	var cases []Case
	for _, c := range file.Cases {
		if c.Calc == calculation {
			cases = append(cases, c)
		}
	}
	if len(cases) == 0 {
		t.Fatalf("public-cases.json has no case of %q", calculation)
	}
	return cases
}

// In is an input as a number; 0 where it is absent, which is the default of every optional input used here.
func (c Case) In(t testing.TB, name string) float64 {
	t.Helper()
	var v float64
	if raw, ok := c.Inputs[name]; ok {
		if err := json.Unmarshal(raw, &v); err != nil {
			t.Fatalf("%s: input %s: %v", c.ID, name, err)
		}
	}
	return v
}

// Compare checks every expected number that got names, and that no expected number is left out but the others.
func (c Case) Compare(t testing.TB, got map[string]float64, others ...string) {
	t.Helper()
	seen := map[string]bool{}
	for _, name := range others {
		seen[name] = true
	}
	for name, raw := range c.Expected {
		g, ok := got[name]
		if !ok {
			if !seen[name] {
				t.Errorf("%s: expected %s = %s is not computed", c.ID, name, raw)
			}
			continue
		}
		if string(raw) == "null" {
			if !math.IsInf(g, 0) {
				t.Errorf("%s: %s = %v, want none", c.ID, name, g)
			}
			continue
		}
		var want float64
		if err := json.Unmarshal(raw, &want); err != nil {
			t.Fatalf("%s: expected %s: %v", c.ID, name, err)
		}
		if math.Abs(g-want) > c.Tol.Rel*math.Abs(want)+c.Tol.Abs {
			t.Errorf("%s: %s = %v, want %v", c.ID, name, g, want)
		}
	}
}
