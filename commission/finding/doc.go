// Package finding holds one judged result: a value over all corners, its limit, its margin and its verdict, with the
// calculation behind it and what would make it pass.
//
// Start at [Finding]. [Judge] is the one place where a value and a limit become a verdict; [Finding.Judged], [Finding.Stated]
// and [Finding.Lacking] build a finding with it, [Explain] begins its calculation. [NewSheet] puts the findings of one site
// together and writes them as table, JSON and CSV.
//
// It imports quantity and nothing else of the program.
package finding
