package poll_test

import (
	"testing"

	"chargehand/protocol/link"
	"chargehand/protocol/link/linktest"
	"chargehand/protocol/poll"
	"chargehand/protocol/registermap"
)

func TestLookReadsTheNeighbourhoodAndNothingElse(t *testing.T) {
	image := &linktest.Image{}
	image.Set(1, 3, 97, 1, 2, 3, 7124, 8150, 6, 0xFF6A, 8)
	image.Remove(1, 3, 99, 106)
	for a := range 200 {
		image.Remove(1, 4, a) // the sister table is not there
	}
	proxy := linktest.NewProxy(image.Answer)
	if err := proxy.Listen(); err != nil {
		t.Fatal(err)
	}
	defer proxy.Close()
	l := link.New(link.Options{Address: proxy.Address()})
	defer l.Close()
	m := voltages()
	s, err := poll.Look(t.Context(), l, 1, m)
	if err != nil {
		t.Fatal(err)
	}
	for a, want := range map[registermap.Address]uint16{97: 1, 100: 7124, 103: 0xFF6A, 104: 8} {
		if got := s.Words[registermap.Register{UnitID: 1, Table: registermap.Holding, Address: a}]; got != want {
			t.Errorf("Look: holding %d = %d, want %d", a, got, want)
		}
	}
	if _, ok := s.Words[registermap.Register{UnitID: 1, Table: registermap.Holding, Address: 99}]; ok {
		t.Errorf("Look gives holding 99, which the device has not")
	}
	refused := 0
	for _, r := range s.Refused {
		refused += r.Span.Quantity
	}
	if want := 18 + 2; refused != want { // 97 to 114 of the sister table, and two of its own
		t.Errorf("Look was refused %d registers, want %d", refused, want)
	}
	for _, r := range proxy.Requests() {
		a, n := int(r[8])<<8|int(r[9]), int(r[10])<<8|int(r[11])
		if f := r[7]; f != 3 && f != 4 || a < 97 || a+n > 115 {
			t.Errorf("Look asked function %d, %d registers from %d, want holding and input 97 to 114 only", f, n, a)
		}
	}
}
