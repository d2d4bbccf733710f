package registermap

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"time"

	"chargehand/commission/document"
	"chargehand/commission/quantity"
	"chargehand/commission/signal"
)

// What a map need not say. A request of 100 registers is accepted by nearly every device, 125 is the protocol's own limit
// (MODBUS Application Protocol V1.1b3, 6.3); a gap of 8 is common practice.
const (
	defaultMaxBlock = 100
	defaultMaxGap   = 8
	mostRegisters   = 125
)

// Read reads a map file. The error is a [*document.Problems] that holds everything wrong with it, in order of place; name is
// only for its messages. A Map is given only where there is none.
//
// Every Point of the Map is complete: its scale, orders and unit factor are filled in where the file leaves them out. The order
// of words is never assumed for a wide value: the map or the signal must state it.
func Read(name string, text []byte) (Map, error) {
	f := document.Open(name, text, Format)
	m := readMap(f.Root())
	if err := f.Err(); err != nil {
		return Map{}, err
	}
	return m, nil
}

func readMap(t *document.Table) Map {
	m := Map{MaxBlock: defaultMaxBlock, MaxGap: defaultMaxGap}
	document.Choice(t, "word_order", &m.WordOrder, HighFirst, LowFirst)
	var interval quantity.Entered[quantity.Seconds]
	document.Quantity(t, "min_interval", &interval, quantity.Rule{Sign: quantity.NotNegative, Least: 1e-4, Most: 10, Example: "10 ms"})
	m.MinInterval = time.Duration(math.Round(float64(interval.Nominal) * float64(time.Second)))
	t.Whole("max_block", &m.MaxBlock, 1, mostRegisters)
	t.Whole("max_gap", &m.MaxGap, 0, mostRegisters)
	t.RequireTable("[[signal]]", `[[signal]] with name = "bus-voltage"`)
	seen := map[signal.Name]int{}
	for _, row := range t.Tables("signal") {
		p := readPoint(row, m)
		if line := seen[p.Name]; line > 0 {
			row.Refuse("name", fmt.Sprintf("each signal once; it stands in line %d already", line), "")
		}
		if p.Name != "" {
			seen[p.Name] = p.Line
		}
		m.Points = append(m.Points, p)
	}
	if t.Has("signal") && len(m.Points) == 0 {
		t.Refuse("signal", "one signal at least", `[[signal]] with name = "bus-voltage"`)
	}
	if m.WordOrder == "" {
		m.WordOrder = HighFirst // no wide value relies on it
	}
	return m
}

func readPoint(t *document.Table, m Map) Point {
	p := Point{Line: t.Line(), Scale: 1, UnitFactor: 1, WordOrder: m.WordOrder, ByteOrder: HighFirst}
	readName(t, &p)
	readPlace(t, &p)
	readType(t, &p)
	readOrders(t, &p)
	readScale(t, &p)
	readUnit(t, &p)
	readRange(t, &p)
	readMissing(t, &p)
	readValues(t, &p)
	t.Require(`name = "bus-voltage"`)
	checkFits(t, p, m)
	return p
}

func readName(t *document.Table, p *Point) {
	var name string
	t.Text("name", &name, string(signal.BusVoltage))
	if name == "" {
		return
	}
	if signal.Name(name).IsKnown() {
		p.Name = signal.Name(name)
		return
	}
	names := make([]string, len(signal.Names))
	for i, n := range signal.Names {
		names[i] = string(n)
	}
	if near := document.Nearest(name, names); near != "" {
		t.Refuse("name", "a known signal, perhaps "+near, fmt.Sprintf("name = %q", near))
		return
	}
	t.Refuse("name", "a known signal: "+strings.Join(names, " "), fmt.Sprintf("name = %q", signal.BusVoltage))
}

// readPlace reads unit_id, table and address, or the reference number in place of the last two.
func readPlace(t *document.Table, p *Point) {
	p.HasUnitID = t.Has("unit_id")
	id, address := 0, 0
	t.Whole("unit_id", &id, 0, 255)
	p.UnitID = uint8(id)
	document.Choice(t, "table", &p.Table, Holding, Input, Coil, Discrete)
	t.Whole("address", &address, 0, math.MaxUint16)
	p.Address = Address(address)
	var reference string
	t.Text("reference", &reference, "40101")
	switch {
	case !t.Has("reference"):
		t.Require(`table = "holding"`, "address = 100")
	case t.Has("address"):
		t.Refuse("reference", "address or reference, not both", "")
	case reference != "":
		readReference(t, reference, p)
	}
}

// readReference takes a reference number of five or six digits: the first names the table, the rest counts from 1.
func readReference(t *document.Table, reference string, p *Point) {
	const example = `reference = "40101"`
	tables := map[byte]Table{'0': Coil, '1': Discrete, '3': Input, '4': Holding}
	item, err := strconv.ParseUint(reference[1:], 10, 32)
	table, known := tables[reference[0]]
	if err != nil || len(reference) != 5 && len(reference) != 6 || strings.Trim(reference, "0123456789") != "" {
		t.Refuse("reference", "5 or 6 digits", example)
		return
	}
	if !known || item < 1 || item > math.MaxUint16+1 {
		t.Refuse("reference", "0 for coils, 1 for discrete inputs, 3 for input registers or 4 for holding registers, then 1 to 9999, or to 65536 in 6 digits", example)
		return
	}
	if t.Has("table") && p.Table != "" && p.Table != table {
		t.Refuse("reference", fmt.Sprintf("a reference in the table %s", p.Table), "")
		return
	}
	p.Table, p.Address = table, Address(item-1)
}

func readType(t *document.Table, p *Point) {
	if p.Table.HasBits() {
		p.Type = Bit
		document.Choice(t, "type", &p.Type, Bit)
		if t.Has("bit") {
			t.Refuse("bit", "no bit: each item of this table is one", "")
		}
	} else {
		document.Choice(t, "type", &p.Type, U16, I16, U32, I32, U64, I64, F32, F64, Bit)
		t.Require(`type = "u16"`)
	}
	if p.Type == Bit && p.Name.Unit() != "" {
		key := "type"
		if !t.Has(key) {
			key = "table"
		}
		t.Refuse(key, fmt.Sprintf("registers that hold a number: %s is in %s", p.Name, p.Name.Unit()), `type = "u16"`)
	}
	if p.Name.IsState() && p.isFloat() {
		t.Refuse("type", "bit or a whole number for a state", `type = "bit"`)
	}
	t.Whole("bit", &p.BitNumber, 0, 15)
	switch {
	case p.Type == Bit && !p.Table.HasBits():
		t.Require("bit = 0")
	case p.Type != Bit && p.Type != "" && t.Has("bit"):
		t.Refuse("bit", `no bit beside the type `+string(p.Type), `type = "bit"`)
	}
}

func (p Point) isFloat() bool { return p.Type == F32 || p.Type == F64 }

func readOrders(t *document.Table, p *Point) {
	document.Choice(t, "word_order", &p.WordOrder, HighFirst, LowFirst)
	document.Choice(t, "byte_order", &p.ByteOrder, HighFirst, LowFirst)
	if p.WordOrder != "" {
		return
	}
	if p.Type.Words() > 1 && !t.Has("word_order") {
		t.RefuseTable(fmt.Sprintf("no word_order for the %s %s", p.Type, p.Name), "the order of words of a wide value, here or at the top of the file", `word_order = "high-first"`)
	}
	p.WordOrder = HighFirst
}

func readScale(t *document.Table, p *Point) {
	t.Number("scale", &p.Scale)
	t.Number("offset", &p.Offset)
	t.Bool("sign_reversed", &p.SignReversed)
	if p.Scale == 0 {
		t.Refuse("scale", "a scale that is not 0", "scale = 0.1")
	}
	if p.Type != Bit && !p.Name.IsState() && p.Name != signal.Mode {
		return
	}
	for _, key := range []string{"scale", "offset", "sign_reversed", "range"} {
		if t.Has(key) {
			t.Refuse(key, "no "+key+" for a bit, a state or a mode", "")
		}
	}
}

// readUnit wants the unit of a signal that has one, so that a value in mV is never taken for one in V.
func readUnit(t *document.Table, p *Point) {
	t.Text("unit", &p.Unit, "V")
	if p.Name == "" {
		return
	}
	coherent := p.Name.Unit()
	if coherent == "" {
		if t.Has("unit") {
			t.Refuse("unit", fmt.Sprintf("no unit: %s is a state, a code or a count", p.Name), "")
		}
		return
	}
	t.Require(fmt.Sprintf("unit = %q", coherent))
	if p.Unit == "" {
		return
	}
	factor, ok := quantity.UnitFactor(p.Unit, coherent)
	if !ok {
		t.Refuse("unit", fmt.Sprintf("a unit of %s: %s", p.Name, strings.Join(quantity.UnitsOf(coherent), " ")), fmt.Sprintf("unit = %q", coherent))
		return
	}
	p.UnitFactor = factor
}

func readRange(t *document.Table, p *Point) {
	if p.Name.IsState() {
		p.Range = &[2]float64{0, 1} // a state that reads 7 is no state
	}
	bounds := t.Numbers("range", 2, "[0, 1300]")
	if bounds == nil {
		return
	}
	if bounds[0] >= bounds[1] {
		t.Refuse("range", "the lower bound first, then a greater one", "range = [0, 1300]")
		return
	}
	p.Range = &[2]float64{bounds[0], bounds[1]}
}

// readMissing reads the codes for 'no value' as the hex words that travel on the wire.
func readMissing(t *document.Table, p *Point) {
	example := strings.TrimSpace(strings.Repeat("8000 ", p.Type.Words()))
	codes := t.Texts("missing", strconv.Quote(example))
	if len(codes) > 0 && p.Type == Bit {
		t.Refuse("missing", "no missing for a bit", "")
		return
	}
	for _, code := range codes {
		words, ok := hexWords(code)
		if !ok || p.Type != "" && len(words) != p.Type.Words() {
			t.Refuse("missing", fmt.Sprintf("%d hex words of 4 digits, as on the wire", p.Type.Words()), fmt.Sprintf("missing = %q", example))
			return
		}
		p.Missing = append(p.Missing, words)
	}
}

// hexWords reads words of four hex digits, with or without one space between two.
func hexWords(s string) (words []uint16, ok bool) {
	for s != "" {
		if len(s) < 4 {
			return nil, false
		}
		w, err := strconv.ParseUint(s[:4], 16, 16)
		if err != nil {
			return nil, false
		}
		words = append(words, uint16(w))
		s = s[4:]
		if len(s) > 1 && s[0] == ' ' {
			s = s[1:]
		}
	}
	return words, len(words) > 0
}

// readValues reads what the raw numbers of the mode mean.
func readValues(t *document.Table, p *Point) {
	const example = `values = { 0 = "off", 1 = "voltage", 2 = "current" }`
	modes := map[string]float64{"off": signal.ModeOff, "voltage": signal.ModeVoltage, "current": signal.ModeCurrent}
	values := t.Table("values")
	if p.Name != signal.Mode {
		if values != nil && p.Name != "" {
			t.Refuse("values", "values only for the signal mode", "")
			values.Keys()
		}
		return
	}
	t.Require(example)
	if p.isFloat() {
		t.Refuse("type", "a whole number for the mode", `type = "u16"`)
	}
	if values == nil {
		return
	}
	p.Values = map[int64]float64{}
	for _, key := range values.Keys() {
		meaning := ""
		document.Choice(values, key, &meaning, "off", "voltage", "current")
		raw, err := rawNumber(key)
		if err != nil {
			values.RefuseTable("the raw number "+key, "a whole number, decimal or with 0x", example)
			continue
		}
		if _, twice := p.Values[raw]; twice {
			values.RefuseTable("the raw number "+key+" twice", "each raw number once", "")
		}
		p.Values[raw] = modes[meaning]
	}
	if len(values.Keys()) == 0 {
		t.Refuse("values", "one raw number at least", example)
	}
}

func rawNumber(key string) (int64, error) {
	if hex, ok := strings.CutPrefix(key, "0x"); ok {
		return strconv.ParseInt(hex, 16, 64)
	}
	return strconv.ParseInt(key, 10, 64)
}

// checkFits refuses a value that ends beyond its table or takes more registers than one request may.
func checkFits(t *document.Table, p Point, m Map) {
	if p.Table.HasBits() || p.Type == "" {
		return
	}
	if int(p.Address)+p.Type.Words() > math.MaxUint16+1 {
		key := "address"
		if t.Has("reference") {
			key = "reference"
		}
		t.Refuse(key, fmt.Sprintf("an address that leaves room for %d registers before 65536", p.Type.Words()), "")
	}
	if p.Type.Words() > m.MaxBlock {
		t.Refuse("type", fmt.Sprintf("a type that takes no more registers than max_block, %d", m.MaxBlock), "max_block = 100")
	}
}
