package registermap

import "fmt"

// Reference gives the traditional number of a place: a digit for the table (0 coil, 1 discrete, 3 input, 4 holding) and
// the item counted from 1 in four digits, or in five from item 10000 on. No standard has these numbers; device lists do.
func Reference(t Table, a Address) string {
	digit := map[Table]int{Coil: 0, Discrete: 1, Input: 3, Holding: 4}[t]
	item := int(a) + 1
	if item > 9999 {
		return fmt.Sprintf("%d%05d", digit, item)
	}
	return fmt.Sprintf("%d%04d", digit, item)
}

// Reference gives the point's traditional number: "40101" for holding 100.
func (p Point) Reference() string { return Reference(p.Table, p.Address) }

// Place shows the point's address both ways: "holding 100, 40101".
func (p Point) Place() string {
	s := fmt.Sprintf("%s %d, %s", p.Table, p.Address, p.Reference())
	if p.Type == Bit && !p.Table.HasBits() {
		s += fmt.Sprintf(", bit %d", p.BitNumber)
	}
	return s
}
