package droop

import (
	"math"

	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

// conductor is one row of the table of conductor resistances: the greatest resistance at 20 °C in ohms per kilometre of a
// conductor of plain annealed copper.
type conductor struct {
	section        float64 // mm²
	class2, class5 float64 // Ω/km at 20 °C
}

// conductors are those of IEC 60228:2004, table 2 (class 2, stranded) and table 3 (class 5, flexible), plain copper, from
// 10 mm² to 400 mm², the sizes that a site file may name. The figures agree in several public reprints of the tables; the
// table numbers are from memory. That 50 mm² of class 5 lies below class 2 is right.
var conductors = []conductor{
	{10, 1.83, 1.91}, {16, 1.15, 1.21}, {25, 0.727, 0.780}, {35, 0.524, 0.554}, {50, 0.387, 0.386}, {70, 0.268, 0.272},
	{95, 0.193, 0.206}, {120, 0.153, 0.161}, {150, 0.124, 0.129}, {185, 0.0991, 0.106}, {240, 0.0754, 0.0801},
	{300, 0.0601, 0.0641}, {400, 0.0470, 0.0486},
}

// copperCoefficient is the temperature coefficient of copper's resistance at 20 °C, per kelvin (IEC 60028, from memory). The
// printed factors of IEC 60228 use the rounded 0.004; they differ by 0.3 % at 70 °C.
const copperCoefficient = 0.00393

// ConductorResistance is the greatest resistance of one conductor in ohms per metre at a temperature: the table's figure
// times 1 + 0.00393·(T − 20 °C). It is false for a section or class that the table does not have.
func ConductorResistance(section quantity.Area, class int, temperature quantity.Temperature) (float64, bool) {
	for _, c := range conductors {
		if !(math.Abs(c.section*1e-6-float64(section)) <= 1e-12) {
			continue
		}
		perKilometre := c.class2
		switch class {
		case 0, 2:
		case 5:
			perKilometre = c.class5
		default:
			return 0, false
		}
		return perKilometre / 1000 * (1 + copperCoefficient*(float64(temperature)-20)), true
	}
	return 0, false
}

// CableResistance is the resistance of a cable's two conductors at its temperature, or the keys that are missing or not in
// the table. A missing cable has none.
func CableResistance(c *site.Cable) (quantity.Spread[quantity.Resistance], []string) {
	if c == nil {
		return quantity.Exactly(quantity.Resistance(0)), nil
	}
	var missing []string
	if !c.Length.IsGiven() {
		missing = append(missing, "infeed.cable.length")
	}
	if !c.Temperature.IsGiven() {
		missing = append(missing, "infeed.cable.temperature")
	}
	if c.Material != "" && c.Material != "copper" {
		missing = append(missing, "infeed.cable.material (copper only)")
	}
	if _, ok := ConductorResistance(c.Section.Nominal, c.Class, 20); !ok {
		missing = append(missing, "infeed.cable.section (a size of IEC 60228, class 2 or 5, 10 mm² to 400 mm²)")
	}
	if len(missing) > 0 {
		return quantity.Spread[quantity.Resistance]{}, missing
	}
	at := func(length quantity.Length, temperature quantity.Temperature) quantity.Resistance {
		perMetre, _ := ConductorResistance(c.Section.Nominal, c.Class, temperature)
		return quantity.Resistance(2 * float64(length) * perMetre)
	}
	return quantity.Spread[quantity.Resistance]{
		Low:     at(c.Length.Low, c.Temperature.Low),
		Nominal: at(c.Length.Nominal, c.Temperature.Nominal),
		High:    at(c.Length.High, c.Temperature.High),
	}, nil
}
