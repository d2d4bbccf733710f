package droop

import (
	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

// Prediction is what the commissioned converter, the first infeed, should show: two straight lines over its current,
// V = NoLoad − slope·I, at its terminals and at the bus.
type Prediction struct {
	Infeed        string
	NoLoad        quantity.Spread[quantity.Voltage] // setpoint ± its error
	TerminalSlope quantity.Spread[quantity.Droop]   // the droop as set
	BusSlope      quantity.Spread[quantity.Droop]   // the droop and the cable
	Least, Most   quantity.Current                  // between which the lines hold
	// Missing names the keys without which there is no prediction; nothing else holds then.
	Missing finding.Missing

	sources []Source
	errors  []quantity.Voltage
}

// Expected is the operating point of the commissioned converter at one bus load.
type Expected struct {
	Current  quantity.Spread[quantity.Current]
	Bus      quantity.Spread[quantity.Voltage]
	Terminal quantity.Spread[quantity.Voltage]
	Share    quantity.Spread[quantity.Ratio] // deviation from the share by rating, in terms of its own rating
}

// Predict gives the lines of the commissioned converter from the site on paper.
func Predict(s site.Site) Prediction {
	sources, errors, missing := Sources(s)
	if len(missing) > 0 {
		return Prediction{Missing: missing}
	}
	own, e := sources[0], errors[0]
	cable, _ := CableResistance(s.Infeeds[0].Cable)
	return Prediction{
		Infeed:        s.Infeeds[0].Name,
		NoLoad:        quantity.Spread[quantity.Voltage]{Low: own.NoLoad - e, Nominal: own.NoLoad, High: own.NoLoad + e},
		TerminalSlope: quantity.Exactly(own.Droop),
		BusSlope: quantity.Spread[quantity.Droop]{Low: own.Droop + quantity.Droop(cable.Low),
			Nominal: own.Droop + quantity.Droop(cable.Nominal), High: own.Droop + quantity.Droop(cable.High)},
		Least: own.Least, Most: own.Most,
		sources: sources, errors: errors,
	}
}

// At is the expected point at a bus load with all infeeds on; false where there is none, or no prediction.
func (p Prediction) At(load Load) (Expected, bool) {
	if len(p.Missing) > 0 || len(p.sources) == 0 {
		return Expected{}, false
	}
	bus := bandOf(p.sources, p.errors, load)
	share := Share(p.sources, p.errors, load)
	if bus.status != Found || share.Status != Found {
		return Expected{}, false
	}
	e := Expected{Current: share.Current[0], Share: share.Deviation[0],
		Bus: quantity.Spread[quantity.Voltage]{Low: quantity.Voltage(bus.value.Low), Nominal: quantity.Voltage(bus.value.Nominal), High: quantity.Voltage(bus.value.High)}}
	drop := func(i quantity.Current) quantity.Voltage {
		return quantity.Voltage(float64(i) * float64(p.sources[0].Cable))
	}
	// The terminal stands on its own line whatever the bus does: its extremes are those of setpoint and current.
	e.Terminal = quantity.Spread[quantity.Voltage]{Low: e.Bus.Low + drop(e.Current.Low), Nominal: e.Bus.Nominal + drop(e.Current.Nominal), High: e.Bus.High + drop(e.Current.High)}
	return e, true
}
