package registermap

import (
	"os"
	"path/filepath"
	"testing"

	"chargehand/commission/signal"
)

// TestPlanOfAWholeMap: the example map has its readings at 100 to 123 and its settings at 200 to 205: two requests.
func TestPlanOfAWholeMap(t *testing.T) {
	text, err := os.ReadFile(filepath.Join("..", "..", "testdata", "sites", "wagtail.map.toml"))
	if err != nil {
		t.Fatal(err)
	}
	m, err := Read("wagtail.map.toml", text)
	if err != nil {
		t.Fatal(err)
	}
	plan := m.Plan(Limits{UnitID: 1})
	if plan.Requests() != 2 || plan.Blocks[0].Quantity != 24 || plan.Blocks[1].Quantity != 6 {
		t.Errorf("Plan(wagtail) =\n%swant 24 registers from 100 and 6 from 200", plan)
	}
	for _, p := range m.Points { // what the device can send, it sends and is read as
		for _, v := range []float64{0, 1} {
			words, err := p.Encode(v)
			if err != nil {
				t.Errorf("Encode(%s, %v) = %v", p.Name, v, err)
				continue
			}
			if r := p.Decode(words); r.Quality != signal.Good || r.Value != v && p.Name != signal.InsulationResistance {
				t.Errorf("Decode(Encode(%s, %v)) = %v %s", p.Name, v, r.Value, r.Quality)
			}
		}
	}
}
