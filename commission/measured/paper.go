package measured

import (
	"math"

	"chargehand/commission/corner"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

// band is a predicted quantity over its tolerances, in SI.
type band struct{ low, nominal, high float64 }

func bandOf[Q quantity.Scalar](s quantity.Spread[Q]) band {
	return band{float64(s.Low), float64(s.Nominal), float64(s.High)}
}

func (b band) plus(o band) band { return band{b.low + o.low, b.nominal + o.nominal, b.high + o.high} }

func (b band) holds(v, guard float64) bool { return v >= b.low-guard && v <= b.high+guard }

// widened grows the band by a fraction on both sides.
func (b band) widened(fraction float64) band {
	return band{b.low * (1 - fraction), b.nominal, b.high * (1 + fraction)}
}

// paper is what the site file says of the pre-charge circuit, in SI and in the symbols of the formulas:
//
//	r    source, resistor and choke ⁄ phases in series, Ω
//	rp   the resistor alone, Ω
//	c    every bank that is not isolated and a filter at the star point, F
//	rb   all bleeders in parallel, Ω; +Inf without
//	p    auxiliary power, W, on above vOn and off below vOff
type paper struct {
	site                  site.Site
	r, ri, rp, c          band
	filter                band // at the star point, 0 without
	rb                    band
	p, vOn, vOff          float64
	cSource               float64 // supercapacitor, 0 for a source that holds its voltage
	phases                int
	busError, sourceError float64
}

func paperOf(s site.Site) paper {
	p := paper{site: s, phases: 3, busError: float64(s.Bus.Error()), sourceError: float64(s.Source.Error())}
	p.ri, p.rp = bandOf(s.Source.InternalResistance.Spread), bandOf(s.Precharge.Resistance.Spread)
	p.r = p.ri.plus(p.rp)
	if v := s.Converter; v != nil {
		if v.Phases > 0 {
			p.phases = v.Phases
		}
		choke := float64(v.ChokeResistance.Nominal) / float64(p.phases)
		p.r = p.r.plus(band{choke, choke, choke})
		if v.Filter != nil && v.Filter.Position == site.AtStar {
			p.filter = bandOf(v.Filter.Capacitance.Spread)
		}
	}
	for _, b := range s.Bus.Capacitances {
		if !b.Isolated {
			p.c = p.c.plus(bandOf(b.Value.Spread))
		}
	}
	p.c = p.c.plus(p.filter)
	p.rb = bleeders(s.Bus.Bleeders)
	if a := s.Bus.Auxiliary; a != nil {
		p.p, p.vOn, p.vOff = float64(a.Power.Nominal), float64(a.StartsAt.Nominal), float64(a.StopsAt.Nominal)
	}
	if s.Source.Kind == site.Supercapacitor {
		p.cSource = float64(s.Source.Capacitance.Nominal)
	}
	return p
}

func bleeders(all []site.Bleeder) band {
	var g band // conductances, the low one from the high resistances
	for _, b := range all {
		g = g.plus(band{1 / float64(b.Value.High), 1 / float64(b.Value.Nominal), 1 / float64(b.Value.Low)})
	}
	return band{1 / g.high, 1 / g.nominal, 1 / g.low}
}

// parallel is a resistance beside another that may be infinite.
func parallel(a, b float64) float64 {
	if math.IsInf(b, 1) {
		return a
	}
	return a * b / (a + b)
}

// series is a capacitance behind the source's own, where it has one.
func (p paper) series(c float64) float64 {
	if p.cSource > 0 {
		return c * p.cSource / (c + p.cSource)
	}
	return c
}

// tau is the time constant (R ∥ R_b)·C over all corners (formulas A).
func (p paper) tau() band {
	s := corner.Over([]corner.Axis{axis("R", p.r), axis("C", p.c), axis("R_b", p.rb)}, func(x []float64) float64 {
		return parallel(x[0], x[2]) * p.series(x[1])
	})
	return band{s.Low, s.Nominal, s.High}
}

func axis(name string, b band) corner.Axis {
	return corner.Axis{Name: name, Low: b.low, Nominal: b.nominal, High: b.high}
}

// settledDrop is the source's EMF less the bus voltage once the charge has settled, with the auxiliary supply on at the
// greatest and off at the least (formulas A: v₊ = ½·[V_f + √(V_f² − 4·R_e·P)]). Where the auxiliary supply lets nothing
// settle the greatest is the whole distance to its turn-on voltage.
func (p paper) settledDrop(emf float64) band {
	drop := func(r, rb, power float64) float64 {
		final, re := emf, r
		if !math.IsInf(rb, 1) {
			final, re = emf*rb/(r+rb), r*rb/(r+rb)
		}
		if power == 0 || final < p.vOn {
			return emf - final
		}
		root := final*final - 4*re*power
		if root < 0 {
			return emf - p.vOn
		}
		return emf - (final+math.Sqrt(root))/2
	}
	return band{drop(p.r.low, p.rb.high, 0), drop(p.r.nominal, p.rb.nominal, p.p), drop(p.r.high, p.rb.low, p.p)}
}

// curve integrates the pre-charge of the figures on paper with some of them changed: the same circuit as the formulas, taken
// in steps so that the auxiliary supply and a load that comes late have their place.
type curve struct {
	emf, v0, r, c, cSource float64
	g                      float64 // conductance across the bus, S
	gFrom                  float64 // seconds from which extra is on
	extra                  float64 // a further conductance, S
	p, vOn, vOff           float64
}

// at gives the bus voltage at ascending times from 0 on; before 0 it is v0.
func (k curve) at(times []float64) []float64 {
	out := make([]float64, len(times))
	v, emf, now, on := k.v0, k.emf, 0.0, k.p > 0 && k.v0 > k.vOn
	longest := k.r * k.c / 60
	for i, t := range times {
		for now < t {
			h := math.Min(longest, t-now)
			if k.gFrom > now && k.gFrom < now+h {
				h = k.gFrom - now
			}
			charge := math.Max(0, (emf-v)/k.r)
			a := k.slope(v, emf, on, now)
			b := k.slope(v+a*h/2, emf-k.fall(charge)*h/2, on, now)
			v += b * h
			emf -= k.fall(charge) * h
			now += h
			switch {
			case k.p > 0 && !on && v > k.vOn:
				on = true
			case on && v < k.vOff:
				on = false
			}
		}
		out[i] = v
	}
	return out
}

func (k curve) fall(current float64) float64 {
	if k.cSource <= 0 {
		return 0
	}
	return current / k.cSource
}

func (k curve) slope(v, emf float64, on bool, now float64) float64 {
	i := math.Max(0, (emf-v)/k.r) - k.g*v
	if k.extra != 0 && now >= k.gFrom {
		i -= k.extra * v
	}
	if on {
		i -= k.p / math.Max(v, 1)
	}
	return i / k.c
}
