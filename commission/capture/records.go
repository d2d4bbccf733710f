package capture

import (
	"encoding/json"
	"errors"
	"fmt"
	"math"
	"time"

	"chargehand/commission/record"
	"chargehand/commission/signal"
)

// PartSize is how many bytes of samples one record holds at most: well below the 4 MiB that a line of the log may have.
const PartSize = 1 << 20

// Records gives the capture as the log keeps it, in parts. Each sample is [seconds since t0, words…] with null where a
// signal had no value. A channel whose words do not give its values (an instrument's readings) is kept as f64 words of the
// values themselves, so that nothing measured is lost.
func Records(c Capture) []record.Capture {
	raw := make([]bool, len(c.Channels))
	signals := make([]record.CaptureSignal, len(c.Channels))
	for i, ch := range c.Channels {
		raw[i] = c.hasWords(i)
		signals[i] = record.CaptureSignal{Name: string(ch.Name), Unit: ch.Unit, Scale: ch.Scale, Offset: ch.Offset, Type: ch.Type}
		if !raw[i] {
			signals[i] = record.CaptureSignal{Name: string(ch.Name), Unit: ch.Unit, Scale: 1, Type: "f64"}
		}
	}
	blank := record.Capture{ID: c.ID, Stage: c.Stage, What: string(c.Kind), Attempt: c.Attempt, T0: c.T0.Format(time.RFC3339Nano), Signals: signals,
		Samples: []json.RawMessage{}, Gaps: []json.RawMessage{}}
	parts := []record.Capture{blank}
	size := 0
	for _, s := range c.Samples {
		line := sampleLine(s, raw)
		if size+len(line) > PartSize && size > 0 {
			parts, size = append(parts, blank), 0
		}
		last := &parts[len(parts)-1]
		last.Samples = append(last.Samples, line)
		size += len(line) + 1
	}
	for _, g := range c.Gaps {
		line, err := json.Marshal([]any{seconds(g.From), seconds(g.To), g.Why})
		if err != nil {
			panic(fmt.Sprintf("capture: a gap does not encode: %v", err)) // finite numbers and a string always do
		}
		parts[0].Gaps = append(parts[0].Gaps, line)
	}
	for i := range parts {
		parts[i].Part, parts[i].Parts = i+1, len(parts)
	}
	return parts
}

// seconds keeps microseconds: the clock of a poll is no finer.
func seconds(d time.Duration) float64 { return math.Round(d.Seconds()*1e6) / 1e6 }

func (c Capture) hasWords(channel int) bool {
	ch := c.Channels[channel]
	for _, s := range c.Samples {
		if channel >= len(s.Values) || !s.Values[channel].OK {
			continue
		}
		v := s.Values[channel]
		decoded, err := decode(ch.Type, ch.Scale, ch.Offset, v.Raw)
		if err != nil || math.Abs(decoded-v.V) > 1e-9*math.Max(1, math.Abs(v.V)) {
			return false
		}
	}
	return true
}

func sampleLine(s Sample, raw []bool) json.RawMessage {
	line := []any{seconds(s.At)}
	for i, hasWords := range raw {
		switch {
		case i >= len(s.Values) || !s.Values[i].OK:
			line = append(line, nil)
		case hasWords:
			line = append(line, s.Values[i].Raw)
		default:
			line = append(line, wordsOf(s.Values[i].V))
		}
	}
	encoded, err := json.Marshal(line)
	if err != nil {
		panic(fmt.Sprintf("capture: a sample does not encode: %v", err)) // times are finite, words are integers
	}
	return encoded
}

// FromRecords puts the parts of one capture together again. All parts must be there, in order, of one capture and with the
// same signals.
func FromRecords(parts []record.Capture) (Capture, error) {
	if len(parts) == 0 {
		return Capture{}, errors.New("capture without parts")
	}
	first := parts[0]
	t0, err := time.Parse(time.RFC3339Nano, first.T0)
	if err != nil {
		return Capture{}, fmt.Errorf("capture %s: t0 %q is not an RFC 3339 time", first.ID, first.T0)
	}
	c := Capture{ID: first.ID, Kind: Kind(first.What), Stage: first.Stage, Attempt: first.Attempt, T0: t0}
	for _, s := range first.Signals {
		c.Channels = append(c.Channels, Channel{Name: signal.Name(s.Name), Unit: s.Unit, Type: s.Type, Scale: s.Scale, Offset: s.Offset})
	}
	for i, p := range parts {
		if p.ID != first.ID || p.Part != i+1 || p.Parts != len(parts) || len(p.Signals) != len(first.Signals) {
			return Capture{}, fmt.Errorf("capture %s: part %d of %d stands where part %d of %d of %s is wanted", p.ID, p.Part, p.Parts, i+1, len(parts), first.ID)
		}
		if err := c.read(p); err != nil {
			return Capture{}, fmt.Errorf("capture %s, part %d: %w", p.ID, p.Part, err)
		}
	}
	return c, nil
}

func (c *Capture) read(p record.Capture) error {
	for k, line := range p.Samples {
		s, err := c.sample(line)
		if err != nil {
			return fmt.Errorf("sample %d: %w", k+1, err)
		}
		c.Samples = append(c.Samples, s)
	}
	for k, line := range p.Gaps {
		g, err := gap(line)
		if err != nil {
			return fmt.Errorf("gap %d: %w", k+1, err)
		}
		c.Gaps = append(c.Gaps, g)
	}
	return nil
}

func (c *Capture) sample(line json.RawMessage) (Sample, error) {
	var fields []json.RawMessage
	if err := json.Unmarshal(line, &fields); err != nil {
		return Sample{}, err
	}
	if len(fields) != len(c.Channels)+1 {
		return Sample{}, fmt.Errorf("%d fields, wanted a time and %d signals", len(fields), len(c.Channels))
	}
	at, err := instant(fields[0])
	if err != nil {
		return Sample{}, err
	}
	s := Sample{At: at, Values: make([]Value, len(c.Channels))}
	for i, field := range fields[1:] {
		var raw []uint16
		if err := json.Unmarshal(field, &raw); err != nil {
			return Sample{}, fmt.Errorf("%s: %w", c.Channels[i].Name, err)
		}
		if raw == nil {
			continue
		}
		ch := c.Channels[i]
		v, err := decode(ch.Type, ch.Scale, ch.Offset, raw)
		if err != nil {
			return Sample{}, fmt.Errorf("%s: %w", ch.Name, err)
		}
		s.Values[i] = Value{V: v, OK: true, Raw: raw}
	}
	return s, nil
}

func instant(field json.RawMessage) (time.Duration, error) {
	var s float64
	if err := json.Unmarshal(field, &s); err != nil {
		return 0, err
	}
	if math.Abs(s) > 1e9 {
		return 0, fmt.Errorf("time %g s is beyond a capture", s)
	}
	return time.Duration(math.Round(s*1e6)) * time.Microsecond, nil
}

func gap(line json.RawMessage) (Gap, error) {
	var fields []json.RawMessage
	if err := json.Unmarshal(line, &fields); err != nil {
		return Gap{}, err
	}
	if len(fields) != 3 {
		return Gap{}, fmt.Errorf("%d fields, wanted from, to and why", len(fields))
	}
	var g Gap
	var err error
	if g.From, err = instant(fields[0]); err != nil {
		return Gap{}, err
	}
	if g.To, err = instant(fields[1]); err != nil {
		return Gap{}, err
	}
	err = json.Unmarshal(fields[2], &g.Why)
	return g, err
}
