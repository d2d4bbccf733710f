package registermap

import (
	"math"
	"strings"
	"testing"

	"chargehand/commission/signal"
)

func TestDecodings(t *testing.T) {
	w := Words{}
	w.Put(Span{1, Holding, 97, 7}, []uint16{0, 0, 8150, 7124, 0xFF6A, 0, 0})
	w.Put(Span{1, Input, 100, 1}, []uint16{6001})
	list := Decodings(Point{Name: signal.BusVoltage, Table: Holding, Address: 100, Type: U16, Scale: 0.1}, 1, w)
	if len(list[0].Changes) != 0 || list[0].Value != 712.4 {
		t.Errorf("first decoding = %v %v, want the map's own, 712.4 V", list[0], list[0].Value)
	}
	want := map[string]float64{"address = 99": 815, "address = 101": 6538.6, "scale = 1": 7124, "scale = 0.01": 71.24,
		"sign_reversed = true": -712.4, `table = "input"`: 600.1, `byte_order = "low-first"`: 5429.9} // 7124 is 1BD4, swapped D41B = 54299
	for _, h := range list[1:] {
		line := h.Changes[0].Line()
		if v, ok := want[line]; ok && math.Abs(h.Value-v) > 1e-9 {
			t.Errorf("%s reads %v, want %v", line, h.Value, v)
		}
		delete(want, line)
		if !isOrdinary(h.Value) {
			t.Errorf("%s reads %v, which no plant has", line, h.Value)
		}
	}
	if len(want) > 0 {
		t.Errorf("decodings lack %v", want)
	}
}

func TestHint(t *testing.T) {
	for _, tt := range []struct {
		p     Point
		words []uint16
		want  string
	}{
		{Point{Type: F32}, []uint16{0xA000, 0x4422}, "650.5 in the other"}, // 650.5 = 4422 A000, by hand
		{Point{Type: F32}, []uint16{0x4422, 0xA000}, ""},
		{Point{Type: U32}, []uint16{0x0007, 0x0000}, "swapped"},
		{Point{Type: U32}, []uint16{0, 7}, ""},
		{Point{Type: I16}, []uint16{0x8000}, "no value"},
		{Point{Type: U16}, []uint16{0xFFFF}, "no value"},
		{Point{Type: U16}, []uint16{7124}, ""},
	} {
		if got := Hint(tt.p, tt.words); tt.want == "" && got != "" || !strings.Contains(got, tt.want) {
			t.Errorf("Hint(%s as %s) = %q, want %q in it", Hex(tt.words), tt.p.Type, got, tt.want)
		}
	}
}
