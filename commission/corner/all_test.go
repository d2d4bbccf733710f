package corner

import (
	"math"
	"reflect"
	"testing"
)

func TestOverAllAgreesWithOverResultByResult(t *testing.T) {
	axes := []Axis{{"a", 1, 2, 4}, Exact("b", 3), {"c", -1, 0, 5}}
	results := []func(x []float64) float64{
		func(x []float64) float64 { return x[0] * x[1] * x[2] },
		func(x []float64) float64 { return x[0] - x[2] },
		func(x []float64) float64 { return 1 / (10 + x[2]) },
	}
	all := OverAll(axes, len(results), func(x, out []float64) {
		for k, f := range results {
			out[k] = f(x)
		}
	})
	for k, f := range results {
		if want := Over(axes, f); !reflect.DeepEqual(all[k], want) {
			t.Errorf("OverAll result %d = %+v, want what Over gives, %+v", k, all[k], want)
		}
	}
}

func TestOverAllSpoilsOnlyTheResultWithoutANumber(t *testing.T) {
	axes := []Axis{{"a", -1, 1, 2}}
	all := OverAll(axes, 2, func(x, out []float64) { out[0], out[1] = math.Sqrt(x[0]), x[0] })
	if !math.IsNaN(all[0].Low) || !math.IsNaN(all[0].High) {
		t.Errorf("sqrt over -1…2 = %v…%v, want no number at either end", all[0].Low, all[0].High)
	}
	if all[1].Low != -1 || all[1].High != 2 {
		t.Errorf("identity over -1…2 = %v…%v, want -1…2", all[1].Low, all[1].High)
	}
}
