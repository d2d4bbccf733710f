// Package droop judges the bus: how the infeeds share it under droop, between which voltages it stands, what happens when
// one is lost or the load feeds back, which settings meet all limits, and what the cables take.
//
// Start at [Findings] for all findings of a site, at [Solve] for the operating point of any set of infeeds and loads, and
// at [Predict] for the lines that the commissioned converter should show.
//
// Infeed k holds V_terminal = V0_k − d_k·I_k; its cable adds to the droop on the way to the bus, V = V0_k − r_k·I_k with
// r_k = d_k + R_cable,k. Its current stays within I_min,k … I_max,k; a negative current flows back. The bus stands where
// the currents of all infeeds balance the loads, ΣI_k(V) = P⁄V + I_c + V⁄R_L. A constant-power load has an unstable point
// besides; reached from the unloaded bus the bus stands at the highest root.
//
// It imports finding, quantity, remedy, signal (the names of the settings) and site, and of the families window: the lowest bus
// stands above the highest source.
package droop
