package commission

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"time"

	"chargehand/commission/chlog"
	"chargehand/commission/finding"
	"chargehand/commission/record"
	"chargehand/commission/site"
	"chargehand/commission/walk"
)

// Papers are the files that a walk rests on, as they were read.
type Papers struct {
	SiteName, SiteText string
	MapName, MapText   string
	Findings           []finding.Finding // of the site
}

// Begin writes what a new log starts with, after its first record: the files, the desk findings, the site's instruments and
// the people, of whom the first is the one who goes the walk.
func Begin(log *chlog.Writer, papers Papers, people []record.Person) (walk.State, error) {
	state := walk.State{}.With(walk.Line{Body: log.Opened()})
	bodies := []record.Body{fileRecord("site", papers.SiteName, papers.SiteText)}
	if papers.MapText != "" {
		bodies = append(bodies, fileRecord("map", papers.MapName, papers.MapText))
	}
	for _, f := range papers.Findings {
		text, err := f.MarshalJSON()
		if err != nil {
			return state, fmt.Errorf("write finding %s: %w", f.ID, err)
		}
		bodies = append(bodies, record.Finding{JSON: text})
	}
	s, _, err := site.Read(papers.SiteName, []byte(papers.SiteText))
	if err != nil {
		return state, err
	}
	for i, instrument := range s.Instruments {
		bodies = append(bodies, instrumentRecord(i, instrument))
	}
	for _, p := range people {
		bodies = append(bodies, p)
	}
	for _, body := range bodies {
		line, err := log.Append(body)
		if err != nil {
			return state, err
		}
		state = state.With(walk.Line{Seq: line.Seq, At: line.At, Body: body})
	}
	return state.Ready(), nil
}

func fileRecord(role, name, text string) record.File {
	sum := sha256.Sum256([]byte(text))
	return record.File{Role: role, Name: name, SHA256: hex.EncodeToString(sum[:]), Text: text}
}

func instrumentRecord(i int, known site.Instrument) record.Instrument {
	date := func(t time.Time) string {
		if t.IsZero() {
			return ""
		}
		return t.Format(time.DateOnly)
	}
	return record.Instrument{ID: fmt.Sprintf("i%d", i+1), Name: known.Name, Serial: known.Serial,
		Calibrated: date(known.Calibrated), Due: date(known.Due),
		Accuracy:   record.InstrumentAccuracy{OfReading: float64(known.OfReading), Plus: float64(known.Plus.Nominal), Unit: "V"},
		MaxVoltage: float64(known.MaxVoltage.Nominal)}
}

// Replay gives the state of the walk that wrote the lines.
func Replay(lines []chlog.Line) (walk.State, error) {
	var state walk.State
	for _, line := range lines {
		body, err := line.Decode()
		if err != nil {
			return state, fmt.Errorf("record %d: %w", line.Seq, err)
		}
		state = state.With(walk.Line{Seq: line.Seq, At: line.At, Body: body})
	}
	return state.Ready(), nil
}
