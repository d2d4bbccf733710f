package measured

import (
	"math"
	"testing"

	"chargehand/commission/discharge"
	"chargehand/commission/precharge"
	"chargehand/commission/quantity"
)

// What captures are held against is what the desk predicts: the circuit on paper here and the families' predictions share no
// code, and both follow the circuit equations of a series resistance, banks, bleeders and an auxiliary supply.
func TestPaperAgreesWithThePredictionsOfTheDesk(t *testing.T) {
	for _, s := range tenSites(t) {
		p := paperOf(s)
		emf := s.Source.HighestRest()
		predicted := precharge.Predict(s, quantity.Spread[quantity.Voltage]{Low: emf, Nominal: emf, High: emf}, 0)
		if len(predicted.Missing) > 0 {
			t.Fatalf("precharge.Predict(%s) lacks %v", s.Reference, predicted.Missing)
		}
		tau := p.tau()
		near(t, s.Reference+" time constant, low", tau.low, float64(predicted.TimeConstant.Low), 0.005)
		near(t, s.Reference+" time constant", tau.nominal, float64(predicted.TimeConstant.Nominal), 0.005)
		near(t, s.Reference+" time constant, high", tau.high, float64(predicted.TimeConstant.High), 0.005)
		if p.cSource == 0 { // a supercapacitor's voltage falls by the charge it gives; the drop is held against it as it then is
			drop := p.settledDrop(float64(emf))
			near(t, s.Reference+" settled voltage, nominal", float64(emf)-drop.nominal, float64(predicted.Settled.Nominal), 0.002)
			near(t, s.Reference+" settled voltage, low", float64(emf)-drop.high, float64(predicted.Settled.Low), 0.002)
			near(t, s.Reference+" settled voltage, high", float64(emf)-drop.low, float64(predicted.Settled.High), 0.002)
		}
		if len(s.Bus.Bleeders) == 0 {
			continue
		}
		nominal := s.Bus.Nominal.Nominal
		falls := discharge.Predict(s, quantity.Spread[quantity.Voltage]{Low: nominal, Nominal: nominal, High: nominal})
		if len(falls.Missing) > 0 {
			t.Fatalf("discharge.Predict(%s) lacks %v", s.Reference, falls.Missing)
		}
		f := &fall{paper: p}
		for _, b := range s.Bus.Capacitances {
			f.link = f.link.plus(bandOf(b.Value.Spread))
		}
		f.link = f.link.plus(p.filter) // the prediction is that of the tail, the filter joined
		near(t, s.Reference+" discharge, low", f.predictedTau().low, float64(falls.TimeConstant.Low), 0.005)
		near(t, s.Reference+" discharge", f.predictedTau().nominal, float64(falls.TimeConstant.Nominal), 0.005)
		near(t, s.Reference+" discharge, high", f.predictedTau().high, float64(falls.TimeConstant.High), 0.005)
	}
}

func near(t *testing.T, what string, got, want, within float64) {
	t.Helper()
	if !(math.Abs(got-want) <= within*math.Abs(want)) {
		t.Errorf("%s = %.6g, want %.6g of the desk within %g %%", what, got, want, 100*within)
	}
}
