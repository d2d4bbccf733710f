package registermap

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strings"
	"time"

	"chargehand/commission/signal"
)

// Span is a row of registers or bits of one table of one unit.
type Span struct {
	UnitID   uint8
	Table    Table
	Address  Address
	Quantity int
}

func (s Span) end() int { return int(s.Address) + s.Quantity }

// Covers tells whether the span holds all of another.
func (s Span) Covers(o Span) bool {
	return s.UnitID == o.UnitID && s.Table == o.Table && s.Address <= o.Address && s.end() >= o.end()
}

func (s Span) String() string {
	first := Reference(s.Table, s.Address)
	if s.Quantity == 1 {
		return fmt.Sprintf("%s %d (%s), unit %d", s.Table, s.Address, first, s.UnitID)
	}
	last := Address(s.end() - 1)
	return fmt.Sprintf("%s %d to %d (%s to %s), unit %d", s.Table, s.Address, last, first, Reference(s.Table, last), s.UnitID)
}

// Block is one request and the points it answers, by their position in the map.
type Block struct {
	Span
	Points []int
}

// Words gives a point's own words out of the block's.
func (b Block) Words(p Point, words []uint16) []uint16 {
	from := int(p.Address) - int(b.Address)
	if from < 0 || from+p.Words() > len(words) {
		return nil
	}
	return words[from : from+p.Words()]
}

// Plan is the requests of one poll.
type Plan struct {
	Blocks []Block
}

// Limits are what a device's requests must keep to beside its map.
type Limits struct {
	UnitID   uint8         // the device's own, for points that name none
	MaxBlock int           // registers, learned from refusals; 0 for the map's
	Refused  []Span        // no request may cover one of these
	Only     []signal.Name // all signals where empty
}

// mostBits is the most bits a request may ask for (MODBUS Application Protocol V1.1b3, 6.1).
const mostBits = 2000

// Plan gives the fewest requests that read the points whole, under the map's max_block and max_gap; of several such plans,
// the one that reads the fewest registers. A value is never split over two requests. Limits of bit tables are sixteen
// times those of registers.
func (m Map) Plan(l Limits) Plan {
	groups := map[Span][]int{} // by unit and table
	var order []Span
	for i, p := range m.Points {
		if len(l.Only) > 0 && !slices.Contains(l.Only, p.Name) {
			continue
		}
		key := Span{UnitID: p.unit(l.UnitID), Table: p.Table}
		if groups[key] == nil {
			order = append(order, key)
		}
		groups[key] = append(groups[key], i)
	}
	var plan Plan
	for _, key := range order {
		plan.Blocks = append(plan.Blocks, m.join(key, groups[key], l)...)
	}
	return plan
}

func (p Point) unit(own uint8) uint8 {
	if p.HasUnitID {
		return p.UnitID
	}
	return own
}

// join plans the points of one table. With the points in order of address, best[i] is the cost of the first i of them, and
// the last block of the best plan takes those from cut[i] on.
func (m Map) join(key Span, points []int, l Limits) []Block {
	slices.SortStableFunc(points, func(a, b int) int {
		return cmp.Or(cmp.Compare(m.Points[a].Address, m.Points[b].Address),
			cmp.Compare(m.Points[a].Words(), m.Points[b].Words()))
	})
	type cost struct{ requests, registers int }
	best := make([]cost, len(points)+1)
	cut := make([]int, len(points)+1)
	for i := 1; i <= len(points); i++ {
		best[i] = cost{math.MaxInt, math.MaxInt}
		for from := i - 1; from >= 0; from-- {
			b, ok := m.block(key, points[from:i], l)
			if !ok {
				continue
			}
			c := cost{best[from].requests + 1, best[from].registers + b.Quantity}
			if c.requests < best[i].requests || c.requests == best[i].requests && c.registers < best[i].registers {
				best[i], cut[i] = c, from
			}
		}
	}
	var blocks []Block
	for i := len(points); i > 0; i = cut[i] {
		b, _ := m.block(key, points[cut[i]:i], l)
		blocks = append(blocks, b)
	}
	slices.Reverse(blocks)
	return blocks
}

// block joins points that lie in order of address, where the limits allow it. A point alone is always allowed.
func (m Map) block(key Span, points []int, l Limits) (Block, bool) {
	first := m.Points[points[0]]
	b := Block{Span: Span{key.UnitID, key.Table, first.Address, first.Words()}, Points: slices.Clone(points)}
	most, gap := m.limits(key.Table, l)
	for _, i := range points[1:] {
		p := m.Points[i]
		if int(p.Address)-b.end() > gap {
			return Block{}, false
		}
		b.Quantity = max(b.Quantity, int(p.Address)+p.Words()-int(b.Address))
	}
	if len(points) == 1 {
		return b, true
	}
	for _, refused := range l.Refused {
		if b.Covers(refused) && !m.isOnePoint(b.Span, points) {
			return Block{}, false
		}
	}
	return b, b.Quantity <= most
}

// isOnePoint tells whether the points all stand in the registers of one of them, so that nothing is gained by parting them.
func (m Map) isOnePoint(s Span, points []int) bool {
	return slices.ContainsFunc(points, func(i int) bool {
		return m.Points[i].Address == s.Address && m.Points[i].Words() == s.Quantity
	})
}

func (m Map) limits(t Table, l Limits) (most, gap int) {
	most = m.MaxBlock
	if most <= 0 || most > 125 {
		most = 125
	}
	if t.HasBits() {
		most, gap = min(16*most, mostBits), 16*m.MaxGap
	} else {
		gap = m.MaxGap
	}
	if l.MaxBlock > 0 && !t.HasBits() {
		most = min(most, l.MaxBlock)
	}
	return most, gap
}

// Split gives the smaller requests to try when a device refuses a block: first without the unused registers between its
// points, then halves. Nil: it cannot be split.
func (m Map) Split(b Block) []Block {
	key := Span{UnitID: b.UnitID, Table: b.Table}
	tight := m
	tight.MaxGap = 0
	if parts := tight.join(key, slices.Clone(b.Points), Limits{}); len(parts) > 1 {
		return parts
	}
	if m.isOnePoint(b.Span, b.Points) {
		return nil
	}
	points := slices.Clone(b.Points)
	for at := len(points) / 2; at < len(points); at++ {
		if m.Points[points[at]].Address == m.Points[points[at-1]].Address {
			continue // bits of one register stay together
		}
		low, _ := tight.block(key, points[:at], Limits{})
		high, _ := tight.block(key, points[at:], Limits{})
		return []Block{low, high}
	}
	for at := len(points)/2 - 1; at > 0; at-- {
		if m.Points[points[at]].Address != m.Points[points[at-1]].Address {
			low, _ := tight.block(key, points[:at], Limits{})
			high, _ := tight.block(key, points[at:], Limits{})
			return []Block{low, high}
		}
	}
	return nil
}

// Requests is how many requests one poll takes.
func (p Plan) Requests() int { return len(p.Blocks) }

// WireTime is how long one poll occupies a serial line of the given speed behind a gateway: 11 bits a character, 8
// characters asked, 5 and the data answered, twice 3.5 characters of silence; the device's own time is not in it.
func (p Plan) WireTime(baud int) time.Duration {
	characters := 0
	for _, b := range p.Blocks {
		data := 2 * b.Quantity
		if b.Table.HasBits() {
			data = (b.Quantity + 7) / 8
		}
		characters += 8 + 5 + data + 7
	}
	return time.Duration(characters) * 11 * time.Second / time.Duration(baud)
}

// String shows the plan, a request a line.
func (p Plan) String() string {
	var s strings.Builder
	for i, b := range p.Blocks {
		fmt.Fprintf(&s, "request %d: %v, %d signals\n", i+1, b.Span, len(b.Points))
	}
	return s.String()
}
