// Package closing says what flows when the bypass contactor closes on the difference that pre-charging has left, and when
// it closes on a live bus.
//
// Start at [Findings] for a site's findings, and at [Loop] for one closing.
//
// The model: the voltage u that is missing drives the loop of R, L and C, the upper freewheel diodes block the reverse
// current. With α = R⁄2L, ω_0 = 1⁄√(LC) the peak is
//
//	î = u·√(C⁄L)·e^(−α·t_p)
//
// in all three regimes, and the link ends k·u above the source, k = e^(−α·π⁄ω_d), where the loop is underdamped
// (textbook series resonant circuit). A filter capacitor at the star point has no choke in its loop and is charged by
// source inductance and its own alone.
//
// It imports corner, finding, quantity, remedy and site, and of the families precharge: the circuit that is charged.
package closing
