package oneline

import (
	"time"

	"chargehand/commission/signal"
	"chargehand/tui/canvas"
	"chargehand/tui/theme"
)

// The sizes of the two drawings, in columns and rows. Below the compact one the states and readings are written in words.
const (
	CompactWidth, CompactHeight = 80, 7
	RoomyWidth, RoomyHeight     = 140, 12
	roomyWithLegend             = RoomyHeight + 1
)

// Height is how many rows [View] takes of the given size: 7 for the compact drawing, 12 or 13 for the roomy one.
func Height(width, height int) int {
	switch {
	case width >= RoomyWidth && height >= RoomyHeight:
		return min(height, roomyWithLegend)
	case width >= CompactWidth && height >= CompactHeight:
		return CompactHeight
	}
	return max(0, min(height, CompactHeight))
}

// View draws the plan with the readings of one instant, in exactly width columns and [Height] rows. A reading older than
// maxAge is withdrawn; one that is unproved is marked with a question mark. A signal that live lacks is not read at all.
func View(plan Plan, live map[signal.Name]signal.Reading, unproved map[signal.Name]bool, now time.Time, maxAge time.Duration,
	t theme.Theme, width, height int) string {
	rows := Height(width, height)
	d := &drawing{
		Canvas:  canvas.New(t, width, rows),
		instant: instant{live, unproved, now, maxAge, t},
		plan:    plan,
	}
	switch {
	case width >= RoomyWidth && rows >= RoomyHeight:
		d.roomy()
	case width >= CompactWidth && rows >= CompactHeight:
		d.compact()
	default:
		d.words()
	}
	return d.String()
}
