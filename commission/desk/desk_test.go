package desk

import (
	"fmt"
	"slices"
	"strings"
	"testing"
	"unicode/utf8"

	"chargehand/commission/finding"
	"chargehand/commission/finding/findingtest"
	"chargehand/commission/signal"
	"chargehand/commission/site"
)

// tenths writes volts in tenths and droop in tenths of a millivolt per ampere.
type tenths struct{}

func (tenths) Raw(name signal.Name, value float64) (int64, bool) {
	switch name {
	case signal.VoltageSetpoint:
		return int64(value*10 + 0.5), true
	case signal.DroopSetting:
		return int64(value*1e4 + 0.5), true
	}
	return 0, false
}

// Source: the expected findings beside the sites.
func TestWholeSites(t *testing.T) {
	for _, name := range findingtest.Sites {
		t.Run(name, func(t *testing.T) {
			sheet := Check(findingtest.Load(t, name), tenths{})
			path := findingtest.Expected(name)
			if n := findingtest.Compare(t, path, sheet.Findings, ""); n < 40 {
				t.Errorf("Compare = %d entries, want at least 40", n)
			}
			if want := findingtest.SiteVerdict(t, path); sheet.Verdict != want {
				t.Errorf("Check(%s).Verdict = %s, want %s", name, sheet.Verdict, want)
			}
		})
	}
}

func TestCatalogueOrder(t *testing.T) {
	var ids []string
	for _, f := range Findings(findingtest.Load(t, "wagtail"), tenths{}) {
		if !slices.Contains(ids, f.ID) {
			ids = append(ids, f.ID)
		}
	}
	if !slices.Equal(ids, IDs) {
		t.Errorf("Findings = %v, want the catalogue %v", ids, IDs)
	}
}

func TestTablesFit(t *testing.T) {
	for _, name := range findingtest.Sites {
		sheet := Check(findingtest.Load(t, name), nil)
		for _, width := range []int{0, 80, 100, 140} {
			var b strings.Builder
			if err := sheet.WriteTable(&b, finding.TableOptions{Width: width}); err != nil {
				t.Fatal(err)
			}
			for line := range strings.Lines(b.String()) {
				if n := utf8.RuneCountInString(strings.TrimSuffix(line, "\n")); n > max(width, 80) {
					t.Errorf("%s at %d: %d columns in %q", name, width, n, line)
				}
			}
		}
	}
}

func ExampleCheck() {
	text, _ := site.Example()
	s, _, err := site.Read("example", []byte(text))
	if err != nil {
		fmt.Println(err)
		return
	}
	for _, f := range Check(s, nil).Only("window.margin").Findings {
		fmt.Printf("%s %s: %.1f V, at least %.1f V\n", f.ID, f.Verdict, f.Value.Low, *f.Limit.Low)
	}
	// Output: window.margin pass: 145.7 V, at least 49.1 V
}
