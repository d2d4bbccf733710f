// Package capture holds an armed window of readings: the raw material of every measured finding.
//
// Start at [Capture]. It keeps raw words beside the values, and marks gaps as gaps.
package capture

import (
	"time"

	"chargehand/commission/signal"
)

// Channel is one signal of a capture, with the map's scaling.
type Channel struct {
	Name    signal.Name
	Unit    string // coherent SI unit of the values
	Type    string // register type: "u16", "i32", "f32", "bit", …
	Scale   float64
	Offset  float64
	Refresh time.Duration // the device's refresh period; 0 where it is not known
}

// Value is one channel's value in one sample; it is absent where OK is false.
type Value struct {
	V   float64
	OK  bool
	Raw []uint16
}

// Sample is all channels at one instant, in the order of the capture's channels.
type Sample struct {
	At     time.Duration // since T0; negative before it
	Values []Value
}

// Gap is a stretch without samples.
type Gap struct {
	From, To time.Duration
	Why      string
}

// Capture is a window of samples around one event.
type Capture struct {
	ID       string // "c1", "c2", … within a log
	Kind     Kind
	Stage    string
	Attempt  int
	T0       time.Time // the event: pre-charge closed, bypass closed, bleeding begun, …
	Channels []Channel
	Samples  []Sample
	Gaps     []Gap
}

// Kind is what the capture is of.
type Kind string

// The kinds of capture.
const (
	Precharge Kind = "precharge"
	Droop     Kind = "droop"
	Discharge Kind = "discharge"
	Step      Kind = "step"
)

// Index gives the position of a signal among the channels, or -1.
func (c Capture) Index(n signal.Name) int {
	for i, ch := range c.Channels {
		if ch.Name == n {
			return i
		}
	}
	return -1
}

// Series gives the times in seconds since T0 and the values of one signal, absent values left out.
func (c Capture) Series(n signal.Name) (t, v []float64) {
	i := c.Index(n)
	if i < 0 {
		return nil, nil
	}
	for _, s := range c.Samples {
		if i < len(s.Values) && s.Values[i].OK {
			t = append(t, s.At.Seconds())
			v = append(v, s.Values[i].V)
		}
	}
	return t, v
}
