package ripple

import (
	"math"
	"math/rand/v2"
	"testing"

	"chargehand/commission/corner"
	"chargehand/commission/finding/findingtest"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

// exactFilter leaves only the tolerance of the chokes: ripple.source takes filter and internal resistance nominal, since
// they hardly move it beside the chokes.
func exactFilter(s site.Site) site.Site {
	s = findingtest.Clone(s)
	r := &s.Source.InternalResistance
	r.Low, r.High = r.Nominal, r.Nominal
	if f := s.Converter.Filter; f != nil {
		f.Capacitance.Low, f.Capacitance.High = f.Capacitance.Nominal, f.Capacitance.Nominal
	}
	return s
}

func TestCornersContainDraws(t *testing.T) {
	for name, draws := range map[string]int{"wagtail": 10000, "nightjar": 2000} {
		findingtest.Contains(t, exactFilter(findingtest.Load(t, name)), draws, Findings)
		findingtest.Contains(t, findingtest.Load(t, name), draws/5, Findings, "ripple.source")
	}
}

func TestWiderTolerancesNeverNarrow(t *testing.T) { findingtest.NeverNarrows(t, Findings) }

// Chokes drawn apart from each other, at a duty of the window: never above high, and at its worst duty never below low.
func TestUnequalChokesWithinSource(t *testing.T) {
	s := findingtest.Load(t, "wagtail")
	f := sourceFinding(s)
	in, _ := read(s)
	b, _ := branches(s)
	random := rand.New(rand.NewPCG(3, 4))
	chokes := make([]quantity.Inductance, in.phases)
	rms := func(duty float64) float64 {
		square := 0.0
		for h := 1; h <= harmonics; h++ {
			i := float64(Harmonic(quantity.Voltage(in.bus), quantity.Ratio(duty), quantity.Frequency(in.switching), chokes, h)) *
				b.SourceShare(quantity.Frequency(float64(h)*in.switching))
			square += i * i / 2
		}
		return math.Sqrt(square)
	}
	for range 2000 {
		for k := range chokes {
			chokes[k] = quantity.Inductance(in.choke.Low + random.Float64()*(in.choke.High-in.choke.Low))
			if random.IntN(2) == 0 {
				chokes[k] = quantity.Inductance([]float64{in.choke.Low, in.choke.High}[random.IntN(2)])
			}
		}
		if got := rms(in.from + random.Float64()*(in.to-in.from)); got > f.Value.High*(1+1e-9) {
			t.Fatalf("rms(%v) = %v, want at most %v", chokes, got, f.Value.High)
		}
		if got, _ := corner.Greatest(in.from, in.to, 60, rms); got < f.Value.Low*(1-1e-9) {
			t.Fatalf("worst rms(%v) = %v, want at least %v", chokes, got, f.Value.Low)
		}
	}
}

// Above ten phases the greatest ripple is a bound: where corners can still be enumerated it must not lie below them.
func TestBoundIsAtLeastTheCorners(t *testing.T) {
	for phases := 1; phases <= 8; phases++ {
		r := newReaching(1000, 5000, phases, 0.1, 0.6, func(int) float64 { return 1 })
		exact := 0.0
		for _, q := range r.corners(0.36e-3, 0.44e-3) {
			rms, _ := r.worst(q)
			exact = math.Max(exact, rms)
		}
		bound, _ := r.worst(r.bound(0.36e-3, 0.44e-3))
		if bound < exact*(1-1e-9) {
			t.Errorf("bound(%d phases) = %v, want at least %v", phases, bound, exact)
		}
	}
}

// The peaks of rms over the duty are wider than the spacing of the search: a scan a hundred times as fine finds no more.
func TestSearchFindsInteriorExtrema(t *testing.T) {
	for _, phases := range []int{1, 2, 3, 4} {
		r := newReaching(1000, 5000, phases, 0.02, 0.97, func(h int) float64 { return 1 / float64(h) })
		for _, q := range r.corners(0.3e-3, 0.5e-3) {
			got, _ := r.worst(q)
			for k := 0; k <= 4000; k++ {
				if v := r.rms(q, r.from+float64(k)/4000*(r.to-r.from)); v > got*(1+1e-9) {
					t.Fatalf("worst(%d phases) = %v, want at least %v", phases, got, v)
				}
			}
		}
	}
}
