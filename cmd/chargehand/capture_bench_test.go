package main

import (
	"path/filepath"
	"testing"
	"time"

	"chargehand/commission/capture"
	"chargehand/commission/chlog"
	"chargehand/commission/finding"
	"chargehand/commission/measured"
	"chargehand/commission/record"
	"chargehand/commission/site"
)

// BenchmarkCapture takes the captures of a whole rehearsal from its log and holds each against its prediction: curves fitted,
// causes ranked. It gives, for each kind, the time that takes per second of what was captured, which is the baseline: at 1000 ms/s
// the judging would take as long as the measuring. A rehearsal's discharge runs hastened, so its seconds are the plant's.
func BenchmarkCapture(b *testing.B) {
	lines, err := chlog.ReadFile(filepath.Join("..", "..", "commission", "report", "testdata", "rehearsal.chlog"))
	if err != nil {
		b.Fatal(err)
	}
	var on site.Site
	parts := map[string][]record.Capture{}
	for _, line := range lines {
		body, err := line.Decode()
		if err != nil {
			b.Fatal(err)
		}
		switch body := body.(type) {
		case record.File:
			if body.Role == "site" {
				if on, _, err = site.Read(body.Name, []byte(body.Text)); err != nil {
					b.Fatal(err)
				}
			}
		case record.Capture:
			parts[body.ID] = append(parts[body.ID], body)
		}
	}
	judges := map[capture.Kind]func(site.Site, capture.Capture) []finding.Finding{capture.Precharge: measured.Precharge,
		capture.Droop: measured.DroopCapture, capture.Discharge: measured.Discharge}
	for id, of := range parts {
		c, err := capture.FromRecords(of)
		if err != nil {
			b.Fatal(err)
		}
		judge, ok := judges[c.Kind]
		if !ok {
			continue
		}
		b.Run(string(c.Kind)+" "+id, func(b *testing.B) {
			for b.Loop() {
				again, err := capture.FromRecords(of)
				if err != nil {
					b.Fatal(err)
				}
				if len(judge(on, again)) == 0 {
					b.Fatal("no finding")
				}
			}
			lasted := c.Samples[len(c.Samples)-1].At - c.Samples[0].At
			b.ReportMetric(float64(len(c.Samples)), "samples")
			b.ReportMetric(1e3*float64(b.Elapsed())/float64(b.N)/float64(max(lasted, time.Millisecond)), "ms/s")
		})
	}
}
