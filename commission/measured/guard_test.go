package measured

import (
	"math"
	"strings"
	"testing"

	"chargehand/commission/finding"
)

// The decision of JCGM 106 with the guard band U: accept inside by U, reject outside by more than U, else inconclusive; not
// capable where 2·U is as wide as the limits (formulas H). P29 of testdata/public-cases.json is the droop of the first row:
// slope 0.10910 V/A, U 0.00293 V/A, set 0.11 V/A ± 10 %, accepted.
func TestJudge(t *testing.T) {
	inf := math.Inf(1)
	tests := []struct {
		name  string
		m     measurement
		b     band
		want  finding.Verdict
		words string
	}{
		{"worked droop, accept", measurement{value: 0.109102564, u: 0.0014648560, freedom: 1 << 20}, band{0.099, 0.11, 0.121}, finding.Pass, ""},
		{"outside by more than U", measurement{value: 0.1300, u: 0.0014648560, freedom: 1 << 20}, band{0.099, 0.11, 0.121}, finding.Fail, "outside"},
		{"outside by less than U", measurement{value: 0.1230, u: 0.0014648560, freedom: 1 << 20}, band{0.099, 0.11, 0.121}, finding.Undecided, "not capable"},
		{"inside by less than U", measurement{value: 0.1190, u: 0.0014648560, freedom: 1 << 20}, band{0.099, 0.11, 0.121}, finding.Marginal, "less than the uncertainty"},
		{"uncertainty as wide as the limits", measurement{value: 0.11, u: 0.006, freedom: 1 << 20}, band{0.099, 0.11, 0.121}, finding.Undecided, "not capable"},
		{"one limit", measurement{value: 20, bound: 2}, band{math.Inf(-1), 25, 25}, finding.Pass, ""},
		{"two points have no scatter", measurement{value: 20, u: 1, freedom: 0}, band{-inf, 25, 25}, finding.Undecided, "cannot be judged"},
		{"not a number", measurement{value: math.NaN()}, band{0, 1, 2}, finding.Undecided, "cannot be judged"},
	}
	for _, test := range tests {
		got, words := judge(test.m, test.b, "droop", "V/A")
		if got != test.want || !strings.Contains(words, test.words) {
			t.Errorf("judge(%s) = %s, %q, want %s with %q", test.name, got, words, test.want, test.words)
		}
	}
}

// With few points U grows as Student's t does: JCGM 100:2008, Table G.2, 95.45 %: 13.97 for one degree of freedom, 2.65 for
// five (from memory).
func TestExpandedUsesStudentsT(t *testing.T) {
	for freedom, k := range map[int]float64{1: 13.97, 5: 2.65, 1 << 20: 2.00} {
		if got := (measurement{u: 1, freedom: freedom}).expanded(); math.Abs(got-k) > 0.006 {
			t.Errorf("expanded(u = 1, %d degrees) = %.3f, want %.2f", freedom, got, k)
		}
	}
	if got, want := (measurement{bound: 3}).expanded(), 2*math.Sqrt(3.0); math.Abs(got-want) > 1e-12 {
		t.Errorf("expanded(bound 3) = %g, want %g (rectangle, JCGM 100:2008, 4.3.7)", got, want)
	}
}

// A fault that is on no list is 'not-known', never the nearest name: resistance, capacitance and the source are all good and
// yet the time constant is off, as with a recorder whose clock runs fast.
func TestUnknownPictureIsNotKnown(t *testing.T) {
	s := readSite(t, "wagtail")
	p := healthy(s, 21)
	c := p.charge()
	for i := range c.Samples { // the recorder's clock is 1.7 times too fast, and the current channel was scaled to fit
		c.Samples[i].At = c.Samples[i].At * 17 / 10
		for k, ch := range c.Channels {
			if ch.Unit == "A" {
				c.Samples[i].Values[k] = encoded(ch, c.Samples[i].Values[k].V/1.7)
			}
		}
	}
	causes := causesOf(Precharge(s, c))
	for _, cause := range causes {
		if cause.ID == "bank-missing" || cause.ID == "load-left-on" || cause.ID == "bus-shorted" {
			t.Errorf("causes of a fast clock with scaled current = %v, want no bank and no load", causes)
		}
	}
}

// Every cause says what would confirm it and what is safe next.
func TestEveryCauseHasConfirmationAndNextStep(t *testing.T) {
	for id, k := range known {
		if k.confirm == "" || k.safe == "" {
			t.Errorf("%s: confirm %q, next %q, want both", id, k.confirm, k.safe)
		}
	}
	vocabulary := strings.Fields(`resistor-open resistor-high resistor-low resistor-drifts-hot bank-missing bank-added load-left-on auxiliary-stall
		bus-shorted bus-shorted-late bypass-welded bypass-early bypass-never bypass-drops-out precharge-welded bus-live bus-still-charged
		load-returns-early fuse-open source-low source-soft source-reversed source-opens charger-refuses choke-open choke-unequal filter-missing
		upper-switch-shorted lower-switch-shorted bleeder-open chopper-dead earth-fault contact-report-false droop-mismatch droop-off
		setpoint-shifted limit-too-low infeed-lost bus-hunts words-swapped address-shifted scale-tenfold sign-unsigned current-reversed
		missing-code-read torn-words answers-one-behind readings-frozen readings-slow gateway-repeats-old sensor-gain sensor-offset link-drops not-known`)
	for _, id := range vocabulary {
		if _, ok := known[id]; !ok {
			t.Errorf("the catalogue lacks %s", id)
		}
	}
	if len(known) != len(vocabulary) {
		t.Errorf("the catalogue has %d causes, the vocabulary %d", len(known), len(vocabulary))
	}
}
