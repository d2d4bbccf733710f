// Package fit is least squares on plain numbers: exponentials, straight lines, steps and averages, each with an honest
// uncertainty.
//
// Start at [Exponential] for a charge or discharge curve, [Line] for a droop line and [Step] for a step response.
//
// An exponential is v(t) = Final − (Final − Start)·e^(−(t−T0)⁄Tau). For a fixed Tau it is linear in Final and Start
// (variable projection; Golub and Pereyra, SIAM J. Numer. Anal. 10 (1973) 413), so the search is in ln Tau alone and a
// Gauss–Newton polish over all parameters by QR decomposition follows. The covariance is s²·(JᵀJ)⁻¹ with
// s² = max(SSR ⁄ (n−p), q²⁄12), q the resolution of the register (JCGM 100:2008, 4.2 and 4.3.7, from memory): residuals
// finer than the register are no finer knowledge. Start and T0 are interchangeable, so T0 is given.
package fit
