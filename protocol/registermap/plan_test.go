package registermap

import (
	"math/rand/v2"
	"slices"
	"testing"
	"time"

	"chargehand/commission/signal"
)

// fewest tries every way of parting the points into groups and gives the fewest groups that are all allowed requests, and
// the fewest registers among those. It shares no code with Plan.
func fewest(points []Point, most, gap int) (requests, registers int) {
	requests = len(points) + 1
	var groups [][]Point
	allowed := func(g []Point) (int, bool) {
		used := map[int]bool{}
		first, last := 1<<20, 0
		for _, p := range g {
			for i := range p.Words() {
				used[int(p.Address)+i] = true
			}
			first, last = min(first, int(p.Address)), max(last, int(p.Address)+p.Words())
		}
		if len(g) > 1 && last-first > most {
			return 0, false
		}
		hole := 0
		for a := first; a < last; a++ {
			if used[a] {
				hole = 0
			} else if hole++; hole > gap {
				return 0, false
			}
		}
		return last - first, true
	}
	var place func(i int)
	place = func(i int) {
		if len(groups) > requests {
			return
		}
		if i == len(points) {
			sum := 0
			for _, g := range groups {
				n, ok := allowed(g)
				if !ok {
					return
				}
				sum += n
			}
			if len(groups) < requests || len(groups) == requests && sum < registers {
				requests, registers = len(groups), sum
			}
			return
		}
		for j := range groups {
			groups[j] = append(groups[j], points[i])
			place(i + 1)
			groups[j] = groups[j][:len(groups[j])-1]
		}
		groups = append(groups, []Point{points[i]})
		place(i + 1)
		groups = groups[:len(groups)-1]
	}
	place(0)
	return requests, registers
}

func TestPlanIsTheFewestRequests(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	types := []Type{U16, U16, U16, I32, F64}
	for n := range 1500 {
		m := Map{MaxBlock: 4 + r.IntN(12), MaxGap: r.IntN(5)}
		for range 1 + r.IntN(7) {
			p := Point{Table: Holding, Type: types[r.IntN(len(types))]}
			p.Address = Address(r.IntN(30))
			m.Points = append(m.Points, p)
		}
		plan := m.Plan(Limits{UnitID: 1})
		checkPlan(t, m, plan)
		requests, registers := fewest(m.Points, m.MaxBlock, m.MaxGap)
		sum := 0
		for _, b := range plan.Blocks {
			sum += b.Quantity
		}
		if plan.Requests() != requests || sum > registers {
			t.Fatalf("map %d, max_block %d, max_gap %d, %v: Plan has %d requests of %d registers, want %d of %d", n, m.MaxBlock,
				m.MaxGap, m.Points, plan.Requests(), sum, requests, registers)
		}
	}
}

// checkPlan sees to it that every point is read whole, once, by a request within the limits.
func checkPlan(t *testing.T, m Map, plan Plan) {
	t.Helper()
	seen := map[int]int{}
	for _, b := range plan.Blocks {
		if len(b.Points) > 1 && !b.Table.HasBits() && b.Quantity > m.MaxBlock {
			t.Fatalf("%v is larger than max_block %d", b.Span, m.MaxBlock)
		}
		words := make([]uint16, b.Quantity)
		for _, i := range b.Points {
			seen[i]++
			if got := len(b.Words(m.Points[i], words)); got != m.Points[i].Words() {
				t.Fatalf("%v gives %d words of %v, want %d", b.Span, got, m.Points[i], m.Points[i].Words())
			}
		}
	}
	for i := range m.Points {
		if seen[i] != 1 {
			t.Fatalf("point %d is read %d times, want once", i, seen[i])
		}
	}
}

func TestPlanKeepsUnitsAndTablesApart(t *testing.T) {
	m := Map{MaxBlock: 100, MaxGap: 8, Points: []Point{
		{Name: signal.BusVoltage, Table: Holding, Address: 0, Type: U16},
		{Name: signal.SourceVoltage, Table: Input, Address: 1, Type: U16},
		{Name: signal.SourceCurrent, Table: Holding, Address: 1, Type: U16, HasUnitID: true, UnitID: 7},
		{Name: signal.BusCurrent, Table: Holding, Address: 2, Type: U16, HasUnitID: true, UnitID: 3},
		{Name: signal.Ready, Table: Coil, Address: 0, Type: Bit},
		{Name: signal.Fault, Table: Coil, Address: 100, Type: Bit},
	}}
	plan := m.Plan(Limits{UnitID: 3})
	checkPlan(t, m, plan)
	if plan.Requests() != 4 { // unit 3 holding, unit 3 input, unit 7 holding, unit 3 coils (a gap of 99 bits is under 8 registers)
		t.Errorf("Plan() = %d requests, want 4:\n%s", plan.Requests(), plan)
	}
	only := m.Plan(Limits{UnitID: 3, Only: []signal.Name{signal.BusVoltage}})
	if only.Requests() != 1 || only.Blocks[0].Quantity != 1 {
		t.Errorf("Plan(only bus-voltage) = %v, want one register", only)
	}
}

func TestRefusedSpansAreNotPlannedAgain(t *testing.T) {
	m := Map{MaxBlock: 100, MaxGap: 8}
	for _, a := range []Address{0, 1, 5, 6} {
		m.Points = append(m.Points, Point{Table: Holding, Address: a, Type: U16})
	}
	whole := m.Plan(Limits{UnitID: 1})
	if whole.Requests() != 1 {
		t.Fatalf("Plan() = %v, want one request", whole)
	}
	parts := m.Split(whole.Blocks[0])
	if len(parts) != 2 || parts[0].Quantity != 2 || parts[1].Quantity != 2 {
		t.Fatalf("Split(0 to 6) = %v, want 0 to 1 and 5 to 6: the unused registers go first", parts)
	}
	plan := m.Plan(Limits{UnitID: 1, Refused: []Span{whole.Blocks[0].Span}})
	if plan.Requests() != 2 {
		t.Errorf("Plan(refused 0 to 6) = %v, want two requests", plan)
	}
	halves := m.Split(parts[0])
	if len(halves) != 2 || halves[0].Quantity != 1 || m.Split(halves[0]) != nil {
		t.Errorf("Split(0 to 1) = %v, want two single registers, which cannot be split", halves)
	}
}

func TestSplitEndsAtWholeValues(t *testing.T) {
	m := Map{MaxBlock: 100, MaxGap: 8, Points: []Point{
		{Table: Holding, Address: 10, Type: Bit, BitNumber: 0}, {Table: Holding, Address: 10, Type: Bit, BitNumber: 1},
		{Table: Holding, Address: 11, Type: F32}, {Table: Holding, Address: 13, Type: U64},
	}}
	queue := m.Plan(Limits{}).Blocks
	var ends []Block
	for len(queue) > 0 {
		parts := m.Split(queue[0])
		if parts == nil {
			ends = append(ends, queue[0])
		}
		queue = append(queue[1:], parts...)
	}
	slices.SortFunc(ends, func(a, b Block) int { return int(a.Address) - int(b.Address) })
	if len(ends) != 3 || ends[0].Quantity != 1 || ends[1].Quantity != 2 || ends[2].Quantity != 4 {
		t.Errorf("splitting to the end = %v, want the register of both bits, the f32 and the u64, each whole", ends)
	}
}

func TestWireTime(t *testing.T) {
	// 9600 baud: 1 register 25 ms, 125 registers 309 ms (calculated: 8 + 5 + 2n + 7 characters of 11 bits).
	for n, want := range map[int]time.Duration{1: 25 * time.Millisecond, 125: 309 * time.Millisecond} {
		p := Plan{Blocks: []Block{{Span: Span{Table: Holding, Quantity: n}}}}
		if got := p.WireTime(9600); got.Round(time.Millisecond) != want {
			t.Errorf("WireTime(%d registers at 9600 baud) = %v, want %v", n, got, want)
		}
	}
}
