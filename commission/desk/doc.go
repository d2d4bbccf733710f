// Package desk is the catalogue: every finding of a site that can be made on paper.
//
// Start at [Check]. [Sheet.Explain] works one finding out with this site's numbers; [Try] puts a finding's remedy into the
// site and judges again.
//
// It imports every family, finding, remedy and site; nothing imports it but what shows or reports findings.
package desk
