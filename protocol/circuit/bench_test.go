package circuit

import "testing"

func BenchmarkPrecharge(b *testing.B) {
	p := plant()
	p.Filter = &Filter{0.8e-3, 2e-3, 40e-9, false}
	p.Bus.Auxiliary = &Auxiliary{40, 350, 300}
	steps := 0
	for b.Loop() {
		c, _ := New(p)
		c.Isolator(true)
		c.Step(0.1)
		c.Precharge(true)
		for range 3000 {
			if err := c.Step(0.002); err != nil {
				b.Fatal(err)
			}
		}
		steps, _, _ = c.Work()
	}
	b.ReportMetric(float64(steps), "steps")
	b.ReportMetric(6*float64(b.N)/b.Elapsed().Seconds(), "times-real-time")
}

// BenchmarkDroop is the bus under droop with a steady load, in the steps that a device takes.
func BenchmarkDroop(b *testing.B) {
	p := everything()
	c, _ := New(p)
	c.Isolator(true)
	c.Step(0.1)
	c.Precharge(true)
	c.Step(6)
	c.Bypass(true)
	c.Step(0.2)
	c.SetVoltage(1030, 0.136)
	c.Release(VoltageMode)
	c.Step(3)
	c.Infeed(0, true)
	c.SetLoad(100e3, 0)
	c.Step(1)
	for b.Loop() {
		if err := c.Step(0.002); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(0.002*float64(b.N)/b.Elapsed().Seconds(), "times-real-time")
}

// BenchmarkDischarge is the bus falling through its bleeder with everything open.
func BenchmarkDischarge(b *testing.B) {
	p := everything()
	c, _ := New(p)
	c.SetBusVoltage(1030)
	for b.Loop() {
		if err := c.Step(0.002); err != nil {
			b.Fatal(err)
		}
	}
	b.ReportMetric(0.002*float64(b.N)/b.Elapsed().Seconds(), "times-real-time")
}
