package desk

import (
	"bytes"
	"fmt"
	"testing"

	"chargehand/commission/finding"
	"chargehand/commission/finding/findingtest"
	"chargehand/commission/quantity"
	"chargehand/commission/site"
)

// The whole catalogue of the example site is to take at most 2 ms of CPU time.
func BenchmarkCheck(b *testing.B) {
	for _, name := range findingtest.Sites {
		s := findingtest.Load(b, name)
		b.Run(name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				Check(s, tenths{})
			}
		})
	}
}

// From the bytes of the file to its findings.
func BenchmarkReadAndCheck(b *testing.B) {
	bytes := findingtest.Text(b, "wagtail")
	b.ReportAllocs()
	for b.Loop() {
		s, _, err := site.Read("wagtail", bytes)
		if err != nil {
			b.Fatal(err)
		}
		Check(s, tenths{})
	}
}

// Eight infeeds to sixteen are to cost at most eight times as much.
func BenchmarkCheckInfeeds(b *testing.B) {
	for _, n := range []int{2, 8, 16, 64} {
		s := withInfeeds(findingtest.Load(b, "wagtail"), n)
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			for b.Loop() {
				Check(s, tenths{})
			}
		})
	}
}

// withInfeeds shares the same load among n infeeds of unequal size that together are as large as before.
func withInfeeds(s site.Site, n int) site.Site {
	pattern := s.Infeeds
	s.Infeeds = nil
	for k := range n {
		one := pattern[k%len(pattern)]
		one.Name = fmt.Sprintf("infeed %d", k+1)
		size := one.RatedCurrent.Nominal * quantity.Current(2+0.1*float64(k%3)) / quantity.Current(n)
		one.RatedCurrent = quantity.Entered[quantity.Current]{Spread: quantity.Exactly(size), Text: "typed"}
		s.Infeeds = append(s.Infeeds, one)
	}
	return s
}

func BenchmarkRender(b *testing.B) {
	sheet := Check(findingtest.Load(b, "wagtail"), tenths{})
	for name, write := range map[string]func(*bytes.Buffer) error{
		"table": func(w *bytes.Buffer) error { return sheet.WriteTable(w, finding.TableOptions{Width: 120}) },
		"json":  func(w *bytes.Buffer) error { return sheet.WriteJSON(w) },
		"csv":   func(w *bytes.Buffer) error { return sheet.WriteCSV(w, true) },
	} {
		b.Run(name, func(b *testing.B) {
			var w bytes.Buffer
			for b.Loop() {
				w.Reset()
				if err := write(&w); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
