package main

import (
	"encoding/json"
	"io"
	"time"

	"chargehand/commission/signal"
)

// linkJSON is one poll as `link --json` writes it.
type linkJSON struct {
	At      string       `json:"at"`
	Signals []signalJSON `json:"signals"`
}

// signalJSON is one signal of a poll. Value is there only when its state is good or late; Age is null where no answer ever
// came, since 0 would look new.
type signalJSON struct {
	Name  string   `json:"name"`
	State string   `json:"state"`
	Value *float64 `json:"value,omitempty"`
	Unit  string   `json:"unit"`
	Raw   []uint16 `json:"raw"`
	Age   *float64 `json:"age"` // seconds
}

func writeBatchJSON(w io.Writer, b signal.Batch) error {
	out := linkJSON{At: b.At.Format(time.RFC3339Nano), Signals: []signalJSON{}}
	for _, r := range b.Readings {
		s := signalJSON{Name: string(r.Name), State: string(r.Quality), Unit: r.Name.Unit(), Raw: r.Raw}
		if s.Raw == nil {
			s.Raw = []uint16{}
		}
		if !r.At.IsZero() {
			age := max(r.Age(b.At).Seconds(), 0)
			s.Age = &age
		}
		if r.Quality.HasValue() {
			value := r.Value
			s.Value = &value
		}
		out.Signals = append(out.Signals, s)
	}
	return json.NewEncoder(w).Encode(out)
}
