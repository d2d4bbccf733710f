// Package precharge says what happens while the source charges the empty bus through the pre-charge resistor, and whether
// the resistor survives it.
//
// Start at [Findings] for a site's findings, at [Circuit] for one charge, at [Rating] and [Body] for the resistor, and at
// [Predict] for the curve that is drawn before the measurement.
//
// The model: a source of EMF E behind R_i, the resistor R_p, the chokes in parallel (R_x), and the upper freewheel diodes
// charge the capacitance C of everything that is not isolated; bleeders R_b stand across it, and an auxiliary supply takes
// the constant power P above its starting voltage V_on until the link falls below V_off. With R = R_p + R_i + R_x,
//
//	R_e = R·R_b⁄(R + R_b)   τ = R_e·C   V_f = E·R_b⁄(R + R_b)   v(t) = V_f − (V_f − V_0)·e^(−t⁄τ)
//
// Textbook circuit theory (Kuphaldt, Lessons in Electric Circuits, volume I, chapter 16); the constant-power case is
// derived in load.go. A supercapacitor stands in series with C, and the bypass may close when source and link differ by
// no more than the closing difference.
//
// It imports corner, finding, quantity, remedy and site, and no other family.
package precharge
