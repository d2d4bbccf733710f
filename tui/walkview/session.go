package walkview

import (
	"context"
	"time"

	"chargehand/commission"
	"chargehand/commission/finding"
	"chargehand/commission/signal"
	"chargehand/commission/site"
	"chargehand/commission/unattended"
)

// Session is an open walk as the screen sees it.
type Session struct {
	Run      *commission.Run
	Operator unattended.Operator // the hand at a simulated plant; nil on a real one
	Log      string              // path of the log
	MaxAge   time.Duration
	Pace     func() float64         // how fast the plant's clock runs; 1 on a real plant
	Key      string                 // fingerprint of the key that signs; empty where there is none
	Unsigned string                 // why sign-offs get no signature; empty where they do
	Notes    []string               // worth knowing before the walk
	Bell     func()                 // rings the terminal's bell; nil where there is none
	Places   map[signal.Name]string // where the map reads each signal, in both notations

	// Check calculates the desk findings of a site with this walk's register map. It is pure and quick.
	Check func(site.Site) []finding.Finding
	// KeepSite writes a revised site file beside the old one and says where; nil where there is no file.
	KeepSite func(text string) (path string, err error)
	// Move goes on with the log in another file.
	Move func(path string) error
	// Finish signs the sealed log and writes the report; it says in lines what was written.
	Finish func(ctx context.Context) ([]string, error)
	// Close ends the walk; the log stays as it is.
	Close func() error
}
