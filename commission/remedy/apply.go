package remedy

import (
	"fmt"
	"slices"
	"strconv"

	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

// Apply gives a copy of the site with the changes put in; the site handed in is not touched. A toleranced value keeps its
// relative tolerance: a choke of another size is still a choke of ten per cent. It fails for a key that no remedy
// changes, and where the site has no such table, infeed or instrument.
func Apply(s site.Site, changes ...finding.Change) (site.Site, error) {
	s = unshared(s)
	for _, c := range changes {
		set, known := setters[c.Key]
		if !known {
			return s, fmt.Errorf("apply remedy: no setter for key %q", c.Key)
		}
		if !set(&s, c) {
			return s, fmt.Errorf("apply remedy: the site has no %s %q to change", c.Key, c.Subject)
		}
	}
	return s, nil
}

// unshared copies whatever a setter may write to.
func unshared(s site.Site) site.Site {
	s.Source.Fuse, s.Source.Switch = copied(s.Source.Fuse), copied(s.Source.Switch)
	s.Bus.Chopper, s.Bus.Auxiliary, s.Bus.Bleeders = copied(s.Bus.Chopper), copied(s.Bus.Auxiliary), slices.Clone(s.Bus.Bleeders)
	s.Precharge.Contactor, s.Bypass, s.Load = copied(s.Precharge.Contactor), copied(s.Bypass), copied(s.Load)
	s.Converter = copied(s.Converter)
	if s.Converter != nil {
		s.Converter.Filter = copied(s.Converter.Filter)
	}
	s.Infeeds, s.Instruments = slices.Clone(s.Infeeds), slices.Clone(s.Instruments)
	return s
}

func copied[T any](p *T) *T {
	if p == nil {
		return nil
	}
	v := *p
	return &v
}

// setter puts one value into a site that shares nothing; false where the site has no place for it.
type setter func(s *site.Site, c finding.Change) bool

var setters = map[string]setter{
	"source.cell_min":                when(func(s *site.Site) *volts { return &s.Source.CellMin }, func(s *site.Site) bool { return s.Source.CellsInSeries > 0 }),
	"source.min_voltage":             when(func(s *site.Site) *volts { return &s.Source.MinVoltage }, func(s *site.Site) bool { return s.Source.CellsInSeries == 0 }),
	"source.internal_resistance":     always(func(s *site.Site) *ohms { return &s.Source.InternalResistance }),
	"source.fuse.voltage":            when(func(s *site.Site) *volts { return &s.Source.Fuse.Voltage }, hasFuse),
	"source.fuse.breaking_capacity":  when(func(s *site.Site) *amperes { return &s.Source.Fuse.BreakingCapacity }, hasFuse),
	"source.fuse.pre_arcing_i2t":     when(func(s *site.Site) *joules { return &s.Source.Fuse.PreArcingI2t }, hasFuse),
	"source.switch.voltage":          when(func(s *site.Site) *volts { return &s.Source.Switch.Voltage }, hasSwitch),
	"source.switch.breaking_current": when(func(s *site.Site) *amperes { return &s.Source.Switch.BreakingCurrent }, hasSwitch),
	"source.switch.poles":            setPoles,

	"bus.under_voltage_trip": always(func(s *site.Site) *volts { return &s.Bus.UnderVoltageTrip }),
	"bus.over_voltage_trip":  always(func(s *site.Site) *volts { return &s.Bus.OverVoltageTrip }),
	"bus.chopper.on":         when(func(s *site.Site) *volts { return &s.Bus.Chopper.On }, func(s *site.Site) bool { return s.Bus.Chopper != nil }),
	"bus.auxiliary.power":    when(func(s *site.Site) *watts { return &s.Bus.Auxiliary.Power }, func(s *site.Site) bool { return s.Bus.Auxiliary != nil }),
	"bus.bleeder":            setBleeders,

	"precharge.resistance":                 always(func(s *site.Site) *ohms { return &s.Precharge.Resistance }),
	"precharge.timeout":                    always(func(s *site.Site) *seconds { return &s.Precharge.Timeout }),
	"precharge.interval":                   always(func(s *site.Site) *seconds { return &s.Precharge.Interval }),
	"precharge.minimum_time":               always(func(s *site.Site) *seconds { return &s.Precharge.MinimumTime }),
	"precharge.closing_difference":         always(func(s *site.Site) *volts { return &s.Precharge.ClosingDifference }),
	"precharge.contactor.voltage":          when(func(s *site.Site) *volts { return &s.Precharge.Contactor.Voltage }, hasContactor),
	"precharge.contactor.breaking_current": when(func(s *site.Site) *amperes { return &s.Precharge.Contactor.BreakingCurrent }, hasContactor),
	"bypass.making_current":                when(func(s *site.Site) *amperes { return &s.Bypass.MakingCurrent }, func(s *site.Site) bool { return s.Bypass != nil }),

	"converter.rated_power": when(func(s *site.Site) *watts { return &s.Converter.RatedPower }, hasConverter),
	"converter.choke":       when(func(s *site.Site) *henries { return &s.Converter.Choke }, hasConverter),
	"converter.filter.capacitance": when(func(s *site.Site) *farads { return &s.Converter.Filter.Capacitance },
		func(s *site.Site) bool { return s.Converter != nil && s.Converter.Filter != nil }),

	"load.power":           when(func(s *site.Site) *watts { return &s.Load.Power }, hasLoad),
	"load.regeneration":    when(func(s *site.Site) *watts { return &s.Load.Regeneration }, hasLoad),
	"load.share_tolerance": when(func(s *site.Site) *ratio { return &s.Load.ShareTolerance }, hasLoad),

	"infeed.setpoint": ofInfeed(func(k *site.Infeed, c finding.Change) { move(&k.Setpoint, c) }),
	"infeed.setpoint_error": ofInfeed(func(k *site.Infeed, c finding.Change) {
		k.SetpointError = quantity.ErrorBound{Absolute: quantity.Voltage(c.Value), Text: text(c)}
	}),
	"infeed.droop": ofInfeed(func(k *site.Infeed, c finding.Change) {
		k.Droop = quantity.DroopSetting{PerAmpere: quantity.Droop(c.Value), Text: text(c)}
	}),
	"instrument.accuracy.of_reading": setAccuracy,
}

type (
	volts   = quantity.Entered[quantity.Voltage]
	amperes = quantity.Entered[quantity.Current]
	ohms    = quantity.Entered[quantity.Resistance]
	farads  = quantity.Entered[quantity.Capacitance]
	henries = quantity.Entered[quantity.Inductance]
	watts   = quantity.Entered[quantity.Power]
	seconds = quantity.Entered[quantity.Seconds]
	joules  = quantity.Entered[quantity.CurrentTime2]
	ratio   = quantity.Entered[quantity.Ratio]
)

func hasFuse(s *site.Site) bool      { return s.Source.Fuse != nil }
func hasSwitch(s *site.Site) bool    { return s.Source.Switch != nil }
func hasContactor(s *site.Site) bool { return s.Precharge.Contactor != nil }
func hasConverter(s *site.Site) bool { return s.Converter != nil }
func hasLoad(s *site.Site) bool      { return s.Load != nil }

// when is the setter of a value that the site has only where has is true.
func when[Q quantity.Scalar](at func(*site.Site) *quantity.Entered[Q], has func(*site.Site) bool) setter {
	return func(s *site.Site, c finding.Change) bool {
		if !has(s) {
			return false
		}
		move(at(s), c)
		return true
	}
}

func always[Q quantity.Scalar](at func(*site.Site) *quantity.Entered[Q]) setter {
	return when(at, func(*site.Site) bool { return true })
}

func ofInfeed(set func(*site.Infeed, finding.Change)) setter {
	return func(s *site.Site, c finding.Change) bool {
		i := slices.IndexFunc(s.Infeeds, func(k site.Infeed) bool { return k.Name == c.Subject })
		if i >= 0 {
			set(&s.Infeeds[i], c)
		}
		return i >= 0
	}
}

func setPoles(s *site.Site, c finding.Change) bool {
	if s.Source.Switch == nil {
		return false
	}
	s.Source.Switch.Poles = int(c.Value)
	return true
}

// setBleeders brings all bleeders in parallel to the value, each in the same proportion; without any it adds one.
func setBleeders(s *site.Site, c finding.Change) bool {
	conductance := 0.0
	for _, b := range s.Bus.Bleeders {
		conductance += 1 / float64(b.Value.Nominal)
	}
	if conductance == 0 {
		s.Bus.Bleeders = append(s.Bus.Bleeders, site.Bleeder{Name: "bleeder", Value: ohms{Spread: quantity.Exactly(quantity.Resistance(c.Value)), Text: text(c)}})
		return true
	}
	for i := range s.Bus.Bleeders {
		v := &s.Bus.Bleeders[i].Value
		move(v, finding.Change{Value: float64(v.Nominal) * c.Value * conductance, Unit: c.Unit})
	}
	return true
}

func setAccuracy(s *site.Site, c finding.Change) bool {
	i := slices.IndexFunc(s.Instruments, func(v site.Instrument) bool { return v.Name == c.Subject })
	if i >= 0 {
		s.Instruments[i].OfReading = quantity.Ratio(c.Value)
	}
	return i >= 0
}

// move sets a value and keeps its relative tolerance.
func move[Q quantity.Scalar](e *quantity.Entered[Q], c finding.Change) {
	to := quantity.Entered[Q]{Spread: quantity.Exactly(Q(c.Value)), Text: text(c)}
	if e.IsGiven() && e.Nominal > 0 {
		to.Low, to.High = e.Low/e.Nominal*to.Nominal, e.High/e.Nominal*to.Nominal
	}
	*e = to
}

func text(c finding.Change) string { return strconv.FormatFloat(c.Value, 'g', -1, 64) + " " + c.Unit }
