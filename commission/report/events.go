package report

import (
	"cmp"
	"fmt"
	"slices"
)

// eventRows are the records that no point holds, in the order of the log: what happened, and what of it.
func (s Story) eventRows() []Event[[2]string] {
	var rows []Event[[2]string]
	add := func(seq int64, at, what, words string) {
		rows = append(rows, Event[[2]string]{seq, at, [2]string{what, words}})
	}
	for _, e := range s.Links {
		add(e.Seq, e.At, "link "+e.Body.Event, joined(e.Body.Peer, e.Body.Why))
	}
	for _, e := range s.Attempts {
		words := fmt.Sprintf("attempt %d; the next not before %s", e.Body.N, clockWords(e.Body.Earliest))
		if e.Body.Override != nil {
			words += "; came earlier: " + *e.Body.Override
		}
		add(e.Seq, e.At, "pre-charge", joined(words, e.Body.Cause))
	}
	for _, e := range s.Hastened {
		add(e.Seq, e.At, "hastened", fmt.Sprintf("%s passed %g times as fast (rehearsal)", e.Body.What, e.Body.Factor))
	}
	for _, e := range s.Clocks {
		add(e.Seq, e.At, "clock step", fmt.Sprintf("the wall clock moved by %g s at %g s since the start", e.Body.WallStep, e.Body.Monotonic))
	}
	for _, e := range s.Resumed {
		words := "by chargehand " + e.Body.Program
		if t := e.Body.Torn; t != nil {
			words += fmt.Sprintf("; a torn last line of %d bytes was set aside in %s (SHA-256 %s)", t.Bytes, t.KeptIn, t.SHA256)
		}
		if m := e.Body.Moved; m != nil {
			words += "; moved here from " + m.From + ": " + m.Why
		}
		add(e.Seq, e.At, "resumed", words)
	}
	for _, e := range s.Others {
		add(e.Seq, e.At, e.Body.Name, "a kind that this version does not know: "+clipped(string(e.Body.JSON), 500))
	}
	for _, e := range s.Unread {
		add(e.Seq, e.At, "unread", e.Body)
	}
	slices.SortStableFunc(rows, func(a, b Event[[2]string]) int { return cmp.Compare(a.Seq, b.Seq) })
	return rows
}

func joined(a, b string) string {
	if a == "" || b == "" {
		return a + b
	}
	return a + "; " + b
}
