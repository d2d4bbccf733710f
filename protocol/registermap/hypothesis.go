package registermap

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"chargehand/commission/signal"
)

// Change is one line of a map that would have to read otherwise.
type Change struct {
	Key      string // "address", "table", "type", "scale", "word_order", "byte_order", "sign_reversed", "bit", "missing"
	From, To string // as the map file writes them
}

// Line is the map file's line after the change.
func (c Change) Line() string { return c.Key + " = " + c.To }

// Hypothesis is another way of reading a signal.
type Hypothesis struct {
	Point   Point    // the signal as it would stand in the map
	Changes []Change // against the map; none for the map as it is
	Value   float64  // what the last sample reads so, in the signal's coherent unit
}

// Lines are the map's lines to change for this signal, as text.
func (h Hypothesis) Lines() []string {
	lines := make([]string, len(h.Changes))
	for i, c := range h.Changes {
		lines[i] = c.Line()
		if c.Key == "address" {
			lines[i] += fmt.Sprintf("   # reference = %q", h.Point.Reference())
		}
	}
	return lines
}

func (h Hypothesis) String() string {
	if len(h.Changes) == 0 {
		return fmt.Sprintf("%s: as the map has it", h.Point.Name)
	}
	var s []string
	for _, c := range h.Changes {
		s = append(s, c.Line())
	}
	return fmt.Sprintf("%s: %s", h.Point.Name, strings.Join(s, ", "))
}

// has tells whether one of the changes is the given one.
func (h Hypothesis) has(c Change) bool { return slices.Contains(h.Changes, c) }

// scales are the usual mistakes of scale.
var scales = []float64{10, 0.1, 100, 0.01, 1000, 0.001}

// numberTypes are all types but the bit.
var numberTypes = []Type{U16, I16, U32, I32, U64, I64, F32, F64}

// hypotheses gives every way to read a signal that differs from the map in two lines at most (with three changes at once
// something fits nearly anything): the neighbouring address (or up
// to three away, if that is all), the sister table, the type, the orders, the scale, the sign; of a bit, its number.
func hypotheses(p Point) []Hypothesis {
	single := variations(p)
	all := []Hypothesis{{Point: p}}
	for i, a := range single {
		all = append(all, a.apply(Hypothesis{Point: p}))
		for _, b := range single[i+1:] {
			if a.change.Key == b.change.Key || a.alone || b.alone {
				continue
			}
			all = append(all, b.apply(a.apply(Hypothesis{Point: p})))
		}
	}
	return slices.DeleteFunc(all, func(h Hypothesis) bool { return !h.makesSense() })
}

// variation is one change and how to make it.
type variation struct {
	change Change
	set    func(*Point)
	alone  bool // not to be joined with another
}

func (v variation) apply(h Hypothesis) Hypothesis {
	v.set(&h.Point)
	h.Changes = append(slices.Clone(h.Changes), v.change)
	return h
}

// variations gives every single change, the likeliest first.
func variations(p Point) []variation {
	var v []variation
	add := func(key, from, to string, set func(*Point)) {
		if from != to {
			v = append(v, variation{change: Change{key, from, to}, set: set})
		}
	}
	for _, off := range []int{-1, 1, -2, 2, -3, 3} {
		a := int(p.Address) + off
		if a < 0 || a > 65535 {
			continue
		}
		add("address", strconv.Itoa(int(p.Address)), strconv.Itoa(a), func(q *Point) { q.Address = Address(a) })
		v[len(v)-1].alone = off < -1 || off > 1
	}
	add("table", quoted(p.Table), quoted(p.Table.sister()), func(q *Point) { q.Table = p.Table.sister() })
	if p.Table.HasBits() {
		return v
	}
	if p.Type == Bit {
		for n := range 16 {
			add("bit", strconv.Itoa(p.BitNumber), strconv.Itoa(n), func(q *Point) { q.BitNumber = n })
		}
		return v
	}
	for _, o := range []Order{HighFirst, LowFirst} {
		add("word_order", quoted(orHigh(p.WordOrder)), quoted(o), func(q *Point) { q.WordOrder = o })
	}
	if p.Values == nil {
		for _, f := range scales {
			to := roundScale(orOne(p.Scale) * f)
			add("scale", number(orOne(p.Scale)), number(to), func(q *Point) { q.Scale = to })
		}
		add("sign_reversed", strconv.FormatBool(p.SignReversed), strconv.FormatBool(!p.SignReversed),
			func(q *Point) { q.SignReversed = !p.SignReversed })
	}
	for _, t := range numberTypes {
		if p.Values != nil && (t == F32 || t == F64) {
			continue
		}
		add("type", quoted(p.Type), quoted(t), func(q *Point) { q.Type = t })
	}
	for _, o := range []Order{HighFirst, LowFirst} {
		add("byte_order", quoted(orHigh(p.ByteOrder)), quoted(o), func(q *Point) { q.ByteOrder = o })
	}
	return v
}

// makesSense leaves out what changes nothing or cannot be.
func (h Hypothesis) makesSense() bool {
	p := h.Point
	isFloat := p.Type == F32 || p.Type == F64
	for _, c := range h.Changes {
		switch {
		case c.Key == "word_order" && p.Type.Words() == 1:
			return false
		case c.Key == "address" && int(p.Address)+p.Words() > 65536:
			return false
		}
	}
	// With the type, the missing codes of another width lose their meaning.
	if isFloat && len(p.Values) > 0 {
		return false
	}
	return true
}

func orHigh(o Order) Order {
	if o == "" {
		return HighFirst
	}
	return o
}

func quoted[T ~string](s T) string { return strconv.Quote(string(s)) }

func number(f float64) string { return strconv.FormatFloat(f, 'g', -1, 64) }

// roundScale takes off what binary multiplication leaves behind the figures that a map would state.
func roundScale(f float64) float64 {
	r, err := strconv.ParseFloat(strconv.FormatFloat(f, 'g', 12, 64), 64)
	if err != nil {
		return f
	}
	return r
}

// Expected is what a signal ought to read, from the site as it stands or a hand meter.
type Expected struct {
	Value     float64 // in the signal's coherent unit
	Tolerance float64 // the reference's own, in the same unit
}

// leastTolerance is the share of the value within which a reading agrees. At 1 % a float read one register off in the other
// word order still agrees: its high word alone fixes it to 0.8 %.
const leastTolerance = 0.001

// agrees tells whether a reading is the expected one: within 0.1 %, or within half a step of the register and the reference's
// own tolerance together.
func (e Expected) agrees(p Point, value float64) bool {
	step := 0.0
	if p.Type != F32 && p.Type != F64 {
		step = math.Abs(orOne(p.Scale) * orOne(p.UnitFactor))
	}
	tolerance := max(leastTolerance*math.Abs(e.Value), (step/2+e.Tolerance)*(1+1e-9))
	return math.Abs(value-e.Value) <= tolerance
}

// Sample is one poll of a neighbourhood, with what some signals ought to read at that time.
type Sample struct {
	Words    Words
	Expected map[signal.Name]Expected
}

// usualMissing are the codes that devices send for 'no value', by common practice.
func usualMissing(t Type) [][]uint16 {
	switch t {
	case U16:
		return [][]uint16{{0xFFFF}}
	case I16:
		return [][]uint16{{0x8000}}
	case U32:
		return [][]uint16{{0xFFFF, 0xFFFF}}
	case I32:
		return [][]uint16{{0x8000, 0}, {0, 0x8000}}
	case U64:
		return [][]uint16{{0xFFFF, 0xFFFF, 0xFFFF, 0xFFFF}}
	case I64:
		return [][]uint16{{0x8000, 0, 0, 0}, {0, 0, 0, 0x8000}}
	}
	return nil
}
