// Package report tells a commissioning from its log alone: to a client on paper, to a mail or a screen reader as text, to
// other programs as JSON and CSV. It also makes the blank test sheet of a site.
//
// Start at [Read], which gives a [Story]; WritePDF, WriteText and WriteJSON write it, [Story.Tables] gives it as CSV. A
// Story holds nothing that the log does not say. What was predicted is calculated from the site file that stands in the log
// at the place of each capture, by the same formulas that drew it then, so the log need not hold the curves. The same log
// and the same verification give the same bytes: no clock is asked, every date comes from a record.
//
// A log may be unsealed or broken. Then the story ends at its last intact record, and every page says so.
package report
