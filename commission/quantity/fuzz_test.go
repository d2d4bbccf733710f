package quantity

import (
	"math"
	"testing"
	"unicode/utf8"
)

// FuzzParse feeds any text to every dimension: no panic, an accepted value is finite, ordered and of an allowed size, and a
// refusal says what is wanted and points into the text.
func FuzzParse(f *testing.F) {
	for _, text := range []string{"62 mΩ ±15 %", "7.5 mF -10/+30 %", "1e30 V", "4k7", "4,700 V", "−40 degC ±2 K", "3 % ±1 points", "0x1F V", "90 kA²s",
		"1\u202f000 V", "nan", "5. V", "33 Ω ±", "33 Ω +-", "33 Ω +5/−", "0 V ±5 %", "1e-400 A"} {
		f.Add(text)
	}
	f.Fuzz(func(t *testing.T, text string) {
		for _, d := range append([]*dimension{errorBound, droopUnits}, dimensions...) {
			for _, rule := range []Rule{{}, {Tolerance: true}, {Sign: Positive, Tolerance: true}} {
				r, refusal := read(text, d, rule)
				if refusal != nil {
					if refusal.Wanted == "" || refusal.Example == "" || refusal.Offset < 0 || refusal.Offset > utf8.RuneCountInString(text) {
						t.Fatalf("read(%q) as %s refused with %+v", text, d.name, refusal)
					}
					continue
				}
				s := Spread[Voltage]{Voltage(r.low), Voltage(r.nominal), Voltage(r.high)}
				if size := math.Abs(r.nominal); !s.IsOrdered() || size != 0 && (size < smallest || size > largest) {
					t.Fatalf("read(%q) as %s = %+v", text, d.name, r)
				}
				if rule.Sign == Positive && r.low <= 0 {
					t.Fatalf("read(%q) as %s = %+v, want above 0", text, d.name, r)
				}
			}
		}
	})
}
