package droop

import (
	"math"
	"slices"

	"chargehand/commission/quantity"
)

// Source is one infeed as the bus sees it.
type Source struct {
	NoLoad  quantity.Voltage    // setpoint at no load
	Droop   quantity.Droop      // at its terminals
	Cable   quantity.Resistance // both conductors; adds to the droop
	Least   quantity.Current    // −∞ where it has no limit; negative: it takes current back
	Most    quantity.Current    // +∞ where it has no limit
	Rated   quantity.Current
	Offline bool
}

// leastSlope stands in for a slope of nothing (droop off, no cable): an isochronous infeed then takes all it can, and the
// bus moves by no more than a microvolt per ampere.
const leastSlope = 1e-6

// slope is r = d + R_cable in ohms.
func (s Source) slope() float64 { return math.Max(float64(s.Droop)+float64(s.Cable), leastSlope) }

// current is the infeed's current at a bus voltage, within its limits.
func (s Source) current(bus float64) float64 {
	i := (float64(s.NoLoad) - bus) / s.slope()
	return math.Min(math.Max(i, float64(s.Least)), float64(s.Most))
}

// Load is what the bus supplies: constant power (negative: regeneration), constant current, and a resistance, 0 for none.
type Load struct {
	Power      quantity.Power
	Current    quantity.Current
	Resistance quantity.Resistance
}

func (l Load) conductance() float64 {
	if l.Resistance == 0 {
		return 0
	}
	return 1 / float64(l.Resistance)
}

// Status tells whether the bus has an operating point.
type Status string

// The three outcomes of [Solve].
const (
	Found      Status = "ok"
	NoSolution Status = "no_solution" // the infeeds cannot carry the load: the bus collapses
	Runaway    Status = "runaway"     // nobody takes what is fed in: the bus runs upwards
)

// LimitState tells whether an infeed stands at one of its limits.
type LimitState string

// The states of an infeed.
const (
	Free    LimitState = "free"
	AtMost  LimitState = "max"
	AtLeast LimitState = "min"
	Off     LimitState = "off"
)

// Point is an operating point. Slices run with the sources; everything but Status is meaningless unless it is Found.
type Point struct {
	Status         Status
	Bus            quantity.Voltage
	Current        []quantity.Current
	Terminal       []quantity.Voltage
	Limit          []LimitState
	StabilityRatio float64 // (P ⁄ V²) ⁄ (G + 1 ⁄ R_L), G of the infeeds that are free; below 1 it is stable
}

// Solve gives the stable operating point: the highest bus voltage at which the infeeds carry the load.
//
// Between the voltages where an infeed meets a limit the balance is a quadratic, −(G + 1⁄R_L)·V² + (A − I_c)·V − P = 0 with
// G = Σ1⁄r and A = ΣV0⁄r over the free infeeds plus the limits of the others. The segments are searched from above; the
// first that holds a root holds the highest. Coming from above the balance is negative, so it falls with rising voltage at
// that root, which is the condition of stability P⁄V² < G + 1⁄R_L (incremental resistance of a constant-power load). The
// cost is that of sorting the 2N limits.
func Solve(sources []Source, load Load) Point {
	bus, status := balance(sources, load)
	p := Point{Status: status}
	if status != Found {
		return p
	}
	p.Bus = quantity.Voltage(bus)
	conductance := load.conductance()
	for _, s := range sources {
		i, state := 0.0, Off
		if !s.Offline {
			i, state = s.current(bus), s.stateAt(bus)
		}
		if state == Free {
			conductance += 1 / s.slope()
		}
		p.Current = append(p.Current, quantity.Current(i))
		p.Limit = append(p.Limit, state)
		p.Terminal = append(p.Terminal, quantity.Voltage(bus+i*float64(s.Cable)))
	}
	p.StabilityRatio = ratio(float64(load.Power)/(bus*bus), conductance)
	return p
}

// ratio is 0 for no constant-power load, infinite where nothing holds the bus against one.
func ratio(incremental, conductance float64) float64 {
	if incremental <= 0 {
		return 0
	}
	return incremental / conductance
}

func (s Source) stateAt(bus float64) LimitState {
	i := (float64(s.NoLoad) - bus) / s.slope()
	switch {
	case i >= float64(s.Most):
		return AtMost
	case i <= float64(s.Least):
		return AtLeast
	}
	return Free
}

// turn is a bus voltage at which an infeed leaves its least current (coming from above) or meets its greatest.
type turn struct {
	at, conductance, amperes float64 // what it adds below `at` to G and to A
}

// balance is the highest root of the balance, as plain numbers.
func balance(sources []Source, load Load) (bus float64, status Status) {
	var buffer [64]turn
	turns := buffer[:0]
	free := 0
	g, a := load.conductance(), -float64(load.Current)
	for _, s := range sources {
		if s.Offline {
			continue
		}
		v0, r, least, most := float64(s.NoLoad), s.slope(), float64(s.Least), float64(s.Most)
		if math.IsInf(least, -1) {
			g, a, free = g+1/r, a+v0/r, free+1
		} else {
			a += least
			turns = append(turns, turn{v0 - r*least, 1 / r, v0/r - least})
		}
		if !math.IsInf(most, 1) {
			turns = append(turns, turn{v0 - r*most, -1 / r, most - v0/r})
		}
	}
	slices.SortFunc(turns, func(x, y turn) int {
		switch {
		case x.at > y.at:
			return -1
		case x.at < y.at:
			return 1
		}
		return 0
	})
	return searchDown(turns, g, a, float64(load.Power), free, load.conductance())
}

// searchDown walks the segments from infinity downwards; g, a and free are those of the uppermost. Where no infeed is free
// the conductance is that of the load exactly, since a rest of rounding would look like a droop.
func searchDown(turns []turn, g, a, power float64, free int, load float64) (float64, Status) {
	if g <= 0 && (a > 0 || a == 0 && power < 0) {
		return 0, Runaway
	}
	upper := math.Inf(1)
	for k := 0; ; k++ {
		lower := 0.0
		if k < len(turns) {
			lower = turns[k].at
		}
		if v, ok := rootIn(math.Max(lower, 0), upper, g, a, power); ok {
			return v, Found
		}
		if k == len(turns) || lower <= 0 {
			return 0, NoSolution
		}
		g, a = g+turns[k].conductance, a+turns[k].amperes
		if turns[k].conductance > 0 {
			free++
		} else {
			free--
		}
		if free == 0 {
			g = load
		}
		upper = lower
	}
}

// rootIn is the greater root of −g·V² + a·V − power = 0 within lower…upper; both ends belong to it.
func rootIn(lower, upper, g, a, power float64) (float64, bool) {
	if lower == upper {
		return 0, false
	}
	var v float64
	switch {
	case g <= 0 && a == 0:
		if power != 0 {
			return 0, false
		}
		v = lower // balanced everywhere: the infeed that is reached first holds the bus
	case g <= 0:
		v = power / a
	default:
		root := a*a - 4*g*power
		if root < 0 {
			return 0, false
		}
		v = greaterRoot(a, math.Sqrt(root), g, power)
	}
	slack := 1e-12 * math.Abs(v)
	if v < lower-slack || v > upper+slack || v <= 0 {
		return 0, false
	}
	return math.Min(math.Max(v, lower), upper), true
}

// greaterRoot avoids the cancellation of a + √… for negative a.
func greaterRoot(a, root, g, power float64) float64 {
	if a >= 0 {
		return (a + root) / (2 * g)
	}
	return -2 * power / (root - a)
}

// GreatestPower is the greatest constant power that the infeeds can carry besides the other loads, and the bus voltage it
// leaves: the maximum of V·(ΣI_k − I_c − V⁄R_L), at a limit of an infeed or at (A − I_c) ⁄ 2(G + 1⁄R_L) between two.
func GreatestPower(sources []Source, other Load) (quantity.Power, quantity.Voltage) {
	carried := func(v float64) float64 {
		sum := -float64(other.Current) - v*other.conductance()
		for _, s := range sources {
			if !s.Offline {
				sum += s.current(v)
			}
		}
		return v * sum
	}
	bends := []float64{0}
	for _, s := range sources {
		for _, i := range []float64{float64(s.Least), float64(s.Most)} {
			if v := float64(s.NoLoad) - s.slope()*i; !s.Offline && !math.IsInf(i, 0) && v > 0 {
				bends = append(bends, v)
			}
		}
		bends = append(bends, math.Max(0, float64(s.NoLoad)))
	}
	slices.Sort(bends)
	best, at := 0.0, 0.0
	for k, v := range bends {
		candidates := []float64{v}
		if k > 0 {
			candidates = append(candidates, vertex(bends[k-1], v, carried))
		}
		for _, c := range candidates {
			if p := carried(c); p > best {
				best, at = p, c
			}
		}
	}
	return quantity.Power(best), quantity.Voltage(at)
}

// vertex is where the parabola through both ends and the middle of a segment is greatest, held within the segment.
func vertex(left, right float64, f func(float64) float64) float64 {
	middle, half := (left+right)/2, (right-left)/2
	if half == 0 {
		return middle
	}
	up, mid, down := f(right), f(middle), f(left)
	bend := up - 2*mid + down
	if bend >= 0 {
		return right
	}
	return math.Min(right, math.Max(left, middle-half*(up-down)/(2*bend)))
}
