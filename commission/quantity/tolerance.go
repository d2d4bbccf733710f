package quantity

import "strings"

// side is one side of a tolerance as typed.
type side struct {
	amount string
	at     int // for messages
}

// tolerance takes what stands behind the unit and gives the distances below and above the nominal value, in the coherent
// unit; both 0 where nothing stands there.
func (s *scanner) tolerance(nominal float64) (below, above float64, refusal *Refusal) {
	if s.rest() == "" {
		return 0, 0, nil
	}
	value := s.text[:s.at]
	spaced := s.space()
	if refusal := s.isTolerance(value, spaced); refusal != nil {
		return 0, 0, refusal
	}
	low, high, refusal := s.sides()
	if refusal != nil {
		return 0, 0, refusal
	}
	s.space()
	u, relative, refusal := s.toleranceUnit(nominal)
	if refusal != nil {
		return 0, 0, refusal
	}
	for _, one := range []struct {
		side  side
		value *float64
	}{{low, &below}, {high, &above}} {
		v, ok := u.value(one.side.amount)
		switch {
		case !ok || v > largest:
			return 0, 0, s.refuseAt(one.side.at, "a smaller tolerance", "")
		case relative && v > 1:
			return 0, 0, s.refuseAt(one.side.at, "a tolerance of at most 100 %", "")
		case relative:
			v *= max(nominal, -nominal)
		}
		*one.value = v
	}
	if s.rest() != "" {
		return 0, 0, s.refuse("nothing behind the tolerance", s.text[:s.at])
	}
	return below, above, nil
}

// isTolerance refuses what cannot begin one.
func (s *scanner) isTolerance(value string, spaced bool) *Refusal {
	rest := s.rest()
	begins := strings.HasPrefix(rest, "±") || strings.HasPrefix(rest, "+") || strings.HasPrefix(rest, "-") || strings.HasPrefix(rest, "−")
	switch {
	case begins && !s.rule.Tolerance:
		return s.refuse("no tolerance: an error or a limit stands in full", value)
	case begins && spaced:
		return nil
	case begins:
		return s.refuse("a space before the tolerance", value+" "+rest)
	case !s.rule.Tolerance:
		return s.refuse("nothing behind the unit", value)
	case strings.TrimSpace(rest) != rest:
		return s.refuse("one space before the tolerance", value+" "+strings.TrimSpace(rest))
	case rest != "" && isDigit(rest[0]):
		return s.refuse("± before the tolerance", value+" ±"+rest)
	}
	return s.refuse("a tolerance, or nothing, behind the unit", value+" ±5 "+s.toleranceExample())
}

func (s *scanner) toleranceExample() string {
	if s.d.tolerant != "" {
		return s.d.tolerant
	}
	return "%"
}

// sides takes the amounts without their unit.
func (s *scanner) sides() (low, high side, refusal *Refusal) {
	if s.take("±") || s.take("+/-") || s.take("+-") {
		s.space()
		both, refusal := s.amount()
		return both, both, refusal
	}
	lowFirst := s.takeMinus()
	if !lowFirst {
		s.take("+")
	}
	first, refusal := s.amount()
	if refusal != nil {
		return side{}, side{}, refusal
	}
	mark := s.at
	s.space()
	if !s.take("/") {
		s.at = mark
		return side{}, side{}, s.refuse("both sides of the tolerance", s.text[:first.at-1]+"-"+first.amount+"/+"+first.amount+s.rest())
	}
	s.space()
	if lowFirst && !s.take("+") || !lowFirst && !s.takeMinus() {
		return side{}, side{}, s.refuse("one side with - and the other with +", "-"+first.amount+"/+"+first.amount+" %")
	}
	second, refusal := s.amount()
	if lowFirst {
		return first, second, refusal
	}
	return second, first, refusal
}

func (s *scanner) amount() (side, *Refusal) {
	at := s.at
	amount := s.unsigned()
	rest := s.rest()
	before := s.text[:at]
	switch {
	case amount == "" && len(rest) > 1 && (rest[0] == '.' || rest[0] == ',') && isDigit(rest[1]):
		return side{}, s.refuse("a digit before the decimal point", before+"0."+rest[1:])
	case amount == "" && (strings.HasPrefix(rest, "-") || strings.HasPrefix(rest, "−")):
		return side{}, s.refuse("a tolerance that is not negative", before+strings.TrimLeft(rest, "-−"))
	case amount == "":
		return side{}, s.refuse("a number in the tolerance", before+"5 "+s.toleranceExample())
	case len(rest) > 1 && rest[0] == ',' && isDigit(rest[1]):
		return side{}, s.refuse("a decimal point", before+amount+"."+rest[1:])
	case strings.HasPrefix(rest, "."):
		return side{}, s.refuse("a digit after the decimal point, or no point", before+amount+rest[1:])
	}
	return side{amount, at}, nil
}

// toleranceUnit takes the tolerance's unit; relative means a fraction of the nominal's magnitude.
func (s *scanner) toleranceUnit(nominal float64) (u unit, relative bool, refusal *Refusal) {
	word := firstWord(s.rest())
	before := s.text[:s.at]
	own, isOwn := s.d.spelled[word]
	switch {
	case word == "":
		return unit{}, false, s.refuse("a unit of the tolerance", strings.TrimRight(before, " \u00a0\u202f")+" "+s.toleranceExample())
	case s.d.tolerant == word:
		s.at += len(word)
		return decimal(word, s.d.units[0].exponent), false, nil
	case s.d.tolerant != "":
		return unit{}, false, s.refuse("the tolerance of "+s.d.name+" in "+s.d.tolerant, before+s.d.tolerant)
	case word == "%" && nominal == 0:
		return unit{}, false, s.refuse("a tolerance in a unit, since per cent of 0 is 0", before+s.d.shown)
	case word == "%":
		s.at += len(word)
		return decimal("%", -2), true, nil
	case isOwn:
		s.at += len(word)
		return own, false, nil
	case word == "points":
		return unit{}, false, s.refuse("a tolerance in % or a unit; points are for a value in %", before+"%")
	}
	return unit{}, false, s.refuse("a tolerance in % or one of "+s.d.list(), before+"%")
}
