package window

import (
	"math"

	"chargehand/commission/corner"
	"chargehand/commission/finding"
	"chargehand/commission/remedy"
	"chargehand/commission/site"
)

// chokeDuty is what one choke carries at one bus voltage, as plain numbers: N phases, sharing error σ, rated power,
// efficiency, switching frequency. The inductance and internal resistance are handed in, being toleranced.
type chokeDuty struct {
	bus, phases, sharing, power, efficiency, switching float64
	charges                                            bool // the source takes charge: the other direction counts too
}

// chokeAxes are internal resistance and choke, in this order.
func chokeAxes(s site.Site) (chokeDuty, []corner.Axis, finding.Missing) {
	axes, missing := powerAxes(s)
	c := converter(s)
	high, more := busEnd(s, true)
	missing.Add(more...)
	missing.Need("converter.phases", c.Phases > 0)
	missing.Need("converter.choke", c.Choke.IsGiven())
	missing.Need("converter.phase_sharing_error", c.PhaseSharingError.IsGiven())
	missing.Need("converter.switching_frequency", c.SwitchingFrequency.IsGiven())
	d := chokeDuty{
		bus: high.values.High, phases: float64(c.Phases), sharing: float64(c.PhaseSharingError.Nominal),
		power: float64(c.RatedPower.Nominal), efficiency: float64(c.Efficiency.Nominal),
		switching: float64(c.SwitchingFrequency.Nominal), charges: !s.Source.BlockingDiode,
	}
	return d, []corner.Axis{axes[0], corner.Of("converter.choke", c.Choke)}, missing
}

// peak is the worst choke peak at rest voltage e, both directions, NaN where the source cannot give the power; signed says
// whether the worst is while charging (−1).
func (d chokeDuty) peak(e, resistance, choke float64) (worst, sign float64) {
	worst, sign = d.oneWay(e, resistance, choke, d.power/d.efficiency), 1
	if !d.charges {
		return worst, sign
	}
	if charging := d.oneWay(e, resistance, choke, -d.power*d.efficiency); charging > worst {
		return charging, -1
	}
	return worst, sign
}

// oneWay is |I|⁄N·(1 + σ) + ΔI⁄2 with ΔI = V_bus·D·(1 − D)⁄(L·f_sw) and the source at its terminal voltage.
func (d chokeDuty) oneWay(e, resistance, choke, sourcePower float64) float64 {
	i, ok := currentAtPower(e, resistance, sourcePower)
	if !ok {
		return math.NaN()
	}
	share := (e - resistance*i) / d.bus
	swing := d.bus * share * (1 - share) / (choke * d.switching)
	return math.Abs(i)/d.phases*(1+d.sharing) + math.Abs(swing)/2
}

// worstOver is the worst peak over rest voltages low…high and the rest voltage where it stands.
func (d chokeDuty) worstOver(low, high, resistance, choke float64) (peak, at float64) {
	if _, ok := currentAtPower(low, resistance, d.power/d.efficiency); !ok {
		return math.NaN(), low
	}
	return corner.Greatest(low, high, 24, func(e float64) float64 {
		p, _ := d.peak(e, resistance, choke)
		return p
	})
}

// chokePeakFinding judges the worst peak current of one choke at rated power against its saturation.
func chokePeakFinding(s site.Site) finding.Finding {
	return remedy.Offer(s, chokePeak, func(f finding.Finding, passes func(site.Site) bool) (string, []finding.Change) {
		if f.State == finding.None {
			return easeBottom(s, passes)
		}
		return lowerPower(s, passes)
	})
}

func chokePeak(s site.Site) finding.Finding {
	f := finding.Finding{
		ID: "window.choke-peak", Title: "Worst peak current of a choke", Unit: "A", Guards: true,
		Basis: "|I|⁄N·(1 + σ) + ΔI⁄2, ΔI = V_bus·D·(1 − D)⁄(L·f_sw), at bus-high, both directions, worst rest voltage; " + powerElectronics,
	}
	d, axes, missing := chokeAxes(s)
	missing.Need("converter.choke_saturation", converter(s).ChokeSaturation.IsGiven())
	if s.Source.HighestRest() <= 0 {
		missing.Add(restKeys(s, +1)...)
	}
	if len(missing) > 0 {
		return f.Lacking(missing...)
	}
	low, high := float64(s.Source.LowestRest()), float64(s.Source.HighestRest())
	result := corner.Over(axes, func(x []float64) float64 {
		peak, _ := d.worstOver(low, high, x[0], x[1])
		return peak
	})
	limit := finding.AtMost(float64(s.Converter.ChokeSaturation.Nominal))
	if math.IsNaN(result.Low) {
		f = f.Without(finding.Fail, "at the bottom of the window the source cannot give the rated power at all")
		f.Limit = limit
		return f
	}
	f = f.Judged(finding.ValueOf(result.Ends()), limit, 0)
	f.Explanation = d.working(f, axes, low, high, result)
	return f
}

func (d chokeDuty) working(f finding.Finding, axes []corner.Axis, low, high float64, result corner.Spread) *finding.Explanation {
	r, l := axes[0].Nominal, axes[1].Nominal
	_, at := d.worstOver(low, high, r, l)
	_, sign := d.peak(at, r, l)
	power := d.power / d.efficiency
	if sign < 0 {
		power = -d.power * d.efficiency
	}
	i, _ := currentAtPower(at, r, power)
	w := finding.Explain(f.Basis, powerElectronics, "choke not saturated; continuous current")
	w.Given("E", "rest voltage where the peak is worst, searched over the window", "V", at)
	w.Given("R_i", "internal resistance of the source", "Ω", r)
	w.Given("P_rated", "rated power, negative where charging is the worse direction", "W", sign*d.power)
	w.Given("eta", "efficiency", "1", d.efficiency)
	w.Given("V_bus", "highest steady bus voltage", "V", d.bus)
	w.Given("N", "phases", "1", d.phases)
	w.Given("sigma", "sharing error of the phases", "1", d.sharing)
	w.Given("L", "inductance of one choke", "H", l)
	w.Given("f_sw", "switching frequency", "Hz", d.switching)
	if sign < 0 {
		w.Step("P", "P_rated * eta", "W", power)
	} else {
		w.Step("P", "P_rated / eta", "W", power)
	}
	w.Step("I", "2 * P / (E + sqrt(E^2 - 4 * R_i * P))", "A", i)
	terminal := at - r*i
	duty := 1 - terminal/d.bus
	w.Step("V_source", "E - R_i * I", "V", terminal)
	w.Step("D", "1 - V_source / V_bus", "1", duty)
	w.Step("dI", "abs(V_bus * D * (1 - D) / (L * f_sw))", "A", math.Abs(d.bus*duty*(1-duty)/(l*d.switching)))
	w.Step("I_peak", "abs(I) / N * (1 + sigma) + dI / 2", "A", result.Nominal)
	w.Spread(corner.DescribeEnds(axes, result), corner.Names(axes), result.Moves)
	return w.Done()
}
