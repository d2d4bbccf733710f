package form

import (
	"strings"

	"github.com/charmbracelet/bubbles/key"

	"chargehand/tui/canvas"
	"chargehand/tui/theme"
)

// HelpLine writes keys on one line of exactly width columns: whole entries only, and where not all find room the last
// one that is named leaves its place to a mark. A disabled binding is left out.
func HelpLine(t theme.Theme, width int, keys []key.Binding) string {
	c := canvas.New(t, width, 1)
	x, cut := 0, t.Pick("…", "~")
	for i, k := range keys {
		if !k.Enabled() || k.Help().Key == "" {
			continue
		}
		shown := keyName(t, k)
		reserve := 0
		if i < len(keys)-1 {
			reserve = 2 + theme.Width(cut)
		}
		if x+theme.Width(shown)+1+theme.Width(k.Help().Desc)+reserve > width {
			c.Text(x, 0, cut, theme.Faint)
			break
		}
		x = c.Text(x, 0, shown, theme.Key) + 1
		x = c.Text(x, 0, k.Help().Desc, theme.Faint) + 3
	}
	return c.String()
}

func keyName(t theme.Theme, k key.Binding) string {
	return asciiArrows(t).Replace(k.Help().Key)
}

func asciiArrows(t theme.Theme) *strings.Replacer {
	if !t.ASCII() {
		return strings.NewReplacer()
	}
	return strings.NewReplacer("←", "Left", "→", "Right", "↑", "Up", "↓", "Down")
}

// HelpPage explains a screen in exactly width columns and height rows: what it is for, then its keys in as many columns as
// there is room for.
func HelpPage(t theme.Theme, width, height int, title, purpose string, groups [][]key.Binding) string {
	c := canvas.New(t, width, height)
	width = c.Width()
	c.Within(0, 0, width, theme.Clean(title), theme.Title)
	y := 2
	for _, line := range wrap(theme.Clean(purpose), min(width, 76)) {
		c.Within(0, y, width, line, theme.Text)
		y++
	}
	y++
	const column = 38
	columns := max(1, min(width/column, len(groups)))
	gap := 1
	if all := count(groups); (all+len(groups)+columns-1)/columns > height-y {
		gap = 0
	}
	next := make([]int, columns)
	for i := range next {
		next[i] = y
	}
	for _, group := range groups {
		to := shortest(next)
		for _, k := range group {
			if !k.Enabled() {
				continue
			}
			x := to * column
			c.Within(x, next[to], 11, keyName(t, k), theme.Key)
			c.Within(x+12, next[to], column-13, k.Help().Desc, theme.Text)
			next[to]++
		}
		next[to] += gap
	}
	return c.String()
}

func count(groups [][]key.Binding) int {
	n := 0
	for _, group := range groups {
		n += len(group)
	}
	return n
}

func shortest(next []int) int {
	best := 0
	for i, n := range next {
		if n < next[best] {
			best = i
		}
	}
	return best
}

// wrap breaks a text into lines of at most width columns, between words.
func wrap(text string, width int) []string {
	var lines []string
	line := ""
	for _, word := range strings.Fields(text) {
		switch {
		case line == "":
			line = word
		case theme.Width(line)+1+theme.Width(word) <= width:
			line += " " + word
		default:
			lines, line = append(lines, line), word
		}
	}
	if line != "" {
		lines = append(lines, line)
	}
	return lines
}
