package simulator

import (
	"time"

	"chargehand/commission/signal"
	"chargehand/protocol/registermap"
)

// readingFaults is what is wrong between the device's values and the wire.
type readingFaults struct {
	random       uint64 // seed of its own
	swapWords    bool
	shift        int     // registers
	scale        float64 // of the voltages; 0: sound
	unsigned     bool
	reverse      bool // currents and power
	missing      bool // the source current's register holds a code that the map does not know
	torn         float64
	behind       bool
	freezeAfter  float64 // s after pre-charge closes at which the bus voltage freezes; 0: never
	slow         time.Duration
	repeatPeriod float64 // s from one spell of repeated old answers to the next; 0: none
	repeatFor    float64 // s
	dropPeriod   float64 // s from one loss of the link to the next; 0: none
	dropFor      float64 // s
}

// scaled is a value as the disturbances of scale and direction leave it.
func (f *readingFaults) scaled(n signal.Name, v float64) float64 {
	switch n {
	case signal.BusVoltage, signal.SourceVoltage, signal.StarPointVoltage:
		if f.scale != 0 {
			return v * f.scale
		}
	case signal.SourceCurrent, signal.BusCurrent, signal.PhaseCurrent1, signal.PhaseCurrent2, signal.PhaseCurrent3, signal.Power:
		if f.reverse {
			return -v
		}
	}
	return v
}

// spoil changes the words of a value after they were encoded.
func (f *readingFaults) spoil(p registermap.Point, value float64, w []uint16) []uint16 {
	if f.missing && p.Name == signal.SourceCurrent {
		code := uint16(0x7FFF)
		for k := range w {
			w[k] = code
		}
	}
	if f.unsigned && p.Type == registermap.I16 && value < 0 {
		w[0] &= 0x7FFF // the sign bit is lost on the way: a little below zero reads as a very large value
	}
	if f.unsigned && (p.Type == registermap.I32 || p.Type == registermap.I64) && value < 0 {
		low := len(w) - 1
		if p.WordOrder == registermap.LowFirst {
			low = 0
		}
		for k := range w {
			if k != low {
				w[k] = 0 // sixteen bits were put into a wider register without their sign
			}
		}
	}
	if f.swapWords && len(w) > 1 {
		for a, b := 0, len(w)-1; a < b; a, b = a+1, b-1 {
			w[a], w[b] = w[b], w[a]
		}
	}
	return w
}

// frozen tells whether the register of a signal has stopped moving.
func (f *readingFaults) frozen(s *Simulator, n signal.Name) bool {
	if f.freezeAfter <= 0 || n != signal.BusVoltage {
		return false
	}
	if since := s.device.prechargeAt; since >= 0 && (s.elapsed-since).Seconds() >= f.freezeAfter {
		s.device.frozen = true
	}
	return s.device.frozen
}

// spell tells whether a fault that comes for some seconds in every period is there now. The first period is sound.
func spell(now time.Duration, period, length float64) bool {
	if period <= 0 {
		return false
	}
	t := now.Seconds()
	return t >= period && t-period*float64(int(t/period)) < length
}
