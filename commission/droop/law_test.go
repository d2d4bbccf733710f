package droop

import (
	"math"
	"math/rand/v2"
	"testing"

	"chargehand/commission/finding"
	"chargehand/commission/finding/findingtest"
	"chargehand/commission/quantity"

	"pgregory.net/rapid"
)

// someSources draws infeeds that differ in everything, some without limits, some that take no current back.
func someSources(t *rapid.T, most int) []Source {
	n := rapid.IntRange(1, most).Draw(t, "n")
	sources := make([]Source, n)
	for k := range sources {
		rated := quantity.Current(rapid.Float64Range(50, 500).Draw(t, "rated"))
		s := Source{NoLoad: quantity.Voltage(rapid.Float64Range(980, 1020).Draw(t, "v0")), Droop: quantity.Droop(rapid.Float64Range(0.01, 0.5).Draw(t, "droop")),
			Cable: quantity.Resistance(rapid.Float64Range(0, 0.03).Draw(t, "cable")), Most: rated, Rated: rated}
		switch rapid.IntRange(0, 3).Draw(t, "limits") {
		case 0:
			s.Least = -rated
		case 1:
			s.Least = quantity.Current(math.Inf(-1))
		case 2:
			s.Most, s.Least = quantity.Current(math.Inf(1)), quantity.Current(math.Inf(-1))
		}
		sources[k] = s
	}
	return sources
}

func someLoad(t *rapid.T) Load {
	l := Load{Power: quantity.Power(1000 * rapid.IntRange(-300, 600).Draw(t, "power")), Current: quantity.Current(rapid.IntRange(0, 100).Draw(t, "current"))}
	if rapid.Bool().Draw(t, "resistive") {
		l.Resistance = quantity.Resistance(rapid.Float64Range(2, 500).Draw(t, "resistance"))
	}
	return l
}

// surplus is the balance written down once more, for the scan: what the infeeds give beyond the load, in amperes.
func surplus(sources []Source, l Load, v float64) float64 {
	sum := -float64(l.Power)/v - float64(l.Current)
	if l.Resistance > 0 {
		sum -= v / float64(l.Resistance)
	}
	for _, s := range sources {
		i := (float64(s.NoLoad) - v) / (float64(s.Droop) + float64(s.Cable))
		sum += math.Min(math.Max(i, float64(s.Least)), float64(s.Most))
	}
	return sum
}

// A scan from far above downwards in steps of 0.1 V, then halving, finds the same highest root; where it finds none
// Solve finds none either.
func TestSolveAgainstScan(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		sources, l := someSources(t, 6), someLoad(t)
		p := Solve(sources, l)
		const top, step = 3000.0, 0.1
		if surplus(sources, l, 1e9) > 0 {
			if p.Status != Runaway {
				t.Fatalf("Solve(%v, %v).Status = %s, want runaway", sources, l, p.Status)
			}
			return
		}
		above := top
		if surplus(sources, l, top) > 0 {
			return // the root lies beyond the scan
		}
		for v := top - step; v > step; v -= step {
			if surplus(sources, l, v) < 0 {
				above = v
				continue
			}
			low := v
			for range 60 {
				if middle := (low + above) / 2; surplus(sources, l, middle) >= 0 {
					low = middle
				} else {
					above = middle
				}
			}
			if p.Status != Found || math.Abs(float64(p.Bus)-low) > 1e-6 {
				t.Fatalf("Solve(%v, %v) = %s at %v, want %v", sources, l, p.Status, float64(p.Bus), low)
			}
			return
		}
		// Two roots nearer than a step hide from the scan, and so does one at the very bottom; the balance must still be met.
		if p.Status == Found && p.Bus > step && math.Abs(surplus(sources, l, float64(p.Bus))) > 1e-6 {
			t.Fatalf("Solve(%v, %v) = %v, where the balance is not met", sources, l, float64(p.Bus))
		}
	})
}

func TestSolveBalancesAndIsStable(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		sources, l := someSources(t, 8), someLoad(t)
		p := Solve(sources, l)
		if p.Status != Found {
			return
		}
		v := float64(p.Bus)
		if r := surplus(sources, l, v); math.Abs(r) > 1e-6*(1+math.Abs(float64(l.Power)/v)) {
			t.Fatalf("Solve(%v, %v) = %v V leaves %v A over", sources, l, v, r)
		}
		if h := 1e-6 * v; surplus(sources, l, v+h) > 1e-9 {
			t.Fatalf("Solve(%v, %v) = %v V is not the highest or not stable", sources, l, v)
		}
		if p.StabilityRatio > 1+1e-6 {
			t.Fatalf("Solve(%v, %v).StabilityRatio = %v, want at most 1", sources, l, p.StabilityRatio)
		}
		for k, s := range sources {
			onLine := math.Abs(float64(p.Terminal[k])-(float64(s.NoLoad)-float64(s.Droop)*float64(p.Current[k]))) < 1e-6
			if (p.Limit[k] == Free) != onLine && p.Limit[k] == Free {
				t.Fatalf("Solve(%v, %v): infeed %d is free at %v and %v, off its line", sources, l, k, p.Terminal[k], p.Current[k])
			}
		}
	})
}

func TestGreatestPowerAgainstScan(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		sources := someSources(t, 5)
		other := Load{Current: quantity.Current(rapid.Float64Range(0, 50).Draw(t, "current"))}
		most, at := GreatestPower(sources, other)
		best := 0.0
		for v := 1.0; v < 1100; v++ {
			best = math.Max(best, v*surplus(sources, other, v))
		}
		if float64(most) < best*(1-1e-9) || float64(most) > best*1.01+100 {
			t.Fatalf("GreatestPower(%v) = %v at %v, want about %v", sources, most, at, best)
		}
		if most <= 0 {
			return
		}
		below, above := other, other
		below.Power, above.Power = most*0.999, most*1.001
		if got := Solve(sources, below).Status; got != Found {
			t.Fatalf("Solve(99.9 %% of %v) = %s, want ok", most, got)
		}
		if got := Solve(sources, above).Status; got == Found {
			t.Fatalf("Solve(100.1 %% of %v) = %s, want no_solution", most, got)
		}
	})
}

// The few corners of Share and bandOf against all 2^N of them, at limits too.
func TestShareAgainstAllCorners(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		sources := someSources(t, 6)
		l := Load{Power: quantity.Power(rapid.Float64Range(-1e5, 3e5).Draw(t, "power"))}
		errors := make([]quantity.Voltage, len(sources))
		for k := range errors {
			errors[k] = quantity.Voltage(rapid.Float64Range(0, 8).Draw(t, "error"))
		}
		share, bus := Share(sources, errors, l), bandOf(sources, errors, l)
		if share.Status != Found || bus.status != Found {
			return
		}
		for pattern := range 1 << len(sources) {
			moved := append([]Source(nil), sources...)
			for k := range moved {
				moved[k].NoLoad += errors[k] * quantity.Voltage(2*(pattern>>k&1)-1)
			}
			p := Solve(moved, l)
			if p.Status != Found {
				return // a corner between has none; the ends had one
			}
			inside(t, "bus", float64(p.Bus), bus.value.Low, bus.value.High)
			sum := quantity.Current(0)
			for _, i := range p.Current {
				sum += i
			}
			for k, i := range p.Current {
				inside(t, "current", float64(i), float64(share.Current[k].Low), float64(share.Current[k].High))
				deviation := float64(i/sources[k].Rated) - float64(sum/ratedSum(sources))
				inside(t, "deviation", deviation, float64(share.Deviation[k].Low), float64(share.Deviation[k].High))
				if worst := share.WorstDeviation(); math.Abs(deviation) > worst.High+1e-7 {
					t.Fatalf("deviation %v, want at most %v", deviation, worst.High)
				}
			}
		}
	})
}

func inside(t *rapid.T, what string, v, low, high float64) {
	if slack := 1e-7 * (1 + math.Abs(v)); v < low-slack || v > high+slack {
		t.Fatalf("%s %v outside %v … %v", what, v, low, high)
	}
}

// A wider setpoint error never narrows, and random draws of setpoints stay inside.
func TestSetpointDrawsStayInside(t *testing.T) {
	for _, name := range []string{"wagtail", "nightjar"} {
		s := findingtest.Load(t, name)
		bounds := Findings(s, nil)
		random := rand.New(rand.NewPCG(5, 6))
		exact := findingtest.Clone(s)
		for range 2000 {
			for k := range exact.Infeeds {
				of := s.Infeeds[k]
				e := float64(of.SetpointError.Of(of.Setpoint.Nominal))
				to := float64(of.Setpoint.Nominal) + e*(2*random.Float64()-1)
				exact.Infeeds[k].Setpoint.Spread = quantity.Exactly(quantity.Voltage(to))
				exact.Infeeds[k].SetpointError = quantity.ErrorBound{Text: "0 V"}
			}
			for k, f := range Findings(exact, nil) {
				compareDraw(t, bounds[k], f)
			}
		}
		wider := findingtest.Clone(s)
		for k := range wider.Infeeds {
			wider.Infeeds[k].SetpointError.Relative *= 2
		}
		for k, f := range Findings(wider, nil) {
			b := bounds[k]
			if f.State == finding.Finite && (f.Value.Low > b.Value.Low+1e-9 || f.Value.High < b.Value.High-1e-9) && f.ID != "droop.advice" {
				t.Errorf("%s %s with twice the error = %v … %v, want no narrower than %v … %v", f.ID, f.Subject, f.Value.Low, f.Value.High, b.Value.Low, b.Value.High)
			}
		}
	}
}

// droop.advice and droop.instrument take the error as an input, not as a corner.
func compareDraw(t *testing.T, b, f finding.Finding) {
	t.Helper()
	if f.State != finding.Finite || f.ID == "droop.advice" || f.ID == "droop.instrument" {
		return
	}
	if slack := 1e-9 * math.Abs(b.Value.High); f.Value.Nominal < b.Value.Low-slack || f.Value.Nominal > b.Value.High+slack {
		t.Errorf("%s %s: a draw of the setpoints gives %v, want it within %v … %v", f.ID, f.Subject, f.Value.Nominal, b.Value.Low, b.Value.High)
	}
}

// Eight infeeds to sixteen: the work of all corners grows with N² · log N, not with 2^N.
func BenchmarkShare(b *testing.B) {
	for _, n := range []int{8, 16, 32} {
		b.Run(string(rune('0'+n/10))+string(rune('0'+n%10)), func(b *testing.B) {
			sources, errors := make([]Source, n), make([]quantity.Voltage, n)
			for k := range sources {
				rated := quantity.Current(100 + 10*k)
				sources[k] = Source{NoLoad: 1030, Droop: quantity.Droop(30 / rated), Most: rated, Least: -rated, Rated: rated}
				errors[k] = 2
			}
			for b.Loop() {
				Share(sources, errors, Load{Power: quantity.Power(80000 * n)})
			}
		})
	}
}
