package ripple

import (
	"math"
	"slices"

	"chargehand/commission/corner"
)

// harmonics is how many harmonics of the switching frequency count in ripple.source.
const harmonics = 5

// enumerated is the greatest number of phases whose choke corners are enumerated; above it the greatest value is an upper
// bound.
const enumerated = 10

// reaching is the ripple that reaches the source: weight[h−1]·sin²(πhD)·|Σ 1⁄L_k·e^(−j2πhk⁄N)|² is the mean square of
// harmonic h.
type reaching struct {
	weight   [harmonics]float64
	phases   int
	from, to float64 // the duty's range
}

func newReaching(bus, switching float64, phases int, from, to float64, share func(h int) float64) reaching {
	r := reaching{phases: phases, from: from, to: to}
	for h := 1; h <= harmonics; h++ {
		n := float64(h)
		amplitude := bus / (math.Pi * math.Pi * n * n * switching) * share(h)
		r.weight[h-1] = amplitude * amplitude / 2
	}
	return r
}

// squares are |Σ 1⁄L_k·e^(−j2πhk⁄N)|² of the harmonics for given chokes.
type squares [harmonics]float64

// equal is the case of equal chokes: only multiples of the number of phases remain.
func (r reaching) equal(choke float64) squares {
	var q squares
	for h := 1; h <= harmonics; h++ {
		if h%r.phases == 0 {
			q[h-1] = float64(r.phases*r.phases) / (choke * choke)
		}
	}
	return q
}

// rms is the root mean square at a duty.
func (r reaching) rms(q squares, duty float64) float64 {
	sum := 0.0
	for h, square := range q {
		if square == 0 {
			continue
		}
		sin := math.Sin(math.Pi * float64(h+1) * duty)
		sum += r.weight[h] * sin * sin * square
	}
	return math.Sqrt(sum)
}

// worst is the greatest over the duty's range and the duty where it stands.
func (r reaching) worst(q squares) (rms, duty float64) {
	return corner.Greatest(r.from, r.to, 40, func(d float64) float64 { return r.rms(q, d) })
}

// greatest is the greatest rms with every choke at either end of its tolerance. The mean square is convex in the inverse
// inductances, so the ends suffice. Corners that no harmonic of which exceeds another corner's are left out; what is left
// is searched over the duty.
func (r reaching) greatest(low, high float64) float64 {
	if r.phases > enumerated {
		rms, _ := r.worst(r.bound(low, high))
		return rms
	}
	best := 0.0
	for _, q := range r.corners(low, high) {
		if rms, _ := r.worst(q); rms > best {
			best = rms
		}
	}
	return best
}

func (r reaching) corners(low, high float64) []squares {
	var kept []squares
	c := make([]float64, r.phases)
	for pattern := 0; pattern < 1<<r.phases; pattern++ {
		for k := range c {
			c[k] = 1 / high
			if pattern>>k&1 == 1 {
				c[k] = 1 / low
			}
		}
		var q squares
		for h := range q {
			q[h] = phasorSquare(c, h+1)
		}
		kept = keepGreatest(kept, q, 1e-12*float64(r.phases*r.phases)/(low*low))
	}
	return kept
}

// keepGreatest adds q unless one of the kept is at least as great in every harmonic, and drops those that q exceeds so.
func keepGreatest(kept []squares, q squares, slack float64) []squares {
	for _, k := range kept {
		if k.covers(q, slack) {
			return kept
		}
	}
	kept = slices.DeleteFunc(kept, func(k squares) bool { return q.covers(k, slack) })
	return append(kept, q)
}

// covers allows for rounding, so that the rotations of one pattern count once.
func (q squares) covers(other squares, slack float64) bool {
	for h := range q {
		if other[h] > q[h]+slack {
			return false
		}
	}
	return true
}

// bound is at least the greatest square of each harmonic by itself: with the chokes on one side of a line through the
// origin at their least and the others at their greatest, over all lines between two neighbours.
func (r reaching) bound(low, high float64) squares {
	var q squares
	c := make([]float64, r.phases)
	for h := range q {
		for line := 0; line < 4*r.phases; line++ {
			angle := math.Pi * (float64(line) + 0.5) / float64(2*r.phases)
			for k := range c {
				c[k] = 1 / high
				if math.Cos(2*math.Pi*float64((h+1)*k)/float64(r.phases)-angle) > 0 {
					c[k] = 1 / low
				}
			}
			q[h] = math.Max(q[h], phasorSquare(c, h+1))
		}
	}
	return q
}
