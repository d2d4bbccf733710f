package findingtest

import (
	"slices"
	"strings"
	"testing"

	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

// Set makes an entered quantity exact.
func Set[Q quantity.Scalar](e *quantity.Entered[Q], v float64) {
	e.Spread, e.Text = quantity.Exactly(Q(v)), "typed"
}

// Find is the finding with an id, and with a subject where the id stands several times.
func Find(t testing.TB, findings []finding.Finding, id, subject string) finding.Finding {
	t.Helper()
	for _, f := range findings {
		if f.ID == id && f.Subject == subject {
			return f
		}
	}
	t.Fatalf("no finding %s %s", id, subject)
	return finding.Finding{}
}

// Absence takes one thing out of a site.
type Absence struct {
	key       string
	take      func(*site.Site)
	undecided []string
}

// Without is the absence of a key, or of what may be absent. The ids, without their family's prefix, are those of the findings
// that are then undecided and name the key or one below it; all others are decided.
func Without(key string, take func(*site.Site), ids []string) Absence { return Absence{key, take, ids} }

// NameWhatIsMissing checks which findings of the first whole site become undecided by each absence, and that they name it.
func NameWhatIsMissing(t *testing.T, family Family, absences []Absence) {
	t.Helper()
	for _, a := range absences {
		s := Load(t, Sites[0])
		a.take(&s)
		findings := family(s)
		for _, f := range findings {
			_, id, _ := strings.Cut(f.ID, ".")
			want := slices.Contains(a.undecided, id)
			if got := f.Verdict == finding.Undecided; got != want || want && !slices.ContainsFunc(f.Because, a.isNamedBy) {
				t.Errorf("without %s: %s = %s (%v), want undecided = %v by that key", a.key, f.ID, f.Verdict, f.Because, want)
			}
		}
		AreOrdered(t, "without "+a.key, findings)
	}
}

func (a Absence) isNamedBy(key string) bool { return key == a.key || strings.HasPrefix(key, a.key+".") }
