package commission

import (
	"fmt"
	"strings"

	"chargehand/commission/finding"
	"chargehand/commission/quantity"
)

// Change is a finding that another site file has moved.
type Change struct{ Was, Is finding.Finding }

// Moved gives the findings whose value or verdict differ, in the order of the new ones. A finding that only one side has
// stands with an empty counterpart.
func Moved(before, after []finding.Finding) []Change {
	was := map[string]finding.Finding{}
	for _, f := range before {
		was[f.ID+":"+f.Subject] = f
	}
	var moved []Change
	for _, f := range after {
		old := was[f.ID+":"+f.Subject]
		delete(was, f.ID+":"+f.Subject)
		if old.Verdict != f.Verdict || old.State != f.State || f.State == finding.Finite && old.Value != f.Value {
			moved = append(moved, Change{old, f})
		}
	}
	for _, f := range before {
		if old, gone := was[f.ID+":"+f.Subject]; gone && !strings.HasPrefix(f.ID, "measured.") {
			moved = append(moved, Change{Was: old})
		}
	}
	return moved
}

// String is one line: what moved, from and to.
func (c Change) String() string {
	named := c.Is
	if named.ID == "" {
		named = c.Was
	}
	return fmt.Sprintf("%s %s → %s", strings.TrimSpace(named.ID+" "+named.Subject), short(c.Was), short(c.Is))
}

func short(f finding.Finding) string {
	switch {
	case f.ID == "":
		return "none"
	case f.State != finding.Finite:
		return fmt.Sprintf("%s (%s)", f.State, f.Verdict)
	}
	return fmt.Sprintf("%s (%s)", quantity.Engineering(f.Value.Nominal, f.Unit, 4), f.Verdict)
}

// words is a note of what moved.
func words(moved []Change) string {
	if len(moved) == 0 {
		return "the changed site file moves no finding"
	}
	lines := make([]string, len(moved))
	for i, c := range moved {
		lines[i] = c.String()
	}
	return "the changed site file moves: " + strings.Join(lines, "; ")
}
