package site

import "chargehand/commission/document"

// Revise gives the text of a site file with values changed in place: comments and everything else stay byte for byte. A
// change is named by the dotted path of its key, in a list with the number of the table from 0: "precharge.resistance",
// "infeed.0.droop". Its value is text as typed, without quotes. [Read] judges the result.
func Revise(text []byte, changes map[string]string) ([]byte, error) {
	return document.Revise(text, changes)
}

// Value gives the text of the value at a path as [Revise] takes it; false where the file has none there.
func Value(text []byte, path string) (string, bool) { return document.Value(text, path) }
