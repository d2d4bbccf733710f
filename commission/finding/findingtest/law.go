package findingtest

import (
	"math"
	"math/rand/v2"
	"testing"

	"chargehand/commission/finding"
	"chargehand/commission/site"
)

// Contains checks that the corners of a site's findings hold every draw of its tolerances: the nominal of a site with
// exact values from within the tolerances must lie between low and high. After the random draws a search climbs from the
// best of them, one value at a time, against each end. Findings for which judged is false are left out.
func Contains(t *testing.T, s site.Site, draws int, findings func(site.Site) []finding.Finding, judged func(id string) bool) {
	t.Helper()
	l := law{t: t, findings: findings, judged: judged, bounds: findings(s), site: Clone(s), failed: map[string]bool{}}
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
		if !judged(f.ID) || f.State != finding.Finite || f.Value.Low == f.Value.High {
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
	findings   func(site.Site) []finding.Finding
	judged     func(id string) bool
	bounds     []finding.Finding
	site       site.Site
	tolerances []Tolerance
	failed     map[string]bool
}

// reach is the farthest a finding has gone towards one side, and with which values.
type reach struct {
	value float64
	place []float64
}

func (r *reach) take(value float64, place []float64) bool {
	if r.place != nil && !(value > r.value) {
		return false
	}
	r.value, r.place = value, append([]float64(nil), place...)
	return true
}

func sign(side int) float64 { return float64(2*side - 1) }

// draw is a place within the tolerances: one value in three at an end, the others evenly.
func (l *law) draw(random *rand.Rand) []float64 {
	place := make([]float64, len(l.tolerances))
	for i, t := range l.tolerances {
		switch random.IntN(6) {
		case 0:
			place[i] = t.Low
		case 1:
			place[i] = t.Upper
		default:
			place[i] = t.Low + random.Float64()*(t.Upper-t.Low)
		}
	}
	return place
}

func (l *law) at(place []float64) []finding.Finding {
	for i, t := range l.tolerances {
		t.Set(place[i])
	}
	return l.findings(l.site)
}

func (l *law) inside(k int, f finding.Finding) {
	l.t.Helper()
	bound := l.bounds[k]
	slack := 1e-9*math.Max(math.Abs(bound.Value.Low), math.Abs(bound.Value.High)) + 1e-12
	name := f.ID + " " + f.Subject
	if !l.judged(f.ID) || l.failed[name] || f.Value.Nominal >= bound.Value.Low-slack && f.Value.Nominal <= bound.Value.High+slack {
		return
	}
	if bound.State != finding.Finite && f.State == bound.State {
		return
	}
	l.failed[name] = true // once is enough
	l.t.Errorf("%s: a draw gives %v, want it within %v … %v", name, f.Value.Nominal, bound.Value.Low, bound.Value.High)
}

// climb tries for each value both ends and the middle, keeping what moves finding k towards a side, twice round.
func (l *law) climb(k int, sign float64, from reach) {
	l.t.Helper()
	for range 2 {
		for i, t := range l.tolerances {
			for _, v := range []float64{t.Low, (t.Low + t.Upper) / 2, t.Upper} {
				place := append([]float64(nil), from.place...)
				place[i] = v
				f := l.at(place)[k]
				l.inside(k, f)
				from.take(sign*f.Value.Nominal, place)
			}
		}
	}
}

// NeverNarrows checks that wider tolerances never give a narrower value.
func NeverNarrows(t *testing.T, s site.Site, findings func(site.Site) []finding.Finding, judged func(id string) bool) {
	t.Helper()
	before := findings(s)
	for _, factor := range []float64{1.1, 1.7, 3} {
		wider := Clone(s)
		for _, tolerance := range Tolerances(&wider) {
			tolerance.Widen(factor)
		}
		for k, f := range findings(wider) {
			b := before[k]
			slack := 1e-9 * math.Max(math.Abs(b.Value.Low), math.Abs(b.Value.High))
			if judged(f.ID) && b.State == finding.Finite && f.State == finding.Finite && (f.Value.Low > b.Value.Low+slack || f.Value.High < b.Value.High-slack) {
				t.Errorf("%s %s with tolerances × %v = %v … %v, want no narrower than %v … %v", f.ID, f.Subject, factor, f.Value.Low, f.Value.High, b.Value.Low, b.Value.High)
			}
		}
		before = findings(wider)
	}
}
