package report

import (
	"chargehand/commission/capture"
	"chargehand/commission/record"
	"chargehand/commission/site"
)

// Capture is a capture of the log in short; its samples go to the plots and to CSV.
type Capture struct {
	ID      string   `json:"id"`
	Seq     int64    `json:"seq"`
	At      string   `json:"at"`
	What    string   `json:"what"`
	Stage   string   `json:"stage"`
	Attempt int      `json:"attempt"`
	T0      string   `json:"t0"`
	Samples int      `json:"samples"`
	Gaps    int      `json:"gaps"`
	Signals []string `json:"signals"`
	Problem string   `json:"problem"` // why its samples could not be read, or ""

	data capture.Capture
	site site.Site // as it stood when the capture was written
}

// assembled collects the parts of captures as they come and gives a capture once it is whole.
type assembled struct{ parts map[string][]record.Capture }

func (a *assembled) take(b record.Capture) (parts []record.Capture, whole bool) {
	if a.parts == nil {
		a.parts = map[string][]record.Capture{}
	}
	a.parts[b.ID] = append(a.parts[b.ID], b)
	if b.Part != b.Parts {
		return nil, false
	}
	parts = a.parts[b.ID]
	delete(a.parts, b.ID)
	return parts, true
}

// captureOf makes the capture of its parts. One that does not read is kept with the reason.
func captureOf(seq int64, at string, parts []record.Capture, s site.Site) Capture {
	first := parts[0]
	c := Capture{ID: first.ID, Seq: seq, At: at, What: first.What, Stage: first.Stage, Attempt: first.Attempt, T0: first.T0, site: s}
	for _, name := range first.Signals {
		c.Signals = append(c.Signals, name.Name)
	}
	data, err := capture.FromRecords(parts)
	if err != nil {
		c.Problem = err.Error()
		return c
	}
	c.data, c.Samples, c.Gaps = data, len(data.Samples), len(data.Gaps)
	return c
}
