// Package walkview is the screen of the walk: the one-line diagram on top, the stages at the left, the open point with its
// chart at the right, and the keys that work here at the foot.
//
// Start at [Model]. It holds the newest [commission.Snapshot] and nothing else of the walk; every act is an event handed to
// the walk's owner inside a command, and "recorded" appears on the message that says so. What Enter does next is decided
// in one place, [Model.next].
package walkview
