package window

import (
	"math"

	"chargehand/commission/quantity"
)

// CurrentAtPower is the current of a source of electromotive force emf behind internal that gives power at its terminals
// (negative: takes it): 2P ⁄ (E + √(E² − 4·R_i·P)), which loses no digits and holds for both signs. There is none above
// E² ⁄ (4·R_i), the greatest power the source can give.
func CurrentAtPower(emf quantity.Voltage, internal quantity.Resistance, power quantity.Power) (quantity.Current, bool) {
	i, ok := currentAtPower(float64(emf), float64(internal), float64(power))
	return quantity.Current(i), ok
}

func currentAtPower(e, r, p float64) (float64, bool) {
	root := e*e - 4*r*p
	if root < 0 || e <= 0 {
		return math.NaN(), false
	}
	return 2 * p / (e + math.Sqrt(root)), true
}

// Limits are what bounds the power of source and converter. An absent limit is 0.
type Limits struct {
	Phase           quantity.Current // per phase
	Phases          int
	Source          quantity.Current
	LeastTerminal   quantity.Voltage
	HighestTerminal quantity.Voltage
}

// AvailableDischarge is the greatest power on the bus side, η·(E − R_i·I)·I with I the least of what the phases, the
// source, its least terminal voltage and its own resistance (E ⁄ 2R_i) allow; and that current.
func AvailableDischarge(emf quantity.Voltage, internal quantity.Resistance, efficiency quantity.Ratio, l Limits) (quantity.Power, quantity.Current) {
	e, r := float64(emf), float64(internal)
	i := l.current()
	if r > 0 {
		i = math.Min(i, e/(2*r))
		if l.LeastTerminal > 0 {
			i = math.Min(i, (e-float64(l.LeastTerminal))/r)
		}
	}
	i = math.Max(i, 0)
	return quantity.Power(float64(efficiency) * (e - r*i) * i), quantity.Current(i)
}

// AvailableCharge is the greatest power taken from the bus, (E + R_i·I)·I ⁄ η, within the same limits upwards.
func AvailableCharge(emf quantity.Voltage, internal quantity.Resistance, efficiency quantity.Ratio, l Limits) (quantity.Power, quantity.Current) {
	e, r := float64(emf), float64(internal)
	i := l.current()
	if r > 0 && l.HighestTerminal > 0 {
		i = math.Min(i, (float64(l.HighestTerminal)-e)/r)
	}
	i = math.Max(i, 0)
	return quantity.Power((e + r*i) * i / float64(efficiency)), quantity.Current(i)
}

func (l Limits) current() float64 {
	i := math.Inf(1)
	if l.Phase > 0 {
		i = float64(l.Phase) * float64(l.Phases)
	}
	if l.Source > 0 {
		i = math.Min(i, float64(l.Source))
	}
	return i
}
