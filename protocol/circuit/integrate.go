package circuit

import "math"

// Coefficients of the three-stage method of order 3; gamma is the root of x³ − 3x² + 3x/2 − 1/6 between 1/6 and 1/2.
const (
	gamma = 0.435866521508458999416019
	a21   = (1 - gamma) / 2
	b1    = -(6*gamma*gamma - 16*gamma + 1) / 4
	b2    = (6*gamma*gamma - 20*gamma + 5) / 4
	// the embedded second-order result uses the first two stages only
	e2 = (1 - 2*gamma) / (1 - gamma)
	e1 = 1 - e2
)

// Limits of the step size in seconds.
const (
	smallestStep = 1e-11
	firstStep    = 1e-7 // after a switch has moved
	largestStep  = 0.25
)

// settlingSteps after a switch has moved are taken at firstStep whatever their error: an interrupted inductance loses its
// current within picoseconds, which the method damps but its error estimate would have to resolve.
const settlingSteps = 3

// tolerance of the local error, relative to the size of each quantity.
const tolerance = 1e-5

// stepper is the working memory of the integration.
type stepper struct {
	h       float64 // step to try next
	settle  int     // settling steps still to come
	lu      *matrix
	luStep  float64 // step that lu was made for; 0: none
	region  uint64
	rate    float64      // how much one round of Newton's method left of the error, as last seen with lu
	trusted int          // stages since rate was seen
	stage   [3][]float64 // y at the stages
	slope   [3][]float64 // M·y' at the stages
	base    []float64
	f, next []float64
	err     []float64

	Steps, Rejected, Factorised int
}

func (s *stepper) init(n int) {
	s.lu = newMatrix(n)
	for k := range s.stage {
		s.stage[k], s.slope[k] = make([]float64, n), make([]float64, n)
	}
	s.base, s.f, s.next, s.err = make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
	s.h = firstStep
}

func (s *stepper) restart() { s.h, s.luStep, s.settle = firstStep, 0, settlingSteps }

// scale is what an error of each quantity is measured against.
func (c *Circuit) scale(k int) float64 {
	switch k {
	case rise:
		return 10 + math.Abs(c.y[rise])
	case drawn:
		return 100 + math.Abs(c.y[drawn])
	case vFilter, vBus, vBanks, vStar, vNode:
		return 200 + math.Abs(c.y[k])
	case ramp:
		return 1000 + math.Abs(c.y[k])
	}
	return 20 + math.Abs(c.y[k])
}

// Step advances the circuit by dt seconds, in as many steps of its own as it needs. Every contact that moves and every
// threshold of the bus voltage that is crossed ends a step.
func (c *Circuit) Step(dt float64) error {
	end := c.time + dt
	for c.time < end {
		limit := math.Min(end, c.nextEvent())
		if limit <= c.time {
			c.arrive()
			continue
		}
		if err := c.advance(limit); err != nil {
			return err
		}
		if c.time >= c.nextEvent() {
			c.arrive()
		}
	}
	return nil
}

// advance makes one accepted step that ends no later than limit.
func (c *Circuit) advance(limit float64) error {
	s := &c.step
	for {
		h := math.Min(s.h, largestStep)
		reaches := false
		if rest := limit - c.time; h >= rest*0.999 {
			h, reaches = rest, true
		} else if h > rest/2 {
			h = rest / 2
		}
		err, solved := c.try(h)
		if solved && s.settle > 0 {
			s.settle--
			err = 1 // no longer step yet
		}
		if !solved || err > 1 {
			s.Rejected++
			shrink := 0.25
			if solved {
				shrink = math.Max(0.2, 0.9*math.Pow(err, -1.0/3))
			}
			if s.h = h * shrink; s.h < smallestStep {
				return &NotConverged{c.time}
			}
			continue
		}
		if crossing := c.crossing(c.y[vBus], s.stage[2][vBus]); crossing != nil {
			h, reaches = c.locate(h, *crossing), false
			c.accept(h)
			crossing.apply(c)
			s.restart()
			return nil
		}
		grow := 4.0
		if err > 0 {
			grow = math.Min(4, 0.9*math.Pow(err, -1.0/3))
		}
		// a step that was cut short by limit says nothing against a longer one
		if next := h * grow; !reaches || next > s.h {
			if !(grow > 0.9 && grow < 1.3) { // keep the factorisation while the step hardly changes
				s.h = next
			}
		}
		c.accept(h)
		if reaches {
			c.time = limit
		}
		return nil
	}
}

// try solves the three stages over h. The result is the local error over the tolerance.
func (c *Circuit) try(h float64) (err float64, solved bool) {
	s := &c.step
	n := len(c.y)
	weights := [3][2]float64{{}, {a21}, {b1, b2}}
	times := [3]float64{gamma, (1 + gamma) / 2, 1}
	for k := range s.stage {
		for i := range s.base {
			s.base[i] = h * (weights[k][0]*s.slope[0][i] + weights[k][1]*s.slope[1][i])
		}
		if k == 0 {
			copy(s.stage[0], c.y)
			clear(s.base)
		} else {
			copy(s.stage[k], s.stage[k-1])
		}
		if !c.solveStage(k, h, c.time+times[k]*h) {
			return 0, false
		}
		for i := 0; i < n; i++ {
			s.slope[k][i] = 0
			if c.mass[i] != 0 {
				s.slope[k][i] = (c.mass[i]*(s.stage[k][i]-c.y[i]) - s.base[i]) / (h * gamma)
			}
		}
	}
	for i := 0; i < n; i++ {
		s.err[i] = h * ((b1-e1)*s.slope[0][i] + (b2-e2)*s.slope[1][i] + gamma*s.slope[2][i])
	}
	s.lu.solve(s.err)
	for i := 0; i < n; i++ {
		if c.mass[i] != 0 {
			err = math.Max(err, math.Abs(s.err[i])/(tolerance*c.scale(i)))
		}
	}
	if math.IsNaN(err) {
		return 0, false
	}
	return err, true
}

// solveStage is Newton's method on M·(Y − y) − base − h·γ·f(Y) = 0, with the last factorisation as long as the step and
// the linear region are the same and it converges well.
func (c *Circuit) solveStage(k int, h, t float64) bool {
	s := &c.step
	y := s.stage[k]
	last := math.Inf(1)
	for round := 0; round < 25; round++ {
		fresh := false
		region := c.evaluate(t, y, s.f, nil)
		if round == 1 && region == s.region && s.luStep == h && s.rate*last < 1e-3 && s.trusted < 12 {
			s.trusted++
			return true
		}
		if s.luStep != h || region != s.region || round > 0 && round%4 == 0 {
			s.lu.clear()
			s.region = c.evaluate(t, y, s.f, s.lu)
			for i := range s.lu.a {
				s.lu.a[i] *= -h * gamma
			}
			for i, m := range c.mass {
				s.lu.add(i, i, m)
			}
			s.Factorised++
			if s.luStep = h; !s.lu.factorise() {
				s.luStep = 0
				return false
			}
			fresh, s.rate = true, 1
		}
		for i := range s.next {
			s.next[i] = h*gamma*s.f[i] + s.base[i] - c.mass[i]*(y[i]-c.y[i])
		}
		s.lu.solve(s.next)
		size := 0.0
		for i, d := range s.next {
			to := y[i] + d
			if !c.released && i >= firstPhase && i < firstPhase+len(c.p.Chokes) && (y[i] > leakAtZero && to < -leakAtZero ||
				y[i] < -leakAtZero && to > leakAtZero) {
				d = -y[i] // from one diode to the other only by way of neither
			}
			y[i] += d
			size = math.Max(size, math.Abs(d)/(tolerance*c.scale(i)))
		}
		if math.IsNaN(size) || math.IsInf(size, 0) {
			return false
		}
		if round == 1 && last > 0 {
			s.rate, s.trusted = size/last, 0
		}
		if size < 1e-3 && round > 0 || size < 1e-5 {
			return true
		}
		if size > 0.3*last && !fresh {
			s.luStep = 0 // too slow: make it anew
		}
		last = size
	}
	return false
}

// accept takes the last tried step of size h as done.
func (c *Circuit) accept(h float64) {
	s := &c.step
	s.Steps++
	before := c.y[iSource]
	for k, w := range [3]float64{b1, b2, gamma} {
		c.account(h*w, s.stage[k])
	}
	copy(c.y, s.stage[2])
	c.time += h
	if rating := c.p.Source.FuseRating; rating > 0 && !c.fuseOpen {
		over := math.Max(0, (before*before+c.y[iSource]*c.y[iSource])/2-rating*rating)
		if c.melted += over * h; c.melted > c.p.Source.FusePreArcing {
			c.fuseOpen = true
			s.restart()
		}
	}
}

// account adds to the energies with the quadrature of the method itself.
func (c *Circuit) account(weight float64, y []float64) {
	emf, _ := c.electromotive(y[drawn])
	c.energy.Source += weight * emf * y[iSource]
	c.energy.Joule += weight * y[iSource] * y[iSource]
	pre, _, _ := c.paths(y)
	across := y[vNode] - y[vStar]
	if pre > 0 {
		i := pre * across
		c.energy.Resistor += weight * i * i * c.p.Precharge.Resistor * (1 + c.p.Precharge.Drift*y[rise])
	}
	c.energy.BusCharge += weight * c.busCurrent(y)
	if c.released {
		return
	}
	heat := emf*y[iSource] - y[vNode]*y[iSource] // source and its open contacts
	heat += across * (y[vNode] - y[vStar]) * c.bypass.conductance(c.p.Bypass, 0)
	heat += pre * pre * across * across * c.p.Precharge.Contactor.Resistance
	heat += c.p.Bus.Leakage * (y[vNode]*y[vNode] + y[vStar]*y[vStar])
	if f := c.p.Filter; f != nil {
		heat += f.Resistance * y[iFilter] * y[iFilter]
	}
	for k, choke := range c.p.Chokes {
		i := y[firstPhase+k]
		l := c.diodes(choke, i, y[vBus])
		heat += c.chokeResistance(choke)*i*i + l.v*i - l.into*y[vBus]
	}
	c.energy.Dissipation += weight * heat
}
