package walkview

import (
	"fmt"
	"slices"
	"strings"

	"chargehand/commission"
	"chargehand/commission/capture"
	"chargehand/commission/record"
	"chargehand/commission/walk"
)

// step is what Enter does next at a point.
type step int

const (
	stepNothing  step = iota
	stepPerson        // nobody has entered who goes the walk
	stepGo            // go to another point: the hold in the way, or the next open one
	stepEnter         // step into the point's stage
	stepArm           // arm the capture
	stepCause         // enter what the last attempt failed of
	stepOverride      // a reason for an attempt before its time
	stepLive          // take the live readings
	stepMeasure       // enter an instrument's reading
	stepSeen          // enter what was seen
	stepPass          // pass the point
	stepFail          // it has failed: deviation or punch item
	stepSign          // sign it
	stepSeal          // all is done: seal the log
)

// action is a step with what it acts on and how the screen names it.
type action struct {
	step   step
	label  string
	point  string // where it leads
	reason string // why it is in the way
}

// next is what Enter does at point p now.
func (m Model) next(p walk.Point) action {
	if m.snapshot.State.Sealed() == nil && m.needsPerson() {
		return action{step: stepPerson, label: "enter who goes the walk"}
	}
	return next(m.snapshot, p)
}

func next(s commission.Snapshot, p walk.Point) action {
	state := s.State
	if state.Sealed() != nil {
		return action{label: "the log is sealed"}
	}
	if s.Capture != nil && s.Capture.Point == p.ID {
		return whileCapturing(*s.Capture)
	}
	if hold, held := state.HeldBy(p); held {
		return action{step: stepGo, point: hold.ID, label: "go to hold " + hold.ID, reason: "closed until " + hold.ID + " is signed"}
	}
	st := state.Status(p.ID)
	switch {
	case state.IsDone(p):
		return afterDone(state)
	case st.Result == walk.Open:
		return nextReading(s, p)
	case st.Result == walk.Failed && st.Accepted == nil && !hasPunch(state, p.ID):
		return action{step: stepFail, point: p.ID, label: "raise a punch item (d deviation)"}
	case p.Kind == walk.Hold:
		return action{step: stepSign, point: p.ID, label: "sign " + p.ID}
	}
	return afterDone(state)
}

// whileCapturing is what is waited for while the point's capture is on.
func whileCapturing(c commission.Progress) action {
	switch {
	case c.Phase == commission.Armed:
		return action{label: "waits for the plant", reason: "armed: it begins by itself when the plant acts; s stops it"}
	case c.Kind == capture.Droop:
		return action{label: "counts load steps", reason: "s ends the capture when the steps are done"}
	case c.Kind == capture.Step:
		return action{label: "watches the trip", reason: "s ends the capture when the plant has answered"}
	}
	return action{label: "capture runs", reason: "it ends by itself; s stops it"}
}

func hasPunch(state walk.State, point string) bool {
	for _, k := range state.Punches() {
		if k.Point == point && k.Event == "raised" {
			return true
		}
	}
	return false
}

func afterDone(state walk.State) action {
	if p, open := state.NextOpen(); open {
		return action{step: stepGo, point: p.ID, label: "go on to " + p.ID}
	}
	return action{step: stepSeal, label: "seal the log"}
}

// nextReading is the next reading an open point wants, or its verdict.
func nextReading(s commission.Snapshot, p walk.Point) action {
	state := s.State
	if state.Stage() < p.Stage {
		return action{step: stepEnter, point: p.ID, label: fmt.Sprintf("enter stage %d", p.Stage)}
	}
	if p.Capture != "" && !captured(state, p) {
		return nextArm(s, p)
	}
	if q, ok := state.CaptureOf(capture.Discharge); ok && p.ID == "down.order" && s.Capture == nil && !captured(state, q) {
		return nextArm(s, q)
	}
	if p.Wants(walk.Live) && p.Capture == "" && !has(state, p, record.FromDevice, "") && anyMapped(s, p) {
		return action{step: stepLive, point: p.ID, label: "take the live readings"}
	}
	if p.Wants(walk.Instrument) {
		for _, h := range p.Hand {
			if !has(state, p, record.FromInstrument, h.What) {
				return action{step: stepMeasure, point: p.ID, label: "enter the instrument's reading"}
			}
		}
	}
	if (p.Wants(walk.Observation) || p.Wants(walk.Document)) && !has(state, p, record.Observed, "") {
		return action{step: stepSeen, point: p.ID, label: enterWhat(p)}
	}
	switch assessed := state.Assess(p); {
	case assessed.Result == walk.Failed:
		return action{step: stepFail, point: p.ID, label: "not met: fail it (r read again)", reason: because(assessed)}
	case assessed.Result == walk.Open && wantsAnotherTrip(p, assessed):
		return nextArm(s, p)
	case assessed.Result == walk.Open && comparesFirst(assessed):
		return action{step: stepPass, point: p.ID, label: "compare and pass"}
	case assessed.Result == walk.Open && mayOmit(state, p):
		return action{step: stepPass, point: p.ID, label: "pass (x not applicable)", reason: because(assessed)}
	case assessed.Result == walk.Open:
		return action{step: stepPass, point: p.ID, label: "pass, though something is missing (u fails it)", reason: because(assessed)}
	case p.Kind == walk.Hold:
		return action{step: stepPass, point: p.ID, label: "pass and sign"}
	}
	return action{step: stepPass, point: p.ID, label: "pass"}
}

// wantsAnotherTrip tells whether a trip that the point binds has not been captured yet.
func wantsAnotherTrip(p walk.Point, a walk.Assessment) bool {
	return p.Capture == capture.Step && slices.ContainsFunc(a.Because, func(because string) bool { return strings.HasPrefix(because, "no finding measured.trip") })
}

// mayOmit tells whether a point can be left out: it is optional, and the case in which it is has not been ruled out.
func mayOmit(state walk.State, p walk.Point) bool {
	found := state.BusBefore()
	return p.MayOmit && (p.OmitWhen == "" || found == "" || found == p.OmitWhen)
}

// comparesFirst tells whether all that is missing are findings that the verdict itself makes of the readings.
func comparesFirst(a walk.Assessment) bool {
	made := []string{"measured.sensor", "measured.window", "measured.setpoint", "measured.current-mode"}
	return !slices.ContainsFunc(a.Because, func(because string) bool {
		id, isMissing := strings.CutPrefix(because, "no finding ")
		return !isMissing || !slices.Contains(made, id)
	})
}

func enterWhat(p walk.Point) string {
	if p.Wants(walk.Document) {
		return "enter the document"
	}
	return "enter what was seen"
}

func because(a walk.Assessment) string {
	if len(a.Because) == 0 {
		return ""
	}
	return a.Because[0]
}

func nextArm(s commission.Snapshot, p walk.Point) action {
	if s.Capture != nil {
		return action{label: "another capture is " + string(s.Capture.Phase)}
	}
	if p.Attempt {
		if s.State.CauseIsMissing() {
			return action{step: stepCause, point: p.ID, label: "enter the last attempt's cause"}
		}
		if wait := s.State.NotBefore(s.Now); wait != "" {
			return action{step: stepOverride, point: p.ID, label: "wait, or give a reason", reason: wait}
		}
	}
	return action{step: stepArm, point: p.ID, label: "arm the capture"}
}

// captured tells whether a capture has brought its reading or finding to the point since it was opened.
func captured(state walk.State, p walk.Point) bool {
	if len(state.Status(p.ID).Readings) > 0 {
		return true
	}
	for _, id := range p.Findings {
		if len(state.Measured(id)) > 0 {
			return true
		}
	}
	return false
}

func has(state walk.State, p walk.Point, source, what string) bool {
	for _, seq := range state.Status(p.ID).Readings {
		if r, ok := state.Reading(seq); ok && r.Source == source && (what == "" || r.Signal == what) {
			return true
		}
	}
	return false
}

// anyMapped tells whether the device has any of the point's signals.
func anyMapped(s commission.Snapshot, p walk.Point) bool {
	for _, name := range p.Signals {
		if _, ok := s.Live[name]; ok {
			return true
		}
	}
	return false
}
