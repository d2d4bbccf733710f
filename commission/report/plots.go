package report

import (
	"fmt"
	"math"
	"strings"

	"chargehand/commission/capture"
	"chargehand/commission/discharge"
	"chargehand/commission/droop"
	"chargehand/commission/finding"
	"chargehand/commission/measured"
	"chargehand/commission/precharge"
	"chargehand/commission/quantity"
	"chargehand/commission/signal"
	"chargehand/commission/site"
)

// traceColumns is how finely a trace is drawn: beyond what a printer resolves on this width, so no spike is lost.
const traceColumns = 700

// plotsOf are the drawings of one capture.
func (s Story) plotsOf(c Capture) []Plot {
	if len(c.data.Samples) == 0 {
		return nil
	}
	switch c.data.Kind {
	case capture.Precharge:
		return []Plot{s.prechargePlot(c), s.closingPlot(c)}
	case capture.Droop:
		return []Plot{s.droopPlot(c)}
	case capture.Discharge:
		return []Plot{s.dischargePlot(c)}
	}
	p := Plot{ID: c.ID, Title: "Capture " + c.ID + ": " + c.What, X: Axis{Label: "time", Unit: "s"}, Y: Axis{Label: "bus voltage", Unit: "V"}}
	p.X.Low, p.X.High = c.extent()
	p.trace("bus voltage", Measured, c, signal.BusVoltage)
	p.fitY()
	return []Plot{p}
}

func (c Capture) extent() (from, to float64) {
	samples := c.data.Samples
	return samples[0].At.Seconds(), samples[len(samples)-1].At.Seconds()
}

// trace draws one signal of a capture; a gap stays a gap.
func (p *Plot) trace(name string, role Role, c Capture, n signal.Name) {
	t, v := c.data.Series(n)
	if len(t) == 0 {
		return
	}
	l := Layer{Name: name, Role: role}
	if len(t) <= traceColumns {
		l.X, l.Y = broken(c.data, t, v)
	} else {
		for _, d := range c.data.Decimated(n, p.X.Low, p.X.High, traceColumns) {
			if !d.OK {
				continue // a column between two samples; true gaps are broken below
			}
			l.X, l.Y = append(l.X, d.T, d.T), append(l.Y, d.Low, d.High)
		}
		l.X, l.Y = broken(c.data, l.X, l.Y)
	}
	p.Layers = append(p.Layers, l)
}

// broken puts a NaN into a trace wherever the capture marks a gap.
func broken(c capture.Capture, t, v []float64) (x, y []float64) {
	gap := 0
	for i := range t {
		for gap < len(c.Gaps) && c.Gaps[gap].To.Seconds() <= t[i]+1e-9 {
			if i > 0 && t[i-1] <= c.Gaps[gap].From.Seconds()+1e-9 {
				x, y = append(x, t[i]), append(y, math.NaN())
			}
			gap++
		}
		x, y = append(x, t[i]), append(y, v[i])
	}
	return x, y
}

func (p *Plot) level(name string, v float64) {
	if !math.IsNaN(v) && v != 0 {
		p.Layers = append(p.Layers, Layer{Name: name, Role: Border, Shape: Level, Level: v})
	}
}

func (p *Plot) moment(name string, t float64) {
	if !math.IsNaN(t) {
		p.Layers = append(p.Layers, Layer{Name: name, Role: Border, Shape: Moment, Level: t})
	}
}

// band draws a predicted range with its nominal line.
func (p *Plot) band(x, low, nominal, high []float64) {
	if len(x) == 0 {
		return
	}
	p.Layers = append(p.Layers, Layer{Name: "predicted, all corners", Role: Predicted, Shape: Band, X: x, Low: low, High: high},
		Layer{Name: "predicted, nominal", Role: Predicted, Shape: Line, X: x, Y: nominal})
}

// before is the last value of a signal up to an instant, else its first; NaN where it has none.
func before(c capture.Capture, n signal.Name, at float64) float64 {
	t, v := c.Series(n)
	value := math.NaN()
	for i := range t {
		if t[i] > at && !math.IsNaN(value) {
			break
		}
		value = v[i]
	}
	return value
}

// restVoltage is the source's rest voltage at the start of a charge: as read then, with its error, else the whole window.
func restVoltage(c capture.Capture, s site.Site) quantity.Spread[quantity.Voltage] {
	if v := before(c, signal.SourceVoltage, 0); v > 0 {
		e := s.Source.Error()
		return quantity.Spread[quantity.Voltage]{Low: quantity.Voltage(v) - e, Nominal: quantity.Voltage(v), High: quantity.Voltage(v) + e}
	}
	return wholeWindow(s)
}

func wholeWindow(s site.Site) quantity.Spread[quantity.Voltage] {
	low, high := s.Source.LowestRest(), s.Source.HighestRest()
	return quantity.Spread[quantity.Voltage]{Low: low, Nominal: (low + high) / 2, High: high}
}

func (s Story) prechargePlot(c Capture) Plot {
	p := Plot{ID: c.ID, Title: fmt.Sprintf("Pre-charge, attempt %d", c.Attempt), X: Axis{Label: "time since the pre-charge closed", Unit: "s"},
		Y: Axis{Label: "voltage", Unit: "V"}}
	from, to := c.extent()
	p.X.Low, p.X.High = math.Max(from, -0.5), to
	v0 := math.Max(0, before(c.data, signal.BusVoltage, 0))
	if math.IsNaN(v0) {
		v0 = 0
	}
	predicted := precharge.Predict(c.site, restVoltage(c.data, c.site), quantity.Voltage(v0))
	p.prechargeBand(predicted)
	p.trace("source voltage, measured", Beside, c, signal.SourceVoltage)
	p.trace("bus voltage, measured", Measured, c, signal.BusVoltage)
	if e := predicted.EarlyRise; e.At > 0 && e.At.Seconds() < to {
		p.Layers = append(p.Layers, Layer{Name: "least early rise", Role: Border, Shape: Points, X: []float64{e.At.Seconds()}, Y: []float64{float64(e.AtLeast)}})
	}
	p.moment("bypass closes", c.firstOn(signal.BypassClosed))
	p.fitY()
	p.Caption = s.says(c, "measured.precharge")
	if len(predicted.Missing) > 0 {
		p.Caption = append(p.Caption, "nothing is predicted without "+strings.Join(predicted.Missing, ", "))
	}
	return p
}

func (p *Plot) prechargeBand(predicted precharge.Prediction) {
	var x, low, nominal, high []float64
	for _, at := range predicted.Band {
		x, low = append(x, at.At.Seconds()), append(low, float64(at.Bus.Low))
		nominal, high = append(nominal, float64(at.Bus.Nominal)), append(high, float64(at.Bus.High))
	}
	p.band(x, low, nominal, high)
}

// firstOn is the first instant from T0 on at which a state is on; NaN if never.
func (c Capture) firstOn(n signal.Name) float64 {
	t, v := c.data.Series(n)
	for i := range t {
		if t[i] >= 0 && v[i] != 0 {
			return t[i]
		}
	}
	return math.NaN()
}

// closingPlot is the last of the charge in detail: the difference that stood across the bypass as it closed.
func (s Story) closingPlot(c Capture) Plot {
	p := Plot{ID: c.ID, Title: "Closing of the bypass, in detail", X: Axis{Label: "time since the pre-charge closed", Unit: "s"},
		Y: Axis{Label: "voltage", Unit: "V"}}
	at := c.firstOn(signal.BypassClosed)
	if math.IsNaN(at) {
		return Plot{}
	}
	from, to := c.extent()
	p.X.Low, p.X.High = math.Max(from, at-1.5), math.Min(to, at+1)
	p.trace("source voltage, measured", Beside, c, signal.SourceVoltage)
	p.trace("star point voltage, measured", Fitted, c, signal.StarPointVoltage)
	p.trace("bus voltage, measured", Measured, c, signal.BusVoltage)
	p.moment("bypass reports closed", at)
	if d := c.site.Precharge.ClosingDifference; d.IsGiven() {
		if e := before(c.data, signal.SourceVoltage, at); !math.IsNaN(e) {
			p.level("source less closing_difference", e-float64(d.Nominal))
		}
	}
	p.fitY()
	p.Caption = s.says(c, "measured.closing")
	return p
}

func (s Story) droopPlot(c Capture) Plot {
	p := Plot{ID: c.ID, Title: "Droop of the commissioned converter", X: Axis{Label: "bus current of the converter", Unit: "A"},
		Y: Axis{Label: "bus voltage", Unit: "V"}}
	p.droopBand(droop.Predict(c.site))
	steps := Layer{Name: "settled steps, measured", Role: Measured, Shape: Points}
	off := Layer{Name: "steps at a limit", Role: Border, Shape: Points}
	least, most := math.Inf(1), math.Inf(-1)
	for _, st := range measured.Steps(c.data) {
		to := &steps
		if st.Limited {
			to = &off
		}
		to.X, to.Y = append(to.X, float64(st.Current)), append(to.Y, float64(st.Voltage))
		least, most = math.Min(least, float64(st.Current)), math.Max(most, float64(st.Current))
	}
	if noLoad, slope, ok := s.line(c); ok && most > least {
		p.Layers = append(p.Layers, Layer{Name: "line through the steps", Role: Fitted, X: []float64{least, most},
			Y: []float64{noLoad - slope*least, noLoad - slope*most}})
	}
	for _, l := range []Layer{steps, off} {
		if len(l.X) > 0 {
			p.Layers = append(p.Layers, l)
		}
	}
	p.X.Low, p.X.High = xRange(p.Layers)
	p.fitY()
	p.Caption = s.says(c, "measured.droop")
	return p
}

// droopBand draws the line of the commissioned converter at the bus over its whole current, over all corners.
func (p *Plot) droopBand(d droop.Prediction) {
	if len(d.Missing) > 0 {
		return
	}
	var x, low, nominal, high []float64
	const points = 40
	for i := range points + 1 {
		current := float64(d.Least) + float64(d.Most-d.Least)*float64(i)/points
		steep, flat := float64(d.BusSlope.High)*current, float64(d.BusSlope.Low)*current
		if current < 0 {
			steep, flat = flat, steep
		}
		x, low = append(x, current), append(low, float64(d.NoLoad.Low)-steep)
		nominal = append(nominal, float64(d.NoLoad.Nominal)-float64(d.BusSlope.Nominal)*current)
		high = append(high, float64(d.NoLoad.High)-flat)
	}
	p.band(x, low, nominal, high)
}

func xRange(layers []Layer) (low, high float64) {
	low, high = math.Inf(1), math.Inf(-1)
	for _, l := range layers {
		for _, x := range l.X {
			low, high = math.Min(low, x), math.Max(high, x)
		}
	}
	return low, high
}

// line is the fitted droop line of a capture as its finding states it.
func (s Story) line(c Capture) (noLoad, slope float64, ok bool) {
	for _, f := range s.Measured {
		if f.Finding.ID != "measured.droop" || !restsOn(f.Finding, c.ID) || f.Finding.State != finding.Finite {
			continue
		}
		for _, part := range f.Finding.Parts {
			if part.Name == "no-load voltage" {
				return part.Value.Nominal, f.Finding.Value.Nominal, true
			}
		}
	}
	return 0, 0, false
}

func (s Story) dischargePlot(c Capture) Plot {
	p := Plot{ID: c.ID, Title: "Discharge", X: Axis{Label: "time since the bleeding began", Unit: "s"}, Y: Axis{Label: "bus voltage", Unit: "V"}}
	p.X.Low, p.X.High = c.extent()
	v0 := before(c.data, signal.BusVoltage, 0)
	if v0 > 0 {
		e := c.site.Bus.Error()
		start := quantity.Spread[quantity.Voltage]{Low: max(quantity.Voltage(v0)-e, 0), Nominal: quantity.Voltage(v0), High: quantity.Voltage(v0) + e}
		p.dischargeBand(discharge.Predict(c.site, start))
	}
	p.trace("bus voltage, measured", Measured, c, signal.BusVoltage)
	if t := c.site.Bus.TouchSafe; t != nil {
		p.level("touch-safe voltage", float64(t.Voltage.Nominal))
	}
	p.fitY()
	p.Caption = s.says(c, "measured.discharge")
	return p
}

func (p *Plot) dischargeBand(predicted discharge.Prediction) {
	var x, low, nominal, high []float64
	for _, at := range predicted.Band {
		x, low = append(x, at.At.Seconds()), append(low, float64(at.Bus.Low))
		nominal, high = append(nominal, float64(at.Bus.Nominal)), append(high, float64(at.Bus.High))
	}
	p.band(x, low, nominal, high)
}

// windowPlot is the source's window under the bus over the state of charge; empty where the site has no window.
func (s Story) windowPlot() Plot { return windowPlot(s.table, s.onPaper) }

func windowPlot(table []windowRow, desk func(id string) (finding.Finding, bool)) Plot {
	p := Plot{ID: "window", Title: "Window: the source under the bus", X: Axis{Label: "state of charge", Unit: "%"}, Y: Axis{Label: "voltage", Unit: "V"}}
	var x, rest, low, high []float64
	for i, row := range table {
		at := 100 * float64(row.StateOfCharge)
		if math.IsNaN(at) {
			at, p.X.Label = 100*float64(i)/math.Max(1, float64(len(table)-1)), "part of the range of rest voltage"
		}
		x, rest = append(x, at), append(rest, float64(row.Rest))
		low, high = append(low, float64(row.Terminal.Low)), append(high, float64(row.Terminal.High))
	}
	if len(x) < 2 {
		return Plot{}
	}
	p.X.Low, p.X.High = x[0], x[len(x)-1]
	p.Layers = append(p.Layers, Layer{Name: "source terminals, discharging at rated power", Role: Predicted, Shape: Band, X: x, Low: low, High: high},
		Layer{Name: "source at rest", Role: Fitted, X: x, Y: rest})
	for _, border := range []struct {
		name, id string
		worst    func(finding.Value) float64
	}{
		{"highest source, charging", "window.source-high", func(v finding.Value) float64 { return v.High }},
		{"lowest bus", "window.bus-low", func(v finding.Value) float64 { return v.Low }},
		{"highest bus", "window.bus-high", func(v finding.Value) float64 { return v.High }},
	} {
		if f, ok := desk(border.id); ok && f.State == finding.Finite {
			v := border.worst(f.Value)
			p.level(border.name+" "+finding.Print(v, f.Unit, 4), v)
		}
	}
	if f, ok := desk("window.margin"); ok {
		p.Caption = append(p.Caption, sentence(f))
	}
	p.fitY()
	return p
}

// sharePlot is how the load was shared: the deviation from the share by rating inside its limits; empty where it was not
// measured.
func (s Story) sharePlot() Plot {
	p := Plot{ID: "share", Title: "Sharing of the load", X: Axis{Label: "infeed", Unit: ""}, Y: Axis{Label: "deviation from the share by rating", Unit: "%"}}
	for _, f := range s.Measured {
		m := f.Finding
		if m.ID != "measured.share" || f.Superseded || m.State != finding.Finite || m.Limit.Low == nil || m.Limit.High == nil {
			continue
		}
		n := float64(len(p.Caption)) + 1
		p.Layers = append(p.Layers,
			Layer{Name: "permitted", Role: Predicted, Shape: Band, X: []float64{n - 0.4, n + 0.4}, Low: []float64{100 * *m.Limit.Low, 100 * *m.Limit.Low},
				High: []float64{100 * *m.Limit.High, 100 * *m.Limit.High}, Hidden: n > 1},
			Layer{Name: "measured with its uncertainty", Role: Measured, X: []float64{n, n}, Y: []float64{100 * m.Value.Low, 100 * m.Value.High}, Hidden: n > 1},
			Layer{Role: Measured, Shape: Points, X: []float64{n}, Y: []float64{100 * m.Value.Nominal}, Hidden: true})
		p.Caption = append(p.Caption, fmt.Sprintf("%.0f: %s", n, sentence(m)))
	}
	if len(p.Layers) == 0 {
		return Plot{}
	}
	p.X.Low, p.X.High = 0.5, float64(len(p.Caption))+0.5
	p.fitY()
	return p
}

// onPaper is the standing desk finding with an id, the first where it stands several times.
func (s Story) onPaper(id string) (finding.Finding, bool) {
	for _, f := range s.Desk {
		if f.Finding.ID == id && !f.Superseded {
			return f.Finding, true
		}
	}
	return finding.Finding{}, false
}

// says gives what the findings with an id say of a capture.
func (s Story) says(c Capture, id string) []string {
	var says []string
	for _, f := range s.Measured {
		if f.Finding.ID == id && restsOn(f.Finding, c.ID) {
			says = append(says, sentence(f.Finding))
		}
	}
	return says
}

// restsOn tells whether a finding names the capture.
func restsOn(f finding.Finding, captureID string) bool {
	for _, id := range f.Captures {
		if id == captureID {
			return true
		}
	}
	return false
}

// sentence is a finding in one line.
func sentence(f finding.Finding) string {
	n := figuresOf(f)
	words := named(f) + ": " + string(f.Verdict) + ", " + n.value
	if f.Limit.IsGiven() {
		words += ", limit " + n.limit
	}
	return words
}
