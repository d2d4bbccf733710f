package unattended

import (
	"context"
	"fmt"
	"time"

	"chargehand/commission"
	"chargehand/commission/walk"
)

// Operator is the hand at a simulated plant. A real plant is operated by its own people with its own controls, so there is
// no Operator for it.
type Operator interface {
	// Do does one act in the words of the simulated plant's console, such as "precharge close" or "load 50 %".
	Do(ctx context.Context, act string) error
	// Measure reads a hand instrument at a named place, in the coherent unit.
	Measure(ctx context.Context, what string) (value float64, unit string, err error)
}

// The acts of a rehearsal, in the words of the simulated plant.
const (
	IsolatorClose  = "isolator close"
	PrechargeClose = "precharge close"
	PrechargeOpen  = "precharge open"
	BypassWithhold = "withhold on"
	BypassRelease  = "withhold off"
	PulsesRelease  = "release"
	InfeedsOn      = "infeed on"
	InfeedsOff     = "infeed off"
	LoadOff        = "load off"
	Regenerate     = "regenerate 50 %"
	PowerMode      = "mode current"
	VoltageMode    = "mode voltage"
	EverythingOff  = "discharge"
	Stop           = "stop"
	Reset          = "reset"
	ReportDropped  = "drop-report on"
	ReportBack     = "drop-report off"
	SourceWithdraw = "withdraw on"
	SourceBack     = "withdraw off"
	EarthTest      = "earth-test 20 kΩ"
	EarthTestOff   = "earth-test off"
	OverVoltageOK  = "over-voltage restore"
	UnderVoltageOK = "under-voltage restore"
)

// OverVoltageAt and UnderVoltageAt are the acts that move a trip's threshold.
func OverVoltageAt(volts float64) string  { return fmt.Sprintf("over-voltage %.0f V", volts) }
func UnderVoltageAt(volts float64) string { return fmt.Sprintf("under-voltage %.0f V", volts) }

// LoadShare is the act that puts a share of the site's greatest load on the bus.
func LoadShare(percent int) string { return fmt.Sprintf("load %d %%", percent) }

// PowerReference is the act that sets the power from source to bus in watts.
func PowerReference(watts float64) string { return fmt.Sprintf("power %.0f W", watts) }

// hand is what both ways of going the walk share: the run, its newest snapshot, and waiting for something to be seen.
type hand struct {
	run    *commission.Run
	latest commission.Snapshot
	say    func(string)
}

// submit hands in an event and keeps the state it leads to.
func (h *hand) submit(ctx context.Context, event walk.Event) error {
	recorded, err := h.run.Submit(ctx, event)
	if recorded.State.NextSeq() > 0 { // a refused event may have been preceded by records of its own
		h.latest.State = recorded.State
	}
	return err
}

// await takes snapshots until what is wanted is seen, and says whether it was before the limit (wall time).
func (h *hand) await(ctx context.Context, limit time.Duration, wanted func(commission.Snapshot) bool) (bool, error) {
	timeout := time.NewTimer(limit)
	defer timeout.Stop()
	for {
		select {
		case h.latest = <-h.run.Snapshots():
			if h.latest.Failure != nil {
				return false, h.latest.Failure
			}
			if wanted(h.latest) {
				return true, nil
			}
		case <-timeout.C:
			return false, nil
		case <-ctx.Done():
			return false, ctx.Err()
		}
	}
}
