package ripple

import (
	"math"

	"chargehand/commission/quantity"
)

// Stage is the switching stage: bus voltage, duty of the lower switch, inductance of one choke, switching frequency.
type Stage struct {
	Bus       quantity.Voltage
	Duty      quantity.Ratio // 0…1
	Choke     quantity.Inductance
	Switching quantity.Frequency
	Phases    int
}

// PhaseSwing is the ripple of one choke, peak to peak: V_bus·D·(1 − D) ⁄ (L·f_sw), greatest at D = ½.
func (s Stage) PhaseSwing() quantity.Current {
	d := float64(s.Duty)
	return quantity.Current(float64(s.Bus) * d * (1 - d) / (float64(s.Choke) * float64(s.Switching)))
}

// SumSwing is the ripple of all phases together, peak to peak: V_bus·x·(1 − x) ⁄ (N·L·f_sw) with x the fraction of N·D.
// It is zero at D = k ⁄ N.
func (s Stage) SumSwing() quantity.Current {
	x := fraction(float64(s.Phases) * float64(s.Duty))
	return quantity.Current(float64(s.Bus) * x * (1 - x) / (float64(s.Phases) * float64(s.Choke) * float64(s.Switching)))
}

// fraction is the part of v above its whole number, where a value within rounding of a whole number has none: at D = k ⁄ N
// floating point gives 1 − 1e−16 as often as 0.
func fraction(v float64) float64 {
	x := v - math.Floor(v)
	if x < 1e-12 || x > 1-1e-12 {
		return 0
	}
	return x
}

// SumRMS is the root mean square of the summed ripple, a triangle: peak to peak ⁄ √12.
func (s Stage) SumRMS() quantity.Current { return s.SumSwing() / quantity.Current(math.Sqrt(12)) }

// Peak is the greatest current of one choke that carries its share of the sum: |I| ⁄ N·(1 + sharing error) + ΔI ⁄ 2.
func (s Stage) Peak(sum quantity.Current, sharing quantity.Ratio) quantity.Current {
	return quantity.Current(math.Abs(float64(sum)))/quantity.Current(s.Phases)*quantity.Current(1+sharing) + s.PhaseSwing()/2
}

// PhaseRMS is the root mean square of one choke's current: √((I ⁄ N)² + ΔI² ⁄ 12).
func (s Stage) PhaseRMS(sum quantity.Current) quantity.Current {
	mean, swing := float64(sum)/float64(s.Phases), float64(s.PhaseSwing())
	return quantity.Current(math.Sqrt(mean*mean + swing*swing/12))
}

// ContinuousFrom is the sum current from which on no choke current touches zero: N·ΔI ⁄ 2.
func (s Stage) ContinuousFrom() quantity.Current {
	return quantity.Current(s.Phases) * s.PhaseSwing() / 2
}

// SumHarmonic is the amplitude of harmonic h of N·f_sw in the sum of equal chokes: V_bus·|sin(π·h·x)| ⁄ (π²h²·N·f_sw·L).
func (s Stage) SumHarmonic(h int) quantity.Current {
	k := float64(h)
	x := fraction(float64(s.Phases) * float64(s.Duty))
	return quantity.Current(float64(s.Bus) * math.Abs(math.Sin(math.Pi*k*x)) /
		(math.Pi * math.Pi * k * k * float64(s.Phases) * float64(s.Switching) * float64(s.Choke)))
}

// Harmonic is the amplitude of harmonic h of f_sw in the sum of chokes that differ:
// |Σ V_bus·sin(π·h·D) ⁄ (π²h²·f_sw·L_k)·e^(−j2πh·k⁄N)|.
func Harmonic(bus quantity.Voltage, duty quantity.Ratio, switching quantity.Frequency, chokes []quantity.Inductance, h int) quantity.Current {
	inverse := make([]float64, len(chokes))
	for k, l := range chokes {
		inverse[k] = 1 / float64(l)
	}
	n := float64(h)
	factor := float64(bus) * math.Sin(math.Pi*n*float64(duty)) / (math.Pi * math.Pi * n * n * float64(switching))
	return quantity.Current(math.Abs(factor) * math.Sqrt(phasorSquare(inverse, h)))
}

// phasorSquare is |Σ c_k·e^(−j2πh·k⁄N)|².
func phasorSquare(c []float64, h int) float64 {
	var re, im float64
	for k, v := range c {
		sin, cos := math.Sincos(2 * math.Pi * float64(h*k) / float64(len(c)))
		re, im = re+v*cos, im+v*sin
	}
	return re*re + im*im
}
