package measured

import (
	"fmt"
	"math"

	"chargehand/commission/capture"
	"chargehand/commission/droop"
	"chargehand/commission/finding"
	"chargehand/commission/fit"
	"chargehand/commission/quantity"
	"chargehand/commission/signal"
	"chargehand/commission/site"
)

// defaultDroopTolerance holds where the site states no share_tolerance: common practice.
const defaultDroopTolerance = 0.10

// line is a fitted droop line with the steps that made it and those that do not belong to it.
type line struct {
	site       site.Site
	prediction droop.Prediction
	on, off    []Step // on the line; at a limit or below the source
	fit        fit.Straight
	slope      measurement // V/A, positive for a falling line
	noLoad     measurement
}

// Droop judges load steps of the commissioned converter: measured.droop (slope), measured.setpoint (no-load voltage) and,
// where the other infeeds' currents were read, measured.share.
func Droop(s site.Site, steps []Step) []finding.Finding {
	l := lineOf(s, steps)
	out := []finding.Finding{l.droop()}
	if l.fit.Status == fit.OK {
		out = append(out, l.setpoint())
	}
	if share, ok := l.share(); ok {
		out = append(out, share)
	}
	causes := l.causes()
	for i := range out {
		if out[i].Verdict == finding.Fail || out[i].Verdict == finding.Undecided && len(causes) > 0 && causes[0].ID != notKnown {
			out[i].Cause = causes
		}
	}
	if len(causes) > 0 && causes[0].ID != notKnown && out[0].Verdict != finding.Fail { // a kink or a lost infeed shows beside a good slope
		if faultsOfLine[causes[0].ID] {
			out[0].Verdict, out[0].Cause = finding.Fail, causes
			out[0].Because = append(out[0].Because, causes[0].Evidence...)
		}
	}
	return out
}

// faultsOfLine are causes that fail the droop although the fitted slope may be good.
var faultsOfLine = map[string]bool{"limit-too-low": true, "infeed-lost": true, "bus-hunts": true, "droop-off": true, "source-soft": true, "current-reversed": true, "charger-refuses": true, "chopper-dead": true}

func lineOf(s site.Site, steps []Step) *line {
	l := &line{site: s, prediction: droop.Predict(s)}
	for _, st := range steps {
		if st.Limited || l.atLimit(st) {
			l.off = append(l.off, st)
			continue
		}
		l.on = append(l.on, st)
	}
	l.dropKink()
	var x, y []float64
	noise := 0.0
	for _, st := range l.on {
		x, y = append(x, float64(st.Current)), append(y, float64(st.Voltage))
		noise = math.Max(noise, float64(st.CurrentU))
	}
	l.fit = fit.Line(x, y, 0)
	if l.fit.Status != fit.OK {
		return l
	}
	for _, st := range l.on { // scatter of the points below what each is known to claims nothing
		l.fit.S = math.Max(l.fit.S, float64(st.VoltageU))
	}
	l.fit.SlopeSE = math.Max(l.fit.SlopeSE, l.fit.S/math.Sqrt(l.fit.SumSquaresX))
	nominal := float64(s.Bus.Nominal.Nominal)
	busGain := float64(s.Bus.Error()) / nominal
	l.slope = measurement{value: -l.fit.Slope, u: l.fit.SlopeSE, freedom: l.fit.Freedom, bound: math.Abs(l.fit.Slope) * math.Hypot(busGain, currentError/2)}
	l.noLoad = measurement{value: l.fit.Intercept, u: l.fit.InterceptSE, freedom: l.fit.Freedom, bound: float64(s.Bus.Error())}
	return l
}

// atLimit: at the rated current the converter no longer follows its line.
func (l *line) atLimit(st Step) bool {
	if len(l.prediction.Missing) > 0 {
		return false
	}
	return float64(st.Current) > 0.985*float64(l.prediction.Most) || float64(st.Current) < 0 && float64(st.Current) < 0.985*float64(l.prediction.Least)
}

// dropKink takes the steps off the line that share one current while the voltage falls: a limit that nobody stated.
func (l *line) dropKink() {
	greatest := math.Inf(-1)
	for _, st := range l.on {
		greatest = math.Max(greatest, float64(st.Current))
	}
	var at []int
	for i, st := range l.on {
		if float64(st.Current) > 0.97*greatest && greatest > 0 {
			at = append(at, i)
		}
	}
	if len(at) < 2 || len(l.on) == len(at) {
		return
	}
	low, high := math.Inf(1), math.Inf(-1)
	for _, i := range at {
		low, high = math.Min(low, float64(l.on[i].Voltage)), math.Max(high, float64(l.on[i].Voltage))
	}
	d := l.paperSlope()
	if high-low < 4*d.high*0.03*greatest+0.002*high {
		return
	}
	var on []Step
	for _, st := range l.on {
		if float64(st.Current) > 0.97*greatest {
			st.Limited = true
			l.off = append(l.off, st)
			continue
		}
		on = append(on, st)
	}
	l.on = on
}

// paperSlope is the droop as set, up to droop and cable, each with the tolerance that the sharing allows.
func (l *line) paperSlope() band {
	tolerance := defaultDroopTolerance
	if load := l.site.Load; load != nil && load.ShareTolerance.IsGiven() {
		tolerance = float64(load.ShareTolerance.Nominal)
	}
	p := l.prediction
	return band{float64(p.TerminalSlope.Low) * (1 - tolerance), float64(p.TerminalSlope.Nominal), float64(p.BusSlope.High) * (1 + tolerance)}
}

func (l *line) droop() finding.Finding {
	out := verdictFinding("measured.droop", "droop as measured", "V/A",
		"ordinary least squares V = V₀ − d·I over the settled steps; gain errors apart from scatter; guard band U = k·u, Student's t for few points")
	out.Subject = l.prediction.Infeed
	if len(l.prediction.Missing) > 0 {
		return cannot(out, "there is no prediction: the site lacks its infeeds' values")
	}
	if l.fit.Status != fit.OK {
		return cannot(out, fmt.Sprintf("%d settled steps stand on the line, %d at a limit: %s", len(l.on), len(l.off), l.fit.Status))
	}
	if span := l.span(); span < 0.15*float64(l.prediction.Most) {
		return cannot(out, fmt.Sprintf("the steps span %s, wanted at least 15 %% of the rated current", number(span, "A")))
	}
	verdict, text := judge(l.slope, l.paperSlope(), "droop", "V/A")
	out = withMeasurement(out, l.slope, l.paperSlope())
	out.Verdict, out.Because = verdict, append(out.Because, text)
	out.Parts = append(out.Parts, finding.Part{Name: "no-load voltage", Unit: "V", Value: l.noLoad.asValue()},
		finding.Part{Name: "steps on the line", Unit: "1", Value: finding.Exactly(float64(len(l.on)))})
	if verdict != finding.Pass && l.slope.value > 0 {
		d := l.site.Infeeds[0].Droop.At(l.site.Bus.Nominal.Nominal, l.site.Infeeds[0].RatedCurrent.Nominal)
		out.Remedy = fmt.Sprintf("multiply the droop setting by %.3f, then repeat the steps", float64(d)/l.slope.value)
	}
	return out
}

func (l *line) span() float64 {
	low, high := math.Inf(1), math.Inf(-1)
	for _, st := range l.on {
		low, high = math.Min(low, float64(st.Current)), math.Max(high, float64(st.Current))
	}
	return high - low
}

func (l *line) setpoint() finding.Finding {
	return Setpoint(l.site, quantity.Voltage(l.noLoad.value), quantity.Voltage(l.fit.InterceptSE), l.fit.Freedom, l.site.Bus.Error())
}

// Setpoint judges the no-load voltage of the commissioned converter, with the standard uncertainty of its scatter, the
// degrees of freedom behind that and the error of what it was read with: measured.setpoint.
func Setpoint(s site.Site, noLoad, u quantity.Voltage, freedom int, instrument quantity.Voltage) finding.Finding {
	out := verdictFinding("measured.setpoint", "no-load voltage as measured", "V", "intercept of the droop line, or a reading at no load; guard band from the instrument's error")
	if len(s.Infeeds) == 0 {
		return cannot(out, "the site has no infeed")
	}
	in := s.Infeeds[0]
	out.Subject = in.Name
	set := float64(in.Setpoint.Nominal)
	allowed := float64(in.SetpointError.Of(in.Setpoint.Nominal)) + float64(s.Bus.Regulation())
	b := band{set - allowed, set, set + allowed}
	m := measurement{value: float64(noLoad), u: float64(u), freedom: freedom, bound: float64(instrument)}
	verdict, text := judge(m, b, "no-load voltage", "V")
	out = withMeasurement(out, m, b)
	out.Verdict, out.Because = verdict, append(out.Because, text)
	if verdict != finding.Pass {
		out.Remedy = fmt.Sprintf("move the setpoint by %+.1f V, then repeat the steps", set-float64(noLoad))
	}
	return out
}

// share judges how the load divides, where every other infeed was read.
func (l *line) share() (finding.Finding, bool) {
	var worst *Step
	for i, st := range l.on {
		if len(l.site.Infeeds) > 1 && len(st.Others) == len(l.site.Infeeds)-1 && (worst == nil || st.Current > worst.Current) {
			worst = &l.on[i]
		}
	}
	if worst == nil {
		return finding.Finding{}, false
	}
	return Share(l.site, *worst), true
}

// Share judges the division of one load among the infeeds: measured.share.
func Share(s site.Site, st Step) finding.Finding {
	out := verdictFinding("measured.share", "share of the load as measured", "1", "current less the share by rating, in terms of the own rating; guard band from the current's error")
	if len(s.Infeeds) == 0 || len(st.Others) != len(s.Infeeds)-1 {
		return cannot(out, "not every infeed's current was read")
	}
	out.Subject = s.Infeeds[0].Name
	total, ratings := float64(st.Current), 0.0
	for _, in := range s.Infeeds {
		ratings += float64(in.RatedCurrent.Nominal)
	}
	for _, i := range st.Others {
		total += float64(i)
	}
	rated := float64(s.Infeeds[0].RatedCurrent.Nominal)
	deviation := (float64(st.Current) - total*rated/ratings) / rated
	tolerance := defaultDroopTolerance
	if s.Load != nil && s.Load.ShareTolerance.IsGiven() {
		tolerance = float64(s.Load.ShareTolerance.Nominal)
	}
	m := measurement{value: deviation, u: float64(st.CurrentU) / rated, freedom: 10, bound: currentError / 2 * total / ratings}
	b := band{-tolerance, 0, tolerance}
	verdict, text := judge(m, b, "deviation from the share by rating", "%")
	out = withMeasurement(out, m, b)
	out.Verdict, out.Because = verdict, append(out.Because, text)
	return out
}

// DroopCapture judges a capture of load stairs: its settled steps as [Droop] does, after a look at the readings themselves.
func DroopCapture(s site.Site, c capture.Capture) []finding.Finding {
	read := readingCauses(paperOf(s), c)
	out := Droop(s, Steps(c))
	for i := range out {
		out[i].Captures = named(c)
	}
	if why := unusable(c, signal.BusVoltage); why != "" {
		out = out[:1]
		out[0] = cannot(out[0], why)
	}
	if len(read) > 0 {
		out[0].Verdict = finding.Worst(out[0].Verdict, weight(read))
		out[0].Because = append(out[0].Because, read[0].Evidence...)
		out[0].Cause = ranked(append(out[0].Cause, read...))
	}
	return out
}
