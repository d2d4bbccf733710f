package canvas

import "chargehand/tui/theme"

// Side says on which sides of a cell a conductor leaves it.
type Side uint8

// The sides.
const (
	Up Side = 1 << iota
	Down
	Left
	Right
)

// Wire draws a straight conductor from one cell to another on the same row or column. Where it meets one that is already
// there the two are joined.
func (c *Canvas) Wire(x0, y0, x1, y1 int, role theme.Role) { c.wire(x0, y0, x1, y1, role, false) }

// Bar draws a straight thick line, a bus bar.
func (c *Canvas) Bar(x0, y0, x1, y1 int, role theme.Role) { c.wire(x0, y0, x1, y1, role, true) }

func (c *Canvas) wire(x0, y0, x1, y1 int, role theme.Role, heavy bool) {
	if y0 == y1 {
		if x0 > x1 {
			x0, x1 = x1, x0
		}
		for x := max(x0, 0); x <= min(x1, c.width-1); x++ {
			c.join(x, y0, sides(x > x0, Left)|sides(x < x1, Right), role, heavy)
		}
		return
	}
	if y0 > y1 {
		y0, y1 = y1, y0
	}
	for y := max(y0, 0); y <= min(y1, c.height-1); y++ {
		c.join(x0, y, sides(y > y0, Up)|sides(y < y1, Down), role, heavy)
	}
}

func sides(here bool, s Side) Side {
	if here {
		return s
	}
	return 0
}

func (c *Canvas) join(x, y int, s Side, role theme.Role, heavy bool) {
	k := c.at(x, y)
	if k == nil {
		return
	}
	if k.char != 0 || k.covered {
		c.uncover(x, y)
		*k = cell{}
	}
	k.wires |= s
	k.heavy = k.heavy || heavy
	k.role = role
}

// Box draws a rectangle.
func (c *Canvas) Box(x0, y0, x1, y1 int, role theme.Role) {
	c.Wire(x0, y0, x1, y0, role)
	c.Wire(x0, y1, x1, y1, role)
	c.Wire(x0, y0, x0, y1, role)
	c.Wire(x1, y0, x1, y1, role)
}

var light = [16]string{
	0: " ", Up: "│", Down: "│", Up | Down: "│",
	Left: "─", Right: "─", Left | Right: "─",
	Down | Right: "┌", Down | Left: "┐", Up | Right: "└", Up | Left: "┘",
	Up | Down | Right: "├", Up | Down | Left: "┤", Down | Left | Right: "┬", Up | Left | Right: "┴",
	Up | Down | Left | Right: "┼",
}

// A thick bar is vertical or horizontal as a whole; what meets it is thin.
var heavy = [16]string{
	0: " ", Up: "┃", Down: "┃", Up | Down: "┃",
	Left: "━", Right: "━", Left | Right: "━",
	Down | Right: "┎", Down | Left: "┒", Up | Right: "┖", Up | Left: "┚",
	Up | Down | Right: "┠", Up | Down | Left: "┨", Down | Left | Right: "┯", Up | Left | Right: "┷",
	Up | Down | Left | Right: "╂",
}

func (c *Canvas) glyph(k *cell) string {
	if k.wires == 0 {
		return " "
	}
	if !c.theme.ASCII() {
		if k.heavy {
			return heavy[k.wires]
		}
		return light[k.wires]
	}
	switch upright, level := k.wires&(Up|Down) != 0, k.wires&(Left|Right) != 0; {
	case upright && level:
		return "+"
	case upright && k.heavy:
		return "#"
	case upright:
		return "|"
	case k.heavy:
		return "="
	}
	return "-"
}
