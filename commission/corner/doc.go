// Package corner takes a calculation over all corners of its toleranced inputs.
//
// Start at [Over], or at [OverAll] for several results of one calculation. An input is an [Axis]; the calculation gets one
// number per axis, so a quantity that enters twice (the resistance in a time constant and in an energy) has the same value in
// both places of one corner. The outcome is a [Spread]. Inputs that only ever enter together share an axis ([Sum],
// [Parallel]). Where a result is not monotone between the corners, [Greatest] searches inside.
//
// It imports quantity and nothing else of the program.
package corner
