// Package document reads strict TOML 1.0: every problem of a file in one go, each with its place, what was read, what is
// wanted and an example. Packages site and registermap read their files through it.
//
// Start at [Open], which never fails: what is wrong is kept in the [File] and comes out of [File.Err]. A [Table] is read key
// by key into the fields of a struct; a key that nobody asked for is unknown, and a problem.
//
// What a file may hold, beside TOML's own rules: keys in lower case exactly; no control characters and no marks that
// reverse the direction of text; no underscores in numbers, no nan, no inf; an inline table on one line. A byte-order mark is
// skipped. At most [MaxSize] bytes.
//
// It imports quantity, and a TOML parser in one file.
package document
