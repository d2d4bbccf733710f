// Package linkview is the screen of the link: every signal of the device as it comes, with its place in both notations, its
// raw words, its age and its quality, and which of them nobody has compared with a known value yet.
//
// Start at [Model].
package linkview
