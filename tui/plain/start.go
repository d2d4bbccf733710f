package plain

import (
	"context"
	"fmt"
	"io"
	"strings"

	"chargehand/tui/start"
	"chargehand/tui/theme"
)

// Choose lists what can be begun and asks for one of it by its number; false where the input ends or nothing is chosen.
func Choose(ctx context.Context, entries []start.Entry, lines <-chan string, out io.Writer) (start.Entry, bool) {
	fmt.Fprintln(out, "chargehand commissions the tie of a source to a DC bus. It only reads the device; it assists and does not authorise.")
	for i, e := range entries {
		words := string(e.Kind) + ": " + e.Title
		if e.Detail != "" {
			words += ", " + e.Detail
		}
		fmt.Fprintf(out, "%d  %s\n", i+1, theme.Clean(words))
	}
	for {
		fmt.Fprint(out, "number [1]: ")
		select {
		case <-ctx.Done():
			return start.Entry{}, false
		case line, ok := <-lines:
			if !ok || strings.TrimSpace(line) == "quit" {
				return start.Entry{}, false
			}
			n := 1
			if line = strings.TrimSpace(line); line != "" {
				if _, err := fmt.Sscan(line, &n); err != nil {
					n = 0
				}
			}
			if n >= 1 && n <= len(entries) {
				return entries[n-1], true
			}
			fmt.Fprintln(out, "type the number of one of them, or quit")
		}
	}
}
