package window

import (
	"math"

	"chargehand/commission/corner"
	"chargehand/commission/finding"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

// Conduction is the loop of source, chokes and freewheel diodes onto a bus that is held below the source.
type Conduction struct {
	EMF, Bus, Diode quantity.Voltage
	Source          quantity.Resistance // source, cables included
	Choke           quantity.Resistance // of one phase
	DiodeResistance quantity.Resistance // of one phase
	ChokeInductance quantity.Inductance // of one phase
	Stray           quantity.Inductance // of the common loop
	Phases          int
}

func (c Conduction) resistance() float64 {
	return float64(c.Source) + (float64(c.Choke)+float64(c.DiodeResistance))/float64(c.Phases)
}

func (c Conduction) inductance() float64 {
	return float64(c.ChokeInductance)/float64(c.Phases) + float64(c.Stray)
}

func (c Conduction) drive() float64 { return float64(c.EMF - c.Bus - c.Diode) }

// Final is the current that settles, all phases together.
func (c Conduction) Final() quantity.Current { return quantity.Current(c.drive() / c.resistance()) }

// Slope is the first rate of rise in amperes per second, all phases together.
func (c Conduction) Slope() float64 { return c.drive() / c.inductance() }

// TimeConstant is L ⁄ R of the loop.
func (c Conduction) TimeConstant() quantity.Seconds {
	return quantity.Seconds(c.inductance() / c.resistance())
}

// TimeTo is the time from no current until the current reaches trip; false when it never does.
func (c Conduction) TimeTo(trip quantity.Current) (quantity.Seconds, bool) {
	final := c.Final()
	if trip >= final {
		return 0, false
	}
	return quantity.Seconds(float64(c.TimeConstant()) * math.Log(float64(final/(final-trip)))), true
}

// TimeToJoule is the time from no current until the Joule integral reaches energy, found by Newton's method on
// ∫i² dt = I_f²·[t − 2T(1 − e^(−t⁄T)) + ½T(1 − e^(−2t⁄T))].
func (c Conduction) TimeToJoule(integral quantity.CurrentTime2) quantity.Seconds {
	final, t := float64(c.Final()), float64(c.TimeConstant())
	goal := float64(integral) / (final * final * t) // in time constants
	x := goal + 1.5                                 // above the root: the integral is convex, so Newton falls onto it
	for range 60 {
		decay := -math.Expm1(-x)
		step := (joule(x) - goal) / (decay * decay)
		x -= step
		if math.Abs(step) <= 1e-13*x {
			break
		}
	}
	return quantity.Seconds(x * t)
}

// joule is ∫₀ˣ (1 − e^(−y))² dy; for small x the leading terms of its series, where the closed form cancels.
func joule(x float64) float64 {
	if x < 1e-3 {
		return x * x * x / 3 * (1 - 0.75*x + 0.35*x*x)
	}
	return x + 2*math.Expm1(-x) - math.Expm1(-2*x)/2
}

// uncontrolledFinding states the diode current into a collapsed bus (0 V): blocking the pulses does not stop it, only fuse or
// contactor do.
func uncontrolledFinding(s site.Site) finding.Finding {
	f := finding.Finding{
		ID: "window.uncontrolled", Title: "Diode current into a collapsed bus", Unit: "A",
		Basis: "I = E_high⁄(R_i + R_choke⁄N), bus at 0 V, diode drop 0; slope E_high⁄(L_choke⁄N + L_source); " + circuitTheory,
	}
	c := converter(s)
	var missing finding.Missing
	missing.Need("source.internal_resistance", s.Source.InternalResistance.IsGiven())
	missing.Need("converter.choke_resistance", c.ChokeResistance.IsGiven())
	missing.Need("converter.phases", c.Phases > 0)
	if s.Source.HighestRest() <= 0 {
		missing.Add(restKeys(s, +1)...)
	}
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	axes := []corner.Axis{internal(s), corner.Of("converter.choke_resistance", c.ChokeResistance),
		corner.Of("converter.choke", c.Choke), corner.Of("source.inductance", s.Source.Inductance)}
	loop := func(x []float64) Conduction {
		return Conduction{EMF: s.Source.HighestRest(), Source: quantity.Resistance(x[0]), Choke: quantity.Resistance(x[1]),
			ChokeInductance: quantity.Inductance(x[2]), Stray: quantity.Inductance(x[3]), Phases: c.Phases}
	}
	final := corner.Over(axes[:2], func(x []float64) float64 { return float64(loop([]float64{x[0], x[1], 0, 0}).Final()) })
	f = f.Stated(finding.ValueOf(final.Ends()))
	f.Because = append(f.Because, "blocking the pulses does not stop it; only fuse or contactor do")
	f = uncontrolledParts(s, f, axes, loop)
	w := finding.Explain(f.Basis, circuitTheory, "bus held at 0 V; chokes not saturated, which makes the real slope steeper")
	w.Given("E_high", "rest voltage at the top", "V", float64(s.Source.HighestRest()))
	w.Given("R_i", "internal resistance of the source", "Ω", axes[0].Nominal)
	w.Given("R_choke", "resistance of one choke", "Ω", axes[1].Nominal)
	w.Given("N", "phases", "1", float64(c.Phases))
	w.Step("R", "R_i + R_choke / N", "Ω", axes[0].Nominal+axes[1].Nominal/float64(c.Phases))
	w.Step("I", "E_high / R", "A", f.Value.Nominal)
	w.Spread(corner.DescribeEnds(axes[:2], final), corner.Names(axes[:2]), final.Moves)
	f.Explanation = w.Done()
	return f
}

// uncontrolledParts adds slope, bus voltage at rated current and time to pre-arcing, each where its inputs are given; what
// is left out is said.
func uncontrolledParts(s site.Site, f finding.Finding, axes []corner.Axis, loop func(x []float64) Conduction) finding.Finding {
	part := func(name, unit string, value func(x []float64) float64, lacking finding.Missing) {
		if len(lacking) > 0 {
			for _, key := range lacking {
				f.Because = append(f.Because, name+" needs "+key)
			}
			return
		}
		f.Parts = append(f.Parts, finding.Part{Name: name, Unit: unit, Value: finding.ValueOf(corner.Over(axes, value).Ends())})
	}
	c := converter(s)
	var inductive finding.Missing
	inductive.Need("converter.choke", c.Choke.IsGiven())
	inductive.Need("source.inductance", s.Source.Inductance.IsGiven())
	part("first slope", "A/s", func(x []float64) float64 { return loop(x).Slope() }, inductive)
	var rated finding.Missing
	rated.Need("converter.rated_current", c.RatedCurrent.IsGiven())
	part("bus voltage at rated current", "V", func(x []float64) float64 {
		return float64(s.Source.HighestRest()) - float64(c.RatedCurrent.Nominal)*loop(x).resistance()
	}, rated)
	fused := append(finding.Missing(nil), inductive...)
	fused.Need("source.fuse.pre_arcing_i2t", s.Source.Fuse != nil && s.Source.Fuse.PreArcingI2t.IsGiven())
	part("time to pre-arcing", "s", func(x []float64) float64 {
		return float64(loop(x).TimeToJoule(s.Source.Fuse.PreArcingI2t.Nominal))
	}, fused)
	return f
}

// backfeedFinding states the current from the bus into the empty source through a shorted upper switch and one choke.
func backfeedFinding(s site.Site) finding.Finding {
	f := finding.Finding{
		ID: "window.backfeed", Title: "Bus into the empty source through a shorted upper switch", Unit: "A",
		Basis: "I = (bus-high − E_low)⁄(R_i + R_choke), one choke, 0 behind a blocking diode; " + circuitTheory,
	}
	bus, missing := busEnd(s, true)
	c := converter(s)
	missing.Need("source.internal_resistance", s.Source.InternalResistance.IsGiven())
	missing.Need("converter.choke_resistance", c.ChokeResistance.IsGiven())
	if s.Source.LowestRest() <= 0 {
		missing.Add(restKeys(s, -1)...)
	}
	if s.Source.BlockingDiode {
		f = f.Stated(finding.Exactly(0))
		f.Because = append(f.Because, "the blocking diode of the source holds")
		return f
	}
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	axes := []corner.Axis{internal(s), corner.Of("converter.choke_resistance", c.ChokeResistance)}
	drive := math.Max(0, bus.values.High-float64(s.Source.LowestRest()))
	result := corner.Over(axes, func(x []float64) float64 { return drive / (x[0] + x[1]) })
	f = f.Stated(finding.ValueOf(result.Ends()))
	w := finding.Explain(f.Basis, circuitTheory, "steady; the bus held by its other infeeds, else only its capacitors discharge")
	w.Given("V_bus_high", "highest steady bus voltage", "V", bus.values.High)
	w.Given("E_low", "rest voltage at the bottom", "V", float64(s.Source.LowestRest()))
	w.Given("R_i", "internal resistance of the source", "Ω", axes[0].Nominal)
	w.Given("R_choke", "resistance of one choke", "Ω", axes[1].Nominal)
	w.Step("I", "max(0, V_bus_high - E_low) / (R_i + R_choke)", "A", result.Nominal)
	w.Spread(corner.DescribeEnds(axes, result), corner.Names(axes), result.Moves)
	f.Explanation = w.Done()
	return f
}
