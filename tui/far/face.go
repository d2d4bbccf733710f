package far

import (
	"time"

	"chargehand/commission/signal"
	"chargehand/tui/canvas"
	"chargehand/tui/theme"
)

// Figure is one reading, large.
type Figure struct {
	Label string // above it: "difference"
	Shown theme.Shown
	Limit string     // below it: "close at ≤ 25 V"
	Role  theme.Role // how the digits look where the value calls for it; theme.Text: as the reading itself
}

// Reading makes a figure of a reading as it may be shown at now.
func Reading(t theme.Theme, label string, r signal.Reading, unproved bool, now time.Time, maxAge time.Duration, limit string) Figure {
	return Figure{Label: label, Shown: t.Show(r, unproved, now, maxAge), Limit: limit}
}

// Countdown is a time that runs out.
type Countdown struct {
	Label string // "time-out in"; empty: no countdown
	Left  time.Duration
	Role  theme.Role
}

// Link is the state of the link in words.
type Link struct {
	Text string
	Role theme.Role
}

// Face is everything on the far view.
type Face struct {
	Banner    string // "REHEARSAL" or empty
	Title     string // what is being done
	Link      Link
	Figures   []Figure // the first three are shown
	Countdown Countdown
	Hint      string // the key that leads back
}

// The size for which the far view is made, at least.
const LeastWidth, LeastHeight = 40, 10

// View draws the face in exactly width columns and height rows. Below [LeastWidth] × [LeastHeight] it writes what fits.
func (f Face) View(t theme.Theme, width, height int) string {
	c := canvas.New(t, width, height)
	width, height = c.Width(), c.Height()
	f.head(c)
	bottom := height
	if f.Hint != "" && height > LeastHeight {
		bottom--
		c.Within(0, bottom, width, theme.Clean(f.Hint), theme.Faint)
	}
	if blocks := f.blocks(t); len(blocks) > 0 && height > 1 {
		drawAll(c, blocks, 1, bottom)
	}
	return c.String()
}

// head writes the banner, the title and at the right the link.
func (f Face) head(c *canvas.Canvas) {
	x := 0
	if f.Banner != "" {
		x = c.Within(0, 0, c.Width(), " "+theme.Clean(f.Banner)+" ", theme.Hazard) + 1
	}
	link := theme.Clean(f.Link.Text)
	room := c.Width() - x - theme.Width(link) - 2
	if room < 0 {
		c.Within(x, 0, c.Width()-x, link, f.Link.Role)
		return
	}
	c.Within(x, 0, room, theme.Clean(f.Title), theme.Title)
	c.Right(c.Width(), 0, c.Width()-x, link, f.Link.Role)
}

// block is one figure or the countdown, ready to be drawn.
type block struct {
	label, limit string
	number, unit string // in glyphs
	role         theme.Role
	note         string // instead of glyphs where they would mislead
}

func (f Face) blocks(t theme.Theme) []block {
	var list []block
	for _, g := range f.Figures[:min(len(f.Figures), 3)] {
		b := block{label: theme.Clean(g.Label), limit: t.Plain(theme.Clean(g.Limit)), role: g.Role}
		if b.role == theme.Text || !g.Shown.HasValue() {
			b.role = g.Shown.Role
		}
		b.number, b.unit = g.Shown.Number, g.Shown.Unit
		if g.Shown.Mark != "" {
			b.label += " (not yet proved)"
		}
		if !g.Shown.HasValue() {
			b.number, b.unit, b.note = "- - -", "", g.Shown.String()
		}
		list = append(list, b)
	}
	if f.Countdown.Label != "" {
		list = append(list, block{label: theme.Clean(f.Countdown.Label), number: Clock(f.Countdown.Left), role: f.Countdown.Role})
	}
	return list
}

// Clock writes a remaining time as minutes and seconds, or hours, minutes and seconds; it stops at 0:00. A begun second
// counts whole, so that 0:00 means the time is over.
func Clock(left time.Duration) string {
	if left <= 0 {
		return "0:00"
	}
	seconds := int64((left + time.Second - 1) / time.Second)
	two := func(v int64) string { return string([]byte{byte('0' + v/10), byte('0' + v%10)}) }
	hours, minutes := seconds/3600, seconds/60%60
	if hours > 99 {
		return "99:59:59"
	}
	text := two(minutes) + ":" + two(seconds%60)
	if hours > 0 {
		text = two(hours) + ":" + text
	}
	if text[0] == '0' {
		return text[1:]
	}
	return text
}
