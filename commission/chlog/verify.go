package chlog

import (
	"context"
	"errors"
	"fmt"
	"hash"
	"io"
	"os"
	"path/filepath"
	"runtime"
	"sync"
	"time"

	"chargehand/commission/record"
	"chargehand/commission/signing"
)

// Verifier says what may be relied on in a log, and how far.
type Verifier struct {
	// Signers is the list of allowed signers; nil when there is none, and then no identity is checked.
	Signers *signing.Allowed
	// Now is today, for a signature that carries no time of its own. Nil stands for the year 1, when no key with a beginning was
	// valid yet.
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
