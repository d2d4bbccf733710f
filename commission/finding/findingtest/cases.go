package findingtest

import (
	"encoding/json"
	"fmt"
	"math"
	"os"
	"slices"
	"testing"
)

// publicCases is the file of worked cases.
const publicCases = "../../testdata/public-cases.json"

// Case is one worked case of testdata/public-cases.json: closed forms, confirmed there by integration or scanning and by a
// circuit simulator.
type Case struct {
	ID, Calc, Title string
	Inputs          map[string]any
	Expected        map[string]any
	Tol             struct{ Rel, Abs float64 }
	TolByKey        map[string]struct{ Rel, Abs float64 } `json:"tol_by_key"`
}

// Cases are the worked cases of one calculation; none is a failure.
func Cases(t testing.TB, calc string) []Case {
	t.Helper()
	text, err := os.ReadFile(publicCases)
	if err != nil {
		t.Fatal(err)
	}
	var file struct{ Cases []Case }
	if err := json.Unmarshal(text, &file); err != nil {
		t.Fatal(err)
	}
	var found []Case
	for _, c := range file.Cases {
		if c.Calc == calc {
			found = append(found, c)
		}
	}
	if len(found) == 0 {
		t.Fatalf("Cases(%s) = none, want some", calc)
	}
	return found
}

// Input is a number of the case's inputs, or the default that formulas I gives.
func (c Case) Input(name string, otherwise float64) float64 {
	if v, ok := c.Inputs[name].(float64); ok {
		return v
	}
	return otherwise
}

// In is a number of the case's inputs; 0 where it is absent.
func (c Case) In(name string) float64 { return c.Input(name, 0) }

// Check compares every expected result with what was got: numbers within the case's tolerance, none at all with a number
// that is infinite, everything else exactly. A result that was not got fails, but for those named as left to others.
func (c Case) Check(t *testing.T, got map[string]any, others ...string) {
	t.Helper()
	for key, want := range c.Expected {
		value, ok := got[key]
		if !ok && slices.Contains(others, key) {
			continue
		}
		if !ok {
			t.Errorf("%s %s: %s = not computed, want %v", c.ID, c.Title, key, want)
			continue
		}
		tol := c.Tol
		if own, ok := c.TolByKey[key]; ok {
			tol.Rel, tol.Abs = own.Rel, math.Max(own.Abs, 1e-12)
		}
		if err := same(value, want, tol.Rel, tol.Abs); err != nil {
			t.Errorf("%s %s: %s: %v", c.ID, c.Title, key, err)
		}
	}
}

func same(got, want any, rel, abs float64) error {
	switch w := want.(type) {
	case nil:
		if g, ok := got.(float64); got != nil && !(ok && math.IsInf(g, 0)) {
			return fmt.Errorf("got %v, want none", got)
		}
	case float64:
		g, ok := got.(float64)
		if !ok || !(math.Abs(g-w) <= abs+rel*math.Abs(w)) {
			return fmt.Errorf("got %v, want %v", got, w)
		}
	case []any:
		g, ok := got.([]any)
		if !ok || len(g) != len(w) {
			return fmt.Errorf("got %v, want %v", got, w)
		}
		for k := range w {
			if err := same(g[k], w[k], rel, abs); err != nil {
				return fmt.Errorf("[%d] %w", k, err)
			}
		}
	default:
		if got != want {
			return fmt.Errorf("got %v, want %v", got, want)
		}
	}
	return nil
}

// List turns numbers or words into what a case's list is compared with.
func List[T any, R any](values []T, as func(T) R) []any {
	list := make([]any, len(values))
	for k, v := range values {
		list[k] = as(v)
	}
	return list
}

// Numbers are the results of a calculation that gives nothing else.
func Numbers(values map[string]float64) map[string]any {
	all := make(map[string]any, len(values))
	for name, v := range values {
		all[name] = v
	}
	return all
}
