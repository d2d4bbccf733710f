package commission

import (
	"slices"

	"chargehand/commission/finding"
	"chargehand/commission/measured"
	"chargehand/commission/quantity"
	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/commission/walk"
)

// PeerCurrent is what the bus current of another infeed is called among a point's readings.
func PeerCurrent(infeed string) string { return string(signal.BusCurrent) + " of " + infeed }

// beside are the readings that some points take beside their signals: the other infeeds' currents where the load is shared,
// raw numbers where settings are read back.
func (r *Run) beside(p walk.Point) []record.Reading {
	var readings []record.Reading
	switch p.ID {
	case "share.share", "share.lost":
		for _, in := range r.state.Site().Infeeds {
			if live, ok := r.peers[in.Name][signal.BusCurrent]; ok {
				reading := r.reading(p.ID, live)
				reading.Signal, reading.U = PeerCurrent(in.Name), 0
				readings = append(readings, reading)
			}
		}
	case "share.keyed":
		now := r.opt.Clock.Now()
		for _, name := range []signal.Name{signal.VoltageSetpoint, signal.DroopSetting} {
			live := r.live[name].Withdrawn(now, r.maxAge())
			if raw, ok := r.rawNumber(live); ok {
				reading := r.reading(p.ID, live)
				value := float64(raw)
				reading.Signal, reading.Value, reading.Unit, reading.U = walk.RawNumber(name), &value, "1", 0
				readings = append(readings, reading)
			}
		}
	}
	return readings
}

// share judges how the load divides by the newest currents of all infeeds at a point, read together: at most half a second
// lies between the polls of two devices. A current that a clamp meter gave counts as well.
func (r *Run) share(p walk.Point) []finding.Finding {
	own, ok := r.newest(p, string(signal.BusCurrent))
	if !ok {
		return nil
	}
	step := measured.Step{Current: quantity.Current(*own.Value), CurrentU: quantity.Current(own.U), Others: map[string]quantity.Current{}}
	for i, in := range r.state.Site().Infeeds {
		if other, ok := r.newest(p, PeerCurrent(in.Name)); ok && i > 0 {
			step.Others[in.Name] = quantity.Current(*other.Value)
		}
	}
	if len(step.Others) == 0 || len(step.Others) < len(r.state.Site().Infeeds)-1 {
		return nil
	}
	return []finding.Finding{measured.Share(r.state.Site(), step)}
}

// newest is the newest reading of what at a point, from wherever it came.
func (r *Run) newest(p walk.Point, what string) (record.Reading, bool) {
	for _, seq := range slices.Backward(r.state.Status(p.ID).Readings) {
		if reading, ok := r.state.Reading(seq); ok && reading.Signal == what && reading.Value != nil {
			return reading, true
		}
	}
	return record.Reading{}, false
}
