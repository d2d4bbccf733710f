package cornertest

import (
	"math"
	"math/rand/v2"
	"testing"

	"chargehand/commission/finding"
	"chargehand/commission/site"
)

// Family is the findings of one family for a site.
type Family func(site.Site) []finding.Finding

// Holds draws sites inside the tolerances, many with values at the ends, and reports every nominal result that lies outside
// the spread over the corners: were a result not monotone between its corners, a draw would find it. The drawn site's own
// low and high, over what is no tolerance (a supply on or off), must lie inside too.
func Holds(t *testing.T, s site.Site, family Family, draws int) {
	t.Helper()
	random := rand.New(rand.NewPCG(1, uint64(draws)))
	whole := family(s)
	reported := map[int]bool{}
	for range draws {
		for k, f := range family(Draw(s, random, 0.4)) {
			w := whole[k]
			if f.State == finding.None || reported[k] {
				continue
			}
			for _, v := range []float64{f.Value.Low, f.Value.Nominal, f.Value.High} {
				slack := 1e-9 * math.Max(1, math.Abs(v))
				if math.IsInf(v, 1) && math.IsInf(w.Value.High, 1) {
					continue
				}
				if v < w.Value.Low-slack || v > w.Value.High+slack {
					reported[k] = true
					t.Errorf("%s: drawn value = %v, want inside %v … %v", f.ID, v, w.Value.Low, w.Value.High)
				}
			}
		}
	}
}

// WidensWith reports every result that a wider tolerance makes narrower.
func WidensWith(t *testing.T, s site.Site, family Family) {
	t.Helper()
	narrow := family(s)
	for _, by := range []float64{1.01, 1.3, 2} {
		for k, w := range family(Widen(s, by)) {
			n := narrow[k]
			slack := 1e-9 * math.Max(1, math.Abs(n.Value.Nominal))
			if w.Value.Low > n.Value.Low+slack || w.Value.High < n.Value.High-slack {
				t.Errorf("%s with tolerances %v times as wide = %v … %v, want it to hold %v … %v",
					w.ID, by, w.Value.Low, w.Value.High, n.Value.Low, n.Value.High)
			}
		}
	}
}

// AreOrdered reports every finding that is decided on values out of order or on no number, and every undecided one that
// names no key.
func AreOrdered(t *testing.T, what string, findings []finding.Finding) {
	t.Helper()
	for _, f := range findings {
		v := f.Value
		switch {
		case f.Verdict == finding.Undecided && len(f.Because) == 0:
			t.Errorf("%s: %s is undecided and names no key", what, f.ID)
		case f.State == finding.None:
		case !(v.Low <= v.Nominal && v.Nominal <= v.High):
			t.Errorf("%s: %s = %v … %v … %v, want them in order", what, f.ID, v.Low, v.Nominal, v.High)
		case f.Verdict == finding.Pass && f.Margin < 0:
			t.Errorf("%s: %s passes with a margin of %v", what, f.ID, f.Margin)
		}
	}
}
