package simulator

import (
	"fmt"
	"math"
	"time"
)

func roundTo(v, step float64) float64 { return math.Round(v/step) * step }

// The stages of the walk from which the plant stands differently.
const (
	stageWindow   = 6  // charged, bypass closed
	stageDroop    = 8  // pulses released in voltage mode at no load
	stageDown     = 11 // as before, running
	stageLeave    = 12 // discharged
	restoreAtMost = 30 * time.Second
)

// Restore puts the plant in the state in which stage 1…12 of the walk finds it, as far as what is wrong with it allows. Its
// clock goes on from now.
func (s *Simulator) Restore(stage int) error {
	if stage < 1 || stage > stageLeave {
		return fmt.Errorf("restore: stage %d, want 1 to %d", stage, stageLeave)
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	if err := s.reset(); err != nil {
		return err
	}
	if stage >= stageWindow && stage < stageLeave {
		s.plant.Isolator(true)
		s.advance(500 * time.Millisecond)
		s.plant.Precharge(true)
		s.until(func() bool { return s.device.bypassAt >= 0 || s.device.fault != noFault })
		s.advance(time.Second)
	}
	if stage >= stageDroop && stage <= stageDown && s.device.ready(s.plant.Read()) {
		s.carryOut(Act{Verb: Release, On: true})
		s.until(func() bool { return s.plant.Read().BusVoltage > s.truth.setpoint-2 })
		s.advance(2 * time.Second)
		s.carryOut(Act{Verb: Infeed, On: true})
		s.advance(time.Second)
	}
	s.started = s.options.Now().Add(-s.elapsed)
	return s.broken
}

// until advances until something has come about, at most restoreAtMost.
func (s *Simulator) until(done func() bool) {
	for t := time.Duration(0); t < restoreAtMost && !done(); t += 10 * tick {
		if s.advance(10*tick) != nil {
			return
		}
	}
}
