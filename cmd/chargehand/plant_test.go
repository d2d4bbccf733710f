package main

import (
	"testing"
	"time"

	"chargehand/commission/record"
	"chargehand/commission/site"
	"chargehand/commission/unattended"
	"chargehand/commission/walk"
	"chargehand/protocol/simulator"
)

// The walk speaks to the simulated plant in the words of its console.
func TestTheWalksActsAndPlacesAreKnownToThePlant(t *testing.T) {
	text, _ := site.Example()
	s, _, err := site.Read(site.ExampleName, []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	_, mapText := site.Example()
	p, err := read(site.ExampleName, text, site.ExampleMapName, mapText)
	if err != nil {
		t.Fatal(err)
	}
	sim, err := simulator.New(simulator.Options{Site: s, Map: p.registers, Now: time.Now})
	if err != nil {
		t.Fatal(err)
	}
	defer sim.Close()
	plant := newPlant(sim, s)
	if err := plant.Do(t.Context(), unattended.PowerReference(20e3)); err != nil {
		t.Fatal(err)
	}
	acts := []string{unattended.OverVoltageAt(990), unattended.UnderVoltageAt(1080), unattended.SourceBack, unattended.EarthTestOff}
	state := walk.State{}.With(walk.Line{Body: record.File{Role: "site", Name: site.ExampleName, Text: text}})
	for _, point := range state.Points() {
		acts = append(acts, unattended.Acts(point.ID)...)
		for _, h := range point.Hand {
			if _, unit, err := plant.Measure(t.Context(), h.What); err != nil || unit != h.Unit {
				t.Errorf("Measure(%s) for %s = %q, %v, want a value in %s", h.What, point.ID, unit, err, h.Unit)
			}
		}
		for _, name := range point.Proves {
			if _, _, err := plant.Measure(t.Context(), string(name)); err != nil && !point.Wants(walk.Instrument) && name != "heatsink-temperature" {
				t.Errorf("Measure(%s) for %s = %v, want what the display shows", name, point.ID, err)
			}
		}
	}
	for _, act := range acts {
		if _, err := simulator.ParseAct(act); err != nil {
			t.Errorf("ParseAct(%s) = %v", act, err)
		}
	}
}
