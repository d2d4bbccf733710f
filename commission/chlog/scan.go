package chlog

import (
	"bytes"
	"fmt"
	"strings"
	"unicode"
	"unicode/utf8"
)

// formError is a fault in the form of one line, at a byte of that line.
type formError struct {
	at   int
	what string
}

// maxDepth bounds how deep a body may nest; no record needs more than six.
const maxDepth = 64

// scanner checks JSON strictly in one pass and keeps nothing: no white space, no control characters, raw or escaped, but
// tab, line feed and carriage return escaped inside text; valid UTF-8; plain keys, none of them twice in one object, not
// even in another case.
type scanner struct {
	b        []byte
	i        int
	depth    int
	keys     [][]byte // of all open objects, innermost last
	replaced bool     // met the escape \ufffd: Go's encoder writes it where text was no UTF-8
}

// plain tells of each byte whether it stands for itself inside text.
var plain = func() (t [256]bool) {
	for c := 0x20; c < 0x7f; c++ {
		t[c] = c != '"' && c != '\\'
	}
	return t
}()

func (s *scanner) fail(format string, a ...any) *formError {
	return &formError{s.i, fmt.Sprintf(format, a...)}
}

// found says what stands at the scanner's place.
func (s *scanner) found() string {
	if s.i >= len(s.b) {
		return "the end of the line"
	}
	c := s.b[s.i]
	switch {
	case c == '\r' && s.i == len(s.b)-1:
		return "a carriage return: the file has been through a program that changes line ends"
	case c == ' ' || c == '\t' || c == '\r' || c == '\n':
		return fmt.Sprintf("white space (byte 0x%02x)", c)
	case c < 0x20 || c == 0x7f:
		return fmt.Sprintf("control character 0x%02x", c)
	case c >= 0x80:
		return fmt.Sprintf("byte 0x%02x", c)
	}
	return fmt.Sprintf("%q", string(rune(c)))
}

func (s *scanner) wanted(what string) *formError { return s.fail("%s, wanted %s", s.found(), what) }

func (s *scanner) peek() byte {
	if s.i < len(s.b) {
		return s.b[s.i]
	}
	return 0
}

func (s *scanner) value() *formError {
	switch c := s.peek(); {
	case c == '{':
		return s.object()
	case c == '[':
		return s.array()
	case c == '"':
		return s.text()
	case c == '-' || '0' <= c && c <= '9':
		return s.number()
	case c == 't':
		return s.literal("true")
	case c == 'f':
		return s.literal("false")
	case c == 'n':
		return s.literal("null")
	}
	return s.wanted("a value")
}

func (s *scanner) literal(word string) *formError {
	for k := range len(word) {
		if s.peek() != word[k] {
			return s.wanted(word)
		}
		s.i++
	}
	return nil
}

func (s *scanner) descend() *formError {
	if s.depth++; s.depth > maxDepth {
		return s.fail("nested deeper than %d", maxDepth)
	}
	s.i++
	return nil
}

func (s *scanner) array() *formError {
	if err := s.descend(); err != nil {
		return err
	}
	defer func() { s.depth-- }()
	if s.peek() == ']' {
		s.i++
		return nil
	}
	for {
		if err := s.value(); err != nil {
			return err
		}
		switch s.peek() {
		case ',':
			s.i++
		case ']':
			s.i++
			return nil
		default:
			return s.wanted(`"," or "]"`)
		}
	}
}

func (s *scanner) object() *formError {
	if err := s.descend(); err != nil {
		return err
	}
	first := len(s.keys)
	defer func() { s.depth--; s.keys = s.keys[:first] }()
	if s.peek() == '}' {
		s.i++
		return nil
	}
	for {
		if err := s.key(first); err != nil {
			return err
		}
		if s.peek() != ':' {
			return s.wanted(`":"`)
		}
		s.i++
		if err := s.value(); err != nil {
			return err
		}
		switch s.peek() {
		case ',':
			s.i++
		case '}':
			s.i++
			return nil
		default:
			return s.wanted(`"," or "}"`)
		}
	}
}

// key reads a key, which holds no escape, and compares it with the object's earlier ones, the first of which is keys[first].
func (s *scanner) key(first int) *formError {
	if s.peek() != '"' {
		return s.wanted("a key")
	}
	start := s.i
	if err := s.text(); err != nil {
		return err
	}
	key := s.b[start+1 : s.i-1]
	if bytes.IndexByte(key, '\\') >= 0 {
		return &formError{start, fmt.Sprintf("key %s holds an escape", s.b[start:s.i])}
	}
	for _, earlier := range s.keys[first:] {
		if len(earlier) == len(key) && bytes.Equal(earlier, key) {
			return &formError{start, fmt.Sprintf("key %q stands twice", key)}
		}
		if bytes.EqualFold(earlier, key) {
			return &formError{start, fmt.Sprintf("keys %q and %q differ only in case", earlier, key)}
		}
	}
	if len(s.keys)-first >= maxKeys {
		return &formError{start, fmt.Sprintf("more than %d keys in one object", maxKeys)}
	}
	s.keys = append(s.keys, key)
	return nil
}

// maxKeys bounds the keys of one object, each of which is compared with each.
const maxKeys = 256

func (s *scanner) text() *formError {
	s.i++
	for s.i < len(s.b) {
		for s.i < len(s.b) && plain[s.b[s.i]] {
			s.i++
		}
		if s.i >= len(s.b) {
			break
		}
		switch c := s.b[s.i]; {
		case c == '"':
			s.i++
			return nil
		case c == '\\':
			if err := s.escape(); err != nil {
				return err
			}
		case c < 0x80:
			return s.fail("%s inside text", s.found())
		default:
			r, n := utf8.DecodeRune(s.b[s.i:])
			if r == utf8.RuneError && n == 1 {
				return s.fail("byte 0x%02x is not UTF-8", c)
			}
			if unicode.IsControl(r) {
				return s.fail("control character %U inside text", r)
			}
			s.i += n
		}
	}
	return s.fail("the line ends inside text")
}

// escape reads what follows a backslash.
func (s *scanner) escape() *formError {
	if s.i+1 >= len(s.b) {
		return s.fail("the line ends inside an escape")
	}
	switch c := s.b[s.i+1]; {
	case strings.IndexByte(`"\/nrt`, c) >= 0:
		s.i += 2
		return nil
	case c != 'u':
		return s.fail("escape \\%q in text, wanted \\\" \\\\ \\/ \\n \\r \\t or \\u", rune(c))
	}
	r, ok := s.hex4(s.i + 2)
	if !ok {
		return s.fail("escape \\u without four hexadecimal digits")
	}
	if r >= 0xdc00 && r <= 0xdfff {
		return s.fail("half of a surrogate pair")
	}
	n := 6
	if r >= 0xd800 && r <= 0xdbff {
		low, ok := s.hex4(s.i + 8)
		if !ok || s.b[s.i+6] != '\\' || s.b[s.i+7] != 'u' || low < 0xdc00 || low > 0xdfff {
			return s.fail("half of a surrogate pair")
		}
		n = 12
	}
	if r != '\t' && r != '\n' && r != '\r' && unicode.IsControl(r) {
		return s.fail("control character %U inside text", r)
	}
	s.replaced = s.replaced || r == utf8.RuneError
	s.i += n
	return nil
}

func (s *scanner) hex4(at int) (rune, bool) {
	if at+4 > len(s.b) {
		return 0, false
	}
	var r rune
	for _, c := range s.b[at : at+4] {
		switch {
		case '0' <= c && c <= '9':
			r = r<<4 | rune(c-'0')
		case 'a' <= c && c <= 'f':
			r = r<<4 | rune(c-'a'+10)
		case 'A' <= c && c <= 'F':
			r = r<<4 | rune(c-'A'+10)
		default:
			return 0, false
		}
	}
	return r, true
}

func (s *scanner) number() *formError {
	if s.peek() == '-' {
		s.i++
	}
	if s.peek() == '0' {
		s.i++
	} else if err := s.digits(); err != nil {
		return err
	}
	if s.peek() == '.' {
		s.i++
		if err := s.digits(); err != nil {
			return err
		}
	}
	if c := s.peek(); c == 'e' || c == 'E' {
		s.i++
		if c := s.peek(); c == '+' || c == '-' {
			s.i++
		}
		return s.digits()
	}
	return nil
}

func (s *scanner) digits() *formError {
	start := s.i
	for s.i < len(s.b) && '0' <= s.b[s.i] && s.b[s.i] <= '9' {
		s.i++
	}
	if s.i == start {
		return s.wanted("a digit")
	}
	return nil
}
