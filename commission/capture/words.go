package capture

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
)

// A channel's Type says how its raw words become a value: the register type, then what differs from the ordinary.
//
//	u16 i16 u32 i32 u64 i64 f32 f64    words high first, high byte first within a word
//	bit                                one coil, or the least significant bit of the word
//	bit 5                              bit 5 of the word
//	u32 low-first                      low word first
//	u16 bytes-low-first                low byte first within a word
//	u16 0=0 3=1 7=2                    raw number to value, as of the signal mode
//
// A map's sign_reversed is in the signs of Scale and Offset: value = raw · Scale + Offset.

// decode gives the value of raw words.
func decode(kind string, scale, offset float64, raw []uint16) (float64, error) {
	words := strings.Fields(kind)
	if len(words) == 0 {
		return 0, fmt.Errorf("no register type")
	}
	ordered, values, bit := slices.Clone(raw), map[int64]float64{}, 0
	for _, word := range words[1:] {
		switch from, to, isValue := strings.Cut(word, "="); {
		case word == "low-first":
			slices.Reverse(ordered)
		case word == "bytes-low-first":
			for i, w := range ordered {
				ordered[i] = w<<8 | w>>8
			}
		case isValue:
			key, err1 := strconv.ParseInt(from, 10, 64)
			value, err2 := strconv.ParseFloat(to, 64)
			if err1 != nil || err2 != nil {
				return 0, fmt.Errorf("register type %q: %q is not raw=value", kind, word)
			}
			values[key] = value
		default:
			n, err := strconv.Atoi(word)
			if err != nil || words[0] != "bit" || n < 0 || n > 15 {
				return 0, fmt.Errorf("register type %q: %q is not known", kind, word)
			}
			bit = n
		}
	}
	number, err := plain(words[0], bit, ordered)
	if err != nil {
		return 0, err
	}
	if len(values) > 0 {
		value, known := values[int64(number)]
		if !known {
			return 0, fmt.Errorf("raw number %g has no value in %q", number, kind)
		}
		return value, nil
	}
	if words[0] == "bit" {
		return number, nil
	}
	return number*scale + offset, nil
}

// plain gives the number that the words of one register type stand for.
func plain(kind string, bit int, raw []uint16) (float64, error) {
	width := map[string]int{"u16": 1, "i16": 1, "bit": 1, "u32": 2, "i32": 2, "f32": 2, "u64": 4, "i64": 4, "f64": 4}[kind]
	if width == 0 {
		return 0, fmt.Errorf("register type %q is not known", kind)
	}
	if len(raw) != width {
		return 0, fmt.Errorf("%d words, register type %s takes %d", len(raw), kind, width)
	}
	var all uint64
	for _, w := range raw {
		all = all<<16 | uint64(w)
	}
	switch kind {
	case "i16":
		return float64(int16(all)), nil
	case "i32":
		return float64(int32(all)), nil
	case "i64":
		return float64(int64(all)), nil
	case "f32":
		return float64(math.Float32frombits(uint32(all))), nil
	case "f64":
		return math.Float64frombits(all), nil
	case "bit":
		return float64(all >> bit & 1), nil
	}
	return float64(all), nil
}

// wordsOf is a value as four f64 words: how a reading that came from no register is kept without loss.
func wordsOf(v float64) []uint16 {
	b := math.Float64bits(v)
	return []uint16{uint16(b >> 48), uint16(b >> 32), uint16(b >> 16), uint16(b)}
}
