package simulator

import (
	"math"

	"chargehand/protocol/registermap"
)

// encode writes a value in the signal's own unit as the words of a point, in wire order. A value beyond the type's range
// stays at its end, as a device's does. The map's own reader is not used, so that each checks the other.
func encode(p registermap.Point, value float64) []uint16 {
	if p.SignReversed {
		value = -value
	}
	scale, factor := p.Scale, p.UnitFactor
	if scale == 0 {
		scale = 1
	}
	if factor == 0 {
		factor = 1
	}
	raw := (value/factor - p.Offset) / scale
	if p.Values != nil {
		for number, meaning := range p.Values {
			if meaning == value {
				raw = float64(number)
			}
		}
	}
	return words(p, bits(p.Type, raw))
}

// bits of a raw number in its type, right-aligned.
func bits(t registermap.Type, raw float64) uint64 {
	switch t {
	case registermap.F32:
		return uint64(math.Float32bits(float32(raw)))
	case registermap.F64:
		return math.Float64bits(raw)
	}
	width := uint(16 * t.Words())
	whole := math.RoundToEven(raw)
	switch t {
	case registermap.I16, registermap.I32, registermap.I64:
		top := math.Ldexp(1, int(width)-1)
		if whole >= top {
			return 1<<(width-1) - 1
		}
		return uint64(int64(math.Max(whole, -top)))
	}
	if whole >= math.Ldexp(1, int(width)) {
		return math.MaxUint64 >> (64 - width)
	}
	return uint64(math.Max(whole, 0))
}

// words puts the bits of a value into registers in the point's order.
func words(p registermap.Point, b uint64) []uint16 {
	n := p.Type.Words()
	list := make([]uint16, n)
	for k := range list {
		w := uint16(b >> (16 * (n - 1 - k)))
		if p.ByteOrder == registermap.LowFirst {
			w = w>>8 | w<<8
		}
		at := k
		if p.WordOrder == registermap.LowFirst {
			at = n - 1 - k
		}
		list[at] = w
	}
	return list
}
