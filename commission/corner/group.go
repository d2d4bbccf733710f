package corner

// Sum is the axis of quantities that only ever enter as their sum: its corners are those of all members together.
func Sum(name string, members []Axis) Axis {
	sum := Axis{Name: name}
	for _, m := range members {
		sum.Low += m.Low
		sum.Nominal += m.Nominal
		sum.High += m.High
	}
	return sum
}

// Parallel is the axis of resistances that only ever enter in parallel, and the conductances that make it up, for [Shares].
// Without any it is exactly 0, which stands for none.
func Parallel(name string, resistances []Axis) (whole Axis, conductances []Axis) {
	if len(resistances) == 0 {
		return Exact(name, 0), nil
	}
	for _, r := range resistances {
		conductances = append(conductances, Axis{Name: r.Name, Low: 1 / r.High, Nominal: 1 / r.Nominal, High: 1 / r.Low})
	}
	sum := Sum(name, conductances)
	return Axis{Name: name, Low: 1 / sum.High, Nominal: 1 / sum.Nominal, High: 1 / sum.Low}, conductances
}

// Scaled is the axis times a number above 0, under its old name.
func (a Axis) Scaled(by float64) Axis {
	return Axis{Name: a.Name, Low: a.Low * by, Nominal: a.Nominal * by, High: a.High * by}
}

// Shares are what each input moves by itself, an axis of several members split among them by their widths; members[i] are
// those of axes[i]. The widths of a sum, and of resistances in parallel as conductances, add up to that of their axis.
func Shares(axes []Axis, members [][]Axis, moves []float64) (names []string, parts []float64) {
	for i, axis := range axes {
		whole := Sum(axis.Name, members[i])
		if width := whole.High - whole.Low; len(members[i]) >= 2 && width > 0 {
			for _, m := range members[i] {
				names, parts = append(names, m.Name), append(parts, moves[i]*(m.High-m.Low)/width)
			}
			continue
		}
		names, parts = append(names, axis.Name), append(parts, moves[i])
	}
	return names, parts
}
