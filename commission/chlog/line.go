package chlog

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"fmt"
	"strconv"
	"strings"
	"time"

	"chargehand/commission/record"
)

// MaxLine is the longest line in bytes, its line feed included. A longer capture is split into parts by whoever writes it.
const MaxLine = 4 << 20

// NoPrev is the prev of a log's first line.
var NoPrev = strings.Repeat("0", 64)

// Line is one record of a log.
type Line struct {
	Seq  int64
	At   time.Time
	Kind string
	Prev string // 64 lower-case hexadecimal digits
	Body json.RawMessage
}

// Decode reads the body. A kind that this version does not know comes back as [record.Other].
func (l Line) Decode() (record.Body, error) {
	body, err := record.Decode(l.Kind, l.Body)
	if err != nil {
		return nil, fmt.Errorf("record %d: %w", l.Seq, err)
	}
	return body, nil
}

// timeForm is RFC 3339 with milliseconds and a numeric offset, one length for every time.
const timeForm = "2006-01-02T15:04:05.000-07:00"

// FormatTime writes a time as every line and statement has it.
func FormatTime(at time.Time) string { return at.Format(timeForm) }

// encode is the line's exact bytes with its line feed.
func encode(prev string, seq int64, at time.Time, kind string, body []byte) []byte {
	b := make([]byte, 0, len(body)+160+len(kind))
	b = append(b, `{"prev":"`...)
	b = append(b, prev...)
	b = append(b, `","seq":`...)
	b = strconv.AppendInt(b, seq, 10)
	b = append(b, `,"at":"`...)
	b = at.AppendFormat(b, timeForm)
	b = append(b, `","kind":"`...)
	b = append(b, kind...)
	b = append(b, `","body":`...)
	b = append(b, body...)
	return append(b, "}\n"...)
}

// encodeBody is the body's JSON without the escapes that Go adds for web pages.
func encodeBody(body record.Body) ([]byte, error) {
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	if err := e.Encode(body); err != nil {
		return nil, err
	}
	return bytes.TrimSuffix(b.Bytes(), []byte("\n")), nil
}

func hashOf(line []byte) string {
	sum := sha256.Sum256(line)
	return hex.EncodeToString(sum[:])
}

// rawLine is a line taken apart; its slices point into the line.
type rawLine struct {
	prev, at, kind, body []byte
	seq                  int64
	time                 time.Time
	bodyAt               int // where the body begins
	replaced             bool
}

// parse takes a line apart, which stands here without its line feed, and checks its form.
func parse(line []byte, keys *[][]byte) (rawLine, *formError) {
	var l rawLine
	s := &scanner{b: line, keys: (*keys)[:0]}
	defer func() { *keys = s.keys[:0] }()
	if err := s.expect(`{"prev":"`); err != nil {
		return l, err
	}
	start := s.i
	for s.i < len(line) && s.i < start+64 && isLowerHex(line[s.i]) {
		s.i++
	}
	if s.i < start+64 {
		return l, s.wanted("64 lower-case hexadecimal digits")
	}
	l.prev = line[start:s.i]
	if err := s.expect(`","seq":`); err != nil {
		return l, err
	}
	if err := s.sequence(&l.seq); err != nil {
		return l, err
	}
	if err := s.expect(`,"at":"`); err != nil {
		return l, err
	}
	if err := s.time(&l); err != nil {
		return l, err
	}
	if err := s.expect(`","kind":"`); err != nil {
		return l, err
	}
	start = s.i
	for s.i < len(line) && (isLower(line[s.i]) || s.i > start && (line[s.i] == '-' || isDigit(line[s.i]))) {
		s.i++
	}
	if l.kind = line[start:s.i]; len(l.kind) == 0 || len(l.kind) > 40 {
		return l, s.wanted("a kind in lower case, at most 40 letters")
	}
	if err := s.expect(`","body":`); err != nil {
		return l, err
	}
	l.bodyAt = s.i
	if s.peek() != '{' {
		return l, s.wanted("an object as body")
	}
	if err := s.value(); err != nil {
		return l, err
	}
	l.body = line[l.bodyAt:s.i]
	if err := s.expect(`}`); err != nil {
		return l, err
	}
	if s.i != len(line) {
		return l, s.wanted("the end of the line")
	}
	l.replaced = s.replaced
	return l, nil
}

// expect reads a fixed text.
func (s *scanner) expect(text string) *formError {
	for k := range len(text) {
		if s.peek() != text[k] || s.i >= len(s.b) {
			return s.wanted("exactly " + text)
		}
		s.i++
	}
	return nil
}

func (s *scanner) sequence(to *int64) *formError {
	start := s.i
	if err := s.digits(); err != nil {
		return err
	}
	digits := string(s.b[start:s.i])
	n, err := strconv.ParseInt(digits, 10, 54)
	if err != nil || len(digits) > 1 && digits[0] == '0' {
		s.i = start
		return s.fail("%.40q is no sequence number", digits)
	}
	*to = n
	return nil
}

// time reads RFC 3339 with milliseconds; an offset of Z is read, too.
func (s *scanner) time(l *rawLine) *formError {
	start := s.i
	end := bytes.IndexByte(s.b[start:min(len(s.b), start+40)], '"')
	if end < 0 {
		return s.fail("no time in the form %s", timeForm)
	}
	text := string(s.b[start : start+end])
	form := timeForm
	if strings.HasSuffix(text, "Z") {
		form = "2006-01-02T15:04:05.000Z"
	}
	at, err := time.Parse(form, text)
	if err != nil || at.Format(form) != text { // Parse is generous: a comma, an offset of -00:00
		return s.fail("%q is no time in the form %s", text, timeForm)
	}
	l.at, l.time = s.b[start:start+end], at
	s.i += end
	return nil
}

func isLowerHex(c byte) bool { return isDigit(c) || 'a' <= c && c <= 'f' }
func isLower(c byte) bool    { return 'a' <= c && c <= 'z' }
func isDigit(c byte) bool    { return '0' <= c && c <= '9' }
