package circuit

import (
	"math"
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
func TestWalkthrough(t *testing.T) {
	p := plant()
	p.Filter = &Filter{0.8e-3, 2e-3, 40e-9, false}
	p.Bus.Bleeder = 1 / 22e3
	p.Bus.Auxiliary = &Auxiliary{40, 350, 300}
	p.Infeeds = []Infeed{{1030, 0.13, 1e-3, 250, 0}}
	c := charged(t, p, 6)
	show := func(what string) {
		r := c.Read()
		s, j, f := c.Work()
		t.Logf("%-12s t=%.3f bus %.2f star %.2f node %.2f is %.3f ph %.3f ibus %.3f P %.0f rise %.2f inf %v rel %v steps %d/%d/%d", what, r.Time, r.BusVoltage, r.StarVoltage, r.SourceVoltage, r.SourceCurrent, r.PhaseCurrents, r.BusCurrent, r.Power, r.ResistorRise, r.InfeedCurrents, r.Released, s, j, f)
	}
	show("charged")
	c.Bypass(true)
	for i := 0; i < 10; i++ {
		must(t, c.Step(0.01))
		show("bypass")
	}
	c.Precharge(false)
	c.SetVoltage(1030, 0.136)
	c.Release(VoltageMode)
	for i := 0; i < 20; i++ {
		must(t, c.Step(0.1))
		show("boost")
	}
	c.Infeed(0, true)
	c.SetLoad(100e3, 0)
	for i := 0; i < 5; i++ {
		must(t, c.Step(0.1))
		show("load")
	}
	c.SetPower(-50e3)
	c.Release(CurrentMode)
	for i := 0; i < 5; i++ {
		must(t, c.Step(0.5))
		show("charge")
	}
	c.SetLoad(0, 0)
	c.Block()
	c.Infeed(0, false)
	must(t, c.Step(0.1))
	show("blocked")
	c.Bypass(false)
	must(t, c.Step(1))
	show("open")
	c.Isolator(false)
	for i := 0; i < 5; i++ {
		must(t, c.Step(100))
		show("discharge")
	}
}
