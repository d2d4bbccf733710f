package registermap

import (
	"fmt"
	"math"
)

// Decodings gives what a signal reads as the map has it, first, and with each single line of the map changed: the neighbouring
// addresses, the sister table, other types, orders, scales and signs. Readings that no plant has are left out, and so are
// registers that were not read. Value is 0 for the first where the map's own reading has none.
func Decodings(p Point, own uint8, w Words) []Hypothesis {
	first := Hypothesis{Point: p}
	if words, ok := w.Of(p, own); ok {
		first.Value = p.Decode(words).Value
	}
	list := []Hypothesis{first}
	for _, v := range variations(p) {
		h := v.apply(Hypothesis{Point: p})
		words, ok := w.Of(h.Point, own)
		if !ok || !h.makesSense() {
			continue
		}
		if r := h.Point.Decode(words); r.Quality.HasValue() && isOrdinary(r.Value) {
			h.Value = r.Value
			list = append(list, h)
		}
	}
	return list
}

// isOrdinary leaves out floats that come of words which are none: next to nothing, or beyond any plant.
func isOrdinary(v float64) bool {
	return v == 0 || math.Abs(v) > 1e-6 && math.Abs(v) < 1e10
}

// Hint says what is odd about a signal's words by themselves, with nothing to compare them with; "" for nothing.
func Hint(p Point, words []uint16) string {
	if len(words) != p.Words() || p.Table.HasBits() {
		return ""
	}
	raw, _ := p.number(words)
	switch {
	case (p.Type == F32 || p.Type == F64) && !isOrdinary(raw) || math.IsNaN(raw):
		q := p
		q.WordOrder = LowFirst
		if p.WordOrder == LowFirst {
			q.WordOrder = HighFirst
		}
		if other, _ := q.number(words); isOrdinary(other) && other != 0 {
			return fmt.Sprintf("%s is no usual number in this word order, and %.6g in the other", Hex(words), other)
		}
		return fmt.Sprintf("%s is no usual number as %s", Hex(words), p.Type)
	case (p.Type == U32 || p.Type == I32) && raw != 0 && math.Mod(raw, 65536) == 0:
		return fmt.Sprintf("%s is a multiple of 65536: perhaps its words are swapped", Hex(words))
	}
	for _, code := range usualMissing(p.Type) {
		if Hex(code) == Hex(words) {
			return fmt.Sprintf("%s is what many devices send for 'no value'", Hex(words))
		}
	}
	return ""
}
