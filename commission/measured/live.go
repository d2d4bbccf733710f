package measured

import (
	"fmt"
	"math"
	"time"

	"chargehand/commission/capture"
	"chargehand/commission/fit"
	"chargehand/commission/quantity"
	"chargehand/commission/signal"
)

// Check is the early test of a charge: so long after the pre-charge has closed the bus must have reached so much. A shorted
// bus draws the same power as a good charge; only the missing rise shows it.
type Check struct {
	At      time.Duration
	AtLeast quantity.Voltage
}

// Rising is the answer of [Rise] for the samples so far.
type Rising struct {
	Decided bool // a sample at or after Check.At has come
	Missing bool // decided, and the bus has not risen: open now
	Since   time.Duration
	Words   string
}

// Rise decides from the samples so far whether the rise is missing. It is to be asked with every sample. Without a new
// value at the time of the check nothing is decided: the words then say how long there has been none, which is a reason to
// open of its own.
func Rise(c capture.Capture, check Check) Rising {
	bus := traceOf(c, signal.BusVoltage)
	limit := check.At.Seconds()
	for i, t := range bus.t {
		if t < limit || math.IsNaN(bus.v[i]) {
			continue
		}
		r := Rising{Decided: true, Since: time.Duration(t * float64(time.Second))}
		r.Missing = bus.between(math.Inf(-1), t+1e-9).greatest() < float64(check.AtLeast)
		if r.Missing {
			r.Words = fmt.Sprintf("open now: %.1f V at %.2f s, at least %.1f V wanted at %.2f s", bus.v[i], t, float64(check.AtLeast), limit)
		} else {
			r.Words = fmt.Sprintf("rise good: %.1f V at %.2f s, at least %.1f V wanted", bus.v[i], t, float64(check.AtLeast))
		}
		return r
	}
	r := Rising{Words: fmt.Sprintf("wanted at least %.1f V at %.2f s", float64(check.AtLeast), limit)}
	if len(c.Samples) > 0 {
		r.Since = c.Samples[len(c.Samples)-1].At
		if late := r.Since.Seconds() - math.Max(0, bus.last()); late > 0.5 {
			r.Words = fmt.Sprintf("no bus voltage for %.1f s: nothing shows whether the bus rises", late)
		}
	}
	return r
}

// Progress is what the samples so far say of the curve.
type Progress struct {
	TimeConstant, Error quantity.Seconds // Error is U, with Student's t
	Final               quantity.Voltage
	Judged              bool   // long enough for a verdict
	Words               string // for the screen
}

// SoFar fits the samples so far of a charge or a discharge.
func SoFar(c capture.Capture) Progress {
	bus := traceOf(c, signal.BusVoltage)
	bus = bus.between(0, math.Inf(1))
	if c.Kind == capture.Precharge {
		if at := traceOf(c, signal.BypassClosed).firstAt(0.5, 0); !math.IsNaN(at) {
			bus = bus.between(0, at)
		}
		if at := bus.firstAt(bus.least()+math.Max(6*bus.resolution, 0.02*bus.span()), 0); !math.IsNaN(at) {
			bus = bus.between(at, math.Inf(1))
		}
	}
	t, v := fit.OncePerRefresh(bus.t, bus.v, fit.Refresh(bus.t, bus.v, bus.resolution))
	o := fit.Options{Resolution: bus.resolution}
	zero := 0.0
	if c.Kind == capture.Discharge {
		o.FixedFinal = &zero
	}
	curve := fit.Exponential(t, v, o)
	if curve.Status != fit.OK && curve.Status != fit.TooEarly {
		return Progress{Words: string(curve.Status)}
	}
	p := Progress{TimeConstant: quantity.Seconds(curve.Tau), Final: quantity.Voltage(curve.Final), Judged: curve.Status == fit.OK,
		Error: quantity.Seconds(fit.Coverage(curve.Freedom) * curve.TauSE)}
	p.Words = fmt.Sprintf("so far %.3g s ± %.2g s", curve.Tau, float64(p.Error))
	if !p.Judged {
		p.Words += ", too early for a verdict"
	}
	return p
}
