package fit

import "math"

// Refresh estimates how often the device renews a value that is polled faster than that: the median distance between
// changes where the value moves by more than three resolutions from change to change. It is 0 where fewer than four in ten
// readings there repeat their predecessor, so that the polling is the slower of the two.
func Refresh(t, v []float64, resolution float64) float64 {
	var distances []float64
	repeats, all := 0, 0
	lastChange := -1
	pending := 0
	for i := 1; i < len(t); i++ {
		if v[i] == v[i-1] {
			pending++
			continue
		}
		if lastChange >= 0 && math.Abs(v[i]-v[i-1]) > 3*resolution {
			distances = append(distances, t[i]-t[lastChange])
			repeats += pending
			all += pending + 1
		}
		lastChange, pending = i, 0
	}
	if len(distances) < 4 || float64(repeats) < 0.4*float64(all) {
		return 0
	}
	return Median(distances)
}

// OncePerRefresh keeps one reading per renewal by the device: each change, and where the value stands still one per
// refresh. With refresh 0 the record is kept as it is.
func OncePerRefresh(t, v []float64, refresh float64) (keptT, keptV []float64) {
	if refresh <= 0 || len(t) == 0 {
		return t, v
	}
	for i := range t {
		changed := i > 0 && v[i] != v[i-1]
		if len(keptT) == 0 || changed || t[i]-keptT[len(keptT)-1] >= 0.98*refresh {
			keptT, keptV = append(keptT, t[i]), append(keptV, v[i])
		}
	}
	// The first reading may be of any age within a refresh: it goes where a younger one follows.
	if len(keptT) > leastPoints {
		keptT, keptV = keptT[1:], keptV[1:]
	}
	return keptT, keptV
}
