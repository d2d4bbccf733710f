package precharge

import (
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"chargehand/commission/finding/findingtest"
	"chargehand/commission/quantity"
)

func TestPredictionOfTheExample(t *testing.T) {
	s := findingtest.Load(t, "wagtail")
	p := Predict(s, quantity.Exactly(s.Source.HighestRest()), 0)
	// The same figures as the desk findings of the site, which testdata/sites checks.
	for _, c := range []struct {
		name string
		got  quantity.Spread[quantity.Seconds]
		id   string
	}{{"TimeConstant", p.TimeConstant, "precharge.time-constant"}} {
		want := findingtest.Find(t, Findings(s), c.id, "").Value
		if float64(c.got.Low) != want.Low || float64(c.got.Nominal) != want.Nominal || float64(c.got.High) != want.High {
			t.Errorf("%s = %v, want %v of %s", c.name, c.got, want, c.id)
		}
	}
	// Half of the rise at 0.3 time constants by hand: 821.7 V·22000⁄22100.063·(1 − e^−0.3)⁄2.
	want := 821.7 * 22000 / 22100.063 * -math.Expm1(-0.3) / 2
	if got := float64(p.EarlyRise.AtLeast); math.Abs(got-want) > 1e-6*want {
		t.Errorf("EarlyRise.AtLeast = %v V, want %v V", got, want)
	}
	if got, want := p.EarlyRise.At.Seconds(), 0.3*float64(p.TimeConstant.Nominal); math.Abs(got-want) > 1e-6 {
		t.Errorf("EarlyRise.At = %v s, want 0.3 time constants, %v s", got, want)
	}
	if last := p.Band[len(p.Band)-1].At; last < 10500*time.Millisecond {
		t.Errorf("band ends at %v, want past the time-out", last)
	}
}

// Any site inside the tolerances charges inside the band, its auxiliary supply on or off.
func TestBandHoldsEveryCharge(t *testing.T) {
	for _, name := range []string{"wagtail", "nightjar", "ouzel"} {
		s := findingtest.Load(t, name)
		highest := s.Source.HighestRest()
		emf := quantity.Spread[quantity.Voltage]{Low: 0.9 * highest, Nominal: 0.95 * highest, High: highest}
		const v0 = 40
		p := Predict(s, emf, v0)
		end := quantity.Seconds(p.Band[bandPoints].At.Seconds())
		random := rand.New(rand.NewPCG(7, 7))
		for range 300 {
			drawn := pathOf(findingtest.Draw(s, random, 0.5))
			c := drawn.circuit(drawn.nominal())
			c.EMF, c.Start = emf.Low+quantity.Voltage(random.Float64())*(emf.High-emf.Low), v0
			if random.IntN(2) == 0 {
				c.Auxiliary = 0
			}
			for i, v := range c.course(end) {
				point, v := p.Band[i], v.low
				if v < point.Bus.Low-1e-6 || v > point.Bus.High+1e-6 {
					t.Fatalf("%s: bus at %v = %v, want inside %v … %v", name, point.At, v, point.Bus.Low, point.Bus.High)
				}
			}
		}
	}
}

func TestBusAtInterpolates(t *testing.T) {
	s := findingtest.Load(t, "wagtail")
	p := Predict(s, quantity.Exactly(s.Source.HighestRest()), 0)
	nominal := pathOf(s)
	for _, at := range []time.Duration{0, 333 * time.Millisecond, 1234567 * time.Microsecond, 5 * time.Second} {
		got, ok := p.BusAt(at)
		want, _ := nominal.circuit(nominal.nominal()).VoltageAt(quantity.Seconds(at.Seconds()))
		if !ok || math.Abs(float64(got.Nominal-want)) > 1e-3*821.7 {
			t.Errorf("BusAt(%v) = %v, %v, want %v within 0.1 %% of the rise", at, got.Nominal, ok, want)
		}
	}
	if _, ok := p.BusAt(time.Hour); ok {
		t.Error("BusAt(an hour) = inside the band, want outside")
	}
}

func TestPredictionOfALiveBusDoesNotRise(t *testing.T) {
	s := findingtest.Load(t, "wagtail")
	p := Predict(s, quantity.Exactly(s.Source.HighestRest()), 1000)
	if p.PeakCurrent.High != 0 || p.TimeToClose.High != 0 {
		t.Errorf("current, time to close on a bus above the source = %v, %v, want 0: the diodes block", p.PeakCurrent, p.TimeToClose)
	}
}
