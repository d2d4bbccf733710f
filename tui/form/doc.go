// Package form holds how a person types into the program: fields with a live check and the error beside them, choices,
// and the keys of all screens in one place.
//
// Start at [Form] and [New]; a [Field] is made by [Input], [Note] or [Choice]. A form is a value: Update gives a new one
// and says by an [Outcome] whether it was finished or left, and leaving it loses nothing that was typed. The text editor is
// this package's own: it works on whole characters with their combining marks, a copy of a form never changes with the
// original, pasted text is made harmless before it is kept, and no key starts another program to reach a clipboard.
//
// [Keys] are the keys of the screens. Each screen picks from them what works there; [HelpLine] and [HelpPage] write them
// at the bottom and on the page behind the question mark.
package form
