package finding

import (
	"bytes"
	"encoding/json"
	"fmt"
	"io"
	"math"
)

// Format is the format of [Sheet]'s JSON.
const Format = "chargehand-findings/1"

// wire is a finding as it is written: these keys in this order, a number that is not finite as null. Captures and cause
// stand only in measured findings that have them.
type wire struct {
	ID       string     `json:"id"`
	Subject  *string    `json:"subject"`
	Title    string     `json:"title"`
	Unit     string     `json:"unit"`
	State    State      `json:"state"`
	Value    wireValue  `json:"value"`
	Parts    []wirePart `json:"parts"`
	Limit    wireLimit  `json:"limit"`
	Margin   *float64   `json:"margin"`
	Verdict  Verdict    `json:"verdict"`
	Because  []string   `json:"because"`
	Basis    string     `json:"basis"`
	Remedy   string     `json:"remedy"`
	Captures []string   `json:"captures,omitempty"`
	Cause    []Cause    `json:"cause,omitempty"`
}

type wireValue struct {
	Low     *float64 `json:"low"`
	Nominal *float64 `json:"nominal"`
	High    *float64 `json:"high"`
}

type wireLimit struct {
	Low  *float64 `json:"low"`
	High *float64 `json:"high"`
}

type wirePart struct {
	Name  string    `json:"name"`
	Unit  string    `json:"unit"`
	Value wireValue `json:"value"`
}

func finite(v float64) *float64 {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return nil
	}
	return &v
}

func (v Value) wire() wireValue {
	return wireValue{finite(v.Low), finite(v.Nominal), finite(v.High)}
}

// value reads nulls back as NaN: the JSON form does not say which way a value is not finite, its state does.
func (w wireValue) value() Value {
	return Value{orNaN(w.Low), orNaN(w.Nominal), orNaN(w.High)}
}

func orNaN(p *float64) float64 {
	if p == nil {
		return math.NaN()
	}
	return *p
}

// MarshalJSON writes the finding as design 6 defines it. Guards, Changes and Explanation are not part of it.
func (f Finding) MarshalJSON() ([]byte, error) {
	w := wire{ID: f.ID, Title: f.Title, Unit: f.Unit, State: f.State, Value: f.Value.wire(), Parts: []wirePart{},
		Margin: finite(f.Margin), Verdict: f.Verdict, Because: f.Because, Basis: f.Basis, Remedy: f.Remedy, Captures: f.Captures, Cause: f.Cause}
	if f.Subject != "" {
		w.Subject = &f.Subject
	}
	if f.Because == nil {
		w.Because = []string{}
	}
	for _, p := range f.Parts {
		w.Parts = append(w.Parts, wirePart{p.Name, p.Unit, p.Value.wire()})
	}
	for _, side := range []struct {
		from *float64
		to   **float64
	}{{f.Limit.Low, &w.Limit.Low}, {f.Limit.High, &w.Limit.High}} {
		if side.from != nil {
			*side.to = finite(*side.from)
		}
	}
	if w.Limit.Low == nil && w.Limit.High == nil {
		w.Margin = nil
	}
	return marshal(w)
}

// marshal writes JSON without the escapes for HTML, which findings are not.
func marshal(v any) ([]byte, error) {
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	if err := e.Encode(v); err != nil {
		return nil, err
	}
	return bytes.TrimSuffix(b.Bytes(), []byte("\n")), nil
}

// UnmarshalJSON reads a finding that MarshalJSON wrote; a verdict or state that it does not know is an error.
func (f *Finding) UnmarshalJSON(text []byte) error {
	var w wire
	if err := json.Unmarshal(text, &w); err != nil {
		return fmt.Errorf("read finding: %w", err)
	}
	switch w.Verdict {
	case Info, Pass, Marginal, Undecided, Fail:
	default:
		return fmt.Errorf("read finding %q: verdict %q is none of pass, marginal, fail, undecided, info", w.ID, w.Verdict)
	}
	switch w.State {
	case Finite, Never, Unlimited, None:
	default:
		return fmt.Errorf("read finding %q: state %q is none of finite, never, unlimited, none", w.ID, w.State)
	}
	*f = Finding{ID: w.ID, Title: w.Title, Unit: w.Unit, State: w.State, Value: w.Value.value(), Limit: Limit(w.Limit),
		Margin: orNaN(w.Margin), Verdict: w.Verdict, Because: w.Because, Basis: w.Basis, Remedy: w.Remedy, Captures: w.Captures, Cause: w.Cause}
	if w.Subject != nil {
		f.Subject = *w.Subject
	}
	for _, p := range w.Parts {
		f.Parts = append(f.Parts, Part{p.Name, p.Unit, p.Value.value()})
	}
	return nil
}

// wireSheet is a sheet as `check --json` writes it.
type wireSheet struct {
	Format    string            `json:"format"`
	Site      string            `json:"site"`
	Reference string            `json:"reference"`
	File      string            `json:"file"`
	Verdict   Verdict           `json:"verdict"`
	Findings  []json.RawMessage `json:"findings"`
}

// WriteJSON writes the sheet as one object on one line.
func (s Sheet) WriteJSON(to io.Writer) error {
	w := wireSheet{Format: Format, Site: s.Site, Reference: s.Reference, File: s.File, Verdict: s.Verdict, Findings: []json.RawMessage{}}
	for _, f := range s.Findings {
		one, err := f.MarshalJSON()
		if err != nil {
			return fmt.Errorf("write finding %s: %w", f.ID, err)
		}
		w.Findings = append(w.Findings, one)
	}
	line, err := marshal(w)
	if err != nil {
		return err
	}
	_, err = to.Write(append(line, '\n'))
	return err
}
