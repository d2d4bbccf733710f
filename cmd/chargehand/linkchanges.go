package main

import (
	"fmt"
	"math"
	"time"

	"chargehand/commission/signal"
	"chargehand/protocol/registermap"
)

// changes remembers what was last told of each signal and of the link.
type changes struct {
	told map[signal.Name]told
	up   bool
	down time.Time // when it was last told that the link is down
}

// told is a reading as it was last told.
type told struct {
	reading signal.Reading
	when    time.Time
}

// How much a value must move to be worth a line, and after how long less will do.
const (
	toldSteps = 10    // steps of its register
	toldShare = 0.005 // of its value
	toldAgain = 10 * time.Second
)

func newChanges(b signal.Batch) *changes {
	c := &changes{told: map[signal.Name]told{}, up: b.Link.Up}
	for _, r := range b.Readings {
		c.told[r.Name] = told{r, b.At}
	}
	return c
}

// isWorthALine tells whether a reading is so different from what was last told of it, or that so long ago, that it is told
// again. Late is no change by itself, and a heartbeat only moves.
func (t told) isWorthALine(p registermap.Point, r signal.Reading, at time.Time) bool {
	before := t.reading
	since := at.Sub(t.when)
	switch {
	case before.Quality.HasValue() != r.Quality.HasValue() || !r.Quality.HasValue() && before.Quality != r.Quality:
		return true
	case !r.Quality.HasValue() || r.Name == signal.Heartbeat || r.Value == before.Value || since < leastLines:
		return false
	case r.Name.Unit() == "" || since > toldAgain:
		return true
	}
	moved := math.Abs(r.Value - before.Value)
	return moved >= toldSteps*math.Abs(p.Scale*p.UnitFactor)*(1-1e-9) && moved >= toldShare*math.Abs(r.Value)
}

// since gives a line for the link where it came or went, and for each signal that changed, once a second at most; while the
// link is down it alone is told, every ten seconds.
func (c *changes) since(m registermap.Map, b signal.Batch) []string {
	var lines []string
	clock := b.At.Format(time.TimeOnly)
	switch {
	case b.Link.Up && !c.up:
		lines = append(lines, fmt.Sprintf("%s  link up again, %d reconnects", clock, b.Link.Reconnects))
	case !b.Link.Up && (c.up || b.At.Sub(c.down) > toldAgain):
		c.down = b.At
		line := fmt.Sprintf("%s  link down, values withdrawn: %s", clock, b.Link.Why)
		if wait := b.Link.NextTry.Sub(b.At); !b.Link.NextTry.IsZero() && wait > 0 {
			line += fmt.Sprintf("; next try in %v", wait.Round(100*time.Millisecond))
		}
		lines = append(lines, line)
	}
	c.up = b.Link.Up
	if !c.up {
		return lines
	}
	for i, r := range b.Readings {
		if !c.told[r.Name].isWorthALine(m.Points[i], r, b.At) {
			continue
		}
		c.told[r.Name] = told{r, b.At}
		text := "no value, " + string(r.Quality)
		if r.Quality.HasValue() {
			text = shown(m.Points[i], r.Value)
		} else if r.Why != "" {
			text += ": " + r.Why
		}
		lines = append(lines, fmt.Sprintf("%s  %-21s %-9s %s", clock, r.Name, registermap.Hex(r.Raw), text))
	}
	return lines
}
