package measured

import (
	"fmt"
	"math"
	"strings"

	"chargehand/commission/capture"
	"chargehand/commission/signal"
)

// trace is one signal of a capture on plain numbers.
type trace struct {
	t, v       []float64
	resolution float64 // of its register; 0 where values are floating point
	ok         bool    // the signal is in the capture and brought a value
}

func traceOf(c capture.Capture, n signal.Name) trace {
	i := c.Index(n)
	if i < 0 {
		return trace{}
	}
	tr := trace{}
	tr.t, tr.v = c.Series(n)
	tr.ok = len(tr.t) > 0
	if kind := c.Channels[i].Type; !strings.HasPrefix(kind, "f") {
		tr.resolution = math.Abs(c.Channels[i].Scale)
	}
	return tr
}

// between gives the part with from ≤ t < to.
func (tr trace) between(from, to float64) trace {
	part := trace{resolution: tr.resolution}
	for i, t := range tr.t {
		if t >= from && t < to {
			part.t, part.v = append(part.t, t), append(part.v, tr.v[i])
		}
	}
	part.ok = len(part.t) > 0
	return part
}

// at is the last value at or before t, the first value before that, NaN without any.
func (tr trace) at(t float64) float64 {
	value := math.NaN()
	for i := range tr.t {
		if tr.t[i] > t && !math.IsNaN(value) {
			break
		}
		value = tr.v[i]
	}
	return value
}

func (tr trace) least() float64 {
	least := math.Inf(1)
	for _, v := range tr.v {
		least = math.Min(least, v)
	}
	return least
}

func (tr trace) greatest() float64 {
	greatest := math.Inf(-1)
	for _, v := range tr.v {
		greatest = math.Max(greatest, v)
	}
	return greatest
}

func (tr trace) span() float64 {
	if !tr.ok {
		return 0
	}
	return tr.greatest() - tr.least()
}

// last is the end of the record in seconds, 0 without one.
func (tr trace) last() float64 {
	if !tr.ok {
		return 0
	}
	return tr.t[len(tr.t)-1]
}

// firstAt is the first instant at or after from at which the value is at least level; NaN if never.
func (tr trace) firstAt(level, from float64) float64 {
	for i, t := range tr.t {
		if t >= from && tr.v[i] >= level {
			return t
		}
	}
	return math.NaN()
}

// unusable says in words why the signal that a verdict rests on cannot carry one, "" where it can.
func unusable(c capture.Capture, n signal.Name) string {
	i := c.Index(n)
	switch {
	case i < 0:
		return fmt.Sprintf("the capture has no %s", n)
	case len(c.Samples) == 0:
		return "the capture is empty"
	}
	values, previous := 0, c.Samples[0].At
	for k, s := range c.Samples {
		if s.At < previous {
			return fmt.Sprintf("time runs backwards at sample %d: %.3f s after %.3f s", k+1, s.At.Seconds(), previous.Seconds())
		}
		previous = s.At
		if i >= len(s.Values) || !s.Values[i].OK {
			continue
		}
		if v := s.Values[i].V; math.IsNaN(v) || math.IsInf(v, 0) {
			return fmt.Sprintf("%s in sample %d is not a number", n, k+1)
		}
		values++
	}
	switch {
	case values == 0:
		return fmt.Sprintf("%s has no value in any of %d samples", n, len(c.Samples))
	case values < 5:
		return fmt.Sprintf("%s has %d values, wanted at least 5", n, values)
	}
	return ""
}
