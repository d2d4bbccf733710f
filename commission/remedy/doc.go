// Package remedy finds what would make a finding pass, by putting other values into the site and judging again.
//
// Start at [Offer], which judges a site and asks for a remedy where it does not pass. [Least] searches the smallest change that
// passes, [LeastChange] the same for one key, [Apply] puts changes into a copy of a site, [Phrase] says them in words.
//
// It imports finding, quantity and site.
package remedy
