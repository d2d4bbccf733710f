package chlog

import (
	"errors"
	"fmt"
	"maps"
	"slices"
	"strings"
	"time"

	"chargehand/commission/record"
	"chargehand/commission/signing"
)

// signed is what a sign-off and a seal have in common.
type signed struct {
	person, statement, signature string
	because                      *string
}

// statement rebuilds the statement from the records, compares bytes, and only then checks the signature.
func (c *check) statement(s Statement, raw rawLine, offset int64, b signed) {
	person, known := c.persons[b.person]
	s.Person = person
	k := StatementCheck{Record: s.Record, Offset: offset, Act: s.Act, Point: s.Point, Verdict: s.Verdict, Person: b.person,
		Name: person.Name, Role: person.Role, At: s.At}
	rebuilt, err := s.Text()
	if strings.Contains(b.statement, "\nmode: rehearsal\n") { // whatever the first record may have been made to say
		c.report.Rehearsal = true
	}
	switch {
	case !known:
		k.State, k.Why = Foreign, fmt.Sprintf("no record before it enters person %q", b.person)
	case err != nil:
		k.State, k.Why = Foreign, err.Error()
	case rebuilt != b.statement:
		k.State, k.Why = Foreign, difference(rebuilt, b.statement)
	case b.signature == "" && b.because != nil && *b.because != "":
		k.State, k.Why = Unsigned, *b.because
		c.report.Notes = append(c.report.Notes, fmt.Sprintf("record %d: %s %s did not sign: %s", s.Record, b.person, person.Name, *b.because))
	case b.signature == "":
		k.State, k.Why = Malformed, "neither a signature nor a reason for its absence"
	default:
		c.checkStatement(&k, person, raw.time, b)
	}
	if k.State.holds() {
		seq := s.Record
		c.report.SignedTo = &seq
	}
	c.report.Statements = append(c.report.Statements, k)
}

func (c *check) checkStatement(k *StatementCheck, person record.Person, at time.Time, b signed) {
	key, err := signing.Verify([]byte(b.statement), b.signature)
	if key.IsValid() {
		k.Key = key.Fingerprint()
	}
	switch {
	case errors.Is(err, signing.ErrMismatch):
		k.State, k.Why = Foreign, "the signature does not fit its statement"
	case err != nil:
		k.State, k.Why = Malformed, err.Error()
	case person.Key != nil && *person.Key != k.Key:
		k.State, k.Why = Foreign, fmt.Sprintf("%s is entered with key %s, and another key signed", b.person, *person.Key)
	default:
		k.State, k.Principal, k.Why = c.identify(key, at, "at the claimed time")
	}
}

// identify asks the list of signers whose key it is.
func (c *check) identify(key signing.PublicKey, at time.Time, which string) (State, string, string) {
	if c.v.Signers == nil {
		return Valid, "", ""
	}
	entry, err := c.v.Signers.Find(key, at)
	switch {
	case err == nil:
		return Valid, entry.Principals, ""
	case errors.Is(err, signing.ErrUnknownKey):
		return Unknown, "", err.Error()
	}
	return Unauthorised, "", err.Error() + " (" + which + ")"
}

// difference names the first line in which a statement differs from what the records say.
func difference(rebuilt, found string) string {
	want, got := strings.Split(rebuilt, "\n"), strings.Split(found, "\n")
	for i := range min(len(want), len(got)) {
		if want[i] != got[i] {
			return fmt.Sprintf("its statement says %q where the log has %q", got[i], want[i])
		}
	}
	return fmt.Sprintf("its statement has %d lines where %d are wanted", len(got)-1, len(want)-1)
}

// checkSignatures checks the detached signatures against the whole file.
func (c *check) checkSignatures() {
	for i := range c.beside {
		b := &c.beside[i]
		if b.signature != nil {
			c.checkBeside(b)
		}
		c.report.Signatures = append(c.report.Signatures, b.check)
	}
}

func (c *check) checkBeside(b *besideSignature) {
	if b.signature.VerifyDigest(b.hash.Sum(nil)) != nil {
		b.check.State, b.check.Why = Foreign, "it is not for these bytes: the log's or its own have been changed"
		return
	}
	for _, id := range slices.Sorted(maps.Keys(c.persons)) {
		if p := c.persons[id]; p.Key != nil && *p.Key == b.check.Key {
			b.check.Name, b.check.Role = p.Name, p.Role
			break
		}
	}
	at, which := c.v.now(), "today, since a detached signature carries no time"
	if c.seal != nil && c.seal.Key == b.check.Key {
		b.check.Name, b.check.Role = c.seal.Name, c.seal.Role
		at, which = c.sealed, "at the seal's claimed time"
	}
	b.check.State, b.check.Principal, b.check.Why = c.identify(b.signature.Key(), at, which)
}

func (v Verifier) now() time.Time {
	if v.Now == nil {
		return time.Time{}
	}
	return v.Now()
}
