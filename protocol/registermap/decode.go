package registermap

import (
	"fmt"
	"math"
	"math/bits"
	"slices"
	"strconv"
	"strings"

	"chargehand/commission/signal"
)

// Words is how many registers, or bits of a bit table, the point takes.
func (p Point) Words() int { return p.width() }

func (p *Point) width() int {
	if p.Table.HasBits() {
		return 1
	}
	return p.Type.Words()
}

// Decode turns the words of a point, in wire order, into a reading; a bit of a coil or discrete table is a word of 0 or 1.
// All words of the point must be there, and stay as they are: the reading keeps them as Raw. A reading without a value says
// why; its time is left to the caller. The code for 'no value' is compared first, before sign and scale; then value =
// raw · scale + offset, with the sign reversed after both.
func (p Point) Decode(words []uint16) signal.Reading { return p.decode(words) }

// decode and what it calls take the point by reference: it is large, and decoding is the most frequent thing done here.
func (p *Point) decode(words []uint16) (r signal.Reading) {
	r.Name, r.Quality, r.Raw = p.Name, signal.Bad, words
	if len(words) != p.width() {
		r.Why = fmt.Sprintf("%d of %d words came", len(words), p.Words())
		return r
	}
	if p.isMissing(words) {
		r.Quality, r.Why = signal.Missing, fmt.Sprintf("the device sent %s, its code for 'no value'", Hex(words))
		return r
	}
	raw, whole := p.number(words)
	if p.Values != nil {
		v, known := p.Values[whole]
		if !known {
			r.Why = fmt.Sprintf("%d is none of the values the map lists", whole)
			return r
		}
		r.Quality, r.Value = signal.Good, v
		return r
	}
	if math.IsNaN(raw) || math.IsInf(raw, 0) {
		r.Why = fmt.Sprintf("%s is not a number as %s", Hex(words), p.Type)
		return r
	}
	stated := p.scaled(raw)
	if p.Range != nil && (stated < p.Range[0] || stated > p.Range[1]) {
		r.Why = fmt.Sprintf("%s is outside the plausible range %s to %s", p.stated(stated), p.stated(p.Range[0]),
			p.stated(p.Range[1]))
		return r
	}
	value := stated * orOne(p.UnitFactor)
	if math.IsInf(value, 0) {
		r.Why = fmt.Sprintf("%s is too large with this scale", Hex(words))
		return r
	}
	r.Quality, r.Value = signal.Good, value
	return r
}

func (p *Point) isMissing(words []uint16) bool {
	for _, m := range p.Missing {
		if slices.Equal(m, words) {
			return true
		}
	}
	return false
}

// scaled gives the value in the stated unit.
func (p *Point) scaled(raw float64) float64 {
	v := times(raw, orOne(p.Scale)) + p.Offset
	if p.SignReversed {
		return 0 - v // no negative zero
	}
	return v
}

// times multiplies by a scale as the map writes it: 7124 · 0.1 is 712.4, although 0.1 has no exact binary form.
func times(raw, scale float64) float64 {
	if inverse := math.Round(1 / scale); scale < 1 && scale > 0 && 1/inverse == scale {
		return raw / inverse
	}
	return raw * scale
}

func (p *Point) stated(v float64) string {
	s := strconv.FormatFloat(v, 'g', 10, 64)
	if p.Unit != "" {
		s += " " + p.Unit
	}
	return s
}

// orOne reads a factor that is not stated as 1.
func orOne(f float64) float64 {
	if f == 0 {
		return 1
	}
	return f
}

// number gives the raw number, and as an integer where the type is one. A 64 bit integer beyond 2^53 loses its last digits
// as a float64; as an integer u64 wraps above 2^63.
func (p *Point) number(words []uint16) (raw float64, whole int64) {
	if p.Table.HasBits() {
		whole = int64(words[0] & 1)
		return float64(whole), whole
	}
	u := p.assemble(words)
	switch p.Type {
	case I16:
		whole = int64(int16(u))
	case I32:
		whole = int64(int32(u))
	case I64:
		whole = int64(u)
	case U64:
		return float64(u), int64(u)
	case F32:
		return float64(math.Float32frombits(uint32(u))), 0
	case F64:
		return math.Float64frombits(u), 0
	case Bit:
		whole = int64(u >> p.BitNumber & 1)
	default:
		whole = int64(u)
	}
	return float64(whole), whole
}

// assemble joins words in wire order to one number, most significant first.
func (p *Point) assemble(words []uint16) uint64 {
	var u uint64
	for i := range words {
		w := words[i]
		if p.WordOrder == LowFirst {
			w = words[len(words)-1-i]
		}
		if p.ByteOrder == LowFirst {
			w = bits.ReverseBytes16(w)
		}
		u = u<<16 | uint64(w)
	}
	return u
}

// split is the inverse of assemble.
func (p *Point) split(u uint64, n int) []uint16 {
	words := make([]uint16, n)
	for i := range words {
		w := uint16(u >> (16 * (n - 1 - i)))
		if p.ByteOrder == LowFirst {
			w = bits.ReverseBytes16(w)
		}
		words[i] = w
	}
	if p.WordOrder == LowFirst {
		slices.Reverse(words)
	}
	return words
}

// Hex writes words as they stand on the wire: "8000", "47F1 2000".
func Hex(words []uint16) string {
	s := make([]string, len(words))
	for i, w := range words {
		s[i] = fmt.Sprintf("%04X", w)
	}
	return strings.Join(s, " ")
}

// Number gives the raw number of a point's words, before scale and sign; 0 where not all words are there.
func (p Point) Number(words []uint16) float64 {
	if len(words) != p.Words() {
		return 0
	}
	raw, _ := p.number(words)
	return raw
}
