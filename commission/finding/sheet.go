package finding

import "strings"

// Sheet is every finding of one site, with the verdict of the whole.
type Sheet struct {
	Site, Reference string
	File            string // as it was named on the command line; "" where there is none
	Verdict         Verdict
	Findings        []Finding
}

// NewSheet is a sheet with the verdict of its findings: the worst in the order fail, undecided, marginal, pass.
func NewSheet(site, reference string, findings []Finding) Sheet {
	verdicts := make([]Verdict, len(findings))
	for i, f := range findings {
		verdicts[i] = f.Verdict
	}
	return Sheet{Site: site, Reference: reference, Verdict: Worst(verdicts...), Findings: findings}
}

// Only is the sheet with the findings whose id begins with a prefix; the verdict is theirs.
func (s Sheet) Only(prefix string) Sheet {
	var kept []Finding
	for _, f := range s.Findings {
		if strings.HasPrefix(f.ID, prefix) {
			kept = append(kept, f)
		}
	}
	only := NewSheet(s.Site, s.Reference, kept)
	only.File = s.File
	return only
}

// Find gives the findings with an id, one for each subject.
func (s Sheet) Find(id string) []Finding {
	var found []Finding
	for _, f := range s.Findings {
		if f.ID == id {
			found = append(found, f)
		}
	}
	return found
}
