package registermap

import (
	"fmt"
	"math"
	"slices"
	"testing"

	"pgregory.net/rapid"

	"chargehand/commission/signal"
)

func TestDecode(t *testing.T) {
	const (
		sunspec = "SunSpec's codes for a point without a value, by common practice"
		words   = "check values of libmodbus, tests/unit-test.h: 123456.0 as ABCD, CDAB, BADC, DCBA"
		hand    = "two's complement, by hand"
	)
	tests := []struct {
		name    string
		point   Point
		words   []uint16
		want    float64
		quality signal.Quality
		source  string
	}{
		{"u16", Point{Type: U16, Scale: 0.1}, []uint16{7124}, 712.4, signal.Good, hand},
		{"u16 large", Point{Type: U16}, []uint16{0xFFFF}, 65535, signal.Good, hand},
		{"i16 −1", Point{Type: I16}, []uint16{0xFFFF}, -1, signal.Good, hand},
		{"i16 least", Point{Type: I16}, []uint16{0x8000}, -32768, signal.Good, hand},
		{"−15 A in tenths", Point{Type: I16, Scale: 0.1}, []uint16{0xFF6A}, -15, signal.Good, hand},
		{"i32 −250", Point{Type: I32}, []uint16{0xFFFF, 0xFF06}, -250, signal.Good, hand},
		{"u32 low first", Point{Type: U32, WordOrder: LowFirst}, []uint16{0x0001, 0x0002}, 0x20001, signal.Good, hand},
		{"i64 −2", Point{Type: I64}, []uint16{0xFFFF, 0xFFFF, 0xFFFF, 0xFFFE}, -2, signal.Good, hand},
		{"u64 low first reverses all words", Point{Type: U64, WordOrder: LowFirst}, []uint16{4, 3, 2, 1},
			1<<48 | 2<<32 | 3<<16 | 4, signal.Good, hand},
		{"f32 ABCD", Point{Type: F32}, []uint16{0x47F1, 0x2000}, 123456, signal.Good, words},
		{"f32 CDAB", Point{Type: F32, WordOrder: LowFirst}, []uint16{0x2000, 0x47F1}, 123456, signal.Good, words},
		{"f32 BADC", Point{Type: F32, ByteOrder: LowFirst}, []uint16{0xF147, 0x0020}, 123456, signal.Good, words},
		{"f32 DCBA", Point{Type: F32, WordOrder: LowFirst, ByteOrder: LowFirst}, []uint16{0x0020, 0xF147}, 123456, signal.Good, words},
		{"f32 650.5", Point{Type: F32}, []uint16{0x4422, 0xA000}, 650.5, signal.Good, "IEEE 754, by hand"},
		{"f64 1", Point{Type: F64}, []uint16{0x3FF0, 0, 0, 0}, 1, signal.Good, "IEEE 754, by hand"},
		{"f32 not a number", Point{Type: F32}, []uint16{0x7FC0, 0}, 0, signal.Bad, "IEEE 754"},
		{"f32 infinite", Point{Type: F32}, []uint16{0x7F80, 0}, 0, signal.Bad, "IEEE 754"},
		{"bit 15", Point{Type: Bit, BitNumber: 15}, []uint16{0x8000}, 1, signal.Good, hand},
		{"bit 0 of 8000", Point{Type: Bit}, []uint16{0x8000}, 0, signal.Good, hand},
		{"bit 0, bytes swapped", Point{Type: Bit, ByteOrder: LowFirst}, []uint16{0x0100}, 1, signal.Good, hand},
		{"coil", Point{Type: Bit, Table: Coil}, []uint16{1}, 1, signal.Good, hand},
		{"missing before sign", Point{Type: I16, Scale: 0.1, Missing: [][]uint16{{0x8000}}}, []uint16{0x8000}, 0, signal.Missing, sunspec},
		{"missing, wide, in wire order", Point{Type: U32, WordOrder: LowFirst, Missing: [][]uint16{{1, 2}, {0xFFFF, 0xFFFF}}},
			[]uint16{1, 2}, 0, signal.Missing, sunspec},
		{"scale, then offset, then sign", Point{Type: U16, Scale: 2, Offset: 3, SignReversed: true}, []uint16{5}, -13, signal.Good, "design: value = raw · scale + offset, sign after both"},
		{"unit factor", Point{Type: U16, Unit: "kΩ", UnitFactor: 1000}, []uint16{62}, 62000, signal.Good, hand},
		{"range in the stated unit", Point{Type: U16, Unit: "kV", UnitFactor: 1000, Scale: 0.001, Range: &[2]float64{0, 1.3}},
			[]uint16{1301}, 0, signal.Bad, "design 5"},
		{"range's edge belongs to it", Point{Type: U16, Range: &[2]float64{0, 1300}}, []uint16{1300}, 1300, signal.Good, "design 5"},
		{"mode", Point{Type: U16, Values: map[int64]float64{7: signal.ModeCurrent}}, []uint16{7}, signal.ModeCurrent, signal.Good, "design 5"},
		{"mode not listed", Point{Type: U16, Values: map[int64]float64{7: signal.ModeCurrent}}, []uint16{1}, 0, signal.Bad, "design 5"},
		{"half a wide value", Point{Type: F32}, []uint16{0x4422}, 0, signal.Bad, "design 5"},
		{"no word", Point{Type: U16}, nil, 0, signal.Bad, "design 5"},
		{"two words for one", Point{Type: U16}, []uint16{1, 2}, 0, signal.Bad, "design 5"},
	}
	for _, tt := range tests {
		r := tt.point.Decode(tt.words)
		if r.Quality != tt.quality || r.Quality.HasValue() && math.Abs(r.Value-tt.want) > 1e-12*math.Abs(tt.want) {
			t.Errorf("%s: Decode(%s) = %v %s (%s), want %v %s; %s", tt.name, Hex(tt.words), r.Value, r.Quality, r.Why, tt.want,
				tt.quality, tt.source)
		}
		if !r.Quality.HasValue() && (r.Why == "" || r.Value != 0) {
			t.Errorf("%s: Decode(%s) has no value and says %q, value %v, want a reason and no number", tt.name, Hex(tt.words), r.Why,
				r.Value)
		}
		if !slices.Equal(r.Raw, tt.words) {
			t.Errorf("%s: Decode(%s).Raw = %s, want the words", tt.name, Hex(tt.words), Hex(r.Raw))
		}
	}
}

var anyPoint = rapid.Custom(func(t *rapid.T) Point {
	p := Point{
		Type:         rapid.SampledFrom([]Type{U16, I16, U32, I32, U64, I64, F32, F64}).Draw(t, "type"),
		Table:        Holding,
		WordOrder:    rapid.SampledFrom([]Order{HighFirst, LowFirst}).Draw(t, "word order"),
		ByteOrder:    rapid.SampledFrom([]Order{HighFirst, LowFirst}).Draw(t, "byte order"),
		Scale:        rapid.SampledFrom([]float64{1, 0.1, 0.01, 10, -1, 0.0001}).Draw(t, "scale"),
		Offset:       rapid.SampledFrom([]float64{0, 0, -40, 1000}).Draw(t, "offset"),
		UnitFactor:   rapid.SampledFrom([]float64{1, 1000}).Draw(t, "factor"),
		SignReversed: rapid.Bool().Draw(t, "sign"),
	}
	return p
})

// TestDecodeEncodeLaw: what a device's words mean, encoded again, is the same words.
func TestDecodeEncodeLaw(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p := anyPoint.Draw(t, "point")
		words := make([]uint16, p.Words())
		for i := range words {
			words[i] = rapid.Uint16().Draw(t, "word")
		}
		r := p.Decode(words)
		if !r.Quality.HasValue() {
			return
		}
		again, err := p.Encode(r.Value)
		if p.Type == U64 || p.Type == I64 || p.Type == F64 || p.Type == F32 { // more digits than scaling keeps
			if err != nil {
				return // at the very edge of the type
			}
			if v := p.Decode(again); math.Abs(v.Value-r.Value) > 1e-6*math.Abs(r.Value)+1e-2 {
				t.Fatalf("Decode(Encode(%v)) = %v", r.Value, v.Value)
			}
			return
		}
		if err != nil || !slices.Equal(again, words) {
			t.Fatalf("Encode(Decode(%s)) = %s, %v, want the same words", Hex(words), Hex(again), err)
		}
	})
}

func TestSwappingTwiceIsNothing(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p := anyPoint.Draw(t, "point")
		u := rapid.Uint64().Draw(t, "bits") >> (64 - 16*p.Words())
		if got := p.assemble(p.split(u, p.Words())); got != u {
			t.Fatalf("assemble(split(%x)) = %x", u, got)
		}
	})
}

func TestEncodeRefusesWhatDoesNotFit(t *testing.T) {
	for _, tt := range []struct {
		p  Point
		v  float64
		ok bool
	}{
		{Point{Type: U16}, 65535, true}, {Point{Type: U16}, 65536, false}, {Point{Type: U16}, -1, false},
		{Point{Type: I16}, -32768, true}, {Point{Type: I16}, -32769, false}, {Point{Type: I16}, 32768, false},
		{Point{Type: U64}, math.Ldexp(1, 64), false}, {Point{Type: I64}, -math.Ldexp(1, 63), true},
		{Point{Type: F32}, 1e39, false}, {Point{Type: U16}, math.NaN(), false}, {Point{Type: Bit}, 2, false},
		{Point{Type: U16, Scale: 0.1}, 6553.5, true}, {Point{Type: U16, Values: map[int64]float64{1: 2}}, 3, false},
	} {
		_, err := tt.p.Encode(tt.v)
		if (err == nil) != tt.ok {
			t.Errorf("Encode(%v as %s) = %v, want ok %v", tt.v, tt.p.Type, err, tt.ok)
		}
	}
}

func TestRaw(t *testing.T) {
	m := Map{Points: []Point{{Name: signal.VoltageSetpoint, Type: U16, Scale: 0.1}, {Name: signal.DroopSetting, Type: U16, Scale: 0.0001},
		{Name: signal.ChargeLimit, Type: F32}}}
	if raw, ok := m.Raw(signal.VoltageSetpoint, 1030); !ok || raw != 10300 {
		t.Errorf("Raw(voltage-setpoint, 1030 V) = %d, %v, want 10300", raw, ok)
	}
	if raw, ok := m.Raw(signal.DroopSetting, 0.13636); !ok || raw != 1364 {
		t.Errorf("Raw(droop-setting, 0.13636 V/A) = %d, %v, want 1364", raw, ok)
	}
	if _, ok := m.Raw(signal.ChargeLimit, 100); ok {
		t.Errorf("Raw of a float register is ok, want none: it has no whole number")
	}
	if _, ok := m.Raw(signal.VoltageSetpoint, 7000); ok {
		t.Errorf("Raw(7000 V at 0.1 V in u16) is ok, want none")
	}
	if _, ok := m.Raw(signal.Power, 1); ok {
		t.Errorf("Raw of a signal the map lacks is ok, want none")
	}
}

func TestReference(t *testing.T) {
	for _, tt := range []struct {
		table   Table
		address Address
		want    string
	}{ // check values: 40108 is holding 107; five digits reach item 9999, six 65536
		{Holding, 107, "40108"}, {Holding, 0, "40001"}, {Holding, 9998, "49999"}, {Holding, 9999, "410000"},
		{Holding, 65535, "465536"}, {Input, 8, "30009"}, {Coil, 19, "00020"}, {Discrete, 196, "10197"}, {Coil, 65535, "065536"},
	} {
		if got := Reference(tt.table, tt.address); got != tt.want {
			t.Errorf("Reference(%s, %d) = %s, want %s", tt.table, tt.address, got, tt.want)
		}
	}
}

func ExamplePoint_Decode() {
	p := Point{Name: signal.BusVoltage, Table: Holding, Address: 100, Type: U16, Scale: 0.1, Unit: "V"}
	r := p.Decode([]uint16{7124})
	fmt.Printf("%s (%s): %.1f V, %s\n", r.Name, p.Place(), r.Value, r.Quality)
	// Output: bus-voltage (holding 100, 40101): 712.4 V, good
}

func FuzzDecode(f *testing.F) {
	f.Add(uint8(0), uint8(1), uint16(7124), uint16(0), uint16(0), uint16(0), uint8(0), 0.1)
	f.Fuzz(func(t *testing.T, kind, n uint8, a, b, c, d uint16, order uint8, scale float64) {
		types := []Type{U16, I16, U32, I32, U64, I64, F32, F64, Bit, ""}
		p := Point{Type: types[int(kind)%len(types)], Scale: scale, BitNumber: int(n) % 16}
		if order&1 != 0 {
			p.WordOrder = LowFirst
		}
		if order&2 != 0 {
			p.ByteOrder = LowFirst
		}
		r := p.Decode([]uint16{a, b, c, d}[:n%5])
		if r.Quality.HasValue() && (int(n%5) != p.Words() || math.IsNaN(r.Value) || math.IsInf(r.Value, 0)) {
			t.Fatalf("Decode gives %v %s", r.Value, r.Quality)
		}
		if !r.Quality.HasValue() && (r.Why == "" || r.Value != 0) {
			t.Fatalf("Decode without a value says %q, %v", r.Why, r.Value)
		}
	})
}
