package droop

import (
	"fmt"
	"math"
	"testing"

	"chargehand/commission/finding/findingtest"
	"chargehand/commission/signal"
	"chargehand/commission/site"
)

func TestPredict(t *testing.T) {
	p := Predict(findingtest.Load(t, "wagtail"))
	// By hand: 1030 V ± 0.2 %; 3 % of 1000 V at 220 A; cable 0.0067071312 Ω.
	near := func(name string, got, want float64) {
		t.Helper()
		if math.Abs(got-want) > 1e-9*math.Abs(want)+1e-12 {
			t.Errorf("Predict %s = %v, want %v", name, got, want)
		}
	}
	near("no-load low", float64(p.NoLoad.Low), 1030*0.998)
	near("no-load high", float64(p.NoLoad.High), 1030*1.002)
	near("terminal slope", float64(p.TerminalSlope.Nominal), 30./220)
	near("bus slope", float64(p.BusSlope.Nominal), 30./220+0.0067071312)
	near("least", float64(p.Least), -220)
	at, ok := p.At(Load{Power: 200e3})
	if !ok {
		t.Fatal("At(200 kW) = none, want a point")
	}
	near("terminal on its line", float64(at.Terminal.Nominal), float64(p.NoLoad.Nominal)-float64(p.TerminalSlope.Nominal)*float64(at.Current.Nominal))
	near("bus on its line", float64(at.Bus.Nominal), float64(p.NoLoad.Nominal)-float64(p.BusSlope.Nominal)*float64(at.Current.Nominal))
	if !at.Current.IsOrdered() || !at.Bus.IsOrdered() || !at.Terminal.IsOrdered() || !at.Share.IsOrdered() {
		t.Errorf("At(200 kW) = %+v, want ordered spreads", at)
	}
	if _, ok := p.At(Load{Power: 1e6}); ok {
		t.Error("At(1 MW) = a point, want none: the infeeds cannot carry it")
	}
	empty := Predict(site.Site{})
	if len(empty.Missing) == 0 {
		t.Error("Predict(empty site).Missing = none, want the keys")
	}
	if _, ok := empty.At(Load{}); ok {
		t.Error("At without prediction = a point, want none")
	}
}

type onlySetpoint struct{}

func (onlySetpoint) Raw(name signal.Name, value float64) (int64, bool) {
	return int64(math.Round(value * 10)), name == signal.VoltageSetpoint
}

func TestRegisters(t *testing.T) {
	f := registers(findingtest.Load(t, "wagtail"), onlySetpoint{})
	if f.Value.Nominal != 10300 || len(f.Parts) != 1 || f.Parts[0].Name != "voltage-setpoint" {
		t.Errorf("registers(setpoint only) = %v, %v, want 10300 and one part", f.Value, f.Parts)
	}
	if f := registers(findingtest.Load(t, "wagtail"), nil); len(f.Because) != 1 || f.Because[0] != "device.map" {
		t.Errorf("registers(nil) because %v, want device.map", f.Because)
	}
}

// An isochronous infeed takes what it can; the bus hardly moves.
func TestDroopOff(t *testing.T) {
	p := Solve([]Source{{NoLoad: 1000, Most: 300, Rated: 300}, {NoLoad: 1000, Droop: 0.1, Most: 300, Rated: 300}}, Load{Current: 200})
	if p.Status != Found || math.Abs(float64(p.Current[0])-200) > 0.1 || math.Abs(float64(p.Bus)-1000) > 1e-3 {
		t.Errorf("Solve(droop off) = %+v, want 200 A from the first at 1000 V", p)
	}
}

func TestNoLoad(t *testing.T) {
	p := Solve([]Source{{NoLoad: 1000, Droop: 0.1, Most: 300}, {NoLoad: 1004, Droop: 0.2, Most: 300}}, Load{})
	if p.Status != Found || math.Abs(float64(p.Bus)-1004) > 1e-9 {
		t.Errorf("Solve(no load) = %s at %v, want the highest setpoint 1004 V", p.Status, p.Bus)
	}
	p = Solve([]Source{{NoLoad: 1000, Droop: 0.1, Least: -300, Most: 300}, {NoLoad: 1004, Droop: 0.1, Least: -300, Most: 300}}, Load{})
	if p.Status != Found || math.Abs(float64(p.Bus)-1002) > 1e-9 || math.Abs(float64(p.Current[1])-20) > 1e-9 {
		t.Errorf("Solve(no load, both ways) = %s at %v, %v, want 1002 V and 20 A round", p.Status, p.Bus, p.Current)
	}
}

func ExampleSolve() {
	p := Solve([]Source{
		{NoLoad: 1000, Droop: 0.1, Most: 300, Rated: 300},
		{NoLoad: 1000, Droop: 0.2, Most: 150, Rated: 150},
	}, Load{Power: 200 * 1000})
	fmt.Printf("%s: %.1f, %.1f and %.1f\n", p.Status, p.Bus, p.Current[0], p.Current[1])
	// Output: ok: 986.5 V, 135.2 A and 67.6 A
}
