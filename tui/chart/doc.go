// Package chart draws curves with exact axes: a predicted band, its nominal line, the trace that is measured, points with
// a fitted line, limits and moments as markers, and a cursor to read values off.
//
// Start at [Chart] and [Chart.View]. [NewAxis] holds the arithmetic that keeps drawing and labels together: a row of
// characters stands for a whole fraction of the step between two ticks, so every tick falls on the middle of a row (on the
// first dot column of a column) and whatever has the tick's value is drawn in the row that carries its label. What lies
// outside the axes is not dropped but marked at the edge; what is missing is left blank and marked on the axis.
//
// A chart is drawn with Braille dots (2 × 4 to a character), with half blocks (1 × 2), or in ASCII (1 × 1).
package chart
