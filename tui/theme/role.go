package theme

// Role says what a piece of text is. The theme decides how it looks.
type Role uint8

// The roles. Those named after IEC 60073 carry that standard's meaning of the colour; the rest carry none.
const (
	Text      Role = iota // ordinary text, the terminal's own colour
	Faint                 // less important than its surroundings: rulers, units, hints
	Title                 // a heading
	Danger                // red: danger, fault, emergency
	Abnormal              // yellow: abnormal, a warning
	Normal                // green: normal, as wanted
	Mandatory             // blue: something a person must do now
	Hazard                // the caution before a hazardous act
	Alarm                 // a fault that must not be overlooked, red ground
	Live                  // a reading that is young enough
	Withdrawn             // a reading whose number is gone
	Unproved              // a reading that nobody has yet compared with another
	Closed                // a closed contact
	Open                  // an open contact
	Unknown               // a contact whose state is not known
	Wire                  // conductors and frames of a drawing
	Symbol                // devices in a drawing
	Axis                  // rulers of a chart
	Band                  // the predicted band
	Nominal               // the predicted line
	Trace                 // what is measured
	Fitted                // a line fitted to what is measured
	Cursor                // the read-off line
	Limit                 // a limit drawn in a chart
	Selected              // the line or field that the keys act on
	Key                   // the name of a key
	roleCount
)

// paint is one role's look: a foreground and a background from the 16 colours, "" for the terminal's own.
type paint struct {
	dark, light         string
	darkBack, lightBack string
	bold, reverse       bool
}

// Colours 0–7 are the plain and 8–15 the bright ones of ECMA-48 and its common extension. On a light ground the bright
// ones are too pale, so the plain ones stand there; 8 (grey) is legible on both.
var paints = [roleCount]paint{
	Text:      {},
	Faint:     {dark: "8", light: "8"},
	Title:     {bold: true},
	Danger:    {dark: "9", light: "1", bold: true},
	Abnormal:  {dark: "11", light: "3", bold: true},
	Normal:    {dark: "10", light: "2"},
	Mandatory: {dark: "12", light: "4", bold: true},
	Hazard:    {dark: "0", darkBack: "11", light: "0", lightBack: "11"},
	Alarm:     {dark: "15", darkBack: "1", light: "15", lightBack: "1", bold: true},
	Live:      {bold: true},
	Withdrawn: {dark: "11", light: "3"},
	Unproved:  {dark: "7", light: "8"},
	Closed:    {bold: true},
	Open:      {},
	Unknown:   {dark: "11", light: "3", bold: true},
	Wire:      {dark: "7", light: "8"},
	Symbol:    {},
	Axis:      {dark: "7", light: "8"},
	Band:      {dark: "8", light: "7"},
	Nominal:   {dark: "7", light: "8"},
	Trace:     {dark: "14", light: "6", bold: true},
	Fitted:    {dark: "13", light: "5"},
	Cursor:    {dark: "15", light: "0", bold: true},
	Limit:     {dark: "11", light: "3"},
	Selected:  {reverse: true},
	Key:       {bold: true},
}
