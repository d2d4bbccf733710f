package desk

import (
	"math"
	"strconv"
	"strings"
	"testing"

	"chargehand/commission/finding"
	"chargehand/commission/finding/findingtest"
)

// Every finding with a value has a calculation, and a calculator that knows nothing of the program gets its results.
func TestExplanationsCanBeRedone(t *testing.T) {
	for _, name := range findingtest.Sites {
		for _, f := range Check(findingtest.Load(t, name), tenths{}).Findings {
			if f.Explanation == nil {
				if f.State == finding.Finite && f.ID != "droop.registers" {
					t.Errorf("%s: %s %s has a value and no explanation", name, f.ID, f.Subject)
				}
				continue
			}
			if err := findingtest.Redo(f.Explanation, f.Value.Nominal); err != nil {
				t.Errorf("%s: Redo(%s %s) = %v, want nil", name, f.ID, f.Subject, err)
			}
		}
	}
}

// The printed lines themselves: "= 821.7 + 260 * 0.062 + 4.1085 = 841.9285 V" comes out as it says.
func TestPrintedLinesCanBeRedone(t *testing.T) {
	lines := 0
	for _, name := range findingtest.Sites {
		sheet := Check(findingtest.Load(t, name), tenths{})
		for _, id := range IDs {
			text, err := sheet.Explain(id)
			if err != nil {
				t.Errorf("%s: Explain(%s) = %v", name, id, err)
			}
			for line := range strings.Lines(text) {
				line = strings.TrimSpace(line)
				if !strings.HasPrefix(line, "= ") {
					continue
				}
				cut := strings.LastIndex(line, " = ")
				number, _, _ := strings.Cut(line[cut+3:], " ")
				want, err := strconv.ParseFloat(number, 64)
				if err != nil {
					t.Errorf("%s: %s: result %q: %v", name, id, number, err)
					continue
				}
				got, err := findingtest.Evaluate(line[2:cut], nil)
				// Twelve digits are printed; where a step takes the difference of nearly equal numbers fewer remain.
				if err != nil || math.Abs(got-want) > 1e-6*math.Max(math.Abs(want), 1e-4) && !(math.IsInf(got, 0) && math.IsInf(want, 0)) {
					t.Errorf("%s: %s prints %q, calculator %v %v", name, id, line, got, err)
				}
				lines++
			}
		}
	}
	if lines < 100 {
		t.Errorf("lines redone = %d, want at least 100", lines)
	}
}

func TestExplainSays(t *testing.T) {
	sheet := Check(findingtest.Load(t, "wagtail"), tenths{})
	text, err := sheet.Explain("window.source-high")
	if err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{"window.source-high: ", "E_high", "821.7 V", "= 821.7 + 260 * 0.062 + 4.1085 = 841.9285 V", "source.internal_resistance at its greatest",
		"source.internal_resistance 100 %", "valid for"} {
		if !strings.Contains(text, want) {
			t.Errorf("Explain(window.source-high) =\n%swant %q in it", text, want)
		}
	}
	if text, err := sheet.Explain("droop.lost-infeed"); err != nil || strings.Count(text, "droop.lost-infeed, ") != 2 {
		t.Errorf("Explain(droop.lost-infeed) = %s, %v, want both infeeds", text, err)
	}
	if _, err := sheet.Explain("margin"); err == nil || !strings.Contains(err.Error(), "window.margin") {
		t.Errorf("Explain(margin) = %v, want an error that names window.margin", err)
	}
}
