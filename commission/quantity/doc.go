// Package quantity holds the physical quantities of the job, their tolerances, and how they are typed and printed.
//
// Start at [Spread], the low, nominal and high value that every result of this program is, and [Entered], a value as it
// was typed in a site file. [Parse] reads one; [Engineering] prints a result for people.
//
// What may be typed:
//
//	quantity  = number [sp] unit [ sp tolerance ] ;
//	number    = [ "-" | "−" ] digits [ "." digits ] [ ("e"|"E") ["+"|"-"] digits ] ;
//	tolerance = pm [sp] amount | low [sp] "/" [sp] high [sp] tunit | high [sp] "/" [sp] low [sp] tunit ;
//	pm        = "±" | "+-" | "+/-" ;      amount = unsigned [sp] tunit ;     tunit = "%" | "points" | unit ;
//	low       = ( "-" | "−" ) unsigned ;  high   = "+" unsigned ;            unsigned = digits [ "." digits ] ;
//	sp        = exactly one of " ", U+00A0, U+202F
//
// A unit is looked up whole and case-sensitive among those of the wanted dimension, so "m" is only the metre and "min" only
// the minute. What is nearly right is refused with the right spelling, never repaired in silence.
//
// It imports the standard library alone.
package quantity
