// Package canvas is a sheet of terminal cells on which the drawings are made.
//
// Start at [New]; [Canvas.Text] writes, [Canvas.Wire] draws conductors that join by themselves where they meet, and
// [Canvas.String] gives the sheet as exactly as many lines and columns as it was made with. Everything outside the sheet
// is dropped, a wide character that would stick out over the edge is left out, and combining marks stay with their letter.
package canvas
