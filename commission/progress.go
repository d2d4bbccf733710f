package commission

import (
	"time"

	"chargehand/commission/capture"
)

// Progress is a capture under way, as a screen draws it.
type Progress struct {
	Point   string
	Kind    capture.Kind
	Attempt int
	Phase   Phase
	Elapsed time.Duration // since the event, or since arming
	Longest time.Duration // when it ends by itself at the latest; 0 where only a hand ends it

	// X and Y are the trace: time in seconds and bus voltage in volts, or for the load stairs bus current in amperes and bus
	// voltage in volts.
	X, Y []float64
	// Band is the prediction on the same axes.
	Band Band
	// Steps are the settled load steps so far, and Line is the line through them; nil before three of them.
	Steps []Settled
	Line  *Line

	Rise    *Rise    // the early check of a pre-charge; nil for other captures
	OpenNow string   // why the pre-charge must be opened at once; empty while it need not
	SoFar   []string // what can be said already, a line each
}

// Band is a predicted range over an axis.
type Band struct{ X, Low, Nominal, High []float64 }

// Settled is one settled load step.
type Settled struct{ Current, Voltage float64 } // A, V

// Line is a fitted straight line with the standard error of its value at any current.
type Line struct {
	NoLoad, Droop     float64 // V, V/A: voltage = NoLoad − Droop · current
	At                func(current float64) float64
	StandardErrorAt   func(current float64) float64
	NoLoadSE, DroopSE float64
}

// Rise is the early check: at At the bus must have risen to AtLeast.
type Rise struct {
	At      time.Duration
	AtLeast float64  // V
	Seen    *float64 // V, once the time has come
}
