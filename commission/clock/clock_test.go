package clock

import (
	"testing"
	"time"
)

func TestPlantKeepsItsTimeWhenThePaceChanges(t *testing.T) {
	wall := time.Date(2026, 12, 1, 9, 0, 0, 0, time.UTC)
	start := wall
	p := NewPlant(func() time.Time { return wall })
	wall = wall.Add(time.Second)
	p.Hasten(50)
	wall = wall.Add(2 * time.Second)
	p.Hasten(1)
	wall = wall.Add(3 * time.Second)
	if got, want := p.Now().Sub(start), 104*time.Second; got != want {
		t.Errorf("plant time after 1 s at 1, 2 s at 50 and 3 s at 1 = %v, want %v", got, want)
	}
	if p.Hasten(0.1); p.Pace() != 1 {
		t.Errorf("Pace() after Hasten(0.1) = %v, want 1: a plant never runs slower than its capture", p.Pace())
	}
}
