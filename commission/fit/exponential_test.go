package fit

import (
	"math"
	"math/rand/v2"
	"testing"
)

// agree tells whether two numbers share so many significant digits.
func agree(got, want float64, digits int) bool {
	return math.Abs(got-want) <= 0.5*math.Pow(10, float64(1-digits))*math.Pow(10, math.Floor(math.Log10(math.Abs(want))))
}

var misra1aX = []float64{77.6, 114.9, 141.1, 190.8, 239.9, 289.0, 332.8, 378.4, 434.8, 477.3, 536.8, 593.1, 689.1, 760.0}
var misra1aY = []float64{10.07, 14.73, 17.94, 23.93, 29.61, 35.18, 40.02, 44.82, 50.76, 55.05, 61.01, 66.40, 75.47, 81.78}
var boxBODX = []float64{1, 2, 3, 5, 7, 10}
var boxBODY = []float64{109, 149, 149, 191, 213, 224}

// The certified values of NIST StRD, nonlinear regression. b1 is Final, b2 is 1⁄Tau, Start is fixed at 0. The starts are
// NIST's for b2; b1 needs none, being a linear fit once b2 is chosen.
func TestExponentialMeetsCertifiedValues(t *testing.T) {
	zero := 0.0
	tests := []struct {
		name         string
		x, y         []float64
		starts       []float64
		b1, b2       float64
		b1SE, b2SE   float64
		ssr, s, corr float64
		corrDigits   int
		source       string
	}{
		{"Misra1a", misra1aX, misra1aY, []float64{0.0001, 0.0005}, 2.3894212918e+02, 5.5015643181e-04, 2.7070075241e+00, 7.2668688436e-06,
			1.2455138894e-01, 1.0187876330e-01, -0.998776, 6, "NIST StRD Misra1a; correlation recomputed with 60 digits"},
		{"BoxBOD", boxBODX, boxBODY, []float64{1, 0.75}, 2.1380940889e+02, 5.4723748542e-01, 1.2354515176e+01, 1.0455993237e-01,
			1.1680088766e+03, 1.7088072423e+01, -0.729846, 6, "NIST StRD BoxBOD; correlation recomputed with 60 digits"},
	}
	for _, test := range tests {
		for _, start := range append([]float64{math.Inf(1)}, test.starts...) { // 1⁄∞: without a start
			c := Exponential(test.x, test.y, Options{FixedStart: &zero, TauStart: 1 / start})
			// d ln b2 = −d ln Tau; the sign of the correlation turns with it.
			for _, check := range []struct {
				what      string
				got, want float64
				digits    int
			}{
				{"b1", c.Final, test.b1, 9}, {"b2", 1 / c.Tau, test.b2, 9},
				{"SE b1", c.FinalSE, test.b1SE, 7}, {"SE b2", c.TauSE / c.Tau / c.Tau, test.b2SE, 7},
				{"residual sum of squares", c.SSR, test.ssr, 9}, {"residual standard deviation", c.S, test.s, 9},
				{"correlation", -c.Correlation, test.corr, test.corrDigits},
			} {
				if !agree(check.got, check.want, check.digits) {
					t.Errorf("Exponential(%s from b2 = %g) %s = %.11g, want %.11g (%s)", test.name, start, check.what, check.got, check.want, test.source)
				}
			}
		}
	}
}

// Misra1a reaches 34 % of its final value: the fit is exact and yet no basis for a verdict.
func TestExponentialSaysTooEarly(t *testing.T) {
	zero := 0.0
	c := Exponential(misra1aX, misra1aY, Options{FixedStart: &zero})
	if c.Status != TooEarly || c.Why == "" {
		t.Errorf("Exponential(Misra1a) = status %q, %q, want %q with words", c.Status, c.Why, TooEarly)
	}
}

// A second computation for the same model with other arithmetic: for a fixed b2 the best b1 is a ratio of sums, so bisect
// the derivative of the sum of squares.
func TestExponentialAgreesWithRatioOfSums(t *testing.T) {
	ssr := func(b2 float64) float64 {
		var yp, pp float64
		for i := range boxBODX {
			p := 1 - math.Exp(-b2*boxBODX[i])
			yp, pp = yp+boxBODY[i]*p, pp+p*p
		}
		sum := 0.0
		for i := range boxBODX {
			r := boxBODY[i] - yp/pp*(1-math.Exp(-b2*boxBODX[i]))
			sum += r * r
		}
		return sum
	}
	low, high := 0.1, 3.0
	for range 200 {
		a, b := low+(high-low)/3, high-(high-low)/3
		if ssr(a) < ssr(b) {
			high = b
		} else {
			low = a
		}
	}
	zero := 0.0
	c := Exponential(boxBODX, boxBODY, Options{FixedStart: &zero})
	if math.Abs(1/c.Tau-low) > 1e-6 {
		t.Errorf("Exponential(BoxBOD) b2 = %.9g, want %.9g by ratio of sums", 1/c.Tau, low)
	}
}

// Shares of the final value after n time constants, as handbooks print them.
func TestExponentialMeetsHandbookShares(t *testing.T) {
	n := []float64{0, 0.5, 1, 2, 3, 4, 5, 6, 7}
	share := []float64{0, 39.3469, 63.2121, 86.4665, 95.0213, 98.1684, 99.3262, 99.7521, 99.9088}
	c := Exponential(n, share, Options{})
	if c.Status != OK || math.Abs(c.Tau-1) > 1e-5 || math.Abs(c.Final-100) > 1e-3 || math.Abs(c.Start) > 1e-3 {
		t.Errorf("Exponential(handbook shares) = %q tau %.7g final %.7g start %.3g, want 1, 100, 0 (RC charge, any circuits handbook)", c.Status, c.Tau, c.Final, c.Start)
	}
	printed := []struct{ n, percent float64 }{{1, 63.2}, {2, 86.5}, {3, 95.0}, {4, 98.2}, {5, 99.3}}
	for _, p := range printed {
		if got := c.At(p.n); math.Abs(got-p.percent) > 0.1 {
			t.Errorf("At(%g) = %.2f %%, want %.1f %% (T. Kuphaldt, Lessons in Electric Circuits, vol. I, ch. 16)", p.n, got, p.percent)
		}
	}
}

// The published worked case of testdata/public-cases.json (P28): irregular, noisy, 1 V register.
func TestExponentialOnIrregularQuantisedSamples(t *testing.T) {
	times, volts := publicCase(t, "P28", "t_s", "v_V")
	c := Exponential(times, volts, Options{Resolution: 1})
	for _, check := range []struct {
		what           string
		got, want, rel float64
	}{
		{"final", c.Final, 716.1617372035674, 1e-6}, {"start", c.Start, 12.307358868376262, 1e-5}, {"tau", c.Tau, 0.5599552069262835, 1e-6},
		{"SE final", c.FinalSE, 0.4684988286618728, 0.02}, {"SE tau", c.TauSE, 0.0016170743114773518, 0.02},
	} {
		if math.Abs(check.got/check.want-1) > check.rel {
			t.Errorf("Exponential(P28) %s = %.9g, want %.9g", check.what, check.got, check.want)
		}
	}
}

// A standard error is honest when the scatter of many fits about the truth is as large as it says.
func TestExponentialStandardErrorsAreHonest(t *testing.T) {
	const runs, tau, final, noise, q = 400, 0.8, 600.0, 0.7, 0.1
	random := rand.New(rand.NewPCG(1, 2))
	sum, se := 0.0, 0.0
	for range runs {
		var times, volts []float64
		for at := 0.0; at < 3.5; at += 0.01 + 0.03*random.Float64() {
			v := final*(1-math.Exp(-at/tau)) + noise*random.NormFloat64()
			times, volts = append(times, at), append(volts, math.Round(v/q)*q)
		}
		c := Exponential(times, volts, Options{Resolution: q})
		sum += (c.Tau - tau) * (c.Tau - tau)
		se += c.TauSE * c.TauSE
	}
	if ratio := math.Sqrt(sum / se); ratio < 0.9 || ratio > 1.1 {
		t.Errorf("scatter of tau over 400 records ⁄ stated standard error = %.3f, want 1 ± 0.1", ratio)
	}
}

func TestExponentialRefuses(t *testing.T) {
	ramp := []float64{0, 1, 2, 3, 4, 5, 6, 7, 8, 9}
	tests := []struct {
		name string
		t, v []float64
		o    Options
		want Status
	}{
		{"empty", nil, nil, Options{}, TooFewPoints},
		{"two points", []float64{0, 1}, []float64{0, 5}, Options{}, TooFewPoints},
		{"constant", ramp, []float64{7, 7, 7, 7, 7, 7, 7, 7, 7, 7}, Options{Resolution: 0.1}, NoRise},
		{"no rise beyond the register's steps", ramp, []float64{7, 7.1, 7, 7.2, 7, 7.1, 7.3, 7, 7.1, 7}, Options{Resolution: 0.1}, NoRise},
		{"NaN", ramp, []float64{0, 1, 2, math.NaN(), 4, 5, 6, 7, 8, 9}, Options{}, NotFinite},
		{"time reversed", []float64{9, 8, 7, 6, 5, 4, 3, 2, 1, 0}, ramp, Options{}, NotOrdered},
		{"one instant", []float64{1, 1, 1, 1, 1, 1}, []float64{0, 1, 2, 3, 4, 5}, Options{}, NotOrdered},
		{"straight ramp", ramp, ramp, Options{Resolution: 0.001}, NoTau},
	}
	for _, test := range tests {
		if got := Exponential(test.t, test.v, test.o); got.Status != test.want || got.Why == "" {
			t.Errorf("Exponential(%s) = status %q (%s), want %q with words", test.name, got.Status, got.Why, test.want)
		}
	}
}

func TestOncePerRefreshKeepsTauWhereValuesRepeat(t *testing.T) {
	const tau, final, refresh, poll = 0.9, 700.0, 0.1, 0.017
	var times, volts []float64
	for at := 0.0; at < 4.5; at += poll {
		held := math.Floor((at+0.03)/refresh)*refresh - 0.03 // the device's own clock is not ours
		times, volts = append(times, at), append(volts, math.Round(10*final*(1-math.Exp(-math.Max(0, held)/tau)))/10)
	}
	estimate := Refresh(times, volts, 0.1)
	if math.Abs(estimate-refresh) > poll {
		t.Errorf("Refresh = %.3f s, want %.3f s", estimate, refresh)
	}
	keptT, keptV := OncePerRefresh(times, volts, estimate)
	if n := float64(len(keptT)); n < 0.8*4.5/refresh || n > 1.3*4.5/refresh {
		t.Errorf("OncePerRefresh kept %g of %d samples, want about %g", n, len(times), 4.5/refresh)
	}
	// The first renewals stand before the start of the charge, so the curve begins after two of them.
	c := Exponential(keptT[2:], keptV[2:], Options{Resolution: 0.1})
	if c.Status != OK || math.Abs(c.Tau-tau) > 4*c.TauSE || c.TauSE > 0.05 {
		t.Errorf("Exponential(once per refresh) = %q tau %.4f ± %.4f, want %.4f", c.Status, c.Tau, c.TauSE, tau)
	}
}

func TestRefreshIsZeroWhereEveryReadingIsNew(t *testing.T) {
	var times, volts []float64
	for i := range 100 {
		times, volts = append(times, float64(i)*0.05), append(volts, 500*(1-math.Exp(-float64(i)*0.05)))
	}
	if got := Refresh(times, volts, 0.1); got != 0 {
		t.Errorf("Refresh(new at each poll) = %g, want 0", got)
	}
}

func TestStepFindsInstantLevelsAndTimeConstant(t *testing.T) {
	random := rand.New(rand.NewPCG(3, 4))
	var times, volts []float64
	for i := range 120 {
		at := float64(i) * 0.02
		v := 1000.0
		if at > 0.5 {
			v -= 18 * (1 - math.Exp(-(at-0.5)/0.15))
		}
		times, volts = append(times, at), append(volts, v+0.05*random.NormFloat64())
	}
	r := Step(times, volts, 0.01)
	if r.Status != OK || math.Abs(r.Before-1000) > 0.05 || math.Abs(r.After-982) > 0.1 || math.Abs(r.At-0.5) > 0.03 || math.Abs(r.Tau-0.15) > 0.02 {
		t.Errorf("Step = %+v, want 1000 to 982 at 0.5 with 0.15", r)
	}
}
