package deskview

import (
	"fmt"
	"slices"
	"strings"

	"chargehand/commission/finding"
	"chargehand/commission/quantity"
)

// Moves says which findings another site file moves: verdicts first, then values.
func Moves(before, after []finding.Finding) []string {
	var verdicts, values []string
	for _, f := range after {
		i := slices.IndexFunc(before, func(b finding.Finding) bool { return b.ID == f.ID && b.Subject == f.Subject })
		if i < 0 {
			continue
		}
		was := before[i]
		change := strings.TrimSpace(f.ID + " " + f.Subject)
		switch {
		case was.Verdict != f.Verdict:
			verdicts = append(verdicts, fmt.Sprintf("%s: %s, was %s", change, f.Verdict, was.Verdict))
		case f.State == finding.Finite && was.State == finding.Finite && was.Value.Nominal != f.Value.Nominal:
			values = append(values, fmt.Sprintf("%s: %s, was %s", change, quantity.Engineering(f.Value.Nominal, f.Unit, 3), quantity.Engineering(was.Value.Nominal, f.Unit, 3)))
		}
	}
	if len(verdicts)+len(values) == 0 {
		return []string{"no finding moves"}
	}
	return append(verdicts, values...)
}
