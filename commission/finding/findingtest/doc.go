// Package findingtest checks the findings of a family against what was worked out apart from the program, and against laws
// that hold for every site.
//
// Start at [AsExpected] for the whole sites of testdata with their expected findings, at [Cases] for the worked cases of
// testdata/public-cases.json, at [Stored] for what a circuit simulator measured, at [Evaluate] and [Explained] for a small
// calculator that redoes printed workings, and at [CornersHold] and [NeverNarrows] for the laws. Paths are seen from a package
// directly below commission.
package findingtest
