package window

import (
	"fmt"
	"math"
	"testing"

	"chargehand/commission/finding/findingtest"
	"chargehand/commission/site"
)

// The rows against figures by hand from wagtail's own numbers: 198 cells, 62 mΩ, 260 A, 4.1085 V error, 990 V lowest bus.
func TestTable(t *testing.T) {
	rows := Table(findingtest.Load(t, "wagtail"))
	if len(rows) != 11 {
		t.Fatalf("Table = %d rows, want 11", len(rows))
	}
	for _, row := range []struct {
		at           int
		charge, rest float64
		margin       float64
	}{
		{0, 0, 198 * 3.20, 990 - (198*3.20 + 260*0.062 + 4.1085)},
		{1, 0.1, 198 * 3.45, 990 - (198*3.45 + 260*0.062 + 4.1085)},
		{3, 0.3, 198 * (3.45 + 0.5*(3.66-3.45)), 990 - (198*(3.45+0.5*(3.66-3.45)) + 260*0.062 + 4.1085)},
		{10, 1, 198 * 4.15, 148.0715},
	} {
		got := rows[row.at]
		if math.Abs(float64(got.StateOfCharge)-row.charge) > 1e-12 || math.Abs(float64(got.Rest)-row.rest) > 1e-9 || math.Abs(float64(got.Margin.Nominal)-row.margin) > 1e-9 {
			t.Errorf("Table[%d] = %v, %v, margin %v, want %v, %v V, %v V", row.at, got.StateOfCharge, got.Rest, got.Margin.Nominal, row.charge, row.rest, row.margin)
		}
	}
	// Full power everywhere: the least rest voltage for it lies below the window.
	for k, r := range rows {
		if math.Abs(float64(r.Available.Nominal)-220e3) > 1e-6 {
			t.Errorf("Table[%d].Available = %v, want rated power", k, r.Available.Nominal)
		}
		if !(r.Current.Low <= r.Current.Nominal && r.Current.Nominal <= r.Current.High) || r.Terminal.Nominal >= r.Rest {
			t.Errorf("Table[%d] = current %v, terminal %v at rest %v", k, r.Current, r.Terminal, r.Rest)
		}
	}
	if rows[0].Current.Nominal <= rows[10].Current.Nominal {
		t.Error("Table: current does not fall towards full charge")
	}
}

// Where the rating binds, the power is η·(E − R_i·I)·I with I the limit, as in window.full-power's own formula backwards.
func TestTablePowerBelowFullPower(t *testing.T) {
	s := findingtest.Load(t, "ouzel")
	full := fullPowerFinding(s).Value.Nominal
	for k, r := range Table(s) {
		limited := r.Available.Nominal < 180e3*(1-1e-9)
		if limited != (float64(r.Rest) < full-1e-9) {
			t.Errorf("Table[%d] at %v gives %v, and full power begins at %v V", k, r.Rest, r.Available.Nominal, full)
		}
		if want := 0.97 * (float64(r.Rest) - 0.085*250) * 250; limited && math.Abs(float64(r.Available.Nominal)-want) > 1e-6*want {
			t.Errorf("Table[%d].Available = %v, want %v", k, r.Available.Nominal, want)
		}
	}
	if rows := Table(site.Site{}); rows != nil {
		t.Errorf("Table(empty site) = %v, want none", rows)
	}
	if rows := Table(findingtest.Load(t, "nightjar")); len(rows) != 11 || !math.IsNaN(float64(rows[3].StateOfCharge)) {
		t.Errorf("Table(no state of charge) = %v, want eleven rows over the voltage", rows)
	}
}

func ExampleDuty() {
	d := Duty(600, 1000)
	fmt.Printf("lower switch %.0f, upper %.0f\n", d, 1-d)
	// Output: lower switch 40 %, upper 60 %
}
