package walkview

import (
	"context"
	"time"

	"chargehand/commission"
	"chargehand/commission/unattended"
)

// Session is an open walk as the screen sees it.
type Session struct {
	Run      *commission.Run
	Operator unattended.Operator // the hand at a simulated plant; nil on a real one
	Log      string              // path of the log
	MaxAge   time.Duration
	Pace     func() float64 // how fast the plant's clock runs; 1 on a real plant
	Signed   bool           // sign-offs get a signature
	Unsigned string         // why not
	Notes    []string       // worth knowing before the walk
	Bell     func()         // rings the terminal's bell; nil where there is none
	// Finish signs the sealed log and writes the report; it says in lines what was written.
	Finish func(ctx context.Context) ([]string, error)
	// Close ends the walk; the log stays as it is.
	Close func() error
}
