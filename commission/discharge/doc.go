// Package discharge says how long the bus stays dangerous after the converter has let go of it.
//
// Start at [Findings] for a site's findings, at [Bus] for one discharge, and at [Predict] for the curve that is drawn before
// the measurement.
//
// The model: all capacitors of the common bus discharge through all bleeders in parallel, and through the auxiliary supply
// as long as it runs. A filter capacitor at the star point is held off by the diodes until the link has fallen to its
// voltage, the source's, and then joins:
//
//	t = R_b·[C_link·ln(V₁⁄E) + (C_link + C_f)·ln(E⁄V₂)]                    (textbook circuit theory)
//	t = ½·R_b·C·ln[(V₁² + P·R_b)⁄(V₂² + P·R_b)]  with constant power P      (the circuit equation in v²)
//
// A calculated time never stands for absence of voltage.
//
// It imports corner, finding, quantity, remedy and site, and of the families window: the fall begins at the highest bus voltage.
package discharge
