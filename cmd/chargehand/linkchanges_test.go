package main

import (
	"strings"
	"testing"
	"time"

	"chargehand/commission/signal"
	"chargehand/protocol/registermap"
)

func TestChangesTellWhatIsWorthALine(t *testing.T) {
	m := registermap.Map{Points: []registermap.Point{
		{Name: signal.BusVoltage, Table: registermap.Holding, Address: 100, Type: registermap.U16, Scale: 0.1, UnitFactor: 1},
		{Name: signal.Running, Table: registermap.Holding, Address: 120, Type: registermap.Bit, Scale: 1, UnitFactor: 1},
	}}
	start := time.Date(2026, 3, 1, 9, 0, 0, 0, time.UTC)
	batch := func(after time.Duration, up bool, bus float64, busQuality, runningQuality signal.Quality, running float64) signal.Batch {
		return signal.Batch{At: start.Add(after), Link: signal.Link{Up: up, Why: "no answer within 1s", NextTry: start.Add(after + 2*time.Second)},
			Readings: []signal.Reading{{Name: signal.BusVoltage, Value: bus, Quality: busQuality}, {Name: signal.Running, Value: running, Quality: runningQuality}}}
	}
	c := newChanges(batch(0, true, 1000, signal.Good, signal.Good, 0))
	steps := []struct {
		name  string
		batch signal.Batch
		want  []string
	}{
		{"nothing moves", batch(1*time.Second, true, 1000, signal.Good, signal.Late, 0), nil},
		{"less than a half per cent", batch(2*time.Second, true, 1004, signal.Good, signal.Good, 0), nil},
		{"more", batch(3*time.Second, true, 1006, signal.Good, signal.Good, 0), []string{"09:00:03  bus-voltage", "1006.0 V"}},
		{"a second has not passed", batch(3500*time.Millisecond, true, 1100, signal.Good, signal.Good, 0), nil},
		{"a state", batch(4*time.Second, true, 1006, signal.Good, signal.Good, 1), []string{"running", "1"}},
		{"a little, after long", batch(20*time.Second, true, 1006.1, signal.Good, signal.Good, 1), []string{"1006.1 V"}},
		{"missing at once", batch(20100*time.Millisecond, true, 0, signal.Missing, signal.Good, 1), []string{"no value, missing"}},
		{"link lost", batch(21*time.Second, false, 0, signal.Stale, signal.Stale, 0), []string{"link down, values withdrawn: no answer within 1s; next try in 2s"}},
		{"still lost", batch(22*time.Second, false, 0, signal.Stale, signal.Stale, 0), nil},
		{"lost for long", batch(32*time.Second, false, 0, signal.Stale, signal.Stale, 0), []string{"09:00:32  link down"}},
		{"back", batch(33*time.Second, true, 1006.1, signal.Good, signal.Good, 1), []string{"link up again", "bus-voltage"}},
	}
	for _, step := range steps {
		got := strings.Join(c.since(m, step.batch), "\n")
		if len(step.want) == 0 && got != "" {
			t.Errorf("%s: since = %q, want nothing", step.name, got)
		}
		for _, want := range step.want {
			if !strings.Contains(got, want) {
				t.Errorf("%s: since = %q, want %q in it", step.name, got, want)
			}
		}
	}
}
