package walk

import (
	"time"

	"chargehand/commission/finding"
	"chargehand/commission/record"
)

// Event is something that a person or a capture asks the walk to take in.
type Event interface{ isEvent() }

type (
	// Enter steps into a stage; every hold of the stages before it must be signed.
	Enter struct{ Stage int }
	// AddPerson names somebody who takes part.
	AddPerson struct{ Name, Role, Organisation, Key string }
	// AddInstrument names a hand instrument; Due is the last day its calibration counts.
	AddInstrument struct{ Record record.Instrument }
	// Take takes one reading at a point. Its ID fields are checked, its value is never changed.
	Take struct{ Reading record.Reading }
	// TakeLive takes the live readings of a point's signals; the owner of the readings turns it into Take.
	TakeLive struct{ Point string }
	// Judge gives a point's result.
	Judge struct {
		Point  string
		Result Result
		Note   string
	}
	// Sign signs a point that has its result.
	Sign struct{ Point, Person, UnsignedBecause string }
	// Deviate accepts a failed point or an unfit instrument, with a reason and by name.
	Deviate struct{ Point, Reason, AcceptedBy string }
	// RaisePunch opens an item; Severity is A, B or C.
	RaisePunch struct{ What, Severity, Owner, Due, Point string }
	// ClearPunch closes one.
	ClearPunch struct{ ID string }
	// AddNote writes free text; Corrects is the seq of the line it corrects, or nil.
	AddNote struct {
		Text     string
		Corrects *int64
	}
	// Reopen opens a point again, and everything that rests on it.
	Reopen struct{ Point, Why string }
	// Keep keeps a device setting as found or as left.
	Keep struct{ Setting record.Setting }
	// Arm starts a capture at a point. Before a pre-charge it counts the attempt; Override is the reason for coming before
	// the resistor has cooled or after the last permitted attempt. Observing only watches what others operate: no hold
	// stands in its way, since nothing is passed by it.
	Arm struct {
		Point, Override string
		Observing       bool
	}
	// StopCapture ends the running capture by hand.
	StopCapture struct{}
	// EnterCause enters what the last failed attempt failed of; without it there is no second attempt.
	EnterCause struct{ Cause string }
	// ChangeSite takes a new revision of the site file, with its findings.
	ChangeSite struct {
		Name, Text, Why string
		Findings        []finding.Finding
	}
	// Seal ends the log.
	Seal struct{ Person, UnsignedBecause string }

	// Captured brings a finished capture's records, the readings taken from it, and what was concluded from it; the owner of
	// the readings sends it.
	Captured struct {
		Parts    []record.Capture
		Readings []record.Reading
		Findings []finding.Finding
	}
	// LinkChanged and Hastened are facts that only need writing down. A clock that was set is written down by the log itself.
	LinkChanged struct{ Link record.Link }
	Hastened    struct{ Hastened record.Hastened }
	// Return says that somebody is back at a walk that was left: after a night, absence of voltage and the emergency stop are
	// proved anew.
	Return struct{}
)

func (Enter) isEvent()         {}
func (AddPerson) isEvent()     {}
func (AddInstrument) isEvent() {}
func (Take) isEvent()          {}
func (TakeLive) isEvent()      {}
func (Judge) isEvent()         {}
func (Sign) isEvent()          {}
func (Deviate) isEvent()       {}
func (RaisePunch) isEvent()    {}
func (ClearPunch) isEvent()    {}
func (AddNote) isEvent()       {}
func (Reopen) isEvent()        {}
func (Keep) isEvent()          {}
func (Arm) isEvent()           {}
func (StopCapture) isEvent()   {}
func (EnterCause) isEvent()    {}
func (ChangeSite) isEvent()    {}
func (Seal) isEvent()          {}
func (Captured) isEvent()      {}
func (LinkChanged) isEvent()   {}
func (Return) isEvent()        {}
func (Hastened) isEvent()      {}

// Result is what a point came to.
type Result string

// The results of a point; an open point has none.
const (
	Open          Result = ""
	Passed        Result = "pass"
	Failed        Result = "fail"
	NotApplicable Result = "not-applicable"
)

// Line is one record that is on disk.
type Line struct {
	Seq  int64
	At   time.Time
	Body record.Body
}
