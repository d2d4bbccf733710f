package quantity

import "strings"

// unit takes the unit behind the number, or says what is wrong with it.
func (s *scanner) unit(number string) (unit, *Refusal) {
	spaced := s.space()
	word := firstWord(s.rest())
	if u, ok := s.d.spelled[word]; ok {
		s.at += len(word)
		return u, nil
	}
	if word == "" {
		if first := strings.TrimSpace(s.rest()); spaced && first != s.rest() && first != "" {
			return unit{}, s.refuse("one space between number and unit", strings.Join(strings.Fields(s.text), " "))
		}
		return unit{}, s.refuse("a unit: "+s.d.list(), s.withUnit(number))
	}
	return unit{}, s.refuseUnit(number, word)
}

// withUnit is the number in the dimension's usual unit. A ratio without unit may be meant as a fraction, so its number is not
// repeated with "%".
func (s *scanner) withUnit(number string) string {
	if s.d == ratio {
		return s.example()
	}
	if s.d == errorBound || s.d == droopUnits {
		return number + " %"
	}
	return number + " " + s.d.shown
}

// refuseUnit explains a unit that the dimension has not.
func (s *scanner) refuseUnit(number, word string) *Refusal {
	behind := s.rest()[len(word):]
	switch word {
	case "kA²s", "kA2s", "kA^2s":
		if s.d == joule {
			return s.refuse("A²s, because kA²s may mean 10³ A²s or 10⁶ A²s", kilo(number)+" A²s"+behind)
		}
	}
	if near, ok := s.d.respelled(word); ok {
		return s.refuse("the unit as "+near, number+" "+near+behind)
	}
	for _, other := range dimensions {
		if _, ok := other.spelled[word]; ok && other != s.d {
			return s.refuse(s.d.name+" in "+s.d.list()+", not "+other.name, "")
		}
	}
	return s.refuse("a unit that is one of "+s.d.list(), "")
}

// kilo is a thousand times a number that was typed without exponent; else the number in words of its exponent.
func kilo(number string) string {
	if strings.ContainsAny(number, "eE") {
		return number
	}
	whole, decimals, _ := strings.Cut(number, ".")
	for len(decimals) < 3 {
		decimals += "0"
	}
	whole = strings.TrimLeft(whole+decimals[:3], "0")
	if whole == "" {
		whole = "0"
	}
	if tail := strings.TrimRight(decimals[3:], "0"); tail != "" {
		return whole + "." + tail
	}
	return whole
}

// respelled finds the one unit that a word means when its case, or a common way of writing it, is not held against it.
func (d *dimension) respelled(word string) (written string, ok bool) {
	plain := strings.NewReplacer("Ohms", "ohm", "ohms", "ohm", "º", "°", "^", "", "sec", "s", "Volts", "V", "volts", "V", "Volt", "V",
		"volt", "V", "Amps", "A", "amps", "A", "Amp", "A", "amp", "A", "hrs", "h", "hr", "h", "mins", "min").Replace(word)
	if u, ok := d.spelled[plain]; ok {
		return u.written, true
	}
	if d == temperature && plain == "C" {
		return "°C", true
	}
	for spelling, u := range d.spelled {
		if !strings.EqualFold(spelling, plain) {
			continue
		}
		if written != "" && written != u.written {
			return "", false // mΩ or MΩ
		}
		written = u.written
	}
	return written, written != ""
}
