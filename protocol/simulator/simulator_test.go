package simulator

import (
	"context"
	"errors"
	"math"
	"testing"
	"time"

	"chargehand/commission/signal"
)

// clock is a plant clock that a test moves by hand.
type clock struct{ now time.Time }

func (c *clock) Now() time.Time { return c.now }

// bench is a simulator with its hand-moved clock.
type bench struct {
	*Simulator
	t     testing.TB
	clock *clock
}

func newBench(t testing.TB, seed int64, disturb ...string) *bench {
	t.Helper()
	return benchOf(t, "wagtail", seed, disturb...)
}

func benchOf(t testing.TB, name string, seed int64, disturb ...string) *bench {
	t.Helper()
	c := &clock{time.Date(2026, 12, 1, 9, 0, 0, 0, time.UTC)}
	o := Options{Site: known(t, name), Map: wagtailMap(t), Now: c.Now, Seed: seed}
	for _, text := range disturb {
		d, err := ParseDisturbance(text)
		if err != nil {
			t.Fatal(err)
		}
		o.Disturb = append(o.Disturb, d)
	}
	s, err := New(o)
	if err != nil {
		t.Fatal(err)
	}
	return &bench{s, t, c}
}

// do carries acts out, and waits where a line is a duration.
func (b *bench) do(lines ...string) {
	b.t.Helper()
	for _, line := range lines {
		if d, err := time.ParseDuration(line); err == nil {
			b.wait(d)
		} else if err := b.try(line); err != nil {
			b.t.Fatalf("Do(%s): %v", line, err)
		}
	}
}

func (b *bench) try(line string) error {
	b.t.Helper()
	act, err := ParseAct(line)
	if err != nil {
		b.t.Fatal(err)
	}
	return b.Do(context.Background(), act)
}

func (b *bench) wait(d time.Duration) {
	b.t.Helper()
	b.clock.now = b.clock.now.Add(d)
	if err := b.catchUp(); err != nil {
		b.t.Fatal(err)
	}
}

func (b *bench) near(n signal.Name, want, within float64) {
	b.t.Helper()
	if got := b.shown(n); math.Abs(got-want) > within {
		b.t.Errorf("%s = %g, want %g within %g", n, got, want, within)
	}
}

// TestWalkOnEverySite goes through a whole commissioning on three different plants.
func TestWalkOnEverySite(t *testing.T) {
	for _, name := range []string{"wagtail", "nightjar", "ouzel"} {
		t.Run(name, func(t *testing.T) {
			b := benchOf(t, name, 5)
			v := b.Truth()
			site := b.options.Site
			b.do("500ms")
			b.near(signal.BusVoltage, 0, 8)
			b.do("isolator close", "500ms")
			b.near(signal.SourceVoltage, v["source.emf"], 8)
			if b.try("release") == nil {
				t.Error("Do(release) before the bypass closed = nil, want a refusal")
			}
			if err := b.try("bypass close"); !errors.Is(err, ErrRefused) {
				t.Errorf("Do(bypass close) on an empty bus = %v, want %v", err, ErrRefused)
			}
			b.do("precharge close", "13s")
			b.near(signal.BypassClosed, 1, 0)
			b.near(signal.PrechargeClosed, 0, 0)
			b.near(signal.Ready, 1, 0)
			b.do("release", "6s")
			setpoint := float64(site.Infeeds[0].Setpoint.Nominal)
			b.near(signal.BusVoltage, setpoint, 0.012*setpoint)
			b.near(signal.Mode, signal.ModeVoltage, 0)
			b.do("infeed on", "load 50 %", "2s")
			want := float64(site.Load.Power.Nominal) / 2
			r := b.plant.Read()
			sum := r.Power + r.InfeedCurrents[0]*r.BusVoltage
			if math.Abs(sum-want) > 0.01*want {
				t.Errorf("both infeeds give %.0f W, want %.0f W", sum, want)
			}
			b.do("mode current", "power 10 kW", "2s")
			b.near(signal.Power, 10e3, 800)
			b.near(signal.Mode, signal.ModeCurrent, 0)
			b.do("mode voltage", "load off", "1s", "discharge", "2s")
			b.near(signal.Running, 0, 0)
			b.near(signal.BypassClosed, 0, 0)
			b.near(signal.SourceVoltage, 0, 8)
			if b.shown(signal.Fault) != 0 {
				t.Errorf("fault code %g after a healthy walk", b.shown(signal.FaultCode))
			}
		})
	}
}

// TestDischargeTakesItsTime compares with t = ½·R·C·ln((V₁² + P·R) ⁄ (V₂² + P·R)), bleeder R and constant power P on C.
func TestDischargeTakesItsTime(t *testing.T) {
	b := newBench(t, 2)
	if err := b.Restore(11); err != nil {
		t.Fatal(err)
	}
	b.do("discharge", "1s")
	v := b.Truth()
	r, c := 1/(1/v["bus.bleeder"]+nodeLeakage), v["bus.capacitance"]
	p := b.plant.Parameters().Bus.Auxiliary.Power
	first := b.plant.Read().BusVoltage
	b.do("20s")
	want := math.Sqrt((first*first+p*r)*math.Exp(-2*20/(r*c)) - p*r)
	if got := b.plant.Read().BusVoltage; math.Abs(got-want) > 2e-4*want {
		t.Errorf("bus 20 s after %.1f V = %.2f V, want %.2f V", first, got, want)
	}
}

func TestSameSeedSamePlantAtAnySpeed(t *testing.T) {
	run := func(step time.Duration, seed int64) [2]float64 {
		b := newBench(t, seed)
		b.do("isolator close", "100ms", "precharge close")
		for left := 2 * time.Second; left > 0; left -= step {
			b.wait(step)
		}
		return [2]float64{b.plant.Read().BusVoltage, b.shown(signal.BusVoltage)}
	}
	a, c, other := run(2*time.Millisecond, 7), run(500*time.Millisecond, 7), run(500*time.Millisecond, 8)
	if a != c {
		t.Errorf("bus in ticks of 2 ms = %v, of 500 ms = %v, want the same", a, c)
	}
	if a == other {
		t.Errorf("seeds 7 and 8 give the same %v", a)
	}
}

func TestTruthLiesWithinTolerances(t *testing.T) {
	s := wagtail(t)
	low, high := 0.0, 0.0
	for _, bank := range s.Bus.Capacitances {
		low, high = low+float64(bank.Value.Low), high+float64(bank.Value.High)
	}
	for seed := range int64(200) {
		v := newBench(t, seed).Truth()
		for _, c := range []struct {
			name      string
			low, high float64
		}{
			{"precharge.resistance", 95, 105}, {"source.internal_resistance", 0.062 * 0.85, 0.062 * 1.15},
			{"bus.capacitance", low, high}, {"source.emf", 633.6, 821.7}, {"bus.bleeder", 22e3 * 0.95, 22e3 * 1.05},
			{"setpoint", 1030 * 0.998, 1030 * 1.002}, {"choke.1", 0.378e-3, 0.462e-3},
		} {
			if v[c.name] < c.low || v[c.name] > c.high {
				t.Errorf("seed %d: %s = %g, want %g to %g", seed, c.name, v[c.name], c.low, c.high)
			}
		}
	}
}

func TestTripsAndInterlocks(t *testing.T) {
	running := func(t *testing.T) *bench {
		b := newBench(t, 4)
		if err := b.Restore(10); err != nil {
			t.Fatal(err)
		}
		b.do("load 10 %", "500ms")
		return b
	}
	for _, c := range []struct {
		name string
		acts []string
		code float64
	}{
		{"emergency stop", []string{"stop"}, faultEmergencyStop},
		{"over-voltage by its threshold", []string{"over-voltage 1000 V"}, faultOverVoltage},
		{"under-voltage by its threshold", []string{"under-voltage 1045 V"}, faultUnderVoltage},
		{"report taken away", []string{"drop-report on"}, faultBypassLost},
		{"bypass opened", []string{"bypass open"}, faultBypassLost},
		{"source withdraws", []string{"withdraw on"}, faultSource},
	} {
		b := running(t)
		b.do(c.acts...)
		b.do("1s")
		b.near(signal.FaultCode, c.code, 0)
		b.near(signal.Fault, 1, 0)
		b.near(signal.Running, 0, 0)
		b.do("reset", "500ms")
		b.near(signal.Running, 0, 0) // nothing starts by itself
	}
	b := newBench(t, 4)
	b.do("isolator close", "200ms", "withhold on", "precharge close", "9s")
	b.near(signal.PrechargeClosed, 1, 0)
	b.do("3s")
	b.near(signal.PrechargeClosed, 0, 0)
	b.near(signal.FaultCode, faultPrechargeTimeout, 0)
	b = running(t)
	b.do("earth-test 20 kΩ", "500ms")
	b.near(signal.InsulationResistance, 19.4e3, 1e3)
	b.near(signal.FaultCode, faultEarth, 0)
	b.near(signal.Running, 1, 0)
}

func TestRestoreStandsWhereTheStageBegins(t *testing.T) {
	b := newBench(t, 6)
	emf := b.Truth()["source.emf"]
	for stage, want := range map[int]struct{ bus, bypass, running float64 }{
		1: {0, 0, 0}, 5: {0, 0, 0}, 6: {emf, 1, 0}, 7: {emf, 1, 0}, 8: {1030, 1, 1}, 9: {1030, 1, 1}, 11: {1030, 1, 1}, 12: {0, 0, 0},
	} {
		if err := b.Restore(stage); err != nil {
			t.Fatal(err)
		}
		b.do("200ms")
		b.near(signal.BusVoltage, want.bus, 25)
		b.near(signal.BypassClosed, want.bypass, 0)
		b.near(signal.Running, want.running, 0)
	}
	if b.Restore(13) == nil {
		t.Error("Restore(13) = nil, want an error")
	}
}

func TestMeasureReadsWithAnInstrumentOfItsOwn(t *testing.T) {
	b := newBench(t, 3)
	b.do("isolator close", "500ms")
	v := b.Truth()
	for what, want := range map[string]float64{"source": v["source.emf"], "bus": 0, "precharge-resistance": v["precharge.resistance"],
		"across-bypass": v["source.emf"], "choke-2": v["choke.2"]} {
		got, unit, err := b.Measure(what)
		if err != nil {
			t.Fatal(err)
		}
		if math.Abs(got-want) > 6e-4*want+0.2 {
			t.Errorf("Measure(%s) = %g %s, want %g", what, got, unit, want)
		}
		if again, _, _ := b.Measure(what); again != got {
			t.Errorf("Measure(%s) = %g, then %g", what, got, again)
		}
	}
	if _, _, err := b.Measure("moon"); err == nil {
		t.Error("Measure(moon) = nil, want an error")
	}
	for what, is := range Places() {
		if is == "" {
			t.Errorf("place %s has no meaning", what)
		}
	}
}

func TestParseActReadsItsOwnHelp(t *testing.T) {
	for _, g := range vocabulary() {
		a, err := ParseAct(g.example)
		if err != nil || a.Verb != g.verb {
			t.Errorf("ParseAct(%q) = %v, %v, want verb %s", g.example, a, err, g.verb)
		}
	}
	for _, text := range []string{"", "isolator", "isolator shut", "load many", "setpoint 1030", "fly", "block now"} {
		if a, err := ParseAct(text); err == nil {
			t.Errorf("ParseAct(%q) = %v, want an error", text, a)
		}
	}
	if len(ActHelp()) != len(vocabulary()) {
		t.Errorf("ActHelp() has %d lines, want %d", len(ActHelp()), len(vocabulary()))
	}
}
