package fit

import (
	"encoding/json"
	"math"
	"os"
	"testing"
)

func publicCase(t *testing.T, id, x, y string) (xs, ys []float64) {
	t.Helper()
	text, err := os.ReadFile("../../testdata/public-cases.json")
	if err != nil {
		t.Fatal(err)
	}
	var file struct {
		Cases []struct {
			ID     string
			Inputs map[string]json.RawMessage
		}
	}
	if err := json.Unmarshal(text, &file); err != nil {
		t.Fatal(err)
	}
	for _, c := range file.Cases {
		if c.ID != id {
			continue
		}
		for key, into := range map[string]*[]float64{x: &xs, y: &ys} {
			if err := json.Unmarshal(c.Inputs[key], into); err != nil {
				t.Fatalf("%s of case %s: %v", key, id, err)
			}
		}
		return xs, ys
	}
	t.Fatalf("no case %s", id)
	return nil, nil
}

var norrisY = []float64{0.1, 338.8, 118.1, 888.0, 9.2, 228.1, 668.5, 998.5, 449.1, 778.9, 559.2, 0.3, 0.1, 778.1, 668.8, 339.3, 448.9, 10.8, 557.7, 228.3, 998.0, 888.8, 119.6, 0.3, 0.6, 557.6, 339.3, 888.0, 998.5, 778.9, 10.2, 117.6, 228.9, 668.4, 449.2, 0.2}
var norrisX = []float64{0.2, 337.4, 118.2, 884.6, 10.1, 226.5, 666.3, 996.3, 448.6, 777.0, 558.2, 0.4, 0.6, 775.5, 666.9, 338.0, 447.5, 11.6, 556.0, 228.1, 995.8, 887.6, 120.2, 0.3, 0.3, 556.8, 339.1, 887.2, 999.0, 779.0, 11.1, 118.3, 229.2, 669.1, 448.9, 0.5}

var natrellaX = []float64{30, 100, 200, 300, 400, 500, 600, 700, 800, 900, 1000, 1100, 1200, 1300, 1400, 1500}
var natrellaY = []float64{4642, 4612, 4565, 4513, 4476, 4433, 4389, 4347, 4303, 4251, 4201, 4140, 4100, 4073, 4024, 3999}

var gumH3X = []float64{1.521, 2.012, 2.512, 3.003, 3.507, 3.999, 4.513, 5.002, 5.503, 6.010, 6.511} // t − 20 °C
var gumH3Y = []float64{-0.171, -0.169, -0.166, -0.159, -0.164, -0.165, -0.156, -0.157, -0.159, -0.161, -0.160}

func TestLineMeetsPublishedFits(t *testing.T) {
	norris, natrella, gum := Line(norrisX, norrisY, 0), Line(natrellaX, natrellaY, 0), Line(gumH3X, gumH3Y, 0)
	correlation := func(l Straight) float64 { return l.Covariance / l.InterceptSE / l.SlopeSE }
	tests := []struct {
		name      string
		got, want float64
		digits    int
		source    string
	}{
		{"Norris intercept", norris.Intercept, -0.262323073774029, 9, "NIST StRD, linear regression, Norris"},
		{"Norris slope", norris.Slope, 1.00211681802045, 12, "NIST StRD Norris"},
		{"Norris SE intercept", norris.InterceptSE, 0.232818234301152, 9, "NIST StRD Norris"},
		{"Norris SE slope", norris.SlopeSE, 0.429796848199937e-03, 9, "NIST StRD Norris"},
		{"Norris residual standard deviation", norris.S, 0.884796396144373, 9, "NIST StRD Norris"},
		{"Norris R squared", norris.RSquared, 0.999993745883712, 12, "NIST StRD Norris"},
		{"Norris residual sum of squares", norris.SSR, 26.6173985294224, 9, "NIST StRD Norris"},
		{"Norris covariance", norris.Covariance, -7.74327536339570e-05, 9, "GSL's linear fit test on Norris"},
		{"Natrella intercept", natrella.Intercept, 4654.9846, 8, "NBS Handbook 91, worksheet 5-4.1"},
		{"Natrella slope", natrella.Slope, -0.44985482, 8, "NBS Handbook 91, worksheet 5-4.1"},
		{"Natrella variance of the slope", natrella.SlopeSE * natrella.SlopeSE, 0.000025649045, 6, "NBS Handbook 91, worksheet 5-4.1"},
		{"Natrella variance of the intercept", natrella.InterceptSE * natrella.InterceptSE, 19.879452, 6, "NBS Handbook 91, worksheet 5-4.1"},
		{"Natrella residual standard deviation", natrella.S, 9.277617, 6, "NBS Handbook 91, worksheet 5-4.1"},
		{"Natrella variance of the fitted value at 1200", math.Pow(natrella.SEAt(1200), 2), 10.53, 4, "NBS Handbook 91, page 5-15"},
		{"Natrella variance of a new reading at 750", math.Pow(natrella.NewReadingSE(750), 2), 91.45, 3, "NBS Handbook 91, page 5-15"},
		{"GUM H.3 y1", gum.Intercept, -0.17120379, 7, "JCGM 100:2008 H.3.3 prints −0.1712"},
		{"GUM H.3 y2", gum.Slope, 0.00218270, 6, "JCGM 100:2008 H.3.3 prints 0.00218"},
		{"GUM H.3 u(y1)", gum.InterceptSE, 0.00287760, 6, "JCGM 100:2008 H.3.3 prints 0.0029"},
		{"GUM H.3 u(y2)", gum.SlopeSE, 0.00066794, 5, "JCGM 100:2008 H.3.3 prints 0.00067"},
		{"GUM H.3 s", gum.S, 0.00349756, 6, "JCGM 100:2008 H.3.3 prints 0.0035"},
		{"GUM H.3 r(y1, y2)", correlation(gum), -0.930430, 6, "JCGM 100:2008 H.3.3 prints −0.930"},
		{"GUM H.3 b(30 °C)", gum.At(10), -0.14937681, 7, "JCGM 100:2008 H.3.4 prints −0.1494"},
		{"GUM H.3 u(b(30 °C)), 0.00727 without the covariance", gum.SEAt(10), 0.00413860, 6, "JCGM 100:2008 H.3.4 prints 0.0041"},
	}
	for _, test := range tests {
		if !agree(test.got, test.want, test.digits) {
			t.Errorf("%s = %.14g, want %.14g to %d digits (%s)", test.name, test.got, test.want, test.digits, test.source)
		}
	}
}

// The published worked case P29 of testdata/public-cases.json: gain errors apart from scatter.
func TestLineKeepsGainErrorsApart(t *testing.T) {
	x, y := publicCase(t, "P29", "i_A", "v_V")
	l := Line(x, y, 0)
	slope, _ := l.WithGains(Gains{Y: 0.002, X: 0.01})
	for _, check := range []struct {
		what      string
		got, want float64
	}{
		{"slope", -l.Slope, 0.10910256410256404}, {"intercept", l.Intercept, 1000.8153846153848},
		{"SE slope", l.SlopeSE, 0.0009528131143774827}, {"SE intercept", l.InterceptSE, 0.12127331058836248},
		{"u slope", slope, 0.0014648560537746172},
	} {
		if math.Abs(check.got/check.want-1) > 1e-6 {
			t.Errorf("Line(P29) %s = %.9g, want %.9g", check.what, check.got, check.want)
		}
	}
}

func TestLineRefuses(t *testing.T) {
	if got := Line([]float64{1, 2}, []float64{1, 2}, 0).Status; got != TooFewPoints {
		t.Errorf("Line(two points) = %q, want %q", got, TooFewPoints)
	}
	if got := Line([]float64{3, 3, 3}, []float64{1, 2, 3}, 0).Status; got != NoRise {
		t.Errorf("Line(one x) = %q, want %q", got, NoRise)
	}
	if got := Line([]float64{1, 2, 3}, []float64{1, math.NaN(), 3}, 0).Status; got != NotFinite {
		t.Errorf("Line(NaN) = %q, want %q", got, NotFinite)
	}
}

// NIST StRD NumAcc2 and NumAcc4, built after their published pattern; mean and deviation are certified exact.
func TestAverageOnLargeOffset(t *testing.T) {
	for _, test := range []struct {
		name           string
		first, a, b    float64
		mean, sd, near float64
		source         string
	}{
		{"NumAcc2", 1.2, 1.1, 1.3, 1.2, 0.1, 1e-14, "NIST StRD, univariate summary statistics, NumAcc2"},
		{"NumAcc4", 10000000.2, 10000000.1, 10000000.3, 10000000.2, 0.1, 1e-8, "NIST StRD NumAcc4 (from memory); the decimals themselves are held to 2⁻³⁰ only"},
	} {
		values := []float64{test.first}
		for range 500 {
			values = append(values, test.a, test.b)
		}
		got := Average(values)
		if math.Abs(got.Mean-test.mean) > test.near || math.Abs(got.SD-test.sd) > test.near {
			t.Errorf("Average(%s) = %.12g, %.12g, want %.12g, %.12g (%s)", test.name, got.Mean, got.SD, test.mean, test.sd, test.source)
		}
	}
}

func TestCoverageIsStudentsT(t *testing.T) {
	table := []float64{12.71, 4.30, 3.18, 2.78, 2.57, 2.45, 2.36, 2.31, 2.26, 2.23} // 1…10 degrees, JCGM 100:2008, Table G.2
	for i, want := range table {
		if got := StudentT(0.975, float64(i+1)); math.Abs(got-want) > 0.0051 {
			t.Errorf("StudentT(0.975, %d) = %.3f, want %.2f (JCGM 100:2008, Table G.2)", i+1, got, want)
		}
	}
	// 95.45 %: JCGM 100:2008, Table G.2 prints 13.97, 4.53, 3.31, 2.87, 2.65 for 1…5 degrees and 2.13 for 20.
	for freedom, want := range map[int]float64{1: 13.97, 2: 4.53, 3: 3.31, 4: 2.87, 5: 2.65, 20: 2.13} {
		if got := Coverage(freedom); math.Abs(got-want) > 0.0051 {
			t.Errorf("Coverage(%d) = %.3f, want %.2f (JCGM 100:2008, Table G.2, from memory)", freedom, got, want)
		}
	}
	if !math.IsInf(Coverage(0), 1) {
		t.Error("Coverage(0) is finite, want none")
	}
}

func TestWithinProbabilityMeetsExamples(t *testing.T) {
	for _, test := range []struct {
		name            string
		y, u, low, high float64
		want            float64
	}{
		{"breakdown voltage", -5.47, 0.05, math.Inf(-1), -5.40, 0.919243},
		{"bursting strength", 507.8, 8.6, 490, math.Inf(1), 0.980763},
		{"viscosity", 13.6, 1.8, 12.5, 16.3, 0.662630},
	} {
		if got := WithinProbability(test.y, test.u, test.low, test.high); math.Abs(got-test.want) > 5e-6 {
			t.Errorf("WithinProbability(%s) = %.6f, want %.6f (JCGM 106:2012, 7, inputs from memory)", test.name, got, test.want)
		}
	}
}

func TestRunsTellsWaveFromNoise(t *testing.T) {
	var wave, alternating []float64
	for i := range 60 {
		wave = append(wave, math.Sin(float64(i)/6))
		alternating = append(alternating, float64(1-2*(i%2)))
	}
	if z := Runs(wave); z > -5 {
		t.Errorf("Runs(slow wave) = %.1f, want below −5", z)
	}
	if z := Runs(alternating); z < 5 {
		t.Errorf("Runs(alternating signs) = %.1f, want above 5", z)
	}
	if z := Runs([]float64{1, 1, 1, 1}); z != 0 {
		t.Errorf("Runs(one sign) = %g, want 0: nothing to say", z)
	}
}

// Norris once more, as a plane with a column of ones: another road to the certified line.
func TestLinearMeetsCertifiedLine(t *testing.T) {
	ones := make([]float64, len(norrisX))
	for i := range ones {
		ones[i] = 1
	}
	x, se, ok := Linear([][]float64{ones, norrisX}, norrisY)
	if !ok || !agree(x[0], -0.262323073774029, 9) || !agree(x[1], 1.00211681802045, 12) || !agree(se[1], 0.429796848199937e-03, 9) {
		t.Errorf("Linear(Norris) = %.12g, %.12g, want -0.262323073774029, 1.00211681802045 (NIST StRD Norris)", x, se)
	}
	if _, _, ok := Linear([][]float64{norrisX, norrisX}, norrisY); ok {
		t.Error("Linear(one column twice) is ok, want not")
	}
}
