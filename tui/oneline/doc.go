// Package oneline draws the live one-line diagram of one site: source, isolator, fuse, pre-charge resistor with its
// contactor, bypass, filter, chokes, bridge, bus and what hangs on it, with switching states in place and readings at
// their nodes.
//
// Start at [NewPlan], which takes from the site what is drawn, and [View], which draws it with the readings of one
// instant. The symbols follow IEC 60617 as far as characters can: a contact is a blade between two terminals, the
// isolator has the bar of a disconnector, a resistor is a box, a fuse a box with the line through it, a choke is arcs, a
// capacitor two plates, a diode a triangle before a bar. An open, a closed and an unknown contact differ in shape.
//
// The wiring is that of a non-isolated converter whose source minus goes straight to the bus minus:
//
//	        ┌── resistor ── pre-charge ──┐
//	+ ── isolator ── fuse ──┴────────── bypass ──────────┴── star point ── chokes ── bridge ── bus +
//	− ─────────────────────────────────────────────────────────────────────────────────────── bus −
package oneline
