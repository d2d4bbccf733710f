package registermap

import (
	"errors"
	"math"
	"testing"

	"chargehand/commission/document"
)

// FuzzRead feeds any bytes: no panic; a refused map has problems with places; every point of an accepted one can be asked for
// on the wire and decodes words of any value to a finite number or none.
func FuzzRead(f *testing.F) {
	for _, text := range []string{wagtail(f), one, "", "format = \"chargehand-map/1\"\nsignal = [{}]\n",
		"format = \"chargehand-map/1\"\n[[signal]]\nname = \"mode\"\nreference = \"00001\"\nvalues = { 0 = \"off\" }\n",
		"format = \"chargehand-map/1\"\n[[signal]]\nname = \"power\"\nreference = \"465536\"\ntype = \"f64\"\nword_order = \"low-first\"\nmissing = [\"7FF8000000000000\"]\n"} {
		f.Add([]byte(text))
	}
	f.Fuzz(func(t *testing.T, text []byte) {
		m, err := Read("x", text)
		if err != nil {
			var p *document.Problems
			if !errors.As(err, &p) || len(p.List) == 0 {
				t.Fatalf("Read(%q) = %v, want problems", text, err)
			}
			return
		}
		for _, p := range m.Points {
			words := make([]uint16, p.Words())
			if !p.Name.IsKnown() || p.Table.FunctionCode() == 0 || int(p.Address)+len(words) > 1<<16 || p.Scale == 0 || p.UnitFactor == 0 || len(words) > m.MaxBlock {
				t.Fatalf("Read(%q) has the point %+v", text, p)
			}
			for i := range words {
				words[i] = 0xFFFF
			}
			if r := p.Decode(words); r.Quality.HasValue() && (math.IsNaN(r.Value) || math.IsInf(r.Value, 0)) {
				t.Fatalf("Decode(%v) of %+v = %v", words, p, r.Value)
			}
		}
	})
}
