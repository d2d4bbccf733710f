package circuit

import "testing"

func BenchmarkPrecharge(b *testing.B) {
	p := plant()
	p.Filter = &Filter{0.8e-3, 2e-3, 40e-9, false}
	p.Bus.Auxiliary = &Auxiliary{40, 350, 300}
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
	}
	b.ReportMetric(6*float64(b.N)/b.Elapsed().Seconds(), "times-real-time")
}
