package simulator

import (
	"math"
	"testing"

	"chargehand/commission/signal"
	"chargehand/protocol/registermap"

	"pgregory.net/rapid"
)

// TestEncodeIsUndoneByTheMapsReader: two codings written apart agree for every type and order.
func TestEncodeIsUndoneByTheMapsReader(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		orders := []registermap.Order{registermap.HighFirst, registermap.LowFirst}
		p := registermap.Point{
			Name: signal.SourceCurrent, Table: registermap.Holding,
			Type: rapid.SampledFrom([]registermap.Type{registermap.U16, registermap.I16, registermap.U32, registermap.I32,
				registermap.U64, registermap.I64, registermap.F32, registermap.F64}).Draw(t, "type"),
			WordOrder: rapid.SampledFrom(orders).Draw(t, "words"), ByteOrder: rapid.SampledFrom(orders).Draw(t, "bytes"),
			Scale: rapid.SampledFrom([]float64{1, 0.1, 0.01}).Draw(t, "scale"), Offset: rapid.SampledFrom([]float64{0, -50}).Draw(t, "offset"),
			UnitFactor:   rapid.SampledFrom([]float64{1, 1000}).Draw(t, "factor"),
			SignReversed: rapid.Bool().Draw(t, "reversed"),
		}
		value := rapid.Float64Range(-250, 250).Draw(t, "value") * p.UnitFactor
		if low := p.Offset * p.UnitFactor; p.SignReversed && -value < low || !p.SignReversed && value < low {
			return // an unsigned register cannot hold it
		}
		if unsigned := p.Type[0] == 'u'; unsigned && p.SignReversed && value > 0 || unsigned && !p.SignReversed && value < 0 && p.Offset == 0 {
			return
		}
		r := p.Decode(encode(p, value))
		if !r.Quality.HasValue() || math.Abs(r.Value-value) > 0.501*p.Scale*p.UnitFactor {
			t.Fatalf("Decode(encode(%+v, %g)) = %g (%s)", p, value, r.Value, r.Why)
		}
	})
}

func TestEncodeStaysAtTheEndOfItsRange(t *testing.T) {
	for _, c := range []struct {
		kind  registermap.Type
		value float64
		want  uint16
	}{{registermap.U16, 7e4, 0xFFFF}, {registermap.U16, -3, 0}, {registermap.I16, 4e4, 0x7FFF}, {registermap.I16, -4e4, 0x8000}} {
		p := registermap.Point{Name: signal.SourceCurrent, Type: c.kind, Scale: 1, UnitFactor: 1}
		if got := encode(p, c.value); got[0] != c.want {
			t.Errorf("encode(%s, %g) = %04X, want %04X", c.kind, c.value, got[0], c.want)
		}
	}
}
