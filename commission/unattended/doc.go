// Package unattended goes the walk without a screen: it sends the events that a screen would.
//
// Start at [Rehearse], which plays the operator on a simulated plant, and [Observe], which only watches a real one: it arms
// captures by itself and leaves undecided whatever needs a hand.
package unattended
