// Package ripple judges the ripple of the interleaved chokes: in one phase, in their sum, what of it reaches the source,
// and whether the filter resonates with the source loop.
//
// Start at [Findings]. [Stage.PhaseSwing] and [Stage.SumSwing] are the peak-to-peak figures, [Branches.SourceShare] parts the
// sum between filter and source, [Harmonic] is one harmonic of the sum with every choke at its own inductance.
//
// N phases switch at f_sw, shifted by a Nth of the period. Each choke sees V_bus on and off with the duty D of the lower
// switch; its current is a triangle, and so is the sum, at N·f_sw, with zeros at D = k⁄N. Source: any textbook of power
// electronics; the sum is checked in the tests against waveforms added up point by point.
//
// It imports corner, finding, quantity, remedy and site, and no other family.
package ripple
