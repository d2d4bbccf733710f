package canvas

import (
	"strings"
	"testing"

	"pgregory.net/rapid"

	"chargehand/tui/theme"
)

// lines draws on a small sheet and gives it without colour.
func lines(width, height int, draw func(*Canvas)) string {
	c := New(theme.Theme{}, width, height)
	draw(c)
	return c.String()
}

func TestText(t *testing.T) {
	for _, c := range []struct {
		name string
		draw func(*Canvas)
		want string
	}{
		{"over the right edge", func(c *Canvas) { c.Text(3, 0, "abc", theme.Text) }, "   ab"},
		{"over the left edge", func(c *Canvas) { c.Text(-1, 0, "abc", theme.Text) }, "bc   "},
		{"off the sheet", func(c *Canvas) { c.Text(0, 9, "abc", theme.Text) }, "     "},
		{"wide at the edge is left out", func(c *Canvas) { c.Text(2, 0, "電池", theme.Text) }, "  電 "},
		{"wide cut from the left", func(c *Canvas) { c.Text(0, 0, "電池", theme.Text); c.Text(1, 0, "x", theme.Text) }, " x池 "},
		{"wide cut from the right", func(c *Canvas) { c.Text(0, 0, "電池", theme.Text); c.Text(2, 0, "x", theme.Text) }, "電x  "},
		{"wide over the halves of two", func(c *Canvas) { c.Text(0, 0, "電池", theme.Text); c.Text(1, 0, "語", theme.Text) }, " 語  "},
		{"a mark stays with its letter", func(c *Canvas) { c.Text(0, 0, "Zoe\u0308!", theme.Text) }, "Zoe\u0308! "},
		{"a control character is dropped", func(c *Canvas) { c.Text(0, 0, "a\x1bb", theme.Text) }, "ab   "},
		{"clipped", func(c *Canvas) { c.Within(0, 0, 4, "abcdef", theme.Text) }, "abc… "},
		{"right", func(c *Canvas) { c.Right(5, 0, 5, "ab", theme.Text) }, "   ab"},
		{"centred", func(c *Canvas) { c.Centred(2, 0, 5, "abc", theme.Text) }, " abc "},
	} {
		if got := lines(5, 1, c.draw); got != c.want {
			t.Errorf("%s: String() = %q, want %q", c.name, got, c.want)
		}
	}
}

func TestWiresJoin(t *testing.T) {
	draw := func(c *Canvas) {
		c.Box(0, 0, 4, 2, theme.Wire)
		c.Wire(2, 0, 2, 2, theme.Wire)
		c.Wire(0, 1, 4, 1, theme.Wire)
	}
	if got, want := lines(5, 3, draw), "┌─┬─┐\n├─┼─┤\n└─┴─┘"; got != want {
		t.Errorf("String() =\n%s\nwant\n%s", got, want)
	}
	c := New(theme.New(theme.Options{ASCII: true}), 5, 3)
	draw(c)
	if got, want := c.String(), "+-+-+\n+-+-+\n+-+-+"; got != want {
		t.Errorf("String() under ASCII =\n%s\nwant\n%s", got, want)
	}
	bar := func(c *Canvas) { c.Bar(2, 0, 2, 2, theme.Symbol); c.Wire(0, 1, 2, 1, theme.Wire) }
	if got, want := lines(3, 3, bar), "  ┃\n──┨\n  ┃"; got != want {
		t.Errorf("String() =\n%s\nwant\n%s", got, want)
	}
}

func TestRunsOfOneRoleShareTheirColour(t *testing.T) {
	c := New(theme.New(theme.Options{Colour: true, Dark: true}), 9, 1)
	c.Text(0, 0, "abc", theme.Danger)
	c.Text(3, 0, "de", theme.Text)
	if got, want := c.String(), "\x1b[1;91mabc\x1b[0mde    "; got != want {
		t.Errorf("String() = %q, want %q", got, want)
	}
}

// Whatever is drawn wherever, the sheet keeps its size.
func TestSizeIsKept(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		width, height := rapid.IntRange(-2, 20).Draw(t, "width"), rapid.IntRange(-2, 6).Draw(t, "height")
		c := New(theme.New(theme.Options{Colour: rapid.Bool().Draw(t, "colour")}), width, height)
		at := rapid.IntRange(-5, 25)
		for range rapid.IntRange(0, 8).Draw(t, "strokes") {
			x, y := at.Draw(t, "x"), at.Draw(t, "y")
			switch rapid.IntRange(0, 2).Draw(t, "kind") {
			case 0:
				c.Text(x, y, theme.Clean(rapid.String().Draw(t, "text")), theme.Alarm)
			case 1:
				c.Wire(x, y, at.Draw(t, "x1"), y, theme.Wire)
			case 2:
				c.Box(x, y, at.Draw(t, "x1"), at.Draw(t, "y1"), theme.Wire)
			}
		}
		got := strings.Split(c.String(), "\n")
		if height <= 0 {
			if c.String() != "" {
				t.Fatalf("String() = %q, want nothing", c.String())
			}
			return
		}
		if len(got) != height {
			t.Fatalf("String() has %d lines, want %d", len(got), height)
		}
		for _, line := range got {
			if w := theme.Width(line); w != max(width, 0) {
				t.Fatalf("line %q is %d wide, want %d", line, w, max(width, 0))
			}
		}
	})
}
