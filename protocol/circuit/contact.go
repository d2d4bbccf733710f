package circuit

import "math"

// never is a time that does not come.
var never = math.Inf(1)

// contact is one contactor in motion.
type contact struct {
	commanded bool
	main      bool
	auxiliary bool
	mainAt    float64 // when the main contact moves next
	auxAt     float64 // when the auxiliary contact moves next
}

func (c *contact) command(p Contactor, close bool, now float64) {
	c.commanded = close
	travel := p.Opening
	if close {
		travel = p.Closing
	}
	c.mainAt = never
	if c.target(p) != c.main {
		c.mainAt = now + travel
	}
}

// target is where the main contact ends with the present command.
func (c *contact) target(p Contactor) bool { return p.Welded || c.commanded && !p.Dead }

// next is when something of the contactor moves.
func (c *contact) next() float64 { return math.Min(c.mainAt, c.auxAt) }

// arrive moves what is due and tells whether the main contact did.
func (c *contact) arrive(p Contactor, now float64) bool {
	moved := false
	if c.mainAt <= now {
		c.main, c.mainAt, moved = c.target(p), never, true
		c.auxAt = now + p.Auxiliary
	}
	if c.auxAt <= now {
		c.auxiliary, c.auxAt = c.main, never
	}
	return moved
}

// conductance of the closed contact in series with a resistor.
func (c *contact) conductance(p Contactor, series float64) float64 {
	if !c.main {
		return 0
	}
	return 1 / (p.Resistance + series)
}
