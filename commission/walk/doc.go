// Package walk holds the rules and the content of the walk: twelve stages, their points, and who may pass what when.
//
// Start at [State], a pure value. [State.Decide] says which log records an [Event] makes, or why it may not happen;
// [State.With] takes one record that is on disk into the state. Nothing else changes a State, so a log replayed record by
// record gives the state of the walk that wrote it. Screens, the unattended walk, sheet and report all use it.
package walk
