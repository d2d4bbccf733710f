package commission

import (
	"testing"
	"time"

	"chargehand/commission/capture"
	"chargehand/commission/signal"
)

// TestLastSettled: the contact closes 150 ms before its report; what the bus reads in between is the closing, not the charge.
func TestLastSettled(t *testing.T) {
	c := capture.Capture{Channels: []capture.Channel{{Name: signal.BusVoltage}, {Name: signal.BypassClosed}}}
	for at := 50 * time.Millisecond; at <= 2*time.Second; at += 50 * time.Millisecond {
		bus, closed := 785.0, 0.0
		if at >= 1500*time.Millisecond {
			bus = 795
		}
		if at >= 1650*time.Millisecond {
			closed = 1
		}
		c.Samples = append(c.Samples, capture.Sample{At: at, Values: []capture.Value{{V: bus, OK: true}, {V: closed, OK: true}}})
	}
	i := lastSettled(c)
	if i < 0 || c.Samples[i].Values[0].V != 785 || c.Samples[i].At != 1350*time.Millisecond {
		t.Fatalf("lastSettled = sample %d, want the one at 1.35 s with 785 V, 300 ms before the report", i)
	}
	open := capture.Capture{Channels: c.Channels, Samples: c.Samples[:20]}
	if got := lastSettled(open); got != 19 {
		t.Errorf("lastSettled of a capture that ends while charging = %d, want its last sample, 19", got)
	}
	if got := lastSettled(capture.Capture{Channels: c.Channels}); got != -1 {
		t.Errorf("lastSettled of nothing = %d, want -1", got)
	}
}
