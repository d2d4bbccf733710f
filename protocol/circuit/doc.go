// Package circuit is the power circuit between a source and a DC bus, integrated in time.
//
// Start at [New] with [Parameters], operate the [Circuit]'s switches, advance it with [Circuit.Step] and look at it with
// [Circuit.Read]. Everything is in plain SI units; there is no clock, no network and no formula of a finding here.
//
// The model. Source (electromotive force over the charge drawn, resistance, inductance, optional blocking diode), fuse and
// isolator lead to node A. From A the pre-charge resistor with its contactor, and beside it the bypass contactor, lead to
// the star point S. From S each choke leads to the leg of a bridge; while pulses are blocked a leg is two diodes, upper to
// bus plus and lower from minus; while they are released it is an averaged voltage between 0 and the bus voltage that a
// current regulator sets. The filter capacitor stands at A or at S. On the bus hang capacitor banks, bleeders, an auxiliary
// supply with start and stop thresholds, loads of constant power and of constant resistance, a chopper with hysteresis and
// other infeeds that follow their own droop behind their cables.
//
// The equations are Kirchhoff's laws as M·y' = f(y), with M = 0 in the rows of the nodes. They are integrated by the
// three-stage singly diagonally implicit Runge–Kutta method of order 3 that is L-stable and stiffly accurate (R. Alexander,
// Diagonally implicit Runge–Kutta methods for stiff O.D.E.'s, SIAM J. Numer. Anal. 14, 1977, theorem 5; its coefficients
// are computed from their order conditions in a test), with an embedded second-order estimate for the step size.
package circuit
