package closing

import (
	"math"

	"chargehand/commission/quantity"
)

// Loop is a series circuit closed on a voltage, with a diode that lets no current back.
type Loop struct {
	Voltage     quantity.Voltage     // u, what is missing, diode drop taken off
	Resistance  quantity.Resistance  // R, all in series
	Inductance  quantity.Inductance  // L, all in series
	Capacitance quantity.Capacitance // C, with a supercapacitor's own in series
	Current     quantity.Current     // i_0, flowing just before
}

// rates are α, ω_0² and the distance from critical damping: ω² = ω_0² − α², negative where overdamped.
func (l Loop) rates() (alpha, resonance2, square float64) {
	alpha = float64(l.Resistance) / (2 * float64(l.Inductance))
	resonance2 = 1 / (float64(l.Inductance) * float64(l.Capacitance))
	return alpha, resonance2, resonance2 - alpha*alpha
}

// Damping is ζ = α⁄ω_0: below 1 the current swings, above it creeps.
func (l Loop) Damping() quantity.Ratio {
	alpha, resonance2, _ := l.rates()
	return quantity.Ratio(alpha / math.Sqrt(resonance2))
}

// PeakTime is when the current is greatest; 0 where it only falls, or without inductance.
func (l Loop) PeakTime() quantity.Seconds {
	if l.Inductance <= 0 {
		return 0
	}
	alpha, resonance2, square := l.rates()
	rise := float64(l.Voltage)/float64(l.Inductance) - 2*alpha*float64(l.Current) // di⁄dt at the start
	if rise <= 0 {
		return 0
	}
	// tan(ω·t) = ω·rise ⁄ (α·rise + ω_0²·i_0), with the hyperbolic tangent where overdamped.
	below := alpha*rise + resonance2*float64(l.Current)
	omega := math.Sqrt(math.Abs(square))
	switch {
	case omega <= 1e-9*alpha:
		return quantity.Seconds(rise / below)
	case square > 0:
		return quantity.Seconds(math.Atan2(omega*rise, below) / omega)
	case l.Current == 0:
		return quantity.Seconds(math.Log((alpha+omega)/math.Sqrt(resonance2)) / omega)
	}
	return quantity.Seconds(math.Atanh(omega*rise/below) / omega)
}

// PeakCurrent is the greatest current; without inductance u⁄R at once.
func (l Loop) PeakCurrent() quantity.Current {
	if l.Inductance <= 0 {
		return max(l.Current, quantity.Current(float64(l.Voltage)/float64(l.Resistance)))
	}
	if l.Current == 0 {
		alpha, _, _ := l.rates()
		return quantity.Current(float64(l.Voltage) * math.Sqrt(float64(l.Capacitance)/float64(l.Inductance)) * math.Exp(-alpha*float64(l.PeakTime())))
	}
	return quantity.Current(l.current(float64(l.PeakTime())))
}

// current is i(t) = e^(−αt)·(i_0·cos ωt + (u⁄L − α·i_0)·sin(ωt)⁄ω), hyperbolic where overdamped. The overdamped form is
// the sum of its two exponentials, the slow rate as ω_0²⁄(α + β), which does not cancel.
func (l Loop) current(t float64) float64 {
	alpha, resonance2, square := l.rates()
	i0 := float64(l.Current)
	slope := float64(l.Voltage)/float64(l.Inductance) - alpha*i0
	omega := math.Sqrt(math.Abs(square))
	switch {
	case omega*t < 1e-6 || omega <= 1e-9*alpha:
		return math.Exp(-alpha*t) * (i0 + slope*t)
	case square > 0:
		return math.Exp(-alpha*t) * (i0*math.Cos(omega*t) + slope*math.Sin(omega*t)/omega)
	}
	slow, fast := resonance2/(alpha+omega), alpha+omega
	return (i0+slope/omega)/2*math.Exp(-slow*t) + (i0-slope/omega)/2*math.Exp(-fast*t)
}

// End is when the current ends in an underdamped loop; infinite where it only creeps to nothing.
func (l Loop) End() quantity.Seconds {
	if l.Inductance <= 0 {
		return quantity.Seconds(math.Inf(1))
	}
	alpha, _, square := l.rates()
	if square <= 0 {
		return quantity.Seconds(math.Inf(1))
	}
	omega := math.Sqrt(square)
	b := (float64(l.Voltage)/float64(l.Inductance) - alpha*float64(l.Current)) / omega
	return quantity.Seconds((math.Pi - math.Atan2(float64(l.Current), b)) / omega)
}

// Charge is what flows until the end: C·(u − L·di⁄dt) at the end, C·u where the current creeps.
func (l Loop) Charge() quantity.Charge {
	return quantity.Charge(float64(l.Capacitance) * (float64(l.Voltage) + float64(l.Beyond())))
}

// Beyond is how far the capacitor ends above what was missing, k·u; 0 where the current creeps.
func (l Loop) Beyond() quantity.Voltage {
	end := float64(l.End())
	if math.IsInf(end, 1) {
		return 0
	}
	alpha, resonance2, square := l.rates()
	omega := math.Sqrt(square)
	i0, u, inductance := float64(l.Current), float64(l.Voltage), float64(l.Inductance)
	// −L·di⁄dt at the end; the derivative of the current in the same form as the current itself.
	slope := u/inductance - alpha*i0
	derivative := math.Exp(-alpha*end) * ((slope-alpha*i0)*math.Cos(omega*end) - (resonance2*i0+alpha*(slope-alpha*i0))*math.Sin(omega*end)/omega)
	return quantity.Voltage(-inductance * derivative)
}

// I2t is ∫ i² dt until the end, from the energy balance (u·q − q²⁄2C + ½·L·i_0²)⁄R; C·u²·(1 − k²)⁄2R from rest.
func (l Loop) I2t() quantity.CurrentTime2 {
	u, c, r, inductance := float64(l.Voltage), float64(l.Capacitance), float64(l.Resistance), float64(l.Inductance)
	if r == 0 {
		// Undamped: the current is a sine of amplitude √(u²C⁄L + i_0²), cut where it starts and whole until its zero.
		i0 := float64(l.Current)
		amplitude2, end := u*u*c/inductance+i0*i0, float64(l.End())
		omega := 1 / math.Sqrt(inductance*c)
		return quantity.CurrentTime2(amplitude2/2*end + i0*u*math.Sqrt(c/inductance)/(2*omega))
	}
	beyond := float64(l.Beyond())
	// u·q − q²⁄2C = ½·C·(u² − beyond²)
	return quantity.CurrentTime2((c*(u-beyond)*(u+beyond) + inductance*float64(l.Current*l.Current)) / (2 * r))
}
