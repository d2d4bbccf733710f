// Package far draws the far view: one to three readings in digits that can be read from the switchboard door, with unit,
// limit, countdown and the state of the link.
//
// Start at [Face] and [Face.View]. The digits are made of dots on a grid of 5 × 7, which are drawn as large as the screen
// allows: a half block for a dot at the least, many whole blocks at the most. Common practice for reading at a distance is
// a letter height of a two-hundredth of it, 15 mm at 3 m: three rows on most screens. The digits here are never lower than
// that unless the screen leaves no room.
package far
