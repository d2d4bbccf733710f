package walk

import (
	"chargehand/commission/capture"
	"chargehand/commission/signal"
)

// Kind says who may pass a point.
type Kind string

// The kinds of point (quality trade language, ISO 10005).
const (
	Hold    Kind = "hold"    // nobody passes before it is signed
	Witness Kind = "witness" // the witness is invited; the walk goes on if absent, logged
	Check   Kind = "check"
)

// By is where a point's reading comes from.
type By string

// The origins of a reading.
const (
	Live        By = "live"
	Instrument  By = "instrument"
	Observation By = "observation"
	Document    By = "document"
)

// Stages is how many stages the walk has.
const Stages = 12

// StageTitles are the stages in order; StageTitles[0] is stage 1.
var StageTitles = [Stages]string{
	"Permission and safety", "Papers against nameplates", "Dead checks", "Link", "Pre-charge", "Window",
	"First boost and voltage mode", "Droop and sharing", "Current mode", "Trips and interlocks",
	"Shut-down and discharge", "Punch list, as-left, sign-off",
}

// Point is one point of the walk with this site's numbers in it.
type Point struct {
	ID    string
	Stage int // 1…12
	Kind  Kind
	By    []By
	Title string

	Caution   string // shown before the point can be started; empty where nothing can hurt
	Do        string
	Expect    string // what is accepted, in words, with this site's prediction
	Otherwise string // what to do when it is not met
	Basis     string

	Signals  []signal.Name // live readings that are shown and taken here
	Hand     []HandReading // readings to enter from an instrument
	Accept   []Criterion   // numeric acceptance; every reading named here is judged
	Findings []string      // findings whose verdict binds the point; "precharge." is a family, "measured.trip:time-out" one subject
	Capture  capture.Kind  // the capture that is armed here; empty where none is
	Unproved bool          // may be judged by a signal that is not proved yet, because nothing else can be seen so early
	Proves   []signal.Name // signals proved here by comparing device and instrument
	Reopens  []string      // points that are open again when this one is reopened or failed; "x.*" is a whole stage's family
	MayOmit  bool          // may be not applicable, with a reason
	OmitWhen BusState      // and then only where the bus was so before the charge; empty: any
	Attempt  bool          // its capture counts as a pre-charge attempt
}

// BusState is what the bus was found to be before the charge.
type BusState string

// The states of the bus before the charge.
const (
	BusDead BusState = "dead"
	BusLive BusState = "live" // held above the source by another infeed
)

// HandReading is a value to be read from a hand instrument.
type HandReading struct {
	What string // a signal's name where the instrument reads the same quantity, else words
	Unit string
}

// Criterion is the permitted range of one reading; both edges belong to it. From names the finding or the key of the site
// file that the numbers come from.
type Criterion struct {
	What      string
	Unit      string
	Low, High *float64
	From      string
}

// Holds tells whether v lies inside.
func (c Criterion) Holds(v float64) bool {
	return (c.Low == nil || v >= *c.Low) && (c.High == nil || v <= *c.High)
}

// Wants tells whether the point's reading comes from by.
func (p Point) Wants(by By) bool {
	for _, b := range p.By {
		if b == by {
			return true
		}
	}
	return false
}

// IsHazardous tells whether the point carries a caution.
func (p Point) IsHazardous() bool { return p.Caution != "" }
