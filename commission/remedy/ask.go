package remedy

import (
	"chargehand/commission/finding"
	"chargehand/commission/site"
)

// Ask gives the finding its remedy: the changes, and the same in words after a verb such as "raise ".
func Ask(f finding.Finding, words string, changes ...finding.Change) finding.Finding {
	f.Changes, f.Remedy = changes, words+Phrase(changes)
	return f
}

// To is the change of a key to the figure needed, rounded so that it passes.
func To(key, unit string, was, needed float64) finding.Change {
	return finding.Change{Key: key, Unit: unit, Was: was, Value: AwayFrom(was, needed)}
}

// LeastChange is the smallest change of one key, on the way from what it was to limit, with which the site passes.
func LeastChange(s site.Site, change finding.Change, limit float64, passes func(site.Site) bool) (finding.Change, bool) {
	value, ok := Least(change.Was, limit, func(v float64) bool {
		change.Value = v
		changed, err := Apply(s, change)
		return err == nil && passes(changed)
	})
	change.Value = value
	return change, ok
}
