// Package tui is the terminal program: it says which screen is shown, passes sizes and messages on, and asks long-lived
// sources for their next message in one place.
//
// Start at [Model]. Each screen is a package of its own with a Model value; what the screens need of the world is a [Host].
package tui
