package chlog

import (
	"fmt"
	"path/filepath"
	"regexp"
	"strings"
)

// rehearsalMark finds the mode in a first line that is damaged.
var rehearsalMark = regexp.MustCompile(`"mode":"rehearsal"`)

func (c *check) damaged(e *DamageError) {
	c.report.err = e
	c.report.Records, c.report.Head, c.report.Sealed = e.Record, "", false
	c.report.Damage = &Damage{e.Record, e.Line, e.Offset, e.What}
	if !c.report.Rehearsal && e.Record == 0 {
		start, _ := readUpTo(c.path, 64<<10)
		c.report.Rehearsal = rehearsalMark.Match(start)
	}
	intact := "nothing is intact"
	if e.Record > 0 {
		intact = fmt.Sprintf("intact to record %d", e.Record-1)
	}
	where := fmt.Sprintf("first wrong byte at offset %d (record %d, line %d): %s", e.Offset, e.Record, e.Line, e.What)
	if e.Torn {
		c.conclude(Unsealed, fmt.Sprintf("%s; %s; cannot tell what followed; %s", intact, c.signedTo(), where))
		return
	}
	c.conclude(Damaged, fmt.Sprintf("%s; %s", intact, where))
}

func (c *check) signedTo() string {
	if c.report.SignedTo == nil {
		return "signed nowhere"
	}
	return fmt.Sprintf("signed to %d", *c.report.SignedTo)
}

// judge finds the gravest thing to be said of a log whose chain holds.
func (c *check) judge() {
	last := c.report.Records - 1
	for _, s := range c.report.Statements {
		if s.State == Foreign || s.State == Malformed {
			c.conclude(OtherHistory, fmt.Sprintf("intact chain, signature at record %d (byte %d) is for another history: %s", s.Record, s.Offset, s.Why))
			return
		}
	}
	for _, s := range c.report.Signatures {
		if !s.State.holds() {
			held := fmt.Sprintf("intact chain to record %d", last)
			if !c.report.Sealed {
				held += " without a seal, " + c.signedTo()
			}
			c.conclude(BadSignature, fmt.Sprintf("%s, but %s does not hold: %s", held, s.File, s.Why))
			return
		}
	}
	switch {
	case !c.report.Sealed:
		c.conclude(Unsealed, fmt.Sprintf("no seal: intact to %d; %s; cannot tell what followed", last, c.signedTo()))
	case c.seal.State == Unsigned && len(c.report.Signatures) == 0:
		c.conclude(SealUnsigned, fmt.Sprintf("intact to the seal at record %d, which nobody's key signed (%s); %s", last, c.seal.Why, c.signedTo()))
	default:
		c.judgeKeys()
	}
}

// judgeKeys looks at the keys once every signature is known to hold.
func (c *check) judgeKeys() {
	for _, s := range c.report.Statements {
		if s.State == Unknown || s.State == Unauthorised {
			c.badKey(s.State, fmt.Sprintf("at record %d (byte %d)", s.Record, s.Offset), s.Why)
			return
		}
	}
	for _, s := range c.report.Signatures {
		if s.State == Unknown || s.State == Unauthorised {
			c.badKey(s.State, s.File, s.Why)
			return
		}
	}
	if len(c.report.Signatures) == 0 {
		c.conclude(SignatureMissing, fmt.Sprintf("the seal's statement holds (%s); nothing else vouches for the last line: %s.sig is missing",
			c.whoSealed(), filepath.Base(c.path)))
		return
	}
	if c.v.Signers == nil {
		c.conclude(Consistent, fmt.Sprintf("consistent, signed by %s; identity not checked", c.keys()))
		return
	}
	c.conclude(Unchanged, fmt.Sprintf("unchanged since %s signed; complete to the seal (record %d, claimed %s)",
		c.names(), c.report.Records-1, c.seal.At))
}

func (c *check) badKey(s State, where, why string) {
	if s == Unknown {
		c.conclude(UnknownKey, fmt.Sprintf("valid signature of an unknown key %s: %s", where, why))
		return
	}
	c.conclude(NotPermitted, fmt.Sprintf("valid signature of a key that may not sign here, %s: %s", where, why))
}

func (c *check) whoSealed() string {
	if c.seal.Principal != "" {
		return c.seal.Principal
	}
	return "key " + c.seal.Key
}

func (c *check) keys() string {
	var keys []string
	for _, s := range c.report.Signatures {
		keys = append(keys, "key "+s.Key)
	}
	return strings.Join(keys, " and ")
}

// names gives each detached signer: who the list says it is, and in which role the log has this key.
func (c *check) names() string {
	var names []string
	for _, s := range c.report.Signatures {
		role := s.Role
		if s.Name != "" {
			role = s.Name + ", " + s.Role
		}
		names = append(names, fmt.Sprintf("%s (%s)", s.Principal, role))
	}
	return strings.Join(names, " and ")
}
