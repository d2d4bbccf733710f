package window

import (
	"chargehand/commission/finding/findingtest"
	"strings"
	"testing"
	"unicode/utf8"
)

func TestWriteRows(t *testing.T) {
	for _, name := range []string{"wagtail", "nightjar", "ouzel"} {
		var b strings.Builder
		if err := WriteRows(&b, Table(findingtest.Load(t, name))); err != nil {
			t.Fatal(err)
		}
		lines := strings.Split(strings.TrimSuffix(b.String(), "\n"), "\n")
		if len(lines) != 12 {
			t.Errorf("WriteRows(%s) = %d lines, want a heading and eleven", name, len(lines))
		}
		for _, line := range lines {
			if utf8.RuneCountInString(line) > 80 {
				t.Errorf("WriteRows(%s): %d columns in %q", name, utf8.RuneCountInString(line), line)
			}
		}
		if name == "wagtail" && !strings.Contains(lines[11], "148 V") {
			t.Errorf("WriteRows(wagtail) last line = %q, want the margin 148 V", lines[11])
		}
	}
}
