package main

import (
	"fmt"
	"time"

	"chargehand/commission/signal"
	"chargehand/protocol/registermap"
)

// changes remembers what was last told of each signal and of the link.
type changes struct {
	told map[signal.Name]string
	when map[signal.Name]time.Time
	up   bool
	why  string
}

func newChanges(b signal.Batch) *changes {
	c := &changes{told: map[signal.Name]string{}, when: map[signal.Name]time.Time{}, up: b.Link.Up}
	for _, r := range b.Readings {
		c.told[r.Name], c.when[r.Name] = changeOf(r), b.At
	}
	return c
}

// changeOf is what counts as a change: another value, or another reason for none. Late is no change by itself.
func changeOf(r signal.Reading) string {
	if r.Quality.HasValue() {
		return registermap.Hex(r.Raw)
	}
	return string(r.Quality)
}

// since gives a line for the link where it came or went, and for each signal that changed. A signal that moves all the time
// is told once a second, the heartbeat, which only moves, not at all; while the link is down it alone is told.
func (c *changes) since(m registermap.Map, b signal.Batch) []string {
	var lines []string
	clock := b.At.Format(time.TimeOnly)
	if b.Link.Up != c.up {
		c.up = b.Link.Up
		if c.up {
			lines = append(lines, fmt.Sprintf("%s  link up again, %d reconnects", clock, b.Link.Reconnects))
		} else {
			line := fmt.Sprintf("%s  link down, values withdrawn: %s", clock, b.Link.Why)
			if wait := b.Link.NextTry.Sub(b.At); !b.Link.NextTry.IsZero() && wait > 0 {
				line += fmt.Sprintf("; next try in %v", wait.Round(100*time.Millisecond))
			}
			lines = append(lines, line)
		}
	}
	if !c.up {
		return lines
	}
	for i, r := range b.Readings {
		now := changeOf(r)
		before := c.told[r.Name]
		if now == before || r.Name == signal.Heartbeat && r.Quality.HasValue() || b.At.Sub(c.when[r.Name]) < leastLines {
			continue
		}
		c.told[r.Name], c.when[r.Name] = now, b.At
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
