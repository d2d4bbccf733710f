package closing

import (
	"os"
	"testing"

	"chargehand/commission/finding/findingtest"
	"chargehand/commission/site"
)

const sites = "../../testdata/sites/"

func load(t testing.TB, name string) site.Site {
	t.Helper()
	text, err := os.ReadFile(sites + name + ".site.toml")
	if err != nil {
		t.Fatal(err)
	}
	s, _, err := site.Read(name+".site.toml", text)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// The figures come from the expected findings beside the sites: every corner enumerated by a program written apart, and
// confirmed by a time-domain circuit.
func TestFindingsOfWholeSites(t *testing.T) {
	for _, name := range []string{"wagtail", "nightjar", "ouzel"} {
		t.Run(name, func(t *testing.T) {
			if n := findingtest.Compare(t, sites+name+".expect.json", Findings(load(t, name)), "closing."); n == 0 {
				t.Error("Compare = 0 entries, want some")
			}
		})
	}
}

// Every printed calculation is redone by a calculator that knows nothing of the program.
func TestExplanationsOfWholeSites(t *testing.T) {
	for _, name := range []string{"wagtail", "nightjar", "ouzel"} {
		for _, f := range Findings(load(t, name)) {
			if f.Explanation == nil {
				if f.State != "none" {
					t.Errorf("%s: %s has no explanation", name, f.ID)
				}
				continue
			}
			if err := findingtest.Redo(f.Explanation, f.Value.Nominal); err != nil {
				t.Errorf("%s: Redo(%s) = %v, want nil", name, f.ID, err)
			}
		}
	}
}

func BenchmarkFindings(b *testing.B) {
	s := load(b, "wagtail")
	for b.Loop() {
		Findings(s)
	}
}
