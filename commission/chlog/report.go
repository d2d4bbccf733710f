package chlog

import "fmt"

// ReportFormat names the JSON form of a [Report].
const ReportFormat = "chargehand-verify/1"

// Outcome is what verifying one log came to.
type Outcome string

// The outcomes, one for each row of what verify may say.
const (
	Unchanged        Outcome = "unchanged"         // all well, known signer
	Consistent       Outcome = "consistent"        // all well, no list of signers
	UnknownKey       Outcome = "unknown-key"       // a list, and a key not on it
	NotPermitted     Outcome = "not-permitted"     // the list refuses the key here or at the claimed time
	Damaged          Outcome = "damaged"           // changed, swapped, inserted, deleted
	OtherHistory     Outcome = "other-history"     // intact chain, signatures for another
	BadSignature     Outcome = "bad-signature"     // a detached signature that does not hold
	Unsealed         Outcome = "unsealed"          // tail or seal cut, or never sealed
	SealUnsigned     Outcome = "seal-unsigned"     // sealed by nobody's key
	SignatureMissing Outcome = "signature-missing" // no detached signature
	Forked           Outcome = "forked"            // another log of this call has the same id and other bytes
	NotALog          Outcome = "not-a-log"
	NewerVersion     Outcome = "newer-version"
	Unreadable       Outcome = "unreadable"
)

// Exit is the exit code of an outcome.
func (o Outcome) Exit() int {
	switch o {
	case Unchanged, Consistent:
		return 0
	case NotALog, NewerVersion, Unreadable:
		return 2
	}
	return 1
}

// Report is what may be said of one log.
type Report struct {
	Format     string           `json:"format"`
	File       string           `json:"file"`
	Rehearsal  bool             `json:"rehearsal"`
	Outcome    Outcome          `json:"outcome"`
	Sentence   string           `json:"sentence"`
	Notes      []string         `json:"notes"` // what else is to be known, a sentence each
	Exit       int              `json:"exit"`
	Log        string           `json:"log"`
	Mode       string           `json:"mode"`
	Program    string           `json:"program"`
	Continues  *string          `json:"continues"`
	Records    int64            `json:"records"` // intact ones
	Bytes      int64            `json:"bytes"`   // in intact records
	Sealed     bool             `json:"sealed"`
	Verdict    string           `json:"verdict"`   // of the seal
	SignedTo   *int64           `json:"signed_to"` // the last record that a valid statement covers, its own
	Head       string           `json:"head"`      // SHA-256 of the last intact line: to print on paper
	Damage     *Damage          `json:"damage"`
	Statements []StatementCheck `json:"statements"`
	Signatures []SignatureCheck `json:"signatures"`
	Torn       []string         `json:"torn"` // files that hold lines set aside
	err        error
}

// Damage is the place of the first fault.
type Damage struct {
	Record int64  `json:"record"`
	Line   int    `json:"line"`
	Offset int64  `json:"offset"`
	What   string `json:"what"`
}

// State is what a single signature came to.
type State string

// The states of a signature.
const (
	Valid        State = "valid"
	Unsigned     State = "unsigned"      // with a reason
	Foreign      State = "foreign"       // for another history or another file
	Malformed    State = "malformed"     // not a signature, or of another namespace
	Unknown      State = "unknown-key"   // valid, but not on the list
	Unauthorised State = "not-permitted" // valid and listed, but not for this or not at the claimed time
)

// holds tells whether the signature is at least that of its key over these bytes.
func (s State) holds() bool { return s == Valid || s == Unknown || s == Unauthorised }

// StatementCheck is one sign-off or seal.
type StatementCheck struct {
	Record    int64  `json:"record"`
	Offset    int64  `json:"offset"`
	Act       string `json:"act"`
	Point     string `json:"point"`
	Verdict   string `json:"verdict"`
	Person    string `json:"person"` // the person's id in the log
	Name      string `json:"name"`
	Role      string `json:"role"`
	At        string `json:"at"` // as the signer claimed
	Key       string `json:"key"`
	Principal string `json:"principal"` // from the list of signers
	State     State  `json:"state"`
	Why       string `json:"why"`
}

// SignatureCheck is one detached signature.
type SignatureCheck struct {
	File      string `json:"file"`
	Key       string `json:"key"`
	Principal string `json:"principal"`
	Name      string `json:"name"` // of the person in the log with this key
	Role      string `json:"role"` // from the log; "role not stated" where nobody there has this key
	State     State  `json:"state"`
	Why       string `json:"why"`
}

// RoleNotStated stands where neither the log nor the list gives a role.
const RoleNotStated = "role not stated"

// String is the report in one line. A rehearsal says so first, whatever else there is to say.
func (r Report) String() string {
	s := fmt.Sprintf("%s: %s", r.File, r.Sentence)
	if r.Rehearsal {
		return "REHEARSAL " + s
	}
	return s
}

// Err is why the log could not be read to its end: nil, or one of the reader's errors.
func (r Report) Err() error { return r.err }

// Worst is the highest exit code of many reports, 0 for none.
func Worst(reports []Report) int {
	worst := 0
	for _, r := range reports {
		worst = max(worst, r.Exit)
	}
	return worst
}
