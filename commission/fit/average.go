package fit

import (
	"math"
	"slices"
)

// Scatter is the average of repeated readings.
type Scatter struct {
	Mean, SD, MeanSE float64 // SD is NaN below two values, all three below one
	N                int
}

// Average gives mean and standard deviation in two passes, the mean corrected by the mean of the residuals: the sum of
// squares about zero would lose every digit on a large offset.
func Average(values []float64) Scatter {
	n := float64(len(values))
	if n == 0 {
		return Scatter{Mean: math.NaN(), SD: math.NaN(), MeanSE: math.NaN()}
	}
	mean := 0.0
	for i, v := range values {
		mean += (v - mean) / float64(i+1)
	}
	rest := 0.0
	for _, v := range values {
		rest += v - mean
	}
	mean += rest / n
	squares, rest := 0.0, 0.0
	for _, v := range values {
		squares += (v - mean) * (v - mean)
		rest += v - mean
	}
	sd := math.NaN()
	if n > 1 {
		sd = math.Sqrt((squares - rest*rest/n) / (n - 1))
	}
	return Scatter{Mean: mean, SD: sd, MeanSE: sd / math.Sqrt(n), N: len(values)}
}

// Median is the middle value, NaN of none; it does not move for one wild value.
func Median(values []float64) float64 {
	if len(values) == 0 {
		return math.NaN()
	}
	sorted := slices.Sorted(slices.Values(values))
	half := len(sorted) / 2
	if len(sorted)%2 == 1 {
		return sorted[half]
	}
	return (sorted[half-1] + sorted[half]) / 2
}

// Runs is z of the Wald–Wolfowitz runs test on the signs of residuals in order: strongly negative where neighbours lie on
// one side, so that the model is wrong; 0 where there are too few to say. Zeros are left out.
func Runs(residuals []float64) float64 {
	var plus, minus, runs float64
	previous := 0.0
	for _, r := range residuals {
		if r == 0 {
			continue
		}
		sign := math.Copysign(1, r)
		if sign > 0 {
			plus++
		} else {
			minus++
		}
		if sign != previous {
			runs++
		}
		previous = sign
	}
	n := plus + minus
	variance := 2 * plus * minus * (2*plus*minus - n) / (n * n * (n - 1))
	if n < 3 || !(variance > 0) {
		return 0
	}
	return (runs - (2*plus*minus/n + 1)) / math.Sqrt(variance)
}
