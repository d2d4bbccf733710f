// Package site holds one site on paper and reads it from a site file.
//
// Start at [Site]: its fields are the keys of the file. [Read] is strict: an unknown key, a missing unit, a wrong
// dimension or an impossible combination is a problem with line, column, what was read, what is wanted and an example,
// and all problems of a file come in one go.
//
// It imports document and quantity.
package site
