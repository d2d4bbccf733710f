// Package theme holds how things look on the screen: colours with their meanings, signs that say the same without
// colour, and how a reading, a verdict and a number are written.
//
// Start at [New] or [Choose]; a [Theme] is a value that is handed to every view, and [Role] says what a piece of text is
// rather than which colour it has. Colours follow the meanings of IEC 60073 (red danger or fault, yellow abnormal, green
// normal, blue mandatory, white and grey without meaning) and only repeat what a word or a sign already says. At most the
// 16 colours of a plain terminal are used, so that its own palette decides how they look.
//
// Text that comes from a file or a device passes [Clean] before it is shown: nothing in it can steer the terminal.
package theme
