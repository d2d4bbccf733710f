package chart

import (
	"math"
	"strconv"
)

// Axis lays a range of values on a number of equal cells (rows or columns). Each cell stands for Step ⁄ PerTick, and the
// first cell for a whole multiple of that.
type Axis struct {
	Cells   int     // how many
	Step    float64 // between two ticks: 1, 2, 2.5 or 5 times a power of ten
	PerTick int     // cells between two ticks
	first   int64   // the first cell's value in units of Step ⁄ PerTick
	places  int     // decimals of a tick's label
}

var mantissas = []struct {
	size   float64
	places int // decimals that a multiple of it needs
}{{1, 0}, {2, 0}, {2.5, 1}, {5, 0}}

// NewAxis chooses ticks so that low and high both lie on the axis, as little of it as possible lies beyond them, and two
// ticks are at least least and at most most cells apart, though never so far that there would be only one. Low need not
// be below high. Values that are not finite, or too far apart for any use, give an axis from 0 to 1.
func NewAxis(low, high float64, cells, least, most int) Axis {
	low, high = usable(low, high)
	cells = max(cells, 1)
	least = min(max(least, 1), max(cells/2, 1))
	most = min(max(most, least), max(cells/2, 1))
	best, bestPitch := Axis{}, math.Inf(1)
	span := high - low
	coarsest := int(math.Ceil(math.Log10(span))) + 1
	for exponent := coarsest; exponent >= coarsest-5; exponent-- {
		for _, m := range mantissas {
			step := decimal(m.size, exponent)
			for perTick := least; perTick <= most; perTick++ {
				pitch := step / float64(perTick)
				if pitch > bestPitch*(1+1e-9) || pitch > bestPitch*(1-1e-9) && perTick >= best.PerTick {
					continue
				}
				first := math.Floor(low/pitch + 1e-9)
				if first+float64(cells-1) < high/pitch-1e-9 || math.Abs(first) > 1e15 {
					continue
				}
				best = Axis{Cells: cells, Step: step, PerTick: perTick, first: int64(first), places: max(0, m.places-exponent)}
				bestPitch = pitch
			}
		}
	}
	if best.Cells == 0 { // a single cell takes in no range
		step := decimal(1, coarsest+1)
		best = Axis{Cells: cells, Step: step, PerTick: least, places: max(0, -coarsest-1)}
		best.first = int64(math.Floor(low / step * float64(least)))
	}
	return best
}

// usable mends a range that has no width or no meaning.
func usable(low, high float64) (float64, float64) {
	const greatest = 1e12
	if low > high {
		low, high = high, low
	}
	if math.IsNaN(low) || math.IsNaN(high) || low < -greatest || high > greatest {
		return 0, 1
	}
	switch least := max(max(math.Abs(low), math.Abs(high))*1e-6, 1e-12); {
	case low == 0 && high == 0:
		return 0, 1
	case high-low <= least:
		half := max(math.Abs(low)*0.05, 0.5)
		return low - half, high + half
	}
	return low, high
}

// decimal is size·10^exponent, rounded once.
func decimal(size float64, exponent int) float64 {
	if exponent < 0 {
		return size / math.Pow10(-exponent)
	}
	return size * math.Pow10(exponent)
}

// Pitch is what one cell stands for.
func (a Axis) Pitch() float64 { return a.Step / float64(a.PerTick) }

// Low is the value of the first cell, High that of the last.
func (a Axis) Low() float64  { return a.Value(0) }
func (a Axis) High() float64 { return a.Value(a.Cells - 1) }

// Value is what a cell stands for.
func (a Axis) Value(cell int) float64 { return a.At(float64(cell)) }

// At is the value of a place in cells from the first, the inverse of [Axis.Cell].
func (a Axis) At(cell float64) float64 {
	return (float64(a.first) + cell) * a.Step / float64(a.PerTick)
}

// Cell is the place of a value in cells from the first, with its fraction.
func (a Axis) Cell(v float64) float64 { return v/a.Pitch() - float64(a.first) }

// Tick is a labelled place on an axis.
type Tick struct {
	Cell  int
	Value float64
	Label string // without unit and prefix
}

// Ticks are the labelled places from the first cell to the last, labelled in units of 10^exponent.
func (a Axis) Ticks(exponent int) []Tick {
	var ticks []Tick
	if a.Cells < 1 || a.PerTick < 1 {
		return nil
	}
	n := int64(a.PerTick)
	for k := ceilDiv(a.first, n); k*n-a.first < int64(a.Cells); k++ {
		v := float64(k) * a.Step
		label := strconv.FormatFloat(v/math.Pow10(exponent), 'f', max(0, a.places+exponent), 64)
		if k == 0 {
			label = "0"
		}
		ticks = append(ticks, Tick{int(k*n - a.first), v, label})
	}
	return ticks
}

func ceilDiv(a, b int64) int64 {
	q := a / b
	if a%b > 0 {
		q++
	}
	return q
}

// prefix gives the engineering exponent that suits an axis of this unit, and its letter.
func (a Axis) prefix(unit string) (exponent int, letter string) {
	size := max(math.Abs(a.Low()), math.Abs(a.High()))
	switch unit {
	case "V", "A", "W", "Ω", "F", "H", "J", "Hz", "V/A", "A²s", "Wh":
		switch {
		case size >= 1e7:
			return 6, "M"
		case size >= 1e4:
			return 3, "k"
		}
	case "s":
	default:
		return 0, ""
	}
	switch {
	case size < 1e-3:
		return -6, "µ"
	case size < 0.2:
		return -3, "m"
	}
	return 0, ""
}
