package measured

import (
	"fmt"
	"math"

	"chargehand/commission/finding"
	"chargehand/commission/fit"
)

// measurement is one measured value with what is known of it.
type measurement struct {
	value   float64
	u       float64 // standard uncertainty from the scatter
	freedom int     // degrees of freedom behind u
	bound   float64 // bound of an error common to all samples; enters as a rectangle, bound ⁄ √3 (JCGM 100, 4.3.7)
}

// expanded is U: the scatter with Student's t for its degrees of freedom, and the bound with k = 2.
func (m measurement) expanded() float64 {
	scatter := 0.0
	if m.u > 0 {
		scatter = fit.Coverage(m.freedom) * m.u
	}
	return math.Hypot(scatter, 2*m.bound/math.Sqrt(3))
}

func (m measurement) asValue() finding.Value {
	U := m.expanded()
	return finding.Value{Low: m.value - U, Nominal: m.value, High: m.value + U}
}

// judge holds a measurement against a predicted band with U as the guard band (JCGM 106:2012, idea, from memory): inside by
// at least U passes, outside by more than U fails, anything between cannot be decided by this measurement. Just inside is
// marginal where the band is wide enough for the measurement to decide at all.
func judge(m measurement, b band, what, unit string) (finding.Verdict, string) {
	U := m.expanded()
	inside := math.Min(m.value-b.low, b.high-m.value)
	text := fmt.Sprintf("%s %s ± %s, predicted %s", what, number(m.value, unit), number(U, unit), b.words(unit))
	switch {
	case math.IsNaN(inside) || math.IsNaN(U) || math.IsInf(U, 0):
		return finding.Undecided, what + " cannot be judged because it has no uncertainty"
	case inside >= U:
		return finding.Pass, text
	case inside < -U:
		return finding.Fail, text + fmt.Sprintf(": %s outside", number(-inside, unit))
	case 2*U >= b.high-b.low:
		return finding.Undecided, text + ": not capable, the uncertainty is as wide as the prediction"
	case inside < 0:
		return finding.Undecided, text + fmt.Sprintf(": outside by %s, which is less than the uncertainty: not capable of deciding", number(-inside, unit))
	}
	return finding.Marginal, text + fmt.Sprintf(": inside by %s, which is less than the uncertainty", number(inside, unit))
}

func (b band) words(unit string) string {
	switch {
	case math.IsInf(b.low, -1):
		return "at most " + number(b.high, unit)
	case math.IsInf(b.high, 1):
		return "at least " + number(b.low, unit)
	}
	return number(b.low, unit) + " … " + number(b.high, unit)
}

func (b band) limit() finding.Limit {
	switch {
	case math.IsInf(b.low, -1):
		return finding.AtMost(b.high)
	case math.IsInf(b.high, 1):
		return finding.AtLeast(b.low)
	}
	return finding.Between(b.low, b.high)
}

// number prints four significant digits with the prefix that keeps them readable.
func number(v float64, unit string) string {
	size := math.Abs(v)
	switch {
	case unit == "%":
		return fmt.Sprintf("%.1f %%", 100*v)
	case size == 0 || math.IsNaN(v) || math.IsInf(v, 0):
		return fmt.Sprintf("%g %s", v, unit)
	case unit == "1":
		return fmt.Sprintf("%.4g", v)
	case unit == "°C" || unit == "K":
		return fmt.Sprintf("%.1f %s", v, unit)
	}
	for _, step := range []struct {
		from   float64
		prefix string
	}{{1e9, "G"}, {1e6, "M"}, {1e4, "k"}, {0.1, ""}, {1e-4, "m"}, {1e-7, "µ"}} {
		if size >= step.from {
			scale := map[string]float64{"G": 1e9, "M": 1e6, "k": 1e3, "": 1, "m": 1e-3, "µ": 1e-6}[step.prefix]
			return significant(v/scale) + " " + step.prefix + unit
		}
	}
	return fmt.Sprintf("%.3g %s", v, unit)
}

func significant(v float64) string {
	digits := 3 - int(math.Floor(math.Log10(math.Abs(v))))
	return fmt.Sprintf("%.*f", min(max(digits, 0), 3), v)
}

// verdictFinding starts a finding with what all measured ones share.
func verdictFinding(id, title, unit, basis string) finding.Finding {
	return finding.Finding{ID: id, Title: title, Unit: unit, State: finding.None, Value: finding.NoValue(), Margin: math.NaN(), Verdict: finding.Undecided, Basis: basis}
}

// withMeasurement fills in value, limit and margin of the finding's own quantity.
func withMeasurement(f finding.Finding, m measurement, b band) finding.Finding {
	f.State, f.Value, f.Limit = finding.Finite, m.asValue(), b.limit()
	f.Margin = math.Inf(1)
	for _, v := range []float64{f.Value.Low, f.Value.High} {
		margin, _ := f.Limit.MarginOf(v)
		f.Margin = math.Min(f.Margin, margin)
	}
	return f
}

func cannot(f finding.Finding, why string) finding.Finding {
	f.State, f.Value, f.Margin, f.Verdict = finding.None, finding.NoValue(), math.NaN(), finding.Undecided
	f.Because = append(f.Because, "cannot be judged because "+why)
	return f
}
