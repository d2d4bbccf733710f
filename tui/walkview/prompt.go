package walkview

import (
	"context"
	"fmt"
	"slices"
	"strings"
	"time"

	tea "github.com/charmbracelet/bubbletea"

	"chargehand/commission/quantity"
	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/commission/walk"
	"chargehand/tui/form"
)

// prompt is a form over the open point, and what is done with it.
type prompt struct {
	title  string
	form   form.Form
	meter  string // what the simulated plant's meter can fill into the field "value"; empty where there is none
	submit func(m Model, f form.Form) (Model, tea.Cmd)
}

func asking(title string, submit func(Model, form.Form) (Model, tea.Cmd), fields ...form.Field) *prompt {
	return &prompt{title: title, form: form.New(form.DefaultKeyMap(), fields...), submit: submit}
}

func (m Model) ask(p *prompt) Model {
	m.prompt = p
	return m
}

// meterKey fills in what the simulated plant's meter shows.
const meterKey = "ctrl+t"

// typed takes a key while a prompt is open.
func (m Model) typed(msg tea.KeyMsg) (Model, tea.Cmd) {
	p := *m.prompt
	if msg.String() == meterKey && p.meter != "" {
		return m.askMeter(p.meter)
	}
	var outcome form.Outcome
	p.form, outcome = p.form.Update(msg)
	switch outcome {
	case form.Accepted:
		m.prompt = nil
		return p.submit(m, p.form)
	case form.Left:
		m.prompt = nil
		m.message, m.refused = "nothing entered", false
		return m, nil
	}
	m.prompt = &p
	return m, nil
}

// askMeter reads the simulated plant's meter into the open field.
func (m Model) askMeter(what string) (Model, tea.Cmd) {
	operator := m.session.Operator
	return m, func() tea.Msg {
		value, _, err := operator.Measure(context.Background(), what)
		return measuredMsg{what, value, err}
	}
}

func (m Model) measured(msg measuredMsg) Model {
	if m.prompt == nil || m.prompt.meter != msg.what {
		return m
	}
	if msg.err != nil {
		m.message, m.refused = msg.err.Error(), true
		return m
	}
	p := *m.prompt
	field, _ := p.form.Field("value")
	p.form = p.form.WithValue("value", strings.TrimSpace(fmt.Sprintf("%.5g %s", msg.value, field.Unit)))
	m.prompt = &p
	return m
}

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

// valued checks a value with its unit as it is typed.
func valued(unit string) form.Check {
	return func(text string) (bool, string) {
		if _, err := parse(text, unit); err != nil {
			return false, err.Error()
		}
		return true, ""
	}
}

func askPerson() *prompt {
	return asking("Who goes this walk?", func(m Model, f form.Form) (Model, tea.Cmd) {
		return m.submit(f.Value("name")+" entered", walk.AddPerson{Name: f.Value("name"), Role: f.Value("role"), Organisation: f.Value("organisation")})
	},
		form.Input("name", "name", "", filled("a name, as it stands under the signatures")),
		form.Choice("role", "role", "technician", "witness", "surveyor", "owner"),
		form.Note("organisation", "organisation"))
}

// askSeen asks what was seen. Where the point proves signals by the device's own display, each of them has a field.
func askSeen(p walk.Point) *prompt {
	var fields []form.Field
	if !p.Wants(walk.Instrument) {
		for _, name := range p.Proves {
			fields = append(fields, form.Input(string(name), string(name), name.Unit(), optional(valued(name.Unit()))))
		}
	}
	fields = append(fields, form.Input("seen", "seen", "", filled("no tick without a value: what was seen, or the document's number")))
	return asking(p.Title, func(m Model, f form.Form) (Model, tea.Cmd) { return m.seen(p, f) }, fields...)
}

func optional(check form.Check) form.Check {
	return func(text string) (bool, string) {
		if strings.TrimSpace(text) == "" {
			return true, "as the device's display shows; empty: not shown"
		}
		return check(text)
	}
}

// seen enters what was seen, the device's displays first.
func (m Model) seen(p walk.Point, f form.Form) (Model, tea.Cmd) {
	var events []walk.Event
	for _, name := range p.Proves {
		text := f.Value(string(name))
		value, err := parse(text, name.Unit())
		if text == "" || err != nil {
			continue
		}
		events = append(events, walk.Take{Reading: record.Reading{Point: p.ID, Signal: string(name), Value: &value, Unit: name.Unit(),
			Source: record.Observed, Quality: string(signal.Good), Text: "as the device's display shows"}})
	}
	events = append(events, walk.Take{Reading: record.Reading{Point: p.ID, Signal: "seen", Source: record.Observed,
		Quality: string(signal.Good), Text: f.Value("seen")}})
	return m.submit("entered", events...)
}

func askMeasure(p walk.Point, h walk.HandReading, instruments []record.Instrument, simulated bool) *prompt {
	names := make([]string, len(instruments))
	for i, instrument := range instruments {
		names[i] = instrument.ID + " " + instrument.Name + " " + instrument.Serial
	}
	ask := asking("Instrument: "+h.What, func(m Model, f form.Form) (Model, tea.Cmd) {
		value, err := parse(f.Value("value"), h.Unit)
		i := slices.Index(names, f.Value("instrument"))
		if err != nil || i < 0 {
			m.message, m.refused = "enter an instrument first: the site file lists them under [[instrument]]", true
			return m, nil
		}
		return m.submit(h.What+" entered", walk.Take{Reading: record.Reading{Point: p.ID, Signal: h.What, Value: &value, Unit: h.Unit,
			Source: record.FromInstrument, Instrument: &instruments[i].ID, Quality: string(signal.Good)}})
	},
		form.Input("value", "value", h.Unit, valued(h.Unit)),
		form.Choice("instrument", "instrument", names...))
	if simulated {
		ask.meter = h.What
	}
	return ask
}

// reasoned asks for one line that stands in the log.
func reasoned(title, label, want string, submit func(m Model, reason string) (Model, tea.Cmd)) *prompt {
	return asking(title, func(m Model, f form.Form) (Model, tea.Cmd) { return submit(m, f.Value("reason")) },
		form.Input("reason", label, "", filled(want)))
}

func askFail(p walk.Point) *prompt {
	return reasoned("Fail "+p.ID, "why", "say why; it stands in the log", func(m Model, why string) (Model, tea.Cmd) {
		return m.submit(p.ID+" failed", walk.Judge{Point: p.ID, Result: walk.Failed, Note: why})
	})
}

func askOmit(p walk.Point) *prompt {
	return reasoned(p.ID+" is not applicable", "because", "say why; it stands in the log", func(m Model, why string) (Model, tea.Cmd) {
		return m.submit(p.ID+" not applicable", walk.Judge{Point: p.ID, Result: walk.NotApplicable, Note: why})
	})
}

func askNote() *prompt {
	return reasoned("Note", "text", "a note", func(m Model, text string) (Model, tea.Cmd) {
		return m.submit("note", walk.AddNote{Text: text})
	})
}

func askReopen(p walk.Point) *prompt {
	return reasoned("Open "+p.ID+" again; what rests on it opens too", "why", "say why; it stands in the log", func(m Model, why string) (Model, tea.Cmd) {
		return m.submit(p.ID+" reopened", walk.Reopen{Point: p.ID, Why: why})
	})
}

func askCause() *prompt {
	return reasoned("What did the last attempt fail of? No further attempt before it is known", "cause", "the cause, and how it was found",
		func(m Model, cause string) (Model, tea.Cmd) { return m.submit("cause", walk.EnterCause{Cause: cause}) })
}

func askOverride(p walk.Point, because string) *prompt {
	return reasoned(because+"; Esc waits", "reason", "a reason for coming before its time", func(m Model, reason string) (Model, tea.Cmd) {
		return m.submit("capture armed", walk.Arm{Point: p.ID, Override: reason})
	})
}

func askPunch(p walk.Point) *prompt {
	return asking("Punch item", func(m Model, f form.Form) (Model, tea.Cmd) {
		return m.submit("punch item", walk.RaisePunch{What: f.Value("what"), Severity: f.Value("severity")[:1], Owner: f.Value("owner"),
			Due: f.Value("due"), Point: p.ID})
	},
		form.Input("what", "what is open", "", filled("what is open")).WithValue(p.ID+": "),
		form.Choice("severity", "severity", "B before handover", "A before energising", "C later"),
		form.Input("owner", "owner", "", filled("who closes it")),
		form.Input("due", "due", "", dated))
}

func askDeviation(p walk.Point, people []record.Person) *prompt {
	names := make([]string, len(people))
	for i, person := range people {
		names[i] = person.ID + " " + person.Name
	}
	return asking("Deviation at "+p.ID, func(m Model, f form.Form) (Model, tea.Cmd) {
		i := slices.Index(names, f.Value("by"))
		if i < 0 {
			m.message, m.refused = "enter who accepts it first", true
			return m, nil
		}
		return m.submit("deviation", walk.Deviate{Point: p.ID, Reason: f.Value("reason"), AcceptedBy: people[i].ID})
	},
		form.Input("reason", "reason", "", filled("why it is accepted")),
		form.Choice("by", "accepted by", names...))
}

func askSeal() *prompt {
	return asking("Seal the log? Nothing is appended after it", func(m Model, f form.Form) (Model, tea.Cmd) {
		if f.Value("seal") != "seal it" {
			return m, nil
		}
		return m.submit("sealed", walk.Seal{Person: m.person(), UnsignedBecause: m.session.Unsigned})
	}, form.Choice("seal", "seal", "not yet", "seal it"))
}

// parse reads a typed value with its unit, in the coherent unit. A typed nil must not become an error.
func parse(text, unit string) (float64, error) {
	v, refusal := quantity.ParseUnit(strings.TrimSpace(text), unit, quantity.Rule{})
	if refusal != nil {
		return 0, refusal
	}
	return v, nil
}
