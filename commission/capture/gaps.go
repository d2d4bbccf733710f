package capture

import (
	"cmp"
	"math"
	"slices"
	"time"

	"chargehand/commission/signal"
)

// WithGaps gives the capture with every stretch marked in which a signal brought no value for longer than the given time:
// beside those already marked, with the same words for all.
func (c Capture) WithGaps(n signal.Name, longest time.Duration, why string) Capture {
	i := c.Index(n)
	marked := slices.Clone(c.Gaps)
	have := false
	var last time.Duration
	for _, s := range c.Samples {
		if i < 0 || i >= len(s.Values) || !s.Values[i].OK {
			continue
		}
		if have && s.At-last > longest && !c.marks(last, s.At) {
			marked = append(marked, Gap{From: last, To: s.At, Why: why})
		}
		have, last = true, s.At
	}
	slices.SortStableFunc(marked, func(a, b Gap) int { return cmp.Compare(a.From, b.From) })
	c.Gaps = marked
	return c
}

func (c Capture) marks(from, to time.Duration) bool {
	for _, g := range c.Gaps {
		if g.From < to && g.To > from {
			return true
		}
	}
	return false
}

// LongestGap is the longest stretch between from and to, in seconds since T0, in which a signal brought no value.
func (c Capture) LongestGap(n signal.Name, from, to float64) float64 {
	t, _ := c.Series(n)
	longest, last := 0.0, from
	for _, at := range t {
		if at < from || at > to {
			continue
		}
		longest, last = math.Max(longest, at-last), at
	}
	return math.Max(longest, to-last)
}

// Dot is one column of a drawn trace: the least and the greatest value in it.
type Dot struct {
	T         float64 // seconds since T0, the middle of the column
	Low, High float64
	OK        bool // false where the column has no value: a gap is drawn as a gap
}

// Decimated gives one signal between two instants as so many columns, each with its least and greatest value, so that no
// spike is lost in drawing. It is for the eye only: a fit takes the samples themselves.
func (c Capture) Decimated(n signal.Name, from, to float64, columns int) []Dot {
	if columns < 1 || !(to > from) {
		return nil
	}
	dots := make([]Dot, columns)
	width := (to - from) / float64(columns)
	for k := range dots {
		dots[k].T = from + (float64(k)+0.5)*width
	}
	t, v := c.Series(n)
	for i, at := range t {
		if at < from || at > to || math.IsNaN(v[i]) {
			continue
		}
		d := &dots[min(int((at-from)/width), columns-1)]
		if !d.OK {
			d.Low, d.High, d.OK = v[i], v[i], true
			continue
		}
		d.Low, d.High = math.Min(d.Low, v[i]), math.Max(d.High, v[i])
	}
	return dots
}
