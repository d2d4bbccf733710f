package quantity

import (
	"math"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// The sizes, in the coherent unit, that a typed value may have beside 0.
const (
	smallest = 1e-15
	largest  = 1e15
)

// longest is the greatest length of a typed quantity in bytes; it bounds the work of finding out what was meant.
const longest = 200

// absoluteZero in degrees Celsius, by definition of the Celsius scale.
const absoluteZero = -273.15

// Parse reads a quantity of the type's own dimension.
func Parse[Q Scalar](text string, rule Rule) (Entered[Q], *Refusal) {
	r, refusal := read(text, dimensionOf[Q](), rule)
	if refusal != nil {
		return Entered[Q]{}, refusal
	}
	return Entered[Q]{Spread[Q]{Q(r.low), Q(r.nominal), Q(r.high)}, text}, nil
}

// ParseUnit reads an exact value of the dimension that a coherent unit belongs to, such as the "V" of a signal. The unit must
// be typed, in any of the dimension's units; where coherent is "" or "1" a bare number is wanted.
func ParseUnit(text, coherent string, rule Rule) (float64, *Refusal) {
	rule.Tolerance = false
	if coherent == "" || coherent == "1" {
		return bareNumber(text, rule)
	}
	d := byCoherent(coherent)
	if d == nil {
		d = newDimension("a value in "+coherent, coherent, coherent, "1 "+coherent, decimal(coherent, 0))
	}
	r, refusal := read(text, d, rule)
	return r.nominal, refusal
}

func bareNumber(text string, rule Rule) (float64, *Refusal) {
	s := &scanner{text: text, d: newDimension("a number without unit", "1", "", "2"), rule: rule}
	number, refusal := s.number()
	if refusal != nil {
		return 0, refusal
	}
	if s.rest() != "" {
		return 0, s.refuse("a number without unit", number)
	}
	v, ok := decimal("", 0).value(number)
	if !ok || v != 0 && (math.Abs(v) < smallest || math.Abs(v) > largest) {
		return 0, s.refuseAt(0, "a size between 1e-15 and 1e15", "")
	}
	return v, s.signed(v, v)
}

// ParseErrorBound reads the greatest error of a measurement or setting, in volts or per cent. 0 is allowed, a tolerance or
// more than 100 % is not.
func ParseErrorBound(text string) (ErrorBound, *Refusal) {
	r, refusal := read(text, errorBound, Rule{Sign: NotNegative})
	if refusal != nil {
		return ErrorBound{}, refusal
	}
	if r.unit != "%" {
		return ErrorBound{Absolute: Voltage(r.nominal), Text: text}, nil
	}
	if r.nominal > 1 {
		return ErrorBound{}, &Refusal{strconv.Quote(text), "an error of at most 100 %", "0.5 %", 0}
	}
	return ErrorBound{Relative: Ratio(r.nominal), Text: text}, nil
}

// ParseDroop reads a droop in per cent or in volts per ampere. It must be above 0, and at most 100 %.
func ParseDroop(text string) (DroopSetting, *Refusal) {
	r, refusal := read(text, droopUnits, Rule{Sign: Positive})
	if refusal != nil {
		return DroopSetting{}, refusal
	}
	if r.unit != "%" {
		return DroopSetting{PerAmpere: Droop(r.nominal), Text: text}, nil
	}
	if r.nominal > 1 {
		return DroopSetting{}, &Refusal{strconv.Quote(text), "a droop of at most 100 %", "3 %", 0}
	}
	return DroopSetting{Percent: Ratio(r.nominal), Text: text}, nil
}

// reading is a parsed quantity in the coherent unit, with the unit it was typed in as this program writes it.
type reading struct {
	low, nominal, high float64
	unit               string
}

// scanner walks along one typed quantity.
type scanner struct {
	text string
	at   int // in bytes
	d    *dimension
	rule Rule
}

func (s *scanner) rest() string { return s.text[s.at:] }

func (s *scanner) refuse(wanted, example string) *Refusal { return s.refuseAt(s.at, wanted, example) }

func (s *scanner) refuseAt(at int, wanted, example string) *Refusal {
	if example == "" {
		example = s.example()
	}
	return &Refusal{Read: quoted(s.text), Wanted: wanted, Example: example, Offset: utf8.RuneCountInString(s.text[:at])}
}

func (s *scanner) example() string {
	if s.rule.Example != "" {
		return s.rule.Example
	}
	return s.d.example
}

// quoted shortens a text that is far too long for a quantity, so that a message stays one line.
func quoted(text string) string {
	const most = 60
	if r := []rune(text); len(r) > most {
		text = string(r[:most]) + "…"
	}
	return strconv.Quote(text)
}

// read parses text as a quantity of the dimension.
func read(text string, d *dimension, rule Rule) (reading, *Refusal) {
	s := &scanner{text: text, d: d, rule: rule}
	number, refusal := s.number()
	if refusal != nil {
		return reading{}, refusal
	}
	u, refusal := s.unit(number)
	if refusal != nil {
		return reading{}, refusal
	}
	v, ok := u.value(number)
	if !ok || v != 0 && (math.Abs(v) < smallest || math.Abs(v) > largest) {
		return reading{}, s.refuseAt(0, "a size between 1e-15 and 1e15 "+strings.TrimSuffix(d.coherent, "1"), "")
	}
	below, above, refusal := s.tolerance(v)
	if refusal != nil {
		return reading{}, refusal
	}
	r := reading{low: v - below, nominal: v, high: v + above, unit: u.written}
	return r, s.bounded(r)
}

// bounded refuses what the rule or nature does not allow, at the lowest corner.
func (s *scanner) bounded(r reading) *Refusal {
	if s.d == temperature && r.low < absoluteZero {
		return s.refuseAt(0, "a temperature above absolute zero, -273.15 °C", "")
	}
	if r.high > largest || r.low < -largest {
		return s.refuseAt(0, "a size between 1e-15 and 1e15 with its tolerance", "")
	}
	return s.signed(r.low, r.nominal)
}

func (s *scanner) signed(low, nominal float64) *Refusal {
	with := ""
	if low != nominal {
		with = " at the lowest corner of its tolerance too"
	}
	switch {
	case s.rule.Sign == Positive && low <= 0:
		return s.refuseAt(0, s.d.name+" above 0"+with, "")
	case s.rule.Sign == NotNegative && low < 0:
		return s.refuseAt(0, s.d.name+" of 0 or more"+with, "")
	}
	return nil
}

// space takes exactly one space of the grammar and tells whether it was there.
func (s *scanner) space() bool {
	r, n := utf8.DecodeRuneInString(s.rest())
	if r == ' ' || r == '\u00a0' || r == '\u202f' {
		s.at += n
		return true
	}
	return false
}

// digits takes a run of ASCII digits.
func (s *scanner) digits() string {
	start := s.at
	for s.at < len(s.text) && s.text[s.at] >= '0' && s.text[s.at] <= '9' {
		s.at++
	}
	return s.text[start:s.at]
}

// unsigned takes digits with decimals, or nothing. A point without digits behind it is left.
func (s *scanner) unsigned() string {
	start := s.at
	if s.digits() == "" {
		return ""
	}
	if mark := s.at; strings.HasPrefix(s.rest(), ".") {
		s.at++
		if s.digits() == "" {
			s.at = mark
		}
	}
	return s.text[start:s.at]
}

func (s *scanner) take(prefix string) bool {
	if !strings.HasPrefix(s.rest(), prefix) {
		return false
	}
	s.at += len(prefix)
	return true
}

// takeMinus takes a hyphen-minus or a minus sign.
func (s *scanner) takeMinus() bool { return s.take("-") || s.take("−") }

// number takes the number, or says what is nearly one.
func (s *scanner) number() (string, *Refusal) {
	if refusal := s.startsBadly(); refusal != nil {
		return "", refusal
	}
	s.takeMinus()
	if s.unsigned() == "" {
		return "", s.notANumber()
	}
	if mark := s.at; s.take("e") || s.take("E") {
		if !s.take("+") {
			s.take("-")
		}
		if s.digits() == "" {
			s.at = mark
		}
	}
	return s.text[:s.at], s.continuesBadly()
}

func (s *scanner) startsBadly() *Refusal {
	trimmed := strings.TrimSpace(s.text)
	switch {
	case len(s.text) > longest:
		return s.refuse(s.d.name+", a number and its unit", "")
	case !utf8.ValidString(s.text):
		return s.refuse("text in UTF-8", "")
	case trimmed == "":
		return s.refuse(s.d.name+", a number and its unit", "")
	case trimmed != s.text:
		return s.refuse("no space before or after", trimmed)
	case s.text[0] == '+':
		return s.refuse("a number without plus sign", s.text[1:])
	}
	return nil
}

// notANumber is why no digit stands where the number begins.
func (s *scanner) notANumber() *Refusal {
	rest := s.rest()
	word := strings.ToLower(rest)
	switch {
	case strings.HasPrefix(rest, ".") && len(rest) > 1 && isDigit(rest[1]):
		return s.refuse("a digit before the decimal point", s.text[:s.at]+"0"+rest)
	case strings.HasPrefix(rest, ",") && len(rest) > 1 && isDigit(rest[1]):
		return s.refuse("a decimal point with a digit before it", s.text[:s.at]+"0."+rest[1:])
	case strings.HasPrefix(word, "nan") || strings.HasPrefix(word, "inf") || strings.HasPrefix(word, "∞"):
		return s.refuse("a finite number", "")
	}
	return s.refuse(s.d.name+", a number and its unit", "")
}

func isDigit(b byte) bool { return b >= '0' && b <= '9' }

// continuesBadly is what is wrong right behind a number: a second separator, grouping, a letter for the decimal point.
func (s *scanner) continuesBadly() *Refusal {
	rest := s.rest()
	if rest == "" {
		return nil
	}
	next, size := utf8.DecodeRuneInString(rest)
	digitFollows := len(rest) > size && isDigit(rest[size])
	before := s.text[:s.at]
	switch {
	case next == '.' && strings.ContainsAny(before, "eE"):
		return s.refuse("an exponent without decimals", "")
	case next == '.' && !digitFollows:
		return s.refuse("a digit after the decimal point, or no point", before+rest[1:])
	case next == '.':
		return s.refuse("digits without grouping", withoutGrouping(s.text, "."))
	case next == ',' && digitFollows:
		return s.comma()
	case (next == '\'' || next == '’' || next == '_') && digitFollows:
		return s.refuse("digits without grouping", withoutGrouping(s.text, "'", "’", "_"))
	case (next == ' ' || next == '\u00a0' || next == '\u202f' || next == '\u2009') && digitFollows:
		return s.refuse("digits without grouping", withoutGrouping(s.text, " ", "\u00a0", "\u202f", "\u2009"))
	case (next == 'x' || next == 'X') && strings.TrimLeft(before, "-−") == "0":
		return s.hexadecimal()
	case unicode.IsLetter(next) && digitFollows && s.d.spelled[firstWord(rest)] == (unit{}):
		return s.letterForPoint(next, size)
	}
	return nil
}

// withoutGrouping drops the marks that stand between two digits. Only the first run of digits and marks is touched, so that
// the space before a unit stays.
func withoutGrouping(text string, marks ...string) string {
	for i := 1; i < len(text); i++ {
		for _, m := range marks {
			end := i + len(m)
			if strings.HasPrefix(text[i:], m) && end < len(text) && isDigit(text[i-1]) && isDigit(text[end]) {
				return withoutGrouping(text[:i]+text[end:], marks...)
			}
		}
	}
	return text
}

// comma tells a decimal comma from grouping. "4,700" may be either: both spellings are shown.
func (s *scanner) comma() *Refusal {
	point := s.text[:s.at] + "." + s.rest()[1:]
	after := &scanner{text: s.rest()[1:]}
	group := after.digits()
	switch {
	case strings.HasPrefix(after.rest(), ","), strings.Contains(s.text[:s.at], "."):
		return s.refuse("digits without grouping", withoutGrouping(s.text, ","))
	case len(group) == 3 && strings.HasPrefix(after.rest(), "."):
		return s.refuse("digits without grouping", withoutGrouping(s.text, ","))
	case len(group) == 3:
		return s.refuse("a decimal point, or digits without grouping: "+withoutGrouping(s.text, ",")+" or "+point, point)
	}
	return s.refuse("a decimal point", point)
}

func (s *scanner) hexadecimal() *Refusal {
	digits := s.rest()[1:]
	end := 0
	for end < len(digits) && strings.IndexByte("0123456789abcdefABCDEF", digits[end]) >= 0 {
		end++
	}
	example := ""
	if v, err := strconv.ParseUint(digits[:end], 16, 32); err == nil {
		example = s.text[:s.at-1] + strconv.FormatUint(v, 10) + digits[end:]
	}
	return s.refuse("a decimal number", example)
}

// letterForPoint is "4k7" or "4R7", as printed on components.
func (s *scanner) letterForPoint(letter rune, size int) *Refusal {
	prefix := string(letter)
	switch letter {
	case 'R', 'V', 'A', 'F', 'H', 'Ω':
		prefix = ""
	case 'K':
		prefix = "k"
	case 'u', 'μ':
		prefix = "µ"
	}
	whole := s.text[:s.at]
	s.at += size
	decimals := s.digits()
	example := ""
	if u, ok := s.d.spelled[prefix+s.d.shown]; ok {
		example = whole + "." + decimals + " " + u.written
	}
	s.at -= size + len(decimals)
	return s.refuse("a decimal point and the unit behind the number", example)
}

// firstWord is text up to the first space or sign.
func firstWord(text string) string {
	end := strings.IndexFunc(text, func(r rune) bool { return unicode.IsSpace(r) || strings.ContainsRune("±+-−", r) })
	if end < 0 {
		return text
	}
	return text[:end]
}
