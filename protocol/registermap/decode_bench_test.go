package registermap

import "testing"

func BenchmarkDecode(b *testing.B) {
	for _, p := range []Point{{Table: Holding, Type: U16, Scale: 0.1}, {Table: Holding, Type: F32, WordOrder: LowFirst}} {
		b.Run(string(p.Type), func(b *testing.B) {
			words := []uint16{0x4422, 0xA000}[:p.Words()]
			for b.Loop() {
				if r := p.Decode(words); !r.Quality.HasValue() {
					b.Fatal(r.Why)
				}
			}
		})
	}
}
