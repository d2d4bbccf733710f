package registermap

import (
	"cmp"
	"slices"
)

// Register is one register, or one bit, of one unit.
type Register struct {
	UnitID  uint8
	Table   Table
	Address Address
}

// Words are registers that were read, in one poll; a bit is a word of 0 or 1. What the device refused is not in it.
type Words map[Register]uint16

// Put enters the words of a span, from its first register on.
func (w Words) Put(s Span, words []uint16) {
	for i, v := range words {
		w[Register{s.UnitID, s.Table, s.Address + Address(i)}] = v
	}
}

// Of gives a point's own words. ok is false unless all of them were read.
func (w Words) Of(p Point, own uint8) (words []uint16, ok bool) {
	words = make([]uint16, p.Words())
	for i := range words {
		at := int(p.Address) + i
		v, ok := w[Register{p.unit(own), p.Table, Address(at)}]
		if !ok || at > 65535 {
			return nil, false
		}
		words[i] = v
	}
	return words, true
}

// reach is how far from a signal's registers its mistakes are looked for. Nothing beyond is ever read.
const reach = 3

// Neighbourhood gives the registers to read when a map is in doubt: those of its signals, three to each side of each, and the
// same places of the sister table (input for holding, discrete for coil). Spans do not overlap and keep to the map's
// max_block.
func (m Map) Neighbourhood(own uint8) []Span {
	var near []Span
	for _, p := range m.Points {
		from := max(0, int(p.Address)-reach)
		to := min(65536, int(p.Address)+p.Words()+reach)
		for _, t := range []Table{p.Table, p.Table.sister()} {
			near = append(near, Span{p.unit(own), t, Address(from), to - from})
		}
	}
	slices.SortFunc(near, func(a, b Span) int {
		return cmp.Or(cmp.Compare(a.UnitID, b.UnitID), cmp.Compare(a.Table, b.Table), cmp.Compare(a.Address, b.Address))
	})
	var spans []Span
	for _, s := range near {
		spans = m.addSpan(spans, s)
	}
	return spans
}

// addSpan joins a span to the last one where they touch, or adds what of it is not read yet.
func (m Map) addSpan(spans []Span, s Span) []Span {
	most, _ := m.limits(s.Table, Limits{})
	if n := len(spans); n > 0 && spans[n-1].UnitID == s.UnitID && spans[n-1].Table == s.Table && int(s.Address) <= spans[n-1].end() {
		last := &spans[n-1]
		if s.end() <= last.end() {
			return spans
		}
		room := min(most-last.Quantity, s.end()-last.end())
		last.Quantity += room
		s = Span{s.UnitID, s.Table, Address(last.end()), s.end() - last.end()}
	}
	for s.Quantity > 0 {
		part := s
		part.Quantity = min(most, s.Quantity)
		spans = append(spans, part)
		s.Address += Address(part.Quantity)
		s.Quantity -= part.Quantity
	}
	return spans
}

// sister is the table that device lists mix up with this one.
func (t Table) sister() Table {
	switch t {
	case Holding:
		return Input
	case Input:
		return Holding
	case Coil:
		return Discrete
	}
	return Coil
}
