// Package quantity holds the physical quantities of the job, their tolerances, and how they are typed and printed.
//
// Start at [Spread], the low, nominal and high value that every result of this program is, and [Entered], a value as it
// was typed in a site file.
package quantity
