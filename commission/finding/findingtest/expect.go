package findingtest

import (
	"encoding/json"
	"math"
	"os"
	"strings"
	"testing"

	"chargehand/commission/finding"
)

// expected is one entry of an expect file. What an entry does not have is not judged; a null is judged.
type expected struct {
	ID, Subject, Unit, Verdict, State, How string
	Value, Limit                           map[string]*float64
	Parts                                  []struct {
		Name, Unit string
		Value      map[string]*float64
	}
	Tol      float64
	LimitTol float64 `json:"limit_tol"`
	PartsTol float64 `json:"parts_tol"`
}

type expectations struct {
	Tol      float64
	Verdict  string
	Findings []expected
}

func read(t testing.TB, path string) expectations {
	t.Helper()
	text, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	var e expectations
	if err := json.Unmarshal(text, &e); err != nil {
		t.Fatal(err)
	}
	return e
}

// SiteVerdict is the verdict that the whole site is expected to get.
func SiteVerdict(t testing.TB, path string) finding.Verdict {
	t.Helper()
	return finding.Verdict(read(t, path).Verdict)
}

// Compare checks every entry of the expect file whose id begins with one of the prefixes against the findings, and gives
// how many it checked.
func Compare(t testing.TB, path string, findings []finding.Finding, prefixes ...string) int {
	t.Helper()
	e := read(t, path)
	checked := 0
	for _, want := range e.Findings {
		for _, prefix := range prefixes {
			if strings.HasPrefix(want.ID, prefix) {
				checked++
				compare(t, find(findings, want), want, e.Tol)
				break
			}
		}
	}
	return checked
}

func find(findings []finding.Finding, want expected) *finding.Finding {
	for k, f := range findings {
		if f.ID == want.ID && (want.Subject == "" || f.Subject == want.Subject) {
			return &findings[k]
		}
	}
	return nil
}

func compare(t testing.TB, f *finding.Finding, want expected, tol float64) {
	t.Helper()
	name := strings.TrimSpace(want.ID + " " + want.Subject)
	if f == nil {
		t.Errorf("%s = no such finding, want one", name)
		return
	}
	if want.Tol != 0 {
		tol = want.Tol
	}
	if want.Unit != "" && f.Unit != want.Unit {
		t.Errorf("%s: unit = %q, want %q", name, f.Unit, want.Unit)
	}
	if want.Verdict != "" && string(f.Verdict) != want.Verdict {
		t.Errorf("%s: verdict = %s (%v), want %s", name, f.Verdict, f.Because, want.Verdict)
	}
	if want.State != "" && string(f.State) != want.State {
		t.Errorf("%s: state = %s, want %s", name, f.State, want.State)
	}
	values(t, name+": value", f.Value, want.Value, tol)
	limits(t, name, f.Limit, want, tol)
	for _, p := range want.Parts {
		part(t, name, f.Parts, p.Name, p.Unit, p.Value, or(want.PartsTol, tol))
	}
}

func limits(t testing.TB, name string, limit finding.Limit, want expected, tol float64) {
	t.Helper()
	edge := func(p *float64) float64 {
		if p == nil {
			return math.NaN()
		}
		return *p
	}
	got := map[string]float64{"low": edge(limit.Low), "high": edge(limit.High)}
	for side, w := range want.Limit {
		number(t, name+": limit "+side, got[side], w, or(want.LimitTol, tol))
	}
}

func part(t testing.TB, name string, parts []finding.Part, want, unit string, value map[string]*float64, tol float64) {
	t.Helper()
	for _, p := range parts {
		if p.Name != want {
			continue
		}
		if unit != "" && p.Unit != unit {
			t.Errorf("%s: part %s: unit = %q, want %q", name, want, p.Unit, unit)
		}
		values(t, name+": part "+want, p.Value, value, tol)
		return
	}
	t.Errorf("%s: part %q = missing, want it", name, want)
}

func values(t testing.TB, name string, got finding.Value, want map[string]*float64, tol float64) {
	t.Helper()
	for side, w := range want {
		number(t, name+" "+side, map[string]float64{"low": got.Low, "nominal": got.Nominal, "high": got.High}[side], w, tol)
	}
}

func number(t testing.TB, name string, got float64, want *float64, tol float64) {
	t.Helper()
	switch {
	case want == nil:
		if !math.IsNaN(got) && !math.IsInf(got, 0) {
			t.Errorf("%s = %v, want none", name, got)
		}
	case !(math.Abs(got-*want) <= tol*math.Abs(*want)+1e-12):
		t.Errorf("%s = %.9g, want %.9g within %g", name, got, *want, tol)
	}
}

func or(first, second float64) float64 {
	if first != 0 {
		return first
	}
	return second
}
