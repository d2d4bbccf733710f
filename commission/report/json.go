package report

import (
	"bytes"
	"encoding/json"
	"fmt"
	"io"
	"unicode"
)

// WriteJSON writes the story as one object on one line. Characters that a terminal might obey are written as escapes.
func (s Story) WriteJSON(w io.Writer) error {
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	if err := e.Encode(s); err != nil {
		return fmt.Errorf("write the report as JSON: %w", err)
	}
	_, err := w.Write(EscapeJSON(b.Bytes()))
	return err
}

// EscapeJSON writes every character of a JSON text that is not printed, beyond ASCII's own, as an escape of four hex digits:
// such a character can only stand in a string, and a terminal might obey it.
func EscapeJSON(text []byte) []byte {
	var out []byte
	for _, r := range string(text) {
		switch {
		case r <= 0x7E || unicode.IsPrint(r):
			out = append(out, string(r)...)
		case r > 0xFFFF: // as a pair of surrogates
			r -= 0x10000
			out = fmt.Appendf(out, `\u%04x\u%04x`, 0xD800+r>>10, 0xDC00+r&0x3FF)
		default:
			out = fmt.Appendf(out, `\u%04x`, r)
		}
	}
	return out
}
