package chlog

import (
	"bufio"
	"bytes"
	"encoding/json"
	"fmt"
	"io"
	"regexp"
	"strings"

	"chargehand/commission/record"
)

// DamageError is the first fault of a log. Everything before Record is intact; nothing from Record on is vouched for.
type DamageError struct {
	Record int64 // the record that is wrong, missing or too many: its place in the log, from 0
	Line   int   // the same, from 1, as an editor counts
	Offset int64 // of the first byte that cannot be relied on
	What   string
	// Torn tells that this is the last line and is not whole, as a crash or a full disk leaves it.
	Torn bool
}

func (e *DamageError) Error() string {
	return fmt.Sprintf("record %d (line %d), byte %d: %s", e.Record, e.Line, e.Offset, e.What)
}

// NotALogError says that a file is something else.
type NotALogError struct{ Why string }

func (e *NotALogError) Error() string { return "not a chargehand log: " + e.Why }

// VersionError says that a log was written by a later version, in a form that this one cannot judge.
type VersionError struct{ Format string }

func (e *VersionError) Error() string {
	return fmt.Sprintf("written in the format %q, which this version does not know (it knows %q); use a newer chargehand",
		e.Format, record.Format)
}

// Reader reads a log strictly, line by line, in memory for no more than two lines.
type Reader struct {
	in     *bufio.Reader
	long   []byte // a line that is longer than the buffer of in
	keys   [][]byte
	offset int64 // of the next line
	start  int64 // of the last line
	seq    int64 // of the next line
	head   string
	opened record.Opened
	sealed bool
	err    error
}

// NewReader reads the log that r gives.
func NewReader(r io.Reader) *Reader {
	return &Reader{in: bufio.NewReaderSize(r, 32<<10), head: NoPrev}
}

// Next gives the next line, io.EOF after the last, or what is wrong: a [*DamageError], [*NotALogError] or [*VersionError].
func (r *Reader) Next() (Line, error) {
	raw, err := r.next()
	if err != nil {
		return Line{}, err
	}
	return Line{Seq: raw.seq, At: raw.time, Kind: string(raw.kind), Prev: string(raw.prev), Body: bytes.Clone(raw.body)}, nil
}

// Offset is the byte at which the last line begins.
func (r *Reader) Offset() int64 { return r.start }

// End is the byte after the last line.
func (r *Reader) End() int64 { return r.offset }

// Head is the SHA-256 of the last line: the prev of the line to come.
func (r *Reader) Head() string { return r.head }

// Opened is the body of the first line.
func (r *Reader) Opened() record.Opened { return r.opened }

// Sealed tells whether the last line is a seal.
func (r *Reader) Sealed() bool { return r.sealed }

// next gives the next line; its slices hold only until the next call.
func (r *Reader) next() (rawLine, error) {
	if r.err != nil {
		return rawLine{}, r.err
	}
	raw, err := r.read()
	r.err = err
	return raw, err
}

func (r *Reader) read() (rawLine, error) {
	line, err := r.line()
	if err != nil && (err != io.EOF || len(line) == 0) {
		if err == io.EOF && r.seq == 0 {
			return rawLine{}, &NotALogError{"the file is empty"}
		}
		return rawLine{}, err
	}
	raw, fault := parse(bytes.TrimSuffix(line, []byte("\n")), &r.keys)
	if r.seq == 0 {
		if err := foreign(line); err != nil {
			return rawLine{}, err
		}
	}
	switch {
	case err == io.EOF && r.seq == 0:
		return rawLine{}, r.damage(int64(len(line)), true, "the first line was never finished: there is nothing in it; begin a new log")
	case err == io.EOF: // without its line feed even a line of good form is not whole
		return rawLine{}, r.damage(r.offset+int64(len(line)), true, "the last line is not whole: the file ends inside it")
	case fault != nil:
		return rawLine{}, r.damage(r.offset+int64(fault.at), r.isLast(), fault.what)
	case raw.seq != r.seq:
		return rawLine{}, r.wrongSeq(raw.seq)
	case string(raw.prev) != r.head:
		return rawLine{}, r.wrongPrev(raw, line)
	case r.sealed:
		return rawLine{}, r.damage(r.offset, false, "a line stands after the seal")
	}
	if err := r.take(raw); err != nil {
		return rawLine{}, err
	}
	r.start, r.offset = r.offset, r.offset+int64(len(line))
	r.head = hashOf(line)
	r.seq++
	return raw, nil
}

// line gives the next line with its line feed, or what there is of it with io.EOF.
func (r *Reader) line() ([]byte, error) {
	part, err := r.in.ReadSlice('\n')
	if err != bufio.ErrBufferFull {
		return part, err
	}
	r.long = append(r.long[:0], part...)
	for err == bufio.ErrBufferFull {
		part, err = r.in.ReadSlice('\n')
		r.long = append(r.long, part...)
		if len(r.long) > MaxLine {
			if r.seq == 0 && !looksLikeALog(r.long) {
				return nil, &NotALogError{fmt.Sprintf("its first line is longer than %d bytes", MaxLine)}
			}
			return nil, r.damage(r.offset+MaxLine, false, fmt.Sprintf("the line is longer than %d bytes", MaxLine))
		}
	}
	return r.long, err
}

func (r *Reader) isLast() bool {
	_, err := r.in.Peek(1)
	return err == io.EOF
}

func (r *Reader) damage(offset int64, torn bool, what string) *DamageError {
	return &DamageError{Record: r.seq, Line: int(r.seq) + 1, Offset: offset, What: what, Torn: torn}
}

func (r *Reader) wrongSeq(seq int64) error {
	what := fmt.Sprintf("record %d stands where record %d should", seq, r.seq)
	switch {
	case seq == r.seq-1:
		what += ": a line stands twice or was put in"
	case seq == r.seq+1:
		what += ": a line is missing, or two are swapped"
	}
	return r.damage(r.offset, false, what)
}

// wrongPrev finds out which of two lines is wrong: the one before, or this one's own prev. The line after this one tells,
// since it was chained to this one as it was written.
func (r *Reader) wrongPrev(raw rawLine, line []byte) error {
	if r.seq == 0 {
		return r.damage(r.offset+9, false, "the first line's prev is not 64 zeros")
	}
	own, prev, seq := hashOf(line), string(raw.prev), raw.seq
	next, err := r.line()
	after, fault := parse(bytes.TrimSuffix(next, []byte("\n")), &r.keys)
	before := &DamageError{Record: r.seq - 1, Line: int(r.seq), Offset: r.start,
		What: fmt.Sprintf("bytes %d to %d are not those that record %d was chained to", r.start, r.offset-1, seq)}
	switch {
	case err == nil && fault == nil && string(after.prev) == own:
		return before
	case err == nil && fault == nil:
		return r.damage(r.offset+9, false, fmt.Sprintf("its prev is %.12s…, but record %d has %.12s…", prev, seq-1, r.head))
	}
	before.What += fmt.Sprintf(", or record %d's own prev is wrong", seq)
	return before
}

// take notes what the reader itself must know of a line.
func (r *Reader) take(raw rawLine) error {
	switch string(raw.kind) {
	case "opened":
		if r.seq != 0 {
			return r.damage(r.offset, false, "a second record \"opened\"")
		}
		return r.open(raw)
	case "seal":
		r.sealed = true
	}
	if r.seq == 0 {
		return r.damage(r.offset, false, fmt.Sprintf("the first record is %q, wanted \"opened\"", raw.kind))
	}
	return nil
}

func (r *Reader) open(raw rawLine) error {
	body, err := record.Decode("opened", raw.body)
	if err != nil {
		return r.damage(r.offset+int64(raw.bodyAt), false, err.Error())
	}
	r.opened = body.(record.Opened)
	if why := faultOf(r.opened); why != "" {
		return r.damage(r.offset+int64(raw.bodyAt), false, why)
	}
	return nil
}

var logID = regexp.MustCompile(`^[0-9a-f]{32}$`)

// faultOf says what is wrong with an opened body, or "".
func faultOf(o record.Opened) string {
	switch {
	case o.Format != record.Format:
		return fmt.Sprintf("the format is %q, wanted %q", o.Format, record.Format)
	case !logID.MatchString(o.Log):
		return fmt.Sprintf("%q is no log id: wanted 32 lower-case hexadecimal digits", o.Log)
	case o.Mode != record.SiteMode && o.Mode != record.RehearsalMode:
		return fmt.Sprintf("the mode is %q, wanted %q or %q", o.Mode, record.SiteMode, record.RehearsalMode)
	}
	return ""
}

// formatMark finds a log's format in its first line even where the line is damaged or of a later form.
var formatMark = regexp.MustCompile(`"format" ?: ?"(chargehand-log/[^"]{0,20})"`)

func looksLikeALog(start []byte) bool {
	start = start[:min(len(start), 64<<10)]
	return bytes.HasPrefix(start, []byte(`{"prev":"000`)) || bytes.Contains(start, []byte("chargehand-log/"))
}

// foreign tells a file that is no log, and one of a later version, from one that is damaged.
func foreign(line []byte) error {
	start := line[:min(len(line), 64<<10)]
	if !looksLikeALog(start) {
		return &NotALogError{describe(start)}
	}
	mark := formatMark.FindSubmatch(start)
	if mark == nil || string(mark[1]) == record.Format {
		return nil
	}
	version := strings.TrimPrefix(string(mark[1]), "chargehand-log/")
	if version == "" || strings.Trim(version, "0123456789") != "" || version[0] == '0' {
		return nil
	}
	return &VersionError{string(mark[1])}
}

// describe says what a file looks like that is no log.
func describe(start []byte) string {
	shown := start[:min(len(start), 20)]
	if json.Valid(bytes.TrimSpace(start)) {
		return fmt.Sprintf("it begins with JSON of another kind, %q", shown)
	}
	return fmt.Sprintf("it begins with %q", shown)
}
