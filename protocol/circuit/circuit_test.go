package circuit

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"
)

// plant is a circuit with plain values: 100 Ω onto 11.7 mF from 800 V.
func plant() Parameters {
	return Parameters{
		Source: Source{EMF: []ChargePoint{{0, 800}}, Resistance: 0.062, Inductance: 6e-6, IsolatorOpening: 0.05},
		Precharge: Precharge{Contactor: Contactor{Closing: 0.02, Opening: 0.02, Auxiliary: 0.005, Resistance: 1e-3},
			Resistor: 100, ThermalResistance: 0.22, ThermalCapacity: 300 / 0.22, Ambient: 35},
		Bypass: Contactor{Closing: 0.04, Opening: 0.03, Auxiliary: 0.005, Resistance: 1e-4},
		Chokes: []Choke{{0.42e-3, 3e-3, Sound}, {0.42e-3, 3e-3, Sound}, {0.42e-3, 3e-3, Sound}},
		Diode:  Diode{},
		Bridge: Bridge{Efficiency: 0.98, LeastDuty: 0.02, SourceLimit: 400, BusLimit: 220, BusReturn: 220, CurrentLag: 1e-3,
			DroopLag: 5e-3, VoltageGain: 1.4, IntegralGain: 56, CurrentTrim: 20, VoltageRamp: 200, PowerRamp: 100e3,
			LeastStar: 200},
		Bus: Bus{Capacitance: 11.7e-3, Leakage: 1e-9, LoadDropsAt: 500},
	}
}

func near(t *testing.T, what string, got, want, relative float64) {
	t.Helper()
	if math.Abs(got-want) > relative*math.Abs(want) {
		t.Errorf("%s = %.8g, want %.8g within %g", what, got, want, relative)
	}
}

func must(t *testing.T, err error) {
	t.Helper()
	if err != nil {
		t.Fatal(err)
	}
}

func charged(t *testing.T, p Parameters, seconds float64) *Circuit {
	t.Helper()
	c, err := New(p)
	must(t, err)
	c.Isolator(true)
	must(t, c.Step(0.1))
	c.Precharge(true)
	must(t, c.Step(p.Precharge.Closing+seconds))
	return c
}

func TestStepChargesThroughTheResistor(t *testing.T) {
	p := plant()
	r := 100 + 1e-3 + 0.062 + 1e-3
	for _, at := range []float64{0.1, 0.5, 1.17, 3, 6} {
		c := charged(t, p, at)
		near(t, "bus voltage of an RC charge", c.Read().BusVoltage, 800*(1-math.Exp(-at/(r*11.7e-3))), 2e-5)
	}
}

// everything has every part of the model in it.
func everything() Parameters {
	p := plant()
	p.Source.EMF = []ChargePoint{{0, 805}, {1e6, 640}}
	p.Diode = Diode{0.8, 1e-3}
	p.Filter = &Filter{0.8e-3, 2e-3, 40e-9, false}
	p.Chokes[1].Inductance, p.Chokes[2].Resistance = 0.38e-3, 4e-3
	p.Precharge.Drift = 0.002
	p.Bus.Bleeder, p.Bus.Leakage = 1/22e3, 1e-6
	p.Bus.Auxiliary = &Auxiliary{40, 350, 300}
	p.Bus.Chopper = &Chopper{1090, 1075, 8}
	p.Bus.Isolated, p.Bus.JoiningResistor = 2e-3, 20
	p.Infeeds = []Infeed{{1030, 0.13, 1e-3, 250, 0}}
	p.Protection = Protection{OverVoltage: 1130, UnderVoltage: 860}
	return p
}

// story is a whole commissioning in steps of dt: charge, bypass, boost, load, regeneration, current mode, discharge.
func story(t *testing.T, p Parameters, dt float64) (figures []float64) {
	t.Helper()
	c, err := New(p)
	must(t, err)
	wait := func(seconds float64) {
		t.Helper()
		for n := math.Round(seconds / dt); n > 0; n-- {
			must(t, c.Step(dt))
		}
		r := c.Read()
		figures = append(figures, r.BusVoltage, r.StarVoltage, r.SourceCurrent+100, r.BusCurrent+100, r.ResistorRise+1)
	}
	c.Isolator(true)
	wait(0.2)
	c.Precharge(true)
	wait(0.5)
	wait(5)
	c.Bypass(true)
	wait(0.06)
	wait(0.2)
	c.Precharge(false)
	c.SetVoltage(1030, 0.136)
	c.Release(VoltageMode)
	wait(0.5)
	wait(2)
	c.JoinBanks(true)
	c.Infeed(0, true)
	wait(1)
	c.SetLoad(150e3, 0)
	wait(0.02)
	wait(1)
	c.SetLoad(-60e3, 0)
	wait(0.5)
	c.SetLoad(0, 0.05)
	c.SetPower(-30e3)
	c.Release(CurrentMode)
	wait(1)
	c.SetLoad(0, 0)
	c.Block()
	wait(0.1)
	c.Bypass(false)
	c.Infeed(0, false)
	wait(1)
	c.Isolator(false)
	wait(60)
	return figures
}

func TestStepHardlyDependsOnItsLength(t *testing.T) {
	coarse, fine := story(t, everything(), 0.02), story(t, everything(), 0.01)
	finest := story(t, everything(), 0.0025)
	for k := range coarse {
		near(t, fmt.Sprintf("figure %d with steps of 20 ms instead of 10 ms", k), coarse[k], fine[k], 5e-4)
		near(t, fmt.Sprintf("figure %d with steps of 10 ms instead of 2.5 ms", k), fine[k], finest[k], 5e-4)
	}
}

func TestStepIsDeterministic(t *testing.T) {
	a, b := story(t, everything(), 0.01), story(t, everything(), 0.01)
	for k := range a {
		if a[k] != b[k] {
			t.Errorf("figure %d = %v, then %v", k, a[k], b[k])
		}
	}
}

func TestCoefficientsMeetTheOrderConditions(t *testing.T) {
	c := [3]float64{gamma, (1 + gamma) / 2, 1}
	a := [3][3]float64{{gamma}, {a21, gamma}, {b1, b2, gamma}}
	b := [3]float64{b1, b2, gamma}
	var sum, first, second, third, embedded, embeddedFirst float64
	for i := range 3 {
		row := 0.0
		for j := range 3 {
			row += a[i][j]
			third += b[i] * a[i][j] * c[j]
		}
		if math.Abs(row-c[i]) > 1e-14 {
			t.Errorf("row %d sums to %v, want %v", i, row, c[i])
		}
		sum, first, second = sum+b[i], first+b[i]*c[i], second+b[i]*c[i]*c[i]
	}
	embedded, embeddedFirst = e1+e2, e1*c[0]+e2*c[1]
	for _, x := range []struct {
		name      string
		got, want float64
	}{{"b·1", sum, 1}, {"b·c", first, 1. / 2}, {"b·c²", second, 1. / 3}, {"b·A·c", third, 1. / 6}, {"b^·1", embedded, 1},
		{"b^·c", embeddedFirst, 1. / 2}} {
		if math.Abs(x.got-x.want) > 1e-14 {
			t.Errorf("%s = %v, want %v", x.name, x.got, x.want)
		}
	}
}

// TestEvaluateKnowsItsDerivatives compares with differences at points of every mode.
func TestEvaluateKnowsItsDerivatives(t *testing.T) {
	random := rand.New(rand.NewPCG(1, 2))
	for name, set := range map[string]func(c *Circuit){
		"blocked":      func(c *Circuit) { c.precharge.main = true },
		"voltage":      func(c *Circuit) { c.bypass.main, c.released, c.droop, c.setpoint = true, true, 0.136, 1030 },
		"current":      func(c *Circuit) { c.bypass.main, c.released, c.mode, c.power = true, true, CurrentMode, 30e3 },
		"source limit": func(c *Circuit) { c.bypass.main, c.released, c.discharge, c.y[ramp] = true, true, 10, 1400 },
		"bus limit":    func(c *Circuit) { c.bypass.main, c.released, c.p.Bridge.BusLimit, c.y[ramp] = true, true, 10, 1400 },
	} {
		c, err := New(everything())
		must(t, err)
		c.isolator.main, c.auxiliaryOn, c.joined = true, true, true
		c.infeedOn[0] = true
		for k := range c.y {
			c.y[k] = 1 + random.Float64()
		}
		c.y[vBus], c.y[vStar], c.y[vNode], c.y[vBanks], c.y[ramp], c.y[drawn] = 1010, 791, 792, 990, 1020, 3e4
		set(c)
		n := len(c.y)
		j := newMatrix(n)
		f, plus, minus := make([]float64, n), make([]float64, n), make([]float64, n)
		c.evaluate(0, c.y, f, j)
		for column := range n {
			h := 1e-4 * math.Max(1, math.Abs(c.y[column])*1e-2)
			y := append([]float64(nil), c.y...)
			y[column] += h
			c.evaluate(0, y, plus, nil)
			y[column] -= 2 * h
			c.evaluate(0, y, minus, nil)
			for row := range n {
				want := (plus[row] - minus[row]) / (2 * h)
				if got := j.a[row*n+column]; math.Abs(got-want) > 1e-4*math.Max(1, math.Abs(want)) {
					t.Errorf("%s: derivative of row %d by %d = %g, want %g", name, row, column, got, want)
				}
			}
		}
	}
}

// TestStepKeepsEnergy: what the source gives is stored on the bus, or has become heat somewhere.
func TestStepKeepsEnergy(t *testing.T) {
	p := everything()
	p.Bus.Bleeder, p.Bus.Auxiliary, p.Filter, p.Precharge.Drift, p.Bus.Isolated = 0, nil, nil, 0, 0
	p.Bus.Leakage = 1e-9
	c := charged(t, p, 4)
	c.Bypass(true)
	must(t, c.Step(0.5))
	e, r := c.Energies(), c.Read()
	stored := p.Bus.Capacitance * r.BusVoltage * r.BusVoltage / 2
	near(t, "energy given by the source", e.Source, stored+e.Resistor+e.Dissipation, 1e-4)
	// the resistor's heat of a whole charge is ½·C·E² less the diode's part: ∫R·i² over 4 s of E ⁄ R · e^(−t ⁄ RC)
	resistance := 100 + 1e-3 + 0.062 + 4e-3/3
	missing := math.Exp(-2 * 4 / (resistance * p.Bus.Capacitance))
	near(t, "heat in the resistor", e.Resistor, p.Bus.Capacitance*math.Pow(r.EMF-0.8, 2)/2*(1-missing), 2e-3)
}

// TestResistorHeatsAsOneNode compares a shorted bus with θ = P·R_th·(1 − e^(−t ⁄ τ)) and the cooling after it.
func TestResistorHeatsAsOneNode(t *testing.T) {
	p := plant()
	p.Bus.ShortConductance = 1e6
	c := charged(t, p, 200)
	i := 800 / (100 + 1e-3 + 0.062 + 1e-3)
	tau := 300.0
	hot := i * i * 100 * 0.22 * (1 - math.Exp(-200/tau))
	near(t, "rise after 200 s at full voltage", c.Read().ResistorRise, hot, 2e-4)
	c.Precharge(false)
	must(t, c.Step(0.02+150))
	near(t, "rise 150 s later", c.Read().ResistorRise, hot*math.Exp(-150/tau), 2e-4)
}

// TestBleederDischarge compares with V·e^(−t ⁄ RC).
func TestBleederDischarge(t *testing.T) {
	p := plant()
	p.Bus.Bleeder = 1 / 22e3
	c, err := New(p)
	must(t, err)
	c.SetBusVoltage(1030)
	must(t, c.Step(300))
	near(t, "bus after 300 s", c.Read().BusVoltage, 1030*math.Exp(-300*(1/22e3+1e-9)/11.7e-3), 2e-5)
}

func TestThresholdsAreLocated(t *testing.T) {
	p := plant()
	p.Bus.Auxiliary = &Auxiliary{2000, 350, 300}
	c := charged(t, p, 0)
	// with 2 kW the resistor can never reach the source: the supply starts at 350 V, pulls down to 300 V, and again
	high, low := 0.0, 1000.0
	for range 4000 {
		must(t, c.Step(1e-3))
		if r := c.Read(); r.Time > 1.5 {
			high, low = math.Max(high, r.BusVoltage), math.Min(low, r.BusVoltage)
		}
	}
	near(t, "upper level of the hiccup", high, 350, 2e-3)
	near(t, "lower level of the hiccup", low, 300, 2e-3)
}

func TestTrips(t *testing.T) {
	running := func(t *testing.T) *Circuit {
		c := charged(t, everything(), 6)
		c.Bypass(true)
		must(t, c.Step(0.2))
		c.Precharge(false)
		c.SetVoltage(1030, 0.136)
		c.Release(VoltageMode)
		must(t, c.Step(3))
		return c
	}
	for _, x := range []struct {
		name    string
		provoke func(c *Circuit)
		want    Trip
	}{
		{"healthy", func(c *Circuit) {}, NoTrip},
		{"threshold moved below the bus", func(c *Circuit) { c.SetProtection(Protection{OverVoltage: 1000}) }, OverVoltageTrip},
		{"threshold moved above the bus", func(c *Circuit) { c.SetProtection(Protection{OverVoltage: 1130, UnderVoltage: 1050}) }, UnderVoltageTrip},
		{"nobody takes the power back", func(c *Circuit) { c.SetLimits(0, 400); c.p.Bus.Chopper = nil; c.SetLoad(-100e3, 0) }, OverVoltageTrip},
		{"bypass drops out", func(c *Circuit) { c.Bypass(false) }, BypassLost},
		{"report taken away", func(c *Circuit) { no := false; c.ForceReport(&no) }, BypassLost},
	} {
		c := running(t)
		x.provoke(c)
		must(t, c.Step(0.5))
		if got, _ := c.Trip(); got != x.want || c.Read().Released != (x.want == NoTrip) {
			t.Errorf("%s: trip %v, released %v, want %v", x.name, got, c.Read().Released, x.want)
		}
	}
	p := plant()
	p.Precharge.Timeout = 2
	c := charged(t, p, 2.1)
	if got, at := c.Trip(); got != PrechargeTimeout || math.Abs(at-0.1-p.Precharge.Closing-2) > 1e-6 || c.Read().PrechargeMain {
		t.Errorf("pre-charge without bypass: trip %v at %.4f s, closed %v, want %v 2 s after closing", got, at,
			c.Read().PrechargeMain, PrechargeTimeout)
	}
}

// TestFaultyPhases says where the current goes.
func TestFaultyPhases(t *testing.T) {
	for _, x := range []struct {
		name     string
		change   func(*Parameters)
		bus      [2]float64 // range after 0.5 s of pre-charge
		currents [3]float64 // parts of the source current
	}{
		{"sound", func(p *Parameters) {}, [2]float64{270, 290}, [3]float64{1. / 3, 1. / 3, 1. / 3}},
		{"choke 2 open", func(p *Parameters) { p.Chokes[1].Fault = Open }, [2]float64{270, 290}, [3]float64{0.5, 0, 0.5}},
		{"lower switch 1 shorted", func(p *Parameters) { p.Chokes[0].Fault = LowerShorted }, [2]float64{0, 1}, [3]float64{1, 0, 0}},
		{"source reversed", func(p *Parameters) { p.Source.EMF[0].EMF = -800 }, [2]float64{0, 1}, [3]float64{1. / 3, 1. / 3, 1. / 3}},
	} {
		p := plant()
		p.Diode = Diode{0.8, 1e-3}
		x.change(&p)
		r := charged(t, p, 0.5).Read()
		if r.BusVoltage < x.bus[0]-1e-3 || r.BusVoltage > x.bus[1] {
			t.Errorf("%s: bus %.1f V, want %v", x.name, r.BusVoltage, x.bus)
		}
		for k, i := range r.PhaseCurrents {
			if got := i / r.SourceCurrent; math.Abs(got-x.currents[k]) > 0.01 {
				t.Errorf("%s: phase %d carries %.3f of the source current, want %.3f", x.name, k+1, got, x.currents[k])
			}
		}
	}
}

func TestUpperSwitchShortedRaisesTheStarPoint(t *testing.T) {
	p := everything()
	p.Chokes[0].Fault = UpperShorted
	c, err := New(p)
	must(t, err)
	c.SetBusVoltage(1030)
	must(t, c.Step(2))
	r := c.Read()
	near(t, "star point with nothing closed", r.StarVoltage, r.BusVoltage, 1e-3)
}

func TestCurrentModeHoldsPowerBothWays(t *testing.T) {
	for _, w := range []float64{30e3, 90e3, -30e3, -60e3} {
		c := charged(t, everything(), 6)
		c.Bypass(true)
		must(t, c.Step(0.2))
		c.Precharge(false)
		c.Infeed(0, true)
		c.SetLoad(120e3, 0)
		must(t, c.Step(0.5))
		c.SetPower(w)
		c.Release(CurrentMode)
		must(t, c.Step(4))
		r := c.Read()
		near(t, fmt.Sprintf("power at a reference of %g W", w), r.Power, w, 1e-4)
		eta := 0.98
		if w < 0 {
			eta = 1 / eta
		}
		loss := 0.0
		for k, choke := range c.p.Chokes {
			loss += choke.Resistance * r.PhaseCurrents[k] * r.PhaseCurrents[k]
		}
		near(t, "power from the source less the chokes' heat", r.StarVoltage*r.SourceCurrent-loss, w/eta, 1e-3)
	}
}

func TestFuseOpensOnItsPreArcingIntegral(t *testing.T) {
	p := plant()
	p.Source.FuseRating, p.Source.FusePreArcing = 500, 90000
	p.Bus.ShortConductance = 1e4
	c := begin(t, p)
	c.Bypass(true)
	must(t, c.Step(0.1))
	if r := c.Read(); !r.FuseOpen || math.Abs(r.SourceCurrent) > 0.01 {
		t.Errorf("shorted bus behind the bypass: fuse open %v, %.2f A, want open and no current", r.FuseOpen, r.SourceCurrent)
	}
}

func TestNewRefusesWhatCannotBeIntegrated(t *testing.T) {
	for name, spoil := range map[string]func(*Parameters){
		"no capacitance": func(p *Parameters) { p.Bus.Capacitance = 0 },
		"no phase":       func(p *Parameters) { p.Chokes = nil },
		"no source":      func(p *Parameters) { p.Source.EMF = nil },
		"no resistance":  func(p *Parameters) { p.Source.Resistance = 0 },
	} {
		p := plant()
		if spoil(&p); errorOf(p) == nil {
			t.Errorf("New(%s) = nil, want an error", name)
		}
	}
}

func errorOf(p Parameters) error { _, err := New(p); return err }

// TestInterruptedCurrentEnds: a contactor that opens under current ends it, with and without a filter to take the chokes'.
func TestInterruptedCurrentEnds(t *testing.T) {
	for name, change := range map[string]func(*Parameters){
		"with filter":    func(p *Parameters) {},
		"without filter": func(p *Parameters) { p.Filter = nil },
	} {
		p := everything()
		change(&p)
		c := charged(t, p, 6)
		c.Bypass(true)
		must(t, c.Step(0.2))
		c.Precharge(false)
		c.SetVoltage(1030, 0.136)
		c.Release(VoltageMode)
		must(t, c.Step(2))
		c.SetLoad(80e3, 0)
		must(t, c.Step(0.5))
		if r := c.Read(); r.SourceCurrent < 50 {
			t.Fatalf("%s: %.1f A before the bypass opens, want more than 50 A", name, r.SourceCurrent)
		}
		c.Bypass(false)
		must(t, c.Step(0.5))
		if r := c.Read(); math.Abs(r.SourceCurrent) > 0.01 || r.Released {
			t.Errorf("%s: %.3f A after the bypass opened, released %v", name, r.SourceCurrent, r.Released)
		}
	}
}
