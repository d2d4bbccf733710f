package findingtest

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"chargehand/commission/finding"
	"chargehand/commission/site"
)

// CornersHold checks [Contains] for every whole site, the first with ten times as many draws. Findings with the ids in
// except are left out.
func CornersHold(t *testing.T, family Family, except ...string) {
	t.Helper()
	draws := 10_000
	for _, name := range Sites {
		Contains(t, Load(t, name), draws, family, except...)
		draws = 1_000
	}
}

// Contains checks that the corners of a site's findings hold every draw of its tolerances: the value of a site with exact
// values from within the tolerances must lie between low and high. So must the drawn site's own low and high, over what is
// no tolerance (a supply on or off). After the random draws a search climbs from the best of them, one value at a time,
// against each end: were a result not monotone between its corners, it would find that.
func Contains(t *testing.T, s site.Site, draws int, family Family, except ...string) {
	t.Helper()
	l := law{t: t, family: family, except: except, bounds: family(s), site: Clone(s), failed: map[int]bool{}}
	l.tolerances = Tolerances(&l.site)
	random := rand.New(rand.NewPCG(1, 2))
	best := make([][2]reach, len(l.bounds))
	for range draws {
		place := l.draw(random)
		for k, f := range l.at(place) {
			l.inside(k, f)
			for side := range best[k] {
				best[k][side].take(sign(side)*f.Value.Nominal, place)
			}
		}
	}
	for k, f := range l.bounds {
		if slices.Contains(except, f.ID) || f.State != finding.Finite || f.Value.Low == f.Value.High {
			continue
		}
		for side := range best[k] {
			l.climb(k, sign(side), best[k][side])
		}
	}
}

// law is one site whose toleranced values can be set, and the bounds that its findings must keep.
type law struct {
	t          *testing.T
	family     Family
	except     []string
	bounds     []finding.Finding
	site       site.Site
	tolerances []Tolerance
	failed     map[int]bool
}

// reach is the farthest a finding has gone towards one side, and with which values.
type reach struct {
	value float64
	place []float64
}

func (r *reach) take(value float64, place []float64) {
	if r.place == nil || value > r.value {
		r.value, r.place = value, append(r.place[:0], place...)
	}
}

func sign(side int) float64 { return float64(2*side - 1) }

// draw is a place within the tolerances: two values in five at an end, the others evenly.
func (l *law) draw(random *rand.Rand) []float64 {
	place := make([]float64, len(l.tolerances))
	for i, t := range l.tolerances {
		place[i] = t.drawn(random, 0.4)
	}
	return place
}

func (l *law) at(place []float64) []finding.Finding {
	for i, t := range l.tolerances {
		t.Set(place[i])
	}
	return l.family(l.site)
}

func (l *law) inside(k int, f finding.Finding) {
	l.t.Helper()
	bound := l.bounds[k]
	if slices.Contains(l.except, f.ID) || l.failed[k] || bound.State != finding.Finite && f.State == bound.State {
		return
	}
	for _, v := range []float64{f.Value.Low, f.Value.Nominal, f.Value.High} {
		if !within(v, bound.Value) {
			l.failed[k] = true // once is enough
			l.t.Errorf("%s %s: a draw gives %v, want it within %v … %v", f.ID, f.Subject, v, bound.Value.Low, bound.Value.High)
			return
		}
	}
}

// within allows for rounding; what is no number lies nowhere.
func within(v float64, bound finding.Value) bool {
	if math.IsInf(v, 0) {
		return v == bound.Low || v == bound.High
	}
	slack := 1e-9*math.Abs(v) + 1e-12
	return v >= bound.Low-slack && v <= bound.High+slack
}

// climb tries for each value both ends and the middle, keeping what moves finding k towards a side, twice round.
func (l *law) climb(k int, sign float64, from reach) {
	l.t.Helper()
	place := append([]float64(nil), from.place...)
	for range 2 {
		for i, t := range l.tolerances {
			for _, v := range []float64{t.Low, (t.Low + t.Upper) / 2, t.Upper} {
				copy(place, from.place)
				place[i] = v
				f := l.at(place)[k]
				l.inside(k, f)
				from.take(sign*f.Value.Nominal, place)
			}
		}
	}
}

// NeverNarrows checks for every whole site that wider tolerances never give a narrower value. Findings with the ids in
// except are left out.
func NeverNarrows(t *testing.T, family Family, except ...string) {
	t.Helper()
	for _, name := range Sites {
		s := Load(t, name)
		before := family(s)
		for _, factor := range []float64{1.01, 1.3, 2} {
			wider := Clone(s)
			for _, tolerance := range Tolerances(&wider) {
				tolerance.Widen(factor)
			}
			after := family(wider)
			for k, f := range after {
				if b := before[k]; !slices.Contains(except, f.ID) && narrower(f.Value, b.Value) {
					t.Errorf("%s: %s %s with tolerances × %v = %v … %v, want no narrower than %v … %v",
						name, f.ID, f.Subject, factor, f.Value.Low, f.Value.High, b.Value.Low, b.Value.High)
				}
			}
			before = after
		}
	}
}

// narrower allows for rounding; a value that is none is not compared.
func narrower(after, before finding.Value) bool {
	return after.Low > before.Low+1e-9*math.Abs(after.Low)+1e-12 || after.High < before.High-1e-9*math.Abs(after.High)-1e-12
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
