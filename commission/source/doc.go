// Package source says what the source can do to a fault and whether it can be cut off: prospective short circuit, fuse,
// isolator.
//
// Start at [Findings]. The model is a rest voltage behind an internal resistance (ohmic; nothing of a battery's chemistry
// helps or hinders), and for the load the current at constant power, i = 2·P⁄(E + √(E² − 4·R_i·P)).
package source
