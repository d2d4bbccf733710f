package findingtest

import (
	"os"
	"testing"

	"chargehand/commission/finding"
	"chargehand/commission/site"
)

// folder is where the whole sites lie, seen from a package of commission.
const folder = "../../testdata/sites/"

// Sites are the names of the whole sites, each with its expected findings beside it.
var Sites = [...]string{"wagtail", "nightjar", "ouzel"}

// Text is the site file of a whole site.
func Text(t testing.TB, name string) []byte {
	t.Helper()
	text, err := os.ReadFile(folder + name + ".site.toml")
	if err != nil {
		t.Fatal(err)
	}
	return text
}

// Load reads a whole site.
func Load(t testing.TB, name string) site.Site {
	t.Helper()
	s, _, err := site.Read(name+".site.toml", Text(t, name))
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// Expected is the path of the findings expected of a whole site, for [Compare] and [SiteVerdict].
func Expected(name string) string { return folder + name + ".expect.json" }

// Family is the findings of one family for a site.
type Family func(site.Site) []finding.Finding

// AsExpected compares a family with the expected findings of every whole site whose ids begin with one of the prefixes.
// The figures were found by enumerating every corner in a program written apart, and confirmed by a time-domain circuit, a
// bisection and a Fourier transform.
func AsExpected(t *testing.T, family Family, prefixes ...string) {
	t.Helper()
	for _, name := range Sites {
		t.Run(name, func(t *testing.T) {
			if n := Compare(t, Expected(name), family(Load(t, name)), prefixes...); n == 0 {
				t.Errorf("Compare(%s) = 0 entries, want some", prefixes)
			}
		})
	}
}

// AllExplained redoes the printed calculation of every finding of a family for every whole site.
func AllExplained(t *testing.T, family Family) {
	t.Helper()
	for _, name := range Sites {
		Explained(t, name, family(Load(t, name)))
	}
}

// Explained redoes every printed calculation by a calculator that knows nothing of the program. A finding with a value must
// have one.
func Explained(t *testing.T, what string, findings []finding.Finding) {
	t.Helper()
	for _, f := range findings {
		switch {
		case f.Explanation == nil && f.State == finding.None:
		case f.Explanation == nil:
			t.Errorf("%s: %s %s has no explanation", what, f.ID, f.Subject)
		default:
			if err := Redo(f.Explanation, f.Value.Nominal); err != nil {
				t.Errorf("%s: Redo(%s %s) = %v, want nil", what, f.ID, f.Subject, err)
			}
		}
	}
}
