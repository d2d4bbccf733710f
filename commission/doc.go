// Package commission runs a walk: one goroutine owns its state, its captures and its log.
//
// Start at [Run]. A screen, or the unattended walk, sends a [walk.Event] to [Run.Submit]; the rules of package walk turn it
// into log records; the log has them on disk before Submit answers. Batches of readings come in on a channel, none is
// skipped, and what they show leaves as a [Snapshot], of which only the newest is kept.
//
// The way of a reading through here: signal.Batch → recorder (a capture) → measured (a finding) → walk (a record) → chlog (a
// line on disk) → Snapshot (a screen).
package commission
