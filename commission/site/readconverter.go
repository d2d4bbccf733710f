package site

import "chargehand/commission/document"

func readConverter(t *document.Table) *Converter {
	if t == nil {
		return nil
	}
	var c Converter
	document.Quantity(t, "rated_power", &c.RatedPower, limit(100, 1e8, "220 kW"))
	document.Quantity(t, "rated_current", &c.RatedCurrent, amperes("400 A"))
	document.Quantity(t, "efficiency", &c.Efficiency, limit(0.5, 1, "97.5 %"))
	t.Whole("phases", &c.Phases, 1, 64)
	document.Quantity(t, "choke", &c.Choke, component(1e-7, 1, "0.42 mH ±10 %"))
	document.Quantity(t, "choke_resistance", &c.ChokeResistance, parasitic(1e-6, 10, "3 mΩ"))
	document.Quantity(t, "choke_saturation", &c.ChokeSaturation, amperes("240 A"))
	document.Quantity(t, "phase_sharing_error", &c.PhaseSharingError, amount(0, 0, "3 %"))
	document.Quantity(t, "switching_frequency", &c.SwitchingFrequency, limit(100, 1e6, "5 kHz"))
	document.Quantity(t, "dead_time", &c.DeadTime, amount(1e-9, 1e-4, "3 µs"))
	document.Quantity(t, "minimum_pulse", &c.MinimumPulse, amount(1e-9, 1e-3, "8 µs"))
	c.Filter = readFilter(t.Table("filter"))
	atMostAll(t, "efficiency", c.Efficiency)
	atMostAll(t, "phase_sharing_error", c.PhaseSharingError)
	// Below half a period a pulse and its complement must both fit, or no duty is left.
	if float64(c.SwitchingFrequency.Nominal)*float64(c.DeadTime.Nominal+c.MinimumPulse.Nominal) >= 0.5 {
		t.Refuse("switching_frequency", "a period longer than twice minimum_pulse and dead_time together", `switching_frequency = "5 kHz"`)
	}
	return &c
}

func readFilter(t *document.Table) *Filter {
	if t == nil {
		return nil
	}
	var f Filter
	document.Quantity(t, "capacitance", &f.Capacitance, component(1e-8, 1, "0.8 mF ±10 %"))
	document.Quantity(t, "esr", &f.ESR, parasitic(1e-6, 100, "2 mΩ"))
	document.Quantity(t, "esl", &f.ESL, parasitic(1e-10, 1e-3, "40 nH"))
	document.Choice(t, "position", &f.Position, AtStar, AtSource)
	t.Require(`capacitance = "0.8 mF ±10 %"`, `position = "star"`)
	return &f
}

func readLoad(t *document.Table) *Load {
	if t == nil {
		return nil
	}
	var l Load
	document.Quantity(t, "power", &l.Power, amount(1, 1e9, "200 kW"))
	document.Quantity(t, "regeneration", &l.Regeneration, amount(1, 1e9, "120 kW"))
	document.Quantity(t, "share_tolerance", &l.ShareTolerance, amount(0, 0, "10 %"))
	atMostAll(t, "share_tolerance", l.ShareTolerance)
	return &l
}

func readInfeeds(rows []*document.Table) []Infeed {
	var infeeds []Infeed
	names := unique{}
	for _, t := range rows {
		var i Infeed
		t.Text("name", &i.Name, "aft string")
		document.Quantity(t, "rated_current", &i.RatedCurrent, amperes("220 A"))
		document.Quantity(t, "setpoint", &i.Setpoint, volts("1030 V"))
		t.Droop("droop", &i.Droop)
		t.ErrorBound("setpoint_error", &i.SetpointError)
		t.Bool("regenerates", &i.Regenerates)
		i.Cable = readCable(t.Table("cable"))
		t.Require(`name = "aft string"`)
		names.check(t, "name", i.Name, "infeed")
		infeeds = append(infeeds, i)
	}
	return infeeds
}

// readCable takes copper only: the conductor table of IEC 60228 and the temperature coefficient are copper's.
func readCable(t *document.Table) *Cable {
	if t == nil {
		return nil
	}
	c := Cable{Class: 2}
	document.Quantity(t, "length", &c.Length, limit(0.01, 1e5, "18 m"))
	document.Quantity(t, "section", &c.Section, limit(0.1e-6, 5000e-6, "120 mm²"))
	document.Choice(t, "material", &c.Material, "copper")
	t.Whole("class", &c.Class, 2, 5)
	document.Quantity(t, "temperature", &c.Temperature, degrees("60 °C"))
	t.Require(`length = "18 m"`, `section = "120 mm²"`)
	checkSection(t, c.Section)
	if c.Class != 2 && c.Class != 5 {
		t.Refuse("class", "IEC 60228 class 2 (stranded) or 5 (flexible)", "class = 5")
	}
	return &c
}
