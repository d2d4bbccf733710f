package registermap

import (
	"fmt"
	"math"

	"chargehand/commission/signal"
)

// EncodeError is a value that a point's registers cannot hold.
type EncodeError struct {
	Point Point
	Value float64 // in the signal's coherent unit
	Why   string
}

func (e *EncodeError) Error() string {
	return fmt.Sprintf("%s (%s): %v %s: %s", e.Point.Name, e.Point.Place(), e.Value, e.Point.Name.Unit(), e.Why)
}

// Encode gives the words, in wire order, that a device with this map sends for a value in the signal's coherent unit: the
// inverse of Decode, rounded to the nearest step of the register. A bit of a register comes as a word with all other bits
// 0, for the caller to join. The error is an EncodeError.
func (p Point) Encode(value float64) ([]uint16, error) {
	if math.IsNaN(value) || math.IsInf(value, 0) {
		return nil, &EncodeError{p, value, "not a number"}
	}
	raw, err := p.raw(value)
	if err != nil {
		return nil, err
	}
	if p.Table.HasBits() || p.Type == Bit {
		if raw = math.Round(raw); raw != 0 && raw != 1 {
			return nil, &EncodeError{p, value, "a bit is 0 or 1"}
		}
		if p.Table.HasBits() {
			return []uint16{uint16(raw)}, nil
		}
		return p.split(uint64(raw)<<p.BitNumber, 1), nil
	}
	n := p.Type.Words()
	switch p.Type {
	case F32:
		f := float32(raw)
		if math.IsInf(float64(f), 0) {
			return nil, &EncodeError{p, value, "does not fit into f32"}
		}
		return p.split(uint64(math.Float32bits(f)), n), nil
	case F64:
		return p.split(math.Float64bits(raw), n), nil
	}
	raw = math.RoundToEven(raw)
	low, high := p.Type.limits()
	if raw < low || raw >= high {
		return nil, &EncodeError{p, value, "does not fit into " + string(p.Type)}
	}
	if raw < 0 {
		return p.split(uint64(int64(raw)), n), nil
	}
	return p.split(uint64(raw), n), nil
}

// limits gives the least raw number of an integer type and the first beyond its greatest.
func (t Type) limits() (low, high float64) {
	size := 16 * t.Words()
	if t == I16 || t == I32 || t == I64 {
		return -math.Ldexp(1, size-1), math.Ldexp(1, size-1)
	}
	return 0, math.Ldexp(1, size)
}

// raw turns a value in the coherent unit into the raw number, not rounded.
func (p *Point) raw(value float64) (float64, error) {
	if p.Values != nil {
		least, found := int64(math.MaxInt64), false
		for raw, v := range p.Values {
			if v == value && raw <= least { // the least of several, so that the answer does not depend on the map's order
				least, found = raw, true
			}
		}
		if !found {
			return 0, &EncodeError{*p, value, "none of the values the map lists"}
		}
		return float64(least), nil
	}
	v := value / orOne(p.UnitFactor)
	if p.SignReversed {
		v = -v
	}
	return (v - p.Offset) / orOne(p.Scale), nil
}

// Raw gives the number to key in for a value in the signal's coherent unit, rounded to the register's step. ok is false
// where the map lacks the signal, its registers cannot hold the value, or they hold it as a float or a bit.
func (m Map) Raw(n signal.Name, value float64) (raw int64, ok bool) {
	p, ok := m.Find(n)
	if !ok || p.Type == F32 || p.Type == F64 || p.Type == Bit || p.Table.HasBits() {
		return 0, false
	}
	words, err := p.Encode(value)
	if err != nil {
		return 0, false
	}
	_, raw = p.number(words)
	return raw, true
}
