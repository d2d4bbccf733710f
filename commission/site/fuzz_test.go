package site

import (
	"errors"
	"testing"

	"chargehand/commission/document"
)

// FuzzRead feeds any bytes: no panic; a refused file has problems with places inside it; an accepted one has the values that
// are required, and revising nothing gives the same bytes.
func FuzzRead(f *testing.F) {
	for _, name := range []string{"wagtail.site.toml", "nightjar.site.toml", "ouzel.site.toml"} {
		f.Add([]byte(load(f, name)))
	}
	for _, text := range []string{minimal, "", "\ufeff", "format = \"chargehand-site/1\"\n[[bus]]\n[bus.capacitance]\n", "[source]\nsoc = [[[{}]]]\n", "a.b.c = 1\n[a]\n[[a.b]]\n",
		"format = \"chargehand-site/2\"", "\"\\u0041\" = '''x'''\n", "x = \"\"\"\n\\\n"} {
		f.Add([]byte(text))
	}
	f.Fuzz(func(t *testing.T, text []byte) {
		s, _, err := Read("x", text)
		if err != nil {
			var p *document.Problems
			if !errors.As(err, &p) || len(p.List) == 0 {
				t.Fatalf("Read(%q) = %v, want problems", text, err)
			}
			for _, q := range p.List {
				if q.Line < 1 || q.Column < 1 || q.Wanted == "" || q.Read == "" {
					t.Fatalf("Read(%q) has the problem %+v", text, q)
				}
			}
			return
		}
		if s.Name == "" || s.Source.InternalResistance.Low <= 0 || s.Precharge.Resistance.Low <= 0 || s.Source.HighestRest() < s.Source.LowestRest() ||
			s.Source.LowestRest() <= 0 || len(s.Bus.Capacitances) == 0 || s.Bus.Nominal.Nominal <= 0 || s.Precharge.ClosingDifference.Nominal <= 0 {
			t.Fatalf("Read(%q) = %+v", text, s)
		}
		if same, err := Revise(text, nil); err != nil || string(same) != string(text) {
			t.Fatalf("Revise(%q, nothing) = %q, %v", text, same, err)
		}
	})
}
