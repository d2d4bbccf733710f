package ripple

import (
	"math"
	"math/cmplx"

	"chargehand/commission/quantity"
)

// Branches are the two ways of the summed ripple: the filter capacitor, and the source with its loop. A zero Capacitance
// is no filter: all of the ripple reaches the source.
type Branches struct {
	Capacitance      quantity.Capacitance
	ESR              quantity.Resistance
	ESL              quantity.Inductance
	Source           quantity.Resistance
	SourceInductance quantity.Inductance
}

func (b Branches) filter(omega float64) complex128 {
	return complex(float64(b.ESR), omega*float64(b.ESL)-1/(omega*float64(b.Capacitance)))
}

func (b Branches) source(omega float64) complex128 {
	return complex(float64(b.Source), omega*float64(b.SourceInductance))
}

// SourceShare is the part of the summed ripple that reaches the source at a frequency, |Z_c ⁄ (Z_c + Z_s)|, the star point
// taken as stiff. It exceeds 1 near the resonance.
func (b Branches) SourceShare(f quantity.Frequency) float64 {
	if b.Capacitance == 0 {
		return 1
	}
	omega := 2 * math.Pi * float64(f)
	zc, zs := b.filter(omega), b.source(omega)
	return cmplx.Abs(zc / (zc + zs))
}

// FilterShare is the part that flows in the filter, |Z_s ⁄ (Z_c + Z_s)|.
func (b Branches) FilterShare(f quantity.Frequency) float64 {
	if b.Capacitance == 0 {
		return 0
	}
	omega := 2 * math.Pi * float64(f)
	zc, zs := b.filter(omega), b.source(omega)
	return cmplx.Abs(zs / (zc + zs))
}

// StarPoint is the factor by which a real star point changes the summed ripple: the chokes in parallel drive the two
// branches, |jωL⁄N ⁄ (jωL⁄N + Z_c ∥ Z_s)|. It multiplies both shares.
func (b Branches) StarPoint(f quantity.Frequency, choke quantity.Inductance, phases int) float64 {
	omega := 2 * math.Pi * float64(f)
	chokes := complex(0, omega*float64(choke)/float64(phases))
	load := b.source(omega)
	if b.Capacitance > 0 {
		zc := b.filter(omega)
		load = zc * load / (zc + load)
	}
	return cmplx.Abs(chokes / (chokes + load))
}

// Resonance is where filter and source loop resonate under a current-controlled converter, 1 ⁄ (2π√(C·(L_s + ESL))).
func (b Branches) Resonance() quantity.Frequency {
	return resonance(float64(b.Capacitance), float64(b.SourceInductance)+float64(b.ESL))
}

// ResonanceAtFixedDuty is the same at a fixed duty: the chokes in parallel stand beside the source loop, and it is higher.
func (b Branches) ResonanceAtFixedDuty(choke quantity.Inductance, phases int) quantity.Frequency {
	l, s := float64(choke)/float64(phases), float64(b.SourceInductance)
	return resonance(float64(b.Capacitance), s*l/(s+l)+float64(b.ESL))
}

func resonance(c, l float64) quantity.Frequency {
	return quantity.Frequency(1 / (2 * math.Pi * math.Sqrt(c*l)))
}
