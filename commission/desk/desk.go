package desk

import (
	"fmt"
	"strings"

	"chargehand/commission/closing"
	"chargehand/commission/discharge"
	"chargehand/commission/droop"
	"chargehand/commission/finding"
	"chargehand/commission/precharge"
	"chargehand/commission/remedy"
	"chargehand/commission/ripple"
	"chargehand/commission/site"
	"chargehand/commission/source"
	"chargehand/commission/window"
)

// Sheet is every desk finding of one site, in the order of the catalogue, with the verdict of the whole.
type Sheet struct{ finding.Sheet }

// Check makes all desk findings of a site. The registers are those of its map and turn settings into raw numbers; nil
// leaves droop.registers undecided.
func Check(s site.Site, r droop.Registers) Sheet {
	return Sheet{finding.NewSheet(s.Name, s.Reference, Findings(s, r))}
}

// Findings are the findings of all families in the order of the catalogue.
func Findings(s site.Site, r droop.Registers) []finding.Finding {
	var all []finding.Finding
	for _, f := range families(r) {
		all = append(all, f.findings(s)...)
	}
	return all
}

// family makes the findings whose ids begin with one of its prefixes.
type family struct {
	prefixes []string
	findings func(site.Site) []finding.Finding
}

func families(r droop.Registers) []family {
	return []family{
		{[]string{"precharge."}, precharge.Findings},
		{[]string{"closing."}, closing.Findings},
		{[]string{"discharge."}, discharge.Findings},
		{[]string{"source."}, source.Findings},
		{[]string{"bus.", "window."}, window.Findings},
		{[]string{"ripple."}, ripple.Findings},
		{[]string{"droop.", "cable."}, func(s site.Site) []finding.Finding { return droop.Findings(s, r) }},
	}
}

// IDs are the ids of the catalogue in its order. Each stands in every sheet, whatever the site has: an absent table makes a
// finding undecided, or information without a value.
var IDs = []string{
	"precharge.time-constant", "precharge.final-voltage", "precharge.stall", "precharge.time-to-close", "precharge.peak-current",
	"precharge.peak-power", "precharge.energy", "precharge.pulse", "precharge.repeat", "precharge.wait", "precharge.shorted-bus",
	"precharge.timeout", "precharge.breaking",
	"closing.inrush", "closing.i2t", "closing.overshoot", "closing.threshold", "closing.live-bus", "closing.without-precharge",
	"discharge.energy", "discharge.touch-safe",
	"source.short-circuit", "source.isolation", "source.fault-energy",
	"bus.insulation-monitor",
	"window.source-high", "window.source-low", "window.bus-low", "window.bus-high", "window.margin", "window.thresholds",
	"window.duty", "window.current", "window.choke-peak", "window.full-power", "window.uncontrolled", "window.backfeed",
	"ripple.phase", "ripple.sum", "ripple.source", "ripple.resonance",
	"droop.advice", "droop.bus-range", "droop.share", "droop.lost-infeed", "droop.regeneration", "droop.stability",
	"droop.instrument", "droop.registers",
	"cable.drop",
}

// Explain works out the findings with an id, or with ids that begin with it, one for each subject. An id that no finding
// has is an error that names those it may have meant.
func (s Sheet) Explain(id string) (string, error) {
	found := s.Find(id)
	if len(found) == 0 {
		found = s.Only(id).Findings
	}
	if len(found) == 0 {
		return "", fmt.Errorf("explain %q: no such finding%s", id, meant(id))
	}
	texts := make([]string, len(found))
	for k, f := range found {
		texts[k] = f.Explained()
	}
	return strings.Join(texts, "\n"), nil
}

// meant names the ids that share a word with what was typed.
func meant(id string) string {
	var near []string
	for _, known := range IDs {
		family, name, _ := strings.Cut(known, ".")
		if id != "" && (strings.Contains(known, id) || strings.HasPrefix(id, family) || strings.Contains(id, name)) {
			near = append(near, known)
		}
	}
	if len(near) == 0 {
		near = IDs
	}
	return ", choose one of " + strings.Join(near, " ")
}

// Try puts the changes of a finding's remedy into the site and gives the finding as it would then be. It is an error where
// the finding has no changes, or the changed site no such finding.
func Try(s site.Site, r droop.Registers, f finding.Finding) (finding.Finding, error) {
	if len(f.Changes) == 0 {
		return f, fmt.Errorf("try the remedy of %s: it changes no key", f.ID)
	}
	changed, err := remedy.Apply(s, f.Changes...)
	if err != nil {
		return f, fmt.Errorf("try the remedy of %s: %w", f.ID, err)
	}
	for _, one := range familyOf(f.ID, r)(changed) {
		if one.ID == f.ID && one.Subject == f.Subject {
			return one, nil
		}
	}
	return f, fmt.Errorf("try the remedy of %s: the changed site has no such finding", f.ID)
}

func familyOf(id string, r droop.Registers) func(site.Site) []finding.Finding {
	for _, f := range families(r) {
		for _, prefix := range f.prefixes {
			if strings.HasPrefix(id, prefix) {
				return f.findings
			}
		}
	}
	return func(site.Site) []finding.Finding { return nil }
}
