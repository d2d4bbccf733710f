package main

import (
	"context"
	"fmt"
	"math"
	"strings"
	"sync"

	"chargehand/commission/signal"
	"chargehand/commission/site"
	"chargehand/commission/unattended"
	"chargehand/commission/walk"
	"chargehand/protocol/simulator"
)

// simulatedPlant is the hand at the simulated converter, in the words of the walk.
type simulatedPlant struct {
	simulator *simulator.Simulator
	site      site.Site

	mu    sync.Mutex
	keyed map[signal.Name]float64 // what was keyed, as the device's own display shows it
}

// settable are the acts that key a setting.
var settable = map[simulator.Verb]signal.Name{simulator.Setpoint: signal.VoltageSetpoint, simulator.Droop: signal.DroopSetting,
	simulator.PowerReference: signal.PowerReference}

func newPlant(s *simulator.Simulator, on site.Site) *simulatedPlant {
	p := &simulatedPlant{simulator: s, site: on, keyed: map[signal.Name]float64{}}
	if len(on.Infeeds) > 0 {
		in := on.Infeeds[0]
		p.keyed[signal.VoltageSetpoint] = float64(in.Setpoint.Nominal)
		p.keyed[signal.DroopSetting] = float64(in.Droop.At(on.Bus.Nominal.Nominal, in.RatedCurrent.Nominal))
	}
	return p
}

// Do does one act of the console's vocabulary.
func (p *simulatedPlant) Do(ctx context.Context, act string) error {
	parsed, err := simulator.ParseAct(act)
	if err != nil {
		return err
	}
	if err := p.simulator.Do(ctx, parsed); err != nil {
		return err
	}
	if name, keys := settable[parsed.Verb]; keys {
		p.mu.Lock()
		p.keyed[name] = parsed.Value
		p.mu.Unlock()
	}
	return nil
}

// restore puts the plant where a log that is gone on with has left it: in the state of the stage, and with what was operated
// at that stage's points since.
func (p *simulatedPlant) restore(ctx context.Context, state walk.State) error {
	next, open := state.NextOpen()
	if !open || next.Stage == 1 {
		return nil
	}
	charged, _ := state.Point("charge.rise")
	stage := next.Stage
	if stage == charged.Stage && state.IsDone(charged) {
		stage++ // the bus stands charged behind the closed bypass
	}
	if err := p.simulator.Restore(stage); err != nil {
		return err
	}
	if stage != next.Stage {
		return nil
	}
	for _, done := range state.InStage(stage) {
		if done.ID == next.ID {
			break
		}
		if done.Capture != "" || state.Status(done.ID).Result != walk.Passed {
			continue
		}
		for _, act := range unattended.Acts(done.ID) {
			if err := p.Do(ctx, act); err != nil {
				return fmt.Errorf("put the simulated plant where %s left it: %w", done.ID, err)
			}
		}
	}
	return nil
}

// spots are where the walk's readings are measured on the simulated plant.
var spots = map[string]string{
	string(signal.SourceVoltage):       "source",
	string(signal.BusVoltage):          "bus",
	string(signal.StarPointVoltage):    "star-point",
	string(signal.SourceCurrent):       "source-current",
	string(signal.BusCurrent):          "bus-current",
	string(signal.ResistorTemperature): "resistor-temperature",
	"difference across the bypass":     "across-bypass",
	"pre-charge resistance":            "precharge-resistance",
	"bleeder resistance":               "bleeder-resistance",
}

// Measure reads a hand instrument, or the device's own display, on the simulated plant.
func (p *simulatedPlant) Measure(_ context.Context, what string) (float64, string, error) {
	if spot, ok := spots[what]; ok {
		return p.simulator.Measure(spot)
	}
	if phase, ok := strings.CutPrefix(what, "choke "); ok {
		return p.simulator.Measure("choke-" + phase)
	}
	if what == "highest voltage found" {
		return p.highest()
	}
	p.mu.Lock()
	defer p.mu.Unlock()
	if v, ok := p.keyed[signal.Name(what)]; ok {
		return v, signal.Name(what).Unit(), nil
	}
	return 0, "", fmt.Errorf("the simulated plant has no place to read %q", what)
}

// highest is the voltage of greatest size at the places where absence of voltage is proved, the source side left out.
func (p *simulatedPlant) highest() (float64, string, error) {
	greatest := 0.0
	for _, spot := range []string{"bus", "star-point"} {
		v, _, err := p.simulator.Measure(spot)
		if err != nil {
			return 0, "", err
		}
		if math.Abs(v) > math.Abs(greatest) {
			greatest = v
		}
	}
	return greatest, "V", nil
}
