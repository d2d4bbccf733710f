// Package record says what each kind of line of the log holds.
//
// Start at [Body]: every kind of design 9 is a struct here whose JSON form is the body of that line. Package chlog writes
// and reads the lines; package walk decides which are written; package report tells the story from them.
package record

import "encoding/json"

// Format is the log format that this version writes.
const Format = "chargehand-log/1"

// Body is the body of one log line.
type Body interface{ Kind() string }

// Opened is the first line of every log.
type Opened struct {
	Format    string   `json:"format"`
	Log       string   `json:"log"`  // 32 lower-case hex digits
	Mode      string   `json:"mode"` // "site" or "rehearsal"
	Program   string   `json:"program"`
	Device    string   `json:"device"`
	Speed     float64  `json:"speed"`
	Disturb   []string `json:"disturb"`
	Seed      *int64   `json:"seed"`
	Continues *string  `json:"continues"`
}

// The modes of a log.
const (
	SiteMode      = "site"
	RehearsalMode = "rehearsal"
)

// File is a site or map file as it was used, whole.
type File struct {
	Role     string  `json:"role"` // "site" or "map"
	Name     string  `json:"name"`
	SHA256   string  `json:"sha256"`
	Text     string  `json:"text"`
	Replaces *string `json:"replaces"` // SHA-256 of the file it replaces
	Why      string  `json:"why"`
}

// Person takes part in the walk.
type Person struct {
	ID           string  `json:"id"` // "p1", "p2", …
	Name         string  `json:"name"`
	Role         string  `json:"role"` // technician, witness, surveyor, owner
	Organisation string  `json:"organisation"`
	Key          *string `json:"key"` // "SHA256:…" or null
}

// Instrument is a hand instrument used in the walk.
type Instrument struct {
	ID         string             `json:"id"` // "i1", …
	Name       string             `json:"name"`
	Serial     string             `json:"serial"`
	Calibrated string             `json:"calibrated"` // date, or ""
	Due        string             `json:"due"`
	Accuracy   InstrumentAccuracy `json:"accuracy"`
	MaxVoltage float64            `json:"max_voltage,omitempty"` // V; 0: not stated
}

// InstrumentAccuracy is the error of an instrument: of_reading (a fraction) of the reading plus a constant in volts.
type InstrumentAccuracy struct {
	OfReading float64 `json:"of_reading"`
	Plus      float64 `json:"plus"`
	Unit      string  `json:"unit"`
}

// Reading is one value taken at a point.
type Reading struct {
	Point      string   `json:"point"`
	Signal     string   `json:"signal"` // a signal's name, or what was measured in words
	Value      *float64 `json:"value"`  // null where there was none
	Unit       string   `json:"unit"`
	Source     string   `json:"source"`     // device, instrument, observed
	Instrument *string  `json:"instrument"` // an instrument's id
	Raw        []uint16 `json:"raw"`
	Age        float64  `json:"age"` // seconds
	U          float64  `json:"u"`   // standard uncertainty in the unit
	Quality    string   `json:"quality"`
	Text       string   `json:"text,omitempty"` // what was observed or which document was seen
	Paper      bool     `json:"paper,omitempty"`
}

// The sources of a reading.
const (
	FromDevice     = "device"
	FromInstrument = "instrument"
	Observed       = "observed"
)

// Capture is one part of a capture. Each sample is [seconds since t0, words or null per signal…].
type Capture struct {
	ID      string            `json:"id"`
	Part    int               `json:"part"`
	Parts   int               `json:"parts"`
	Stage   string            `json:"stage"`
	What    string            `json:"what"` // precharge, droop, discharge, step
	Attempt int               `json:"attempt"`
	T0      string            `json:"t0"`
	Signals []CaptureSignal   `json:"signals"`
	Samples []json.RawMessage `json:"samples"`
	Gaps    []json.RawMessage `json:"gaps"` // [from, to, why]
}

// CaptureSignal is one signal of a capture with the map's scaling, in the signal's coherent SI unit.
type CaptureSignal struct {
	Name   string  `json:"name"`
	Unit   string  `json:"unit"`
	Scale  float64 `json:"scale"`
	Offset float64 `json:"offset,omitempty"`
	Type   string  `json:"type"`
}

// Finding is a desk or measured finding exactly as `check --json` writes it, with captures and causes.
type Finding struct{ JSON json.RawMessage }

// MarshalJSON writes the finding as it came.
func (f Finding) MarshalJSON() ([]byte, error) { return f.JSON, nil }

// UnmarshalJSON keeps the finding as it stands.
func (f *Finding) UnmarshalJSON(b []byte) error { f.JSON = append(f.JSON[:0], b...); return nil }

// Stage is a step from stage to stage.
type Stage struct {
	Stage       string  `json:"stage"`
	Event       string  `json:"event"` // entered, left, reopened
	Invalidates []int64 `json:"invalidates"`
}

// The events of a stage.
const (
	Entered  = "entered"
	Left     = "left"
	Reopened = "reopened"
)

// Point is the verdict on one point.
type Point struct {
	ID       string  `json:"id"`
	Result   string  `json:"result"` // pass, fail, not-applicable, undecided
	Readings []int64 `json:"readings"`
	Note     string  `json:"note"`
}

// Attempt is one pre-charge attempt and when the next may come.
type Attempt struct {
	N        int     `json:"n"`
	Earliest string  `json:"earliest"`
	Override *string `json:"override"` // the reason for coming earlier
	Cause    string  `json:"cause,omitempty"`
}

// Deviation is a failed point that somebody accepted.
type Deviation struct {
	Point      string `json:"point"`
	Reason     string `json:"reason"`
	AcceptedBy string `json:"accepted_by"`
}

// Punch is an open item.
type Punch struct {
	ID       string `json:"id"` // "k1", …
	What     string `json:"what"`
	Severity string `json:"severity"` // A, B, C
	Owner    string `json:"owner"`
	Due      string `json:"due"`
	Event    string `json:"event"` // raised, cleared
	Point    string `json:"point,omitempty"`
}

// Note is free text; Corrects names the line it corrects.
type Note struct {
	Text     string `json:"text"`
	Corrects *int64 `json:"corrects"`
}

// Setting is a device setting as found or as left.
type Setting struct {
	Name   string  `json:"name"`
	When   string  `json:"when"` // as-found, as-left
	Value  float64 `json:"value"`
	Unit   string  `json:"unit"`
	Raw    *int64  `json:"raw"`
	Source string  `json:"source"`
}

// Link is a change of the connection.
type Link struct {
	Event string `json:"event"` // up, lost, reconnected
	Peer  string `json:"peer"`
	Why   string `json:"why"`
}

// Clock is a step of the wall clock against the monotonic clock.
type Clock struct {
	WallStep  float64 `json:"wall_step"`
	Monotonic float64 `json:"monotonic"`
}

// Hastened says that a rehearsal shortened a wait.
type Hastened struct {
	What   string  `json:"what"`
	Factor float64 `json:"factor"`
}

// Resumed continues a log after an end without a seal.
type Resumed struct {
	Program string `json:"program"`
	Torn    *Torn  `json:"torn"`
	Moved   *Moved `json:"moved,omitempty"`
}

// Moved says that the log goes on in another place: everything before this line is a copy, byte for byte.
type Moved struct {
	From string `json:"from"` // the file's name in the place it left
	Why  string `json:"why"`
}

// Torn is a last line that was not whole, set aside beside the log.
type Torn struct {
	Bytes  int64  `json:"bytes"`
	SHA256 string `json:"sha256"`
	KeptIn string `json:"kept_in"`
}

// SignOff is a person's signature under a point or a stage.
type SignOff struct {
	Person          string  `json:"person"`
	Point           string  `json:"point"`
	Statement       string  `json:"statement"`
	Signature       string  `json:"signature"`
	UnsignedBecause *string `json:"unsigned_because"`
}

// Seal is the last line of a log.
type Seal struct {
	Person          string  `json:"person"`
	Verdict         string  `json:"verdict"`
	Statement       string  `json:"statement"`
	Signature       string  `json:"signature"`
	UnsignedBecause *string `json:"unsigned_because,omitempty"`
}

// Kind of each body, as the log writes it.
func (Opened) Kind() string     { return "opened" }
func (File) Kind() string       { return "file" }
func (Person) Kind() string     { return "person" }
func (Instrument) Kind() string { return "instrument" }
func (Reading) Kind() string    { return "reading" }
func (Capture) Kind() string    { return "capture" }
func (Finding) Kind() string    { return "finding" }
func (Stage) Kind() string      { return "stage" }
func (Point) Kind() string      { return "point" }
func (Attempt) Kind() string    { return "attempt" }
func (Deviation) Kind() string  { return "deviation" }
func (Punch) Kind() string      { return "punch" }
func (Note) Kind() string       { return "note" }
func (Setting) Kind() string    { return "setting" }
func (Link) Kind() string       { return "link" }
func (Clock) Kind() string      { return "clock" }
func (Hastened) Kind() string   { return "hastened" }
func (Resumed) Kind() string    { return "resumed" }
func (SignOff) Kind() string    { return "sign-off" }
func (Seal) Kind() string       { return "seal" }
