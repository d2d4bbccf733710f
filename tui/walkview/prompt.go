package walkview

import (
	"context"
	"fmt"
	"strings"
	"time"

	tea "github.com/charmbracelet/bubbletea"

	"chargehand/commission/quantity"
	"chargehand/commission/walk"
	"chargehand/tui/form"
)

// prompt is a form over the open point, and what is done with it.
type prompt struct {
	title  string
	form   form.Form
	submit func(m Model, f form.Form) (Model, tea.Cmd)

	phrases   []string // texts to begin with, one after the other
	phrase    int      // how many of them have been used
	phraseFor string   // the field that they are for

	meters    []walk.HandReading // fields that the simulated plant's meter can fill in, by what they are
	rehearsed string             // what a rehearsal may put into the field phraseFor; empty where this is none

	preview     func(f form.Form) []string // what the typed values would do; nil where nothing is shown
	previewed   []string
	previewedOf string
}

func asking(title string, submit func(Model, form.Form) (Model, tea.Cmd), fields ...form.Field) *prompt {
	return &prompt{title: title, form: form.New(form.DefaultKeyMap(), fields...), submit: submit}
}

// offering gives the prompt texts to begin with.
func (p *prompt) offering(field string, phrases ...string) *prompt {
	p.phraseFor, p.phrases = field, phrases
	return p
}

func (m Model) ask(p *prompt) Model {
	m.prompt, m.message = p, ""
	return m
}

// The keys of a prompt beside those of its form.
const (
	meterKey  = "ctrl+t" // fill in what the simulated plant's meter shows
	phraseKey = "ctrl+n" // begin with a prepared text, then with the next
)

// typed takes a key while a prompt is open.
func (m Model) typed(msg tea.KeyMsg) (Model, tea.Cmd) {
	p := *m.prompt
	switch {
	case msg.String() == meterKey && !msg.Paste && p.canFill():
		return m.fill(p)
	case msg.String() == phraseKey && !msg.Paste && len(p.phrases) > 0:
		p.form = p.form.Prepared(p.phraseFor, p.phrases[p.phrase%len(p.phrases)])
		p.phrase++
		m.prompt = p.looked()
		return m, nil
	}
	var outcome form.Outcome
	p.form, outcome = p.form.Update(msg)
	switch outcome {
	case form.Accepted:
		if m.busy { // what is being written comes first, and nothing typed is lost
			m.prompt = p.looked()
			return m.refuse("still writing the record before; Enter again"), nil
		}
		m.prompt = nil
		return p.submit(m, p.form)
	case form.Left:
		m.prompt = nil
		m.message, m.refused = "nothing entered", false
		return m, nil
	}
	m.prompt = p.looked()
	return m, nil
}

// looked is the prompt with its preview brought up to what is typed.
func (p prompt) looked() *prompt {
	if p.preview == nil {
		return &p
	}
	var typed strings.Builder
	for _, f := range p.form.Fields() {
		typed.WriteString(f.Value() + "\x00")
	}
	if of := typed.String(); of != p.previewedOf {
		p.previewed, p.previewedOf = p.preview(p.form), of
	}
	return &p
}

func (p prompt) canFill() bool { return len(p.meters) > 0 || p.rehearsed != "" }

// fill reads the simulated plant's meter into the open fields.
func (m Model) fill(p prompt) (Model, tea.Cmd) {
	if p.rehearsed != "" {
		p.form = p.form.WithValue(p.phraseFor, p.rehearsed).Focus(p.phraseFor)
	}
	m.prompt = &p
	if len(p.meters) == 0 {
		return m, nil
	}
	return m, m.readMeter(p.meters)
}

// readMeter reads the simulated plant's meter at several places.
func (m Model) readMeter(places []walk.HandReading) tea.Cmd {
	operator := m.session.Operator
	return func() tea.Msg {
		msg := measuredMsg{values: map[string]float64{}}
		for _, h := range places {
			v, _, err := operator.Measure(context.Background(), h.What)
			if err != nil {
				msg.because = append(msg.because, err.Error())
				continue
			}
			msg.values[h.What] = v
		}
		return msg
	}
}

// measured puts the meter's values into the open prompt's fields; the last field gets the focus, so that Enter takes all.
func (m Model) measured(msg measuredMsg) Model {
	if m.prompt == nil {
		return m
	}
	p := *m.prompt
	for _, h := range p.meters {
		if v, ok := msg.values[h.What]; ok {
			p.form = p.form.WithValue(h.What, strings.TrimSpace(meterText(v)+" "+h.Unit))
		}
	}
	if fields := p.form.Fields(); len(msg.values) > 0 && len(fields) > 0 {
		p.form = p.form.Focus(fields[len(fields)-1].ID)
	}
	m.prompt = p.looked()
	if len(msg.values) == 0 && len(msg.because) > 0 {
		m.message, m.refused = msg.because[0], true
	}
	return m
}

// meterText writes a value with the four and a half digits of a hand meter.
func meterText(v float64) string { return fmt.Sprintf("%.5g", v) }

func filled(what string) form.Check {
	return func(text string) (bool, string) {
		if strings.TrimSpace(text) == "" {
			return false, what
		}
		return true, ""
	}
}

func dated(text string) (bool, string) {
	if _, err := time.Parse(time.DateOnly, strings.TrimSpace(text)); err != nil {
		return false, "a date such as 2027-03-01"
	}
	return true, ""
}

// valued checks a value with its unit as it is typed, and holds it against the point's limits.
func valued(unit string, limits []walk.Criterion) form.Check {
	return func(text string) (bool, string) {
		v, err := parse(text, unit)
		if err != nil {
			return false, err.Error()
		}
		for _, c := range limits {
			if !c.Holds(v) {
				return true, "outside " + limitWords(c)
			}
		}
		return true, ""
	}
}

func optional(check form.Check) form.Check {
	return func(text string) (bool, string) {
		if strings.TrimSpace(text) == "" {
			return true, "may stay empty"
		}
		return check(text)
	}
}

// limitWords is a criterion in words.
func limitWords(c walk.Criterion) string {
	show := func(v float64) string { return quantity.Engineering(v, c.Unit, 3) }
	switch {
	case c.Low != nil && c.High != nil:
		return show(*c.Low) + " … " + show(*c.High)
	case c.High != nil:
		return "at most " + show(*c.High)
	case c.Low != nil:
		return "at least " + show(*c.Low)
	}
	return ""
}

// parse reads a typed value with its unit, in the coherent unit. A typed nil must not become an error.
func parse(text, unit string) (float64, error) {
	v, refusal := quantity.ParseUnit(strings.TrimSpace(text), unit, quantity.Rule{})
	if refusal != nil {
		return 0, refusal
	}
	return v, nil
}
