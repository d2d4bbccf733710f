// Package source says what the source can do to a fault and whether it can be cut off: prospective short circuit, fuse,
// isolator.
//
// Start at [Findings] for a site's findings, at [ShortCircuit] and [FaultEnergy] for the two formulas. The model is a rest voltage behind an internal resistance (ohmic; nothing of a battery's chemistry
// helps or hinders), and for the load the current at constant power, i = 2·P⁄(E + √(E² − 4·R_i·P)).
//
// It imports corner, finding, quantity, remedy and site, and of the families window: what the isolator breaks is the current at full power.
package source
