package signing

import (
	"bufio"
	"bytes"
	"errors"
	"fmt"
	"io"
	"strings"
	"time"

	"golang.org/x/crypto/ssh"
)

// Allowed is a list of allowed signers in OpenSSH's form (ssh-keygen(1), ALLOWED SIGNERS): a line names principals, options,
// a key and a comment.
type Allowed struct{ entries []AllowedEntry }

// AllowedEntry is one line of the list.
type AllowedEntry struct {
	Line        int    // from 1
	Principals  string // a pattern list, as it stands
	Namespaces  string // a pattern list; "" allows every namespace
	ValidAfter  time.Time
	ValidBefore time.Time
	Key         PublicKey
	Comment     string
}

// ListError is a fault in a list of allowed signers.
type ListError struct {
	Name string
	Line int
	Why  string
}

func (e *ListError) Error() string { return fmt.Sprintf("%s:%d: %s", e.Name, e.Line, e.Why) }

// ParseAllowed reads a list. Times without Z are read in the given zone, as ssh-keygen reads them in the machine's. A
// line for a certificate authority is refused: certificates are not read here, and passing over it would look like a check.
func ParseAllowed(name string, r io.Reader, zone *time.Location) (*Allowed, error) {
	list := &Allowed{}
	scanner := bufio.NewScanner(r)
	scanner.Buffer(nil, 1<<20)
	n := 0
	for scanner.Scan() {
		n++
		line := strings.TrimSpace(scanner.Text())
		if line == "" || line[0] == '#' {
			continue
		}
		entry, err := parseAllowedLine(line, zone)
		if err != nil {
			return nil, &ListError{name, n, err.Error()}
		}
		entry.Line = n
		list.entries = append(list.entries, entry)
	}
	if err := scanner.Err(); err != nil {
		return nil, &ListError{name, n + 1, err.Error()}
	}
	return list, nil
}

// Entries are the lines of the list in order.
func (l *Allowed) Entries() []AllowedEntry { return l.entries }

func parseAllowedLine(line string, zone *time.Location) (AllowedEntry, error) {
	var e AllowedEntry
	principals, rest, err := cutWord(line)
	if err != nil {
		return e, err
	}
	e.Principals = principals
	if e.Principals == "" {
		return e, errors.New("no principals")
	}
	if key, comment, ok := parseKey(rest); ok {
		e.Key, e.Comment = key, comment
		return e, checkListedKey(key)
	}
	if first, _, _ := cutWord(rest); usable(first) {
		return e, fmt.Errorf("no public key of the type %s follows", first)
	}
	options, rest, err := cutOptions(rest)
	if err != nil {
		return e, err
	}
	for _, o := range options {
		if err := e.take(o, zone); err != nil {
			return e, err
		}
	}
	key, comment, ok := parseKey(rest)
	if !ok {
		return e, errors.New("no public key after the principals: wanted, for example, name@example.org ssh-ed25519 AAAA…")
	}
	e.Key, e.Comment = key, comment
	if !e.ValidAfter.IsZero() && !e.ValidBefore.IsZero() && !e.ValidAfter.Before(e.ValidBefore) {
		return e, errors.New("valid-after is not before valid-before")
	}
	return e, checkListedKey(key)
}

func checkListedKey(k PublicKey) error {
	if !usable(k.key.Type()) {
		return fmt.Errorf("a %s key cannot sign: wanted Ed25519, ECDSA or RSA", k.key.Type())
	}
	return nil
}

// parseKey reads "type base64 comment".
func parseKey(s string) (PublicKey, string, bool) {
	keyType, rest, _ := strings.Cut(strings.TrimSpace(s), " ")
	if strings.ContainsAny(keyType, "=,\"") {
		return PublicKey{}, "", false
	}
	key, comment, options, _, err := ssh.ParseAuthorizedKey([]byte(strings.TrimSpace(s)))
	if err != nil || len(options) > 0 || rest == "" || key.Type() != keyType {
		return PublicKey{}, "", false
	}
	return PublicKey{key}, comment, true
}

// cutWord takes the first word, which may stand in double quotes.
func cutWord(s string) (word, rest string, err error) {
	if quoted, isQuoted := strings.CutPrefix(s, `"`); isQuoted {
		word, rest, ok := strings.Cut(quoted, `"`)
		if !ok {
			return "", "", errors.New("a quotation mark without its partner")
		}
		return word, strings.TrimLeft(rest, " \t"), nil
	}
	i := strings.IndexAny(s, " \t")
	if i < 0 {
		return s, "", nil
	}
	return s[:i], strings.TrimLeft(s[i:], " \t"), nil
}

// cutOptions takes options separated by commas up to the first white space outside quotation marks.
func cutOptions(s string) (options []string, rest string, err error) {
	quoted, start := false, 0
	for i := 0; i < len(s); i++ {
		switch c := s[i]; {
		case c == '\\' && quoted && i+1 < len(s) && s[i+1] == '"':
			i++
		case c == '"':
			quoted = !quoted
		case c == ',' && !quoted:
			options = append(options, s[start:i])
			start = i + 1
		case (c == ' ' || c == '\t') && !quoted:
			return append(options, s[start:i]), strings.TrimLeft(s[i:], " \t"), nil
		}
	}
	if quoted {
		return nil, "", errors.New("a quotation mark without its partner")
	}
	return append(options, s[start:]), "", nil
}

// optionExamples holds the options that are read here.
var optionExamples = map[string]string{
	"namespaces":   `namespaces="chargehand"`,
	"valid-after":  `valid-after="20260101Z"`,
	"valid-before": `valid-before="20261231Z"`,
}

// take reads one option. Their names do not depend on case (ssh-keygen(1)).
func (e *AllowedEntry) take(option string, zone *time.Location) error {
	name, value, hasValue := strings.Cut(option, "=")
	name = strings.ToLower(name)
	if name == "cert-authority" {
		return errors.New("cert-authority: certificates are not read here; list the signer's own key instead")
	}
	if optionExamples[name] == "" {
		return fmt.Errorf("%.60q is neither an option nor a key: options are namespaces=\"…\", valid-after=\"…\", valid-before=\"…\"", option)
	}
	if !hasValue || len(value) < 2 || value[0] != '"' || value[len(value)-1] != '"' {
		return fmt.Errorf("%s wants a value in quotation marks, for example %s", name, optionExamples[name])
	}
	value = strings.ReplaceAll(value[1:len(value)-1], `\"`, `"`)
	switch name {
	case "namespaces":
		if e.Namespaces != "" {
			return errors.New("namespaces stands twice")
		}
		if value == "" {
			return errors.New("namespaces is empty")
		}
		e.Namespaces = value
		return nil
	case "valid-after":
		return takeTime(&e.ValidAfter, name, value, zone)
	default:
		return takeTime(&e.ValidBefore, name, value, zone)
	}
}

func takeTime(to *time.Time, name, value string, zone *time.Location) error {
	if !to.IsZero() {
		return fmt.Errorf("%s stands twice", name)
	}
	at, err := parseListTime(value, zone)
	if err != nil {
		return fmt.Errorf("%s: %w", name, err)
	}
	*to = at
	return nil
}

// parseListTime reads YYYYMMDD[Z] or YYYYMMDDHHMM[SS][Z].
func parseListTime(s string, zone *time.Location) (time.Time, error) {
	digits, utc := strings.CutSuffix(s, "Z")
	if utc {
		zone = time.UTC
	}
	form := map[int]string{8: "20060102", 12: "200601021504", 14: "20060102150405"}[len(digits)]
	at, err := time.ParseInLocation(form, digits, zone)
	if form == "" || err != nil || strings.Trim(digits, "0123456789") != "" {
		return time.Time{}, fmt.Errorf("%q is no time: wanted YYYYMMDD, YYYYMMDDHHMM or YYYYMMDDHHMMSS, with Z for UTC, for example 20261231Z", s)
	}
	return at, nil
}

// RefusedError says why a listed key may not stand for a signature.
type RefusedError struct {
	Key  string // fingerprint
	Line int    // of the list
	Why  string
}

func (e *RefusedError) Error() string {
	return fmt.Sprintf("key %s (line %d of the signers): %s", e.Key, e.Line, e.Why)
}

// ErrUnknownKey says that no line of the list has the key.
var ErrUnknownKey = errors.New("the key is not on the list of signers")

// Find gives the first line that allows a key to sign a log at a time; at is what the signer claimed. Without one, the error
// is [ErrUnknownKey], or a [*RefusedError] where the key is listed but its namespace or time does not allow it.
func (l *Allowed) Find(key PublicKey, at time.Time) (AllowedEntry, error) {
	var refused error
	for _, e := range l.entries {
		if !e.Key.Equal(key) {
			continue
		}
		why := e.whyNot(at)
		if why == "" {
			return e, nil
		}
		if refused == nil {
			refused = &RefusedError{key.Fingerprint(), e.Line, why}
		}
	}
	if refused != nil {
		return AllowedEntry{}, refused
	}
	return AllowedEntry{}, fmt.Errorf("%s: %w", key.Fingerprint(), ErrUnknownKey)
}

func (e AllowedEntry) whyNot(at time.Time) string {
	switch {
	case e.Namespaces != "" && !MatchPatternList(e.Namespaces, Namespace):
		return fmt.Sprintf("not permitted for the namespace %q, only for %q", Namespace, e.Namespaces)
	case !e.ValidAfter.IsZero() && at.Before(e.ValidAfter):
		return fmt.Sprintf("valid only after %s, claimed %s", e.ValidAfter.Format(time.RFC3339), at.Format(time.RFC3339))
	case !e.ValidBefore.IsZero() && at.After(e.ValidBefore):
		return fmt.Sprintf("expired on %s, claimed %s", e.ValidBefore.Format(time.RFC3339), at.Format(time.RFC3339))
	}
	return ""
}

// Allows tells whether the line speaks for an identity, as `ssh-keygen -Y verify -I` asks.
func (e AllowedEntry) Allows(identity string) bool { return MatchPatternList(e.Principals, identity) }

// MatchPatternList tells whether a name matches a list of patterns separated by commas, in which * stands for any run of
// characters, ? for one, and a leading ! forbids (ssh_config(5), PATTERNS). A name that a ! matches is refused whatever else
// matches.
func MatchPatternList(list, name string) bool {
	matched := false
	for p := range strings.SplitSeq(list, ",") {
		positive, negated := strings.CutPrefix(p, "!")
		if !matchPattern(positive, name) {
			continue
		}
		if negated {
			return false
		}
		matched = true
	}
	return matched
}

// matchPattern remembers only the last *, so that no pattern makes it slow.
func matchPattern(pattern, name string) bool {
	p, n, star, mark := 0, 0, -1, 0
	for n < len(name) {
		switch {
		case p < len(pattern) && pattern[p] == '*':
			star, mark = p, n
			p++
		case p < len(pattern) && (pattern[p] == '?' || pattern[p] == name[n]):
			p++
			n++
		case star >= 0:
			mark++
			p, n = star+1, mark
		default:
			return false
		}
	}
	return len(bytes.Trim([]byte(pattern[p:]), "*")) == 0
}
