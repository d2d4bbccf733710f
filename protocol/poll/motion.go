package poll

import (
	"fmt"
	"math"
	"slices"
	"time"

	"chargehand/commission/signal"
)

// When a value that stands still is called frozen. A device at rest stands still too, so a still value alone says nothing:
// either the heartbeat has stopped, or a value that moved by several steps at every refresh stopped dead while others go on.
const (
	beatsToTrust   = 3               // changes of the heartbeat before its silence means anything
	beatsMissed    = 5               // of its own period
	leastStill     = time.Second     // real time
	refreshesStill = 20              // of the value's own period
	movesToTrust   = 20              // changes in a row
	bigStep        = 3               // raw steps; a settling value ends in smaller ones
	othersMoved    = 5               // changes of other values meanwhile
	motionPause    = 2 * time.Second // without samples: what was learned of the pace is kept, the stillness is not
)

// motion follows how a signal's words change, by real time.
type motion struct {
	words     []uint16
	seenAt    time.Time
	changedAt time.Time
	changes   int
	period    time.Duration // from change to change, smoothed
	step      float64       // size of the last changes in raw steps, smoothed
	unbroken  int           // changes in a row, each about a period after the one before
}

// see takes a reading and tells whether its words differ from those before.
func (m *motion) see(r signal.Reading, at time.Time) bool {
	first := m.words == nil
	paused := !first && at.Sub(m.seenAt) > motionPause
	changed := !first && !slices.Equal(m.words, r.Raw)
	if first || paused {
		m.changedAt, m.unbroken = at, 0
	}
	if changed && !paused {
		m.move(r, at)
	}
	m.words, m.seenAt = r.Raw, at
	return changed && !paused
}

func (m *motion) move(r signal.Reading, at time.Time) {
	gap := at.Sub(m.changedAt)
	step := math.Abs(float64(int16(r.Raw[len(r.Raw)-1] - m.words[len(m.words)-1])))
	m.changes++
	if m.period == 0 || m.unbroken == 0 {
		m.period, m.step = gap, step
	}
	if gap > 3*m.period {
		m.unbroken = 0
	}
	m.unbroken++
	m.period += (gap - m.period) / 8
	m.step += (step - m.step) / 4
	m.changedAt = at
}

// stillUnits gives, by unit, why all its readings are frozen: its heartbeat moved and has stopped.
func (p *Poller) stillUnits(now time.Time) map[uint8]string {
	var still map[uint8]string
	for _, s := range p.points {
		if s.point.Name != signal.Heartbeat || s.motion.changes < beatsToTrust {
			continue
		}
		if stood := s.motion.seenAt.Sub(s.motion.changedAt); stood > max(leastStill, beatsMissed*s.motion.period) {
			if still == nil {
				still = map[uint8]string{}
			}
			still[s.unit] = fmt.Sprintf("the heartbeat has stood still for %v", stood.Round(100*time.Millisecond))
		}
	}
	return still
}

// stopped says why a single signal is frozen, or "". Where the map has a heartbeat, that alone decides.
func (p *Poller) stopped(s *pointState, now time.Time) string {
	m := &s.motion
	stood := m.seenAt.Sub(m.changedAt)
	if !isMeasured(s.point.Name) || s.reading.Value == 0 || m.unbroken < movesToTrust || m.step < bigStep ||
		stood <= max(leastStill, refreshesStill*m.period) {
		return ""
	}
	moved := 0
	for _, o := range p.points {
		if o.point.Name == signal.Heartbeat && o.motion.changes >= beatsToTrust {
			return ""
		}
		if o != s && isMeasured(o.point.Name) && o.motion.changedAt.Sub(m.changedAt) > stood/2 {
			moved += o.motion.unbroken
		}
	}
	if moved < othersMoved {
		return ""
	}
	return fmt.Sprintf("has stood still for %v while others move", stood.Round(100*time.Millisecond))
}

// isMeasured tells the signals that are measured from those that are set, counted or switched.
func isMeasured(n signal.Name) bool {
	switch n {
	case signal.VoltageSetpoint, signal.DroopSetting, signal.PowerReference, signal.ChargeLimit, signal.DischargeLimit,
		signal.InsulationResistance:
		return false
	}
	return n.Unit() != ""
}
