// Package window judges the voltage window: whether the source stays clear of the bus at every load, tolerance and
// temperature, and what the converter can do at the ends of that window.
//
// Start at [Findings] for all findings of a site and at [Table] for the same over the state of charge. [SourceHigh],
// [BusHigh] and [SourceCurrent] are what other families build on.
//
// The source is an electromotive force E behind its internal resistance R_i. Positive current discharges it. Above the
// bus its current flows through the freewheel diodes and nobody controls it; everything here follows from that. The duty
// is that of the lower switch, D = 1 − V_source ⁄ V_bus (any textbook of power electronics, the ideal boost converter).
//
// It imports corner, finding, quantity, remedy and site, and no other family.
package window
