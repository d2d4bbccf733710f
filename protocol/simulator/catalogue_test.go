//go:build !race

// These tests compute some ten plant minutes in one goroutine: nothing for the race detector, which would take minutes.

package simulator

import (
	"math"
	"slices"
	"strings"
	"testing"
	"time"

	"chargehand/commission/signal"
)

// names is section 10 of the design, in its order.
const names = `resistor-open resistor-high resistor-low resistor-drifts-hot bank-missing bank-added load-left-on auxiliary-stall
bus-shorted bus-shorted-late bypass-welded bypass-early bypass-never bypass-drops-out precharge-welded bus-live
bus-still-charged load-returns-early fuse-open
source-low source-soft source-reversed source-opens charger-refuses choke-open choke-unequal
filter-missing upper-switch-shorted lower-switch-shorted bleeder-open chopper-dead earth-fault contact-report-false
droop-mismatch droop-off setpoint-shifted limit-too-low infeed-lost bus-hunts
words-swapped address-shifted scale-tenfold sign-unsigned current-reversed missing-code-read torn-words
answers-one-behind readings-frozen readings-slow gateway-repeats-old sensor-gain sensor-offset link-drops`

func TestEveryNameOfTheDesignIsThere(t *testing.T) {
	var got []string
	for _, d := range Disturbances() {
		got = append(got, d.Name)
		if d.Meaning == "" || d.SizeMeans == "" || d.Unit == "" || d.DefaultSize < d.Least || d.DefaultSize > d.Most {
			t.Errorf("%s: %+v is not whole", d.Name, d)
		}
	}
	if want := strings.Fields(names); !slices.Equal(got, want) {
		t.Errorf("Disturbances() = %v, want %v", got, want)
	}
}

func TestParseDisturbance(t *testing.T) {
	for text, want := range map[string]Disturbance{"resistor-high": {"resistor-high", 0.3}, "resistor-high=0.5": {"resistor-high", 0.5},
		" bus-hunts=0.02 ": {"bus-hunts", 0.02}} {
		if got, err := ParseDisturbance(text); err != nil || got != want {
			t.Errorf("ParseDisturbance(%q) = %v, %v, want %v", text, got, err, want)
		}
	}
	for _, text := range []string{"", "resistor", "resistor-high=", "resistor-high=x", "resistor-high=NaN", "resistor-high=-1"} {
		if got, err := ParseDisturbance(text); err == nil {
			t.Errorf("ParseDisturbance(%q) = %v, want an error", text, got)
		}
	}
	if list, err := ParseDisturbances("resistor-high=0.2, link-drops"); err != nil || len(list) != 2 {
		t.Errorf("ParseDisturbances = %v, %v, want two", list, err)
	}
}

// charge is what one pre-charge looks like.
type charge struct {
	source              float64 // V read before it
	start, half, end    float64 // bus voltage before, after 0.5 s, after 7 s
	atBypass            float64 // bus voltage when the bypass reported; 0: never
	bypassAfter         float64 // s
	first               float64 // greatest source current of the first half second
	current, reversed   float64 // greatest and least source current read
	phases              [3]float64
	star                float64 // star point before the isolator closed
	bypass, fault, code float64 // at the end
	precharge           float64
}

// chargeOf runs isolator, pre-charge and twelve seconds.
func chargeOf(b *bench) charge {
	b.t.Helper()
	b.do("1s")
	var c charge
	c.star = b.shown(signal.StarPointVoltage)
	b.do("isolator close", "300ms")
	c.source, c.start = b.shown(signal.SourceVoltage), b.shown(signal.BusVoltage)
	b.do("precharge close")
	for n := 1; n <= 700; n++ {
		b.wait(10 * time.Millisecond)
		i := b.shown(signal.SourceCurrent)
		c.current, c.reversed = math.Max(c.current, i), math.Min(c.reversed, i)
		if n <= 50 {
			c.first = c.current
		}
		if n == 50 {
			c.half = b.shown(signal.BusVoltage)
			for k, p := range []signal.Name{signal.PhaseCurrent1, signal.PhaseCurrent2, signal.PhaseCurrent3} {
				c.phases[k] = b.shown(p)
			}
		}
		if c.bypassAfter == 0 && b.shown(signal.BypassClosed) == 1 {
			c.bypassAfter, c.atBypass = float64(n)/100, b.shown(signal.BusVoltage)
		}
	}
	c.end = b.shown(signal.BusVoltage)
	b.wait(5 * time.Second)
	c.bypass, c.fault, c.code = b.shown(signal.BypassClosed), b.shown(signal.Fault), b.shown(signal.FaultCode)
	c.precharge = b.shown(signal.PrechargeClosed)
	return c
}

// TestPrechargeDisturbances: each changes what it should, against the same plant without it.
func TestPrechargeDisturbances(t *testing.T) {
	const seed = 11
	sound := chargeOf(newBench(t, seed))
	if sound.bypass != 1 || sound.fault != 0 || sound.bypassAfter < 1 {
		t.Fatalf("sound charge = %+v", sound)
	}
	between := func(v, low, high float64) bool { return v >= low && v <= high }
	for name, holds := range map[string]func(c charge) bool{
		"resistor-open": func(c charge) bool { return c.end < 8 && c.current < 1 && c.code == faultPrechargeTimeout },
		"resistor-high": func(c charge) bool { return c.half < 0.87*sound.half && c.bypassAfter > 1.2*sound.bypassAfter },
		"resistor-low":  func(c charge) bool { return c.half > 1.15*sound.half && c.bypassAfter < 0.85*sound.bypassAfter },
		"bank-missing":  func(c charge) bool { return c.half > 1.06*sound.half && between(c.first/sound.first, 0.97, 1.03) },
		"bank-added":    func(c charge) bool { return c.half < 0.87*sound.half && between(c.first/sound.first, 0.97, 1.03) },
		"load-left-on": func(c charge) bool {
			return c.bypass == 0 && between(c.end/sound.source, 0.92, 0.96) && c.code == faultPrechargeTimeout
		},
		"auxiliary-stall":   func(c charge) bool { return c.bypass == 0 && between(c.end/sound.source, 0.90, 0.95) },
		"bus-shorted":       func(c charge) bool { return c.end < 8 && c.current > 7 && c.code == faultPrechargeTimeout },
		"bus-shorted-late":  func(c charge) bool { return c.half > 0.9*sound.half && c.end < 8 },
		"bypass-welded":     func(c charge) bool { return c.start > 0.9*sound.source },
		"bypass-early":      func(c charge) bool { return between(c.bypassAfter, 0.3, 0.75*sound.bypassAfter) && c.current > 200 },
		"bypass-never":      func(c charge) bool { return c.bypass == 0 && c.end > 0.98*sound.source },
		"bypass-drops-out":  func(c charge) bool { return c.bypassAfter > 0 && c.bypass == 0 },
		"precharge-welded":  func(c charge) bool { return c.bypass == 1 && c.precharge == 1 },
		"bus-live":          func(c charge) bool { return c.start > 1000 && between(c.bypassAfter, 1, 1.3) && c.current < 30 },
		"bus-still-charged": func(c charge) bool { return between(c.start/sound.source, 0.45, 0.55) },
		"load-returns-early": func(c charge) bool {
			return between(c.half/sound.half, 0.97, 1.03) && c.end < sound.end-8 && c.bypass == 0
		},
		"fuse-open":            func(c charge) bool { return c.source < 10 && c.end < 8 },
		"source-low":           func(c charge) bool { return between(c.source/sound.source, 0.9, 0.94) && c.bypass == 1 },
		"source-reversed":      func(c charge) bool { return c.source == 0 && c.reversed < -7 && c.end < 8 },
		"source-opens":         func(c charge) bool { return between(c.end, 0.2*sound.end, 0.7*sound.end) },
		"choke-open":           func(c charge) bool { return math.Abs(c.phases[1]) < 0.3 && c.phases[0] > 1.2*sound.phases[0] },
		"choke-unequal":        func(c charge) bool { return c.phases[0] > 1.05*sound.phases[0] },
		"filter-missing":       func(c charge) bool { return c.half > sound.half && c.bypass == 1 },
		"lower-switch-shorted": func(c charge) bool { return c.end < 8 && c.phases[0] > 7 },
		"contact-report-false": func(c charge) bool { return c.bypassAfter < 0.02 && c.bypassAfter > 0 },
		"resistor-drifts-hot":  func(c charge) bool { return c.half < 0.97*sound.half && between(c.first/sound.first, 0.95, 1.05) },
		"scale-tenfold":        func(c charge) bool { return between(c.end/sound.end, 0.099, 0.101) },
		"current-reversed":     func(c charge) bool { return c.reversed < -7 && c.current < 1 },
		"missing-code-read":    func(c charge) bool { return c.current > 3000 },
		"readings-frozen":      func(c charge) bool { return between(c.end/sound.end, 0.3, 0.6) && c.bypass == 1 },
		"sensor-gain":          func(c charge) bool { return between(c.end/sound.end, 1.035, 1.045) },
		"sensor-offset":        func(c charge) bool { return between(c.end-sound.end, 19, 21) },
		"sign-unsigned":        func(c charge) bool { return c.current > 3000 },
		"address-shifted":      func(c charge) bool { return c.bypassAfter == 0 },
	} {
		t.Run(name, func(t *testing.T) {
			if c := chargeOf(newBench(t, seed, name)); !holds(c) {
				t.Errorf("charge = %+v, sound %+v", c, sound)
			}
		})
	}
}

func TestUpperSwitchShortedShowsWithTheBusLive(t *testing.T) {
	c := newBench(t, 1, "upper-switch-shorted", "bus-live")
	c.do("3s")
	c.near(signal.StarPointVoltage, c.shown(signal.BusVoltage), 12)
}

func TestEarthFaultLowersTheInsulation(t *testing.T) {
	b := newBench(t, 1, "earth-fault")
	b.do("1s")
	b.near(signal.InsulationResistance, 19.5e3, 1e3)
}

func TestBleederOpenKeepsTheCharge(t *testing.T) {
	fall := func(disturb ...string) float64 {
		b := newBench(t, 1, disturb...)
		if err := b.Restore(11); err != nil {
			t.Fatal(err)
		}
		b.do("discharge", "2m")
		return b.plant.Read().BusVoltage
	}
	if sound, open := fall(), fall("bleeder-open"); open < sound+100 {
		t.Errorf("bus after 2 min = %.0f V without bleeder, %.0f V with", open, sound)
	}
}

// stairs are the converter's droop: bus-side current and terminal voltage at four loads.
func stairs(b *bench, acts ...string) (current, voltage [4]float64) {
	b.t.Helper()
	if err := b.Restore(8); err != nil {
		b.t.Fatal(err)
	}
	b.do(acts...)
	for k, load := range []string{"load 10 %", "load 30 %", "load 50 %", "load 80 %"} {
		b.do(load, "4s")
		r := b.plant.Read()
		current[k], voltage[k] = r.BusCurrent, r.BusVoltage+b.truth.cable*r.BusCurrent
	}
	return current, voltage
}

func TestDroopDisturbances(t *testing.T) {
	const seed = 3
	slope := func(i, v [4]float64) float64 { return (v[0] - v[2]) / (i[2] - i[0]) }
	i, v := stairs(newBench(t, seed))
	if got := slope(i, v); math.Abs(got-0.13636) > 0.001 {
		t.Errorf("droop = %.5f V/A, want 3 %% of 1000 V over 220 A = 0.13636", got)
	}
	mi, mv := stairs(newBench(t, seed, "droop-mismatch"))
	if got := slope(mi, mv); math.Abs(got-1.6*0.13636) > 0.002 {
		t.Errorf("droop with droop-mismatch = %.5f V/A, want %.5f", got, 1.6*0.13636)
	}
	oi, ov := stairs(newBench(t, seed, "droop-off"), "infeed off")
	if got := slope(oi, ov); math.Abs(got) > 0.001 {
		t.Errorf("droop with droop-off = %.5f V/A, want 0", got)
	}
	_, sv := stairs(newBench(t, seed, "setpoint-shifted"), "infeed off")
	_, pv := stairs(newBench(t, seed), "infeed off")
	if got := sv[1] - pv[1]; math.Abs(got-8) > 0.5 {
		t.Errorf("setpoint-shifted raises the voltage by %.2f V, want 8 V", got)
	}
	li, _ := stairs(newBench(t, seed, "limit-too-low"))
	if b := newBench(t, seed); li[3] > 0.85*i[3] || b.device.discharge != 400 {
		t.Errorf("limit-too-low: %.1f A at the greatest load, %.1f A without; register %.0f A", li[3], i[3], b.device.discharge)
	}
	b := newBench(t, seed, "infeed-lost")
	b.do("1s")
	ii, _ := stairs(b)
	if ii[2] < 1.7*i[2] || ii[0] > 1.1*i[0] {
		t.Errorf("infeed-lost: %.1f A and %.1f A at 10 and 50 %%, want the other's share too from 40 %% on", ii[0], ii[2])
	}
}

func TestBusHunts(t *testing.T) {
	swing := func(disturb ...string) float64 {
		b := newBench(t, 3, disturb...)
		if err := b.Restore(8); err != nil {
			t.Fatal(err)
		}
		b.do("infeed off", "1s")
		low, high := 2000.0, 0.0
		for range 200 {
			b.wait(10 * time.Millisecond)
			v := b.plant.Read().BusVoltage
			low, high = math.Min(low, v), math.Max(high, v)
		}
		return high - low
	}
	if sound, hunting := swing(), swing("bus-hunts"); sound > 0.5 || hunting < 12 {
		t.Errorf("bus swings by %.1f V with bus-hunts, %.1f V without", hunting, sound)
	}
}

func TestChopperAndCharging(t *testing.T) {
	highest := func(disturb ...string) (bus, charging float64) {
		b := newBench(t, 3, disturb...)
		if err := b.Restore(8); err != nil {
			t.Fatal(err)
		}
		b.do("regenerate 100 %")
		for range 300 {
			b.wait(5 * time.Millisecond)
			r := b.plant.Read()
			bus, charging = math.Max(bus, r.BusVoltage), math.Min(charging, r.SourceCurrent)
		}
		return bus, charging
	}
	if bus, charging := highest(); bus > 1080 || charging > -100 {
		t.Errorf("regeneration: bus up to %.0f V, source %.0f A, want below the chopper and absorbed", bus, charging)
	}
	if bus, charging := highest("charger-refuses"); bus < 1085 || bus > 1100 || charging < -5 {
		t.Errorf("charger-refuses: bus up to %.0f V, source %.0f A, want held by the chopper", bus, charging)
	}
	if bus, _ := highest("charger-refuses", "chopper-dead"); bus < 1129 {
		t.Errorf("charger-refuses and chopper-dead: bus up to %.0f V, want the over-voltage trip at 1130 V", bus)
	}
}

func TestSourceSoftSags(t *testing.T) {
	sag := func(disturb ...string) float64 {
		b := newBench(t, 3, disturb...)
		if err := b.Restore(8); err != nil {
			t.Fatal(err)
		}
		before := b.shown(signal.SourceVoltage)
		b.do("load 80 %", "2s")
		return before - b.shown(signal.SourceVoltage)
	}
	if sound, soft := sag(), sag("source-soft"); soft < 4*sound {
		t.Errorf("sag %.1f V with source-soft, %.1f V without", soft, sound)
	}
}

// TestPrechargeWeldedLeavesAShelf: the discharge ends at E·R_b ⁄ (R + R_b), as a divider does.
func TestPrechargeWeldedLeavesAShelf(t *testing.T) {
	b := newBench(t, 1, "precharge-welded")
	if err := b.Restore(11); err != nil {
		t.Fatal(err)
	}
	b.do("infeed off", "block", "bypass open", "3m")
	if bus, emf := b.plant.Read().BusVoltage, b.Truth()["source.emf"]; bus < 0.97*emf || bus > emf {
		t.Errorf("bus after 3 min = %.1f V, want a little below the source's %.1f V", bus, emf)
	}
}
