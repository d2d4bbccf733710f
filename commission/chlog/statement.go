package chlog

import (
	"errors"
	"fmt"
	"strings"
	"time"
	"unicode"
	"unicode/utf8"

	"chargehand/commission/record"
)

// StatementFormat is the first line of every statement.
const StatementFormat = "chargehand-statement/1"

// The acts that a statement is for.
const (
	ActSignOff = "sign-off"
	ActSeal    = "seal"
)

// Statement is what a person signs: everything that ties the signature to one record of one log. It never begins like a log
// line, so neither can stand for the other.
type Statement struct {
	Log     string // the log's id
	Mode    string // record.SiteMode or record.RehearsalMode
	Act     string // ActSignOff or ActSeal
	Point   string // of a sign-off
	Verdict string // of a seal
	Files   []string
	Person  record.Person
	Record  int64  // the seq of the line that holds it
	Head    string // the prev of that line
	At      string // the time of that line, as it stands there
}

// Text is the exact message that is signed: lines each ended by a line feed. It fails where a value holds a control
// character or a line of its own.
func (s Statement) Text() (string, error) {
	lines := []string{StatementFormat, "log: " + s.Log, "mode: " + s.Mode, "act: " + s.Act}
	switch s.Act {
	case ActSignOff:
		lines = append(lines, "point: "+s.Point)
	case ActSeal:
		lines = append(lines, "verdict: "+s.Verdict, "files: "+fileList(s.Files))
	default:
		return "", fmt.Errorf("no act %q", s.Act)
	}
	lines = append(lines,
		fmt.Sprintf("person: %s %s, %s", s.Person.ID, s.Person.Name, s.Person.Role),
		fmt.Sprintf("record: %d", s.Record), "head: "+s.Head, "at: "+s.At)
	for _, l := range lines {
		if !utf8.ValidString(l) || strings.ContainsFunc(l, unicode.IsControl) {
			return "", fmt.Errorf("%q cannot stand in a statement: it holds a control character", l)
		}
	}
	return strings.Join(lines, "\n") + "\n", nil
}

// fileList is the SHA-256 of each file record in the order of the log, or "-" where there is none.
func fileList(files []string) string {
	if len(files) == 0 {
		return "-"
	}
	return strings.Join(files, " ")
}

// Signer signs statements and sealed logs; package signing has those that do.
type Signer interface {
	Sign(message []byte) (armored string, err error)
	Fingerprint() string
}

// ErrUnsigned says that a sign-off or seal has neither a signature nor a reason for its absence.
var ErrUnsigned = errors.New("without a key, say why it is not signed")

// SignOff records that a person signs off a point. Without a signer, because says why it is not signed.
func (w *Writer) SignOff(personID, point string, signer Signer, because string) (Line, error) {
	return w.AppendSigned(func(seq int64, head string, at time.Time) (record.Body, error) {
		s := Statement{Act: ActSignOff, Point: point, Record: seq, Head: head, At: FormatTime(at)}
		text, signature, reason, err := w.sign(s, personID, signer, because)
		return record.SignOff{Person: personID, Point: point, Statement: text, Signature: signature, UnsignedBecause: reason}, err
	})
}

// Seal ends the log with its verdict. After it nothing is appended; [SignFile] makes the detached signature.
func (w *Writer) Seal(personID, verdict string, signer Signer, because string) (Line, error) {
	return w.AppendSigned(func(seq int64, head string, at time.Time) (record.Body, error) {
		s := Statement{Act: ActSeal, Verdict: verdict, Files: w.files, Record: seq, Head: head, At: FormatTime(at)}
		text, signature, reason, err := w.sign(s, personID, signer, because)
		return record.Seal{Person: personID, Verdict: verdict, Statement: text, Signature: signature, UnsignedBecause: reason}, err
	})
}

func (w *Writer) sign(s Statement, personID string, signer Signer, because string) (text, signature string, reason *string, err error) {
	person, ok := w.persons[personID]
	if !ok {
		return "", "", nil, fmt.Errorf("no person %q in this log", personID)
	}
	s.Log, s.Mode, s.Person = w.opened.Log, w.opened.Mode, person
	if text, err = s.Text(); err != nil {
		return "", "", nil, err
	}
	if signer == nil {
		if because == "" {
			return "", "", nil, ErrUnsigned
		}
		return text, "", &because, nil
	}
	if person.Key != nil && *person.Key != signer.Fingerprint() {
		return "", "", nil, fmt.Errorf("%s is entered with key %s, not %s", personID, *person.Key, signer.Fingerprint())
	}
	signature, err = signer.Sign([]byte(text))
	return text, signature, nil, err
}

// printable replaces control characters, so that a system's message can stand in a record.
func printable(s string) string {
	return strings.Map(func(r rune) rune {
		if unicode.IsControl(r) || r == utf8.RuneError {
			return '?'
		}
		return r
	}, s)
}
