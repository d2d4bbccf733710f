package chlog

import (
	"context"
	"errors"
	"fmt"
	"hash"
	"io"
	"maps"
	"os"
	"path/filepath"
	"regexp"
	"runtime"
	"slices"
	"strings"
	"sync"
	"time"

	"chargehand/commission/record"
	"chargehand/commission/signing"
)

// Verifier says what may be relied on in a log, and how far.
type Verifier struct {
	// Signers is the list of allowed signers; nil when there is none, and then no identity is checked.
	Signers *signing.Allowed
	// Now is today, for a signature that carries no time of its own.
	Now func() time.Time
	// Progress, if not nil, is told how many bytes of how many are read, over all files. It is called by several goroutines.
	Progress func(done, total int64)
}

// Verify checks many logs at once and gives a report for each, in the order of paths. Logs of one call that have the same id
// are compared with each other, too.
func (v Verifier) Verify(ctx context.Context, paths []string) []Report {
	reports := make([]Report, len(paths))
	meter := newMeter(paths, v.Progress)
	work := make(chan int)
	var workers sync.WaitGroup
	for range min(runtime.GOMAXPROCS(0), len(paths)) {
		workers.Go(func() {
			for i := range work {
				reports[i] = v.one(ctx, paths[i], meter)
			}
		})
	}
	for i := range paths {
		work <- i
	}
	close(work)
	workers.Wait()
	findForks(reports, paths)
	return reports
}

// File checks one log.
func (v Verifier) File(path string) Report {
	return v.Verify(context.Background(), []string{path})[0]
}

func (v Verifier) one(ctx context.Context, path string, m *meter) Report {
	c := newCheck(v, path)
	if err := c.run(ctx, m); err != nil {
		c.report.err = err
		c.conclude(Unreadable, "cannot be read: "+err.Error())
	}
	c.report.Exit = c.report.Outcome.Exit()
	return c.report
}

// check is the verification of one log.
type check struct {
	v       Verifier
	path    string
	report  Report
	persons map[string]record.Person
	files   []string
	beside  []besideSignature
	seal    *StatementCheck
	sealed  time.Time // the seal's claimed time
}

// besideSignature is a detached signature and the hash it wants over the log.
type besideSignature struct {
	check     SignatureCheck
	signature *signing.Signature
	hash      hash.Hash
}

func newCheck(v Verifier, path string) *check {
	return &check{v: v, path: path, persons: map[string]record.Person{}, report: Report{Format: ReportFormat, File: path,
		Notes: []string{}, Statements: []StatementCheck{}, Signatures: []SignatureCheck{}, Torn: []string{}}}
}

func (c *check) conclude(o Outcome, sentence string) {
	c.report.Outcome, c.report.Sentence = o, sentence
}

func (c *check) run(ctx context.Context, m *meter) error {
	f, err := os.Open(c.path)
	if err != nil {
		return err
	}
	defer f.Close()
	if info, err := f.Stat(); err != nil || info.IsDir() {
		return errors.Join(err, errors.New("it is a folder"))
	}
	if err := c.readSignatures(); err != nil {
		return err
	}
	return c.read(m.of(ctx, f))
}

// read takes the log itself; its detached signatures are there already.
func (c *check) read(in io.Reader) error {
	r := NewReader(io.TeeReader(in, c.hashes()))
	err := c.lines(r)
	c.report.Records, c.report.Bytes, c.report.Sealed, c.report.Head = r.seq, r.offset, r.sealed, r.head
	o := r.Opened()
	c.report.Log, c.report.Mode, c.report.Program, c.report.Continues = o.Log, o.Mode, o.Program, o.Continues
	c.report.Rehearsal = c.report.Rehearsal || o.Mode == record.RehearsalMode
	switch e := err.(type) {
	case nil:
		c.checkSignatures()
		c.judge()
	case *DamageError:
		if e.Record < r.seq { // the last line read is the wrong one
			c.report.Bytes = r.start
		}
		c.damaged(e)
	case *NotALogError:
		c.conclude(NotALog, e.Error())
		c.report.err = e
	case *VersionError:
		c.conclude(NewerVersion, e.Error())
		c.report.err = e
	default:
		return err
	}
	return nil
}

// readSignatures reads the detached signatures first, since they say which hash of the file they want.
func (c *check) readSignatures() error {
	files, err := signatureFiles(c.path)
	if err != nil {
		return err
	}
	for _, f := range files {
		text, err := readUpTo(f.path, 1<<20)
		if err != nil {
			return err
		}
		c.addSignature(filepath.Base(f.path), text)
	}
	return nil
}

func (c *check) addSignature(name string, text []byte) {
	b := besideSignature{check: SignatureCheck{File: name, Role: RoleNotStated}}
	signature, err := signing.Parse(text)
	if err != nil {
		b.check.State, b.check.Why = Malformed, err.Error()
	} else {
		b.signature, b.hash = signature, c.hashFor(signature)
		b.check.Key = signature.Key().Fingerprint()
	}
	c.beside = append(c.beside, b)
}

func readUpTo(path string, most int64) ([]byte, error) {
	f, err := os.Open(path)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	return io.ReadAll(io.LimitReader(f, most))
}

// hashFor shares one hash among signatures that want the same.
func (c *check) hashFor(s *signing.Signature) hash.Hash {
	for _, b := range c.beside {
		if b.signature != nil && b.signature.HashAlgorithm() == s.HashAlgorithm() {
			return b.hash
		}
	}
	return s.NewHash()
}

// hashes takes the whole file once for each hash that is wanted.
func (c *check) hashes() io.Writer {
	var writers []io.Writer
	seen := map[hash.Hash]bool{}
	for _, b := range c.beside {
		if b.hash != nil && !seen[b.hash] {
			seen[b.hash] = true
			writers = append(writers, b.hash)
		}
	}
	return io.MultiWriter(writers...)
}

func (c *check) lines(r *Reader) error {
	for {
		raw, err := r.next()
		if err == io.EOF {
			return nil
		}
		if err != nil {
			return err
		}
		if err := c.line(raw, r); err != nil {
			return err
		}
	}
}

func (c *check) line(raw rawLine, r *Reader) error {
	switch string(raw.kind) {
	case "person", "file", "resumed", "sign-off", "seal":
	default:
		return nil
	}
	body, err := record.Decode(string(raw.kind), raw.body)
	if err != nil {
		// The chain holds, so the line is as it was written: whoever wrote it was not this program.
		return &DamageError{Record: raw.seq, Line: int(raw.seq) + 1, Offset: r.start + int64(raw.bodyAt), What: err.Error()}
	}
	s := Statement{Log: r.opened.Log, Mode: r.opened.Mode, Record: raw.seq, Head: string(raw.prev), At: string(raw.at)}
	switch b := body.(type) {
	case record.Person:
		c.persons[b.ID] = b
	case record.File:
		c.files = append(c.files, b.SHA256)
	case record.Resumed:
		c.resumed(raw.seq, b)
	case record.SignOff:
		s.Act, s.Point = ActSignOff, b.Point
		c.statement(s, raw, r.start, signed{b.Person, b.Statement, b.Signature, b.UnsignedBecause})
	case record.Seal:
		s.Act, s.Verdict, s.Files = ActSeal, b.Verdict, c.files
		c.statement(s, raw, r.start, signed{b.Person, b.Statement, b.Signature, b.UnsignedBecause})
		c.seal, c.sealed = &c.report.Statements[len(c.report.Statements)-1], raw.time
		c.report.Verdict = b.Verdict
	}
	return nil
}

func (c *check) resumed(seq int64, b record.Resumed) {
	if b.Torn != nil {
		c.report.Torn = append(c.report.Torn, b.Torn.KeptIn)
		c.report.Notes = append(c.report.Notes, fmt.Sprintf("a torn last line of %d bytes was set aside before record %d: %s",
			b.Torn.Bytes, seq, b.Torn.KeptIn))
	}
	if b.Moved != nil {
		c.report.Notes = append(c.report.Notes, fmt.Sprintf("moved here at record %d from %s (%s)", seq, b.Moved.From, b.Moved.Why))
	}
}

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
