package report

import (
	"chargehand/commission/chlog"
	"chargehand/commission/finding"
	"chargehand/commission/record"
)

// Format names the JSON form of a [Story].
const Format = "chargehand-report/1"

// Mark is a word that stands across every page.
type Mark string

// The marks of a page.
const (
	Rehearsal Mark = "REHEARSAL" // nothing in it was measured on a plant
	Unsealed  Mark = "UNSEALED"  // the log has no seal: something may have followed
	Broken    Mark = "BROKEN"    // the log was changed, or a signature is not for it
)

// Story is everything that a log says, in the order in which people ask. Numbers are in coherent SI units, times are RFC
// 3339 as the log has them.
type Story struct {
	Format  string          `json:"format"`
	Marks   []Mark          `json:"marks"`
	Verdict finding.Verdict `json:"verdict"` // the seal's, else what the records come to so far
	Because []string        `json:"because"` // what the verdict rests on, a sentence each; empty where all is well

	Log          Log          `json:"log"`
	Verification chlog.Report `json:"verification"`

	Site        Site                `json:"site"`
	Files       []Event[File]       `json:"files"`
	People      []record.Person     `json:"people"`
	Instruments []record.Instrument `json:"instruments"`
	Settings    []Setting           `json:"settings"`

	Desk     []Finding `json:"desk"`
	Measured []Finding `json:"measured"`
	Captures []Capture `json:"captures"`
	Stages   []Stage   `json:"stages"`

	Deviations []Event[record.Deviation] `json:"deviations"`
	Punches    []Punch                   `json:"punch_list"`
	Notes      []Event[record.Note]      `json:"notes"`
	Attempts   []Event[record.Attempt]   `json:"attempts"`
	Links      []Event[record.Link]      `json:"links"`
	Clocks     []Event[record.Clock]     `json:"clock_steps"`
	Hastened   []Event[record.Hastened]  `json:"hastened"`
	Resumed    []Event[record.Resumed]   `json:"resumed"`
	Others     []Event[record.Other]     `json:"other_records"` // of kinds that this version does not know
	Unread     []Event[string]           `json:"unread"`        // records whose body could not be read, and why

	table []windowRow
}

// Event is one record with its place and time.
type Event[T any] struct {
	Seq  int64  `json:"seq"`
	At   string `json:"at"`
	Body T      `json:"body"`
}

// Log identifies the log.
type Log struct {
	File      string   `json:"file"` // its name without a folder
	ID        string   `json:"id"`
	Mode      string   `json:"mode"`
	Program   string   `json:"program"`
	Device    string   `json:"device"`
	Speed     float64  `json:"speed"`
	Disturb   []string `json:"disturb"`
	Seed      *int64   `json:"seed"`
	Continues *string  `json:"continues"`
	Records   int64    `json:"records"`
	Head      string   `json:"head"`   // SHA-256 of the last intact line with its line feed
	SHA256    string   `json:"sha256"` // of the whole file as it was read
	Begun     string   `json:"begun"`
	Ended     string   `json:"ended"` // time of the last intact record
}

// Site is what was commissioned, on paper and on the plates.
type Site struct {
	Name      string  `json:"name"`
	Reference string  `json:"reference"`
	Location  string  `json:"location"`
	Plates    []Plate `json:"plates"`
}

// Plate is one value of the site file as it was found, in the first site file of the log, and as it was left, in the last;
// both as typed.
type Plate struct {
	Group   string `json:"group"`
	What    string `json:"what"`
	AsFound string `json:"as_found"`
	AsLeft  string `json:"as_left"`
}

// File is a site or map file that the walk rested on.
type File struct {
	Role     string  `json:"role"`
	Name     string  `json:"name"`
	SHA256   string  `json:"sha256"`
	Replaces *string `json:"replaces"`
	Why      string  `json:"why"`
}

// Setting is a device setting as found and as left; a side that was not recorded is nil.
type Setting struct {
	Name     string   `json:"name"`
	Unit     string   `json:"unit"`
	AsFound  *float64 `json:"as_found"`
	FoundRaw *int64   `json:"as_found_raw"`
	AsLeft   *float64 `json:"as_left"`
	LeftRaw  *int64   `json:"as_left_raw"`
	Source   string   `json:"source"`
}

// Finding is a finding with its place in the log. A superseded one was judged anew later.
type Finding struct {
	Seq        int64           `json:"seq"`
	At         string          `json:"at"`
	Superseded bool            `json:"superseded"`
	Finding    finding.Finding `json:"finding"`
}

// Stage is one stage of the walk with its points.
type Stage struct {
	Number int             `json:"number"` // 0: points that this version does not know
	Title  string          `json:"title"`
	Events []Event[string] `json:"events"` // entered, left, reopened
	Points []Point         `json:"points"`
}

// Point is one point with what was done at it.
type Point struct {
	ID         string            `json:"id"`
	Kind       string            `json:"kind"` // hold, witness, check
	Title      string            `json:"title"`
	Expect     string            `json:"expect"`
	Result     string            `json:"result"` // pass, fail, not-applicable, undecided; "open" where there is none
	Seq        *int64            `json:"seq"`    // of the record that gave the result
	At         string            `json:"at"`
	Note       string            `json:"note"`
	Readings   []Reading         `json:"readings"`
	Signatures []Signature       `json:"signatures"`
	Deviation  *record.Deviation `json:"deviation"`
	Reopened   int               `json:"reopened"` // how often
	Earlier    []Event[string]   `json:"earlier"`  // results that were taken back
}

// Reading is one value taken at a point.
type Reading struct {
	Seq        int64          `json:"seq"`
	At         string         `json:"at"`
	Instrument string         `json:"instrument_name"`
	Corrected  string         `json:"corrected"` // a later record's correction, or ""
	Body       record.Reading `json:"body"`
}

// Signature is one signed, or expressly unsigned, statement.
type Signature struct {
	Record int64  `json:"record"`
	At     string `json:"at"`
	Person string `json:"person"`
	Name   string `json:"name"`
	Role   string `json:"role"`
	Key    string `json:"key"`
	State  string `json:"state"`
	Why    string `json:"why"`
}

// Punch is an open item and what became of it.
type Punch struct {
	Seq     int64        `json:"seq"`
	Raised  string       `json:"raised"`
	Cleared string       `json:"cleared"` // "" while it is open
	Body    record.Punch `json:"body"`
}

// IsOpen tells whether the item still stands.
func (p Punch) IsOpen() bool { return p.Cleared == "" }
