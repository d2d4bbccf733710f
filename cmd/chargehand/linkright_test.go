package main

import (
	"strings"
	"testing"
	"time"

	"chargehand/commission/clock"
	"chargehand/commission/signal"
	"chargehand/protocol/link"
	"chargehand/protocol/poll"
	"chargehand/protocol/simulator"
)

// A right map is never accused, whatever state the plant is in and whatever its true values within the site's tolerances are.
func TestARightMapIsNeverAccused(t *testing.T) {
	t.Parallel()
	s, m := wagtail(t)
	p := papers{mapFile: "wagtail.map.toml", mapText: shared(t, "wagtail.map.toml"), site: s, registers: m, hasMap: true}
	for seed := range int64(3) {
		plant, err := simulator.New(simulator.Options{Site: s, Map: m, Now: clock.NewPlant(time.Now).Now, Seed: seed + 1, ReplyDelay: -1})
		if err != nil {
			t.Fatal(err)
		}
		address, err := plant.Serve(t.Context(), "127.0.0.1:0")
		if err != nil {
			t.Fatal(err)
		}
		wire := link.New(link.Options{Address: address, LoopbackOnly: true})
		for stage := 1; stage <= 12; stage++ {
			if err := plant.Restore(stage); err != nil {
				t.Fatal(err)
			}
			time.Sleep(60 * time.Millisecond) // the registers are renewed every 20 ms
			trial := &linkTrial{app: &app{}, papers: p, wire: wire, poller: poll.New(poll.Options{Link: wire, UnitID: p.unit(), Map: m})}
			trial.last.Readings = decoded(t, trial)
			trial.sample(t.Context(), nil)
			if o := trial.opinion(); o.accused {
				t.Errorf("seed %d, stage %d: the right map is accused\n%s", seed+1, stage, strings.Join(o.lines, "\n"))
			}
		}
		wire.Close()
		if err := plant.Close(); err != nil {
			t.Error(err)
		}
	}
}

// decoded reads every signal of a trial's map once.
func decoded(t *testing.T, trial *linkTrial) []signal.Reading {
	t.Helper()
	survey, err := poll.Look(t.Context(), trial.wire, trial.papers.unit(), trial.papers.registers)
	if err != nil {
		t.Fatal(err)
	}
	var all []signal.Reading
	for _, p := range trial.papers.registers.Points {
		words, ok := survey.Words.Of(p, trial.papers.unit())
		if !ok {
			t.Fatalf("the simulated converter has not got %s", p.Name)
		}
		all = append(all, p.Decode(words))
	}
	return all
}
