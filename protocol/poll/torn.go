package poll

import (
	"fmt"
	"math"

	"chargehand/commission/signal"
	"chargehand/protocol/registermap"
)

// torn suspects wide integers of which one register is older than another: the number is off by about one step of the
// higher register, 65536, for one sample. Floats tear too, but there a step of the higher register is under 1 % of the value
// and cannot be told from a change.
type torn struct {
	known   bool
	last    float64 // raw number, the last believed
	step    float64 // usual change from sample to sample, smoothed
	suspect bool
	odd     float64 // raw number under suspicion
}

// slack is how far from a step of the higher register a torn value may lie, at least: what the lower register moved.
const slack = 64

// check passes a reading on, or holds its value back until the next sample confirms it.
func (t *torn) check(p registermap.Point, r signal.Reading) signal.Reading {
	if p.Words() < 2 || p.Type == registermap.F32 || p.Type == registermap.F64 || !r.Quality.HasValue() {
		return r
	}
	raw := p.Number(r.Raw)
	change := raw - t.last
	switch {
	case !t.known:
	case t.suspect && math.Abs(raw-t.odd) < math.Abs(change): // it stayed: a real change
		t.suspect, t.last = false, raw
		return r
	case !t.suspect && t.isOddStep(change):
		t.suspect, t.odd = true, raw
		return withdrawn(r, signal.Bad, fmt.Sprintf("may be torn: moved by %.0f in one sample; the next one decides", change))
	default:
		t.step += (math.Abs(change) - t.step) / 8
	}
	t.known, t.suspect, t.last = true, false, raw
	return r
}

// isOddStep tells a change by about one step of a higher register from the usual ones.
func (t *torn) isOddStep(change float64) bool {
	tolerance := max(slack, 4*t.step)
	for _, step := range []float64{1 << 16, 1 << 32, 1 << 48} {
		if tolerance < step/2 && math.Abs(math.Abs(change)-step) <= tolerance {
			return true
		}
	}
	return false
}
