package walkview

import (
	"slices"
	"strings"

	tea "github.com/charmbracelet/bubbletea"

	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/commission/walk"
	"chargehand/tui/form"
)

func askPerson(first bool) *prompt {
	title, roles := "Who takes part?", []string{"witness", "surveyor", "owner", "technician"}
	if first {
		title, roles = "Who goes this walk?", []string{"technician", "witness", "surveyor", "owner"}
	}
	return asking(title, func(m Model, f form.Form) (Model, tea.Cmd) {
		person := walk.AddPerson{Name: f.Value("name"), Role: f.Value("role"), Organisation: f.Value("organisation")}
		if first {
			person.Key = m.session.Key
		}
		return m.submit(f.Value("name")+" entered", person)
	},
		form.Input("name", "name", "", filled("a name, as it stands under the signatures")),
		form.Choice("role", "role", roles...),
		form.Note("organisation", "organisation"))
}

// askSignature asks who signs a point beside the one who goes the walk.
func askSignature(p walk.Point, others []record.Person) *prompt {
	names := personNames(others)
	return asking("Sign "+p.ID+" as", func(m Model, f form.Form) (Model, tea.Cmd) {
		i := slices.Index(names, f.Value("who"))
		if i < 0 {
			return m.ask(askPerson(false)), nil
		}
		return m.submit(p.ID+" signed by "+others[i].Name, walk.Sign{Point: p.ID, Person: others[i].ID, UnsignedBecause: "no key of their own here; countersigns the sealed log"})
	}, form.Choice("who", "who", append(slices.Clone(names), "somebody else, to be entered")...))
}

func personNames(people []record.Person) []string {
	names := make([]string, len(people))
	for i, p := range people {
		names[i] = p.ID + " " + p.Name + ", " + p.Role
	}
	return names
}

// askSeen asks what was seen. Where the point proves signals by the device's own display, each of them has a field.
func (m Model) askSeen(p walk.Point) *prompt {
	var fields []form.Field
	var displays []walk.HandReading
	if !p.Wants(walk.Instrument) {
		for _, name := range p.Proves {
			fields = append(fields, form.Input(string(name), string(name), name.Unit(), optional(valued(name.Unit(), nil))))
			displays = append(displays, walk.HandReading{What: string(name), Unit: name.Unit()})
		}
	}
	label := "seen"
	if p.Wants(walk.Document) {
		label = "document"
	}
	fields = append(fields, form.Input("seen", label, "", filled("what was seen, or the document's number")))
	ask := asking(p.Title, func(m Model, f form.Form) (Model, tea.Cmd) { return m.seen(p, f) }, fields...).
		offering("seen", append(slices.Clone(prepared(p)), m.earlier(p)...)...)
	if m.session.Operator != nil {
		ask.rehearsed, ask.meters = rehearsed(p), displays
	}
	return ask
}

// earlier is what was entered at the point before it was opened again, and at the point before it: such texts repeat.
func (m Model) earlier(p walk.Point) []string {
	var texts []string
	for _, q := range m.snapshot.State.Points() {
		if q.Stage == p.Stage {
			texts = append(texts, m.seenAt(q)...)
		}
		if q.ID == p.ID {
			break
		}
	}
	slices.Reverse(texts)
	return texts[:min(len(texts), 2)]
}

func (m Model) seenAt(p walk.Point) []string {
	var texts []string
	for _, seq := range m.snapshot.State.Status(p.ID).Readings {
		if r, ok := m.snapshot.State.Reading(seq); ok && r.Source == record.Observed && r.Signal == "seen" && !strings.HasPrefix(r.Text, "rehearsed: ") {
			texts = append(texts, r.Text)
		}
	}
	return texts
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
	return m.submit("what was seen", events...)
}

// askMeasure asks for every hand reading of a point at once. While a hold before the point is open, its readings are only
// noted, and offered again when the point's turn comes.
func (m Model) askMeasure(p walk.Point) *prompt {
	instruments := m.snapshot.State.Instruments()
	names := make([]string, len(instruments))
	for i, instrument := range instruments {
		names[i] = instrument.ID + " " + instrument.Name + " " + instrument.Serial
	}
	if len(names) == 0 {
		return askInstrument()
	}
	var fields []form.Field
	for _, h := range p.Hand {
		field := form.Input(h.What, h.What, h.Unit, valued(h.Unit, limitsOf(p, h)))
		if v, ok := m.noted[p.ID+" "+h.What]; ok {
			field = field.WithValue(strings.TrimSpace(meterText(v) + " " + h.Unit))
		}
		fields = append(fields, field)
	}
	fields = append(fields, form.Choice("instrument", "instrument", names...))
	title := "By instrument: " + p.Title
	if m.hasNoted(p) {
		title += " (as noted during the capture)"
	}
	ask := asking(title, func(m Model, f form.Form) (Model, tea.Cmd) {
		i := slices.Index(names, f.Value("instrument"))
		values := map[string]float64{}
		for _, h := range p.Hand {
			if v, err := parse(f.Value(h.What), h.Unit); err == nil {
				values[h.What] = v
			}
		}
		return m.instrumentRead(p, values, instruments[max(i, 0)])
	}, fields...)
	if m.session.Operator != nil && !m.hasNoted(p) {
		ask.meters = p.Hand
	}
	return ask
}

// hasNoted tells whether the point's values were read before its turn; the meter shows others by now.
func (m Model) hasNoted(p walk.Point) bool {
	return slices.ContainsFunc(p.Hand, func(h walk.HandReading) bool { _, ok := m.noted[p.ID+" "+h.What]; return ok })
}

func limitsOf(p walk.Point, h walk.HandReading) []walk.Criterion {
	return slices.DeleteFunc(slices.Clone(p.Accept), func(c walk.Criterion) bool { return c.What != h.What })
}

// instrumentRead enters values read by hand; at a point that is still closed they are noted.
func (m Model) instrumentRead(p walk.Point, values map[string]float64, by record.Instrument) (Model, tea.Cmd) {
	if _, held := m.snapshot.State.HeldBy(p); held {
		return m.note(p, values, by)
	}
	var events []walk.Event
	for _, h := range p.Hand {
		if v, ok := values[h.What]; ok {
			events = append(events, walk.Take{Reading: record.Reading{Point: p.ID, Signal: h.What, Value: &v, Unit: h.Unit,
				Source: record.FromInstrument, Instrument: &by.ID, Quality: string(signal.Good)}})
		}
	}
	return m.submit("instrument reading", events...)
}

// note keeps values that were read before their point's turn: in the log as a note, and here for the point.
func (m Model) note(p walk.Point, values map[string]float64, by record.Instrument) (Model, tea.Cmd) {
	noted := make(map[string]float64, len(m.noted)+len(values))
	for k, v := range m.noted {
		noted[k] = v
	}
	var words []string
	for _, h := range p.Hand {
		if v, ok := values[h.What]; ok {
			noted[p.ID+" "+h.What] = v
			words = append(words, h.What+" "+strings.TrimSpace(meterText(v)+" "+h.Unit))
		}
	}
	m.noted = noted
	text := strings.Join(words, ", ")
	return m.submit("noted for "+p.ID+": "+text, walk.AddNote{Text: "read for " + p.ID + " with " + by.Name + " " + by.Serial + ": " + text})
}

func askInstrument() *prompt {
	return asking("Which instrument? Its date decides whether it counts", func(m Model, f form.Form) (Model, tea.Cmd) {
		plus, _ := parse(f.Value("plus"), "V")
		most, _ := parse(f.Value("range"), "V")
		return m.submit(f.Value("name")+" entered", walk.AddInstrument{Record: record.Instrument{Name: f.Value("name"), Serial: f.Value("serial"),
			Calibrated: f.Value("calibrated"), Due: f.Value("due"),
			Accuracy: record.InstrumentAccuracy{OfReading: percent(f.Value("accuracy")), Plus: plus, Unit: "V"}, MaxVoltage: most}})
	},
		form.Input("name", "name", "", filled("what it is, such as hand multimeter")),
		form.Input("serial", "serial", "", filled("its serial number")),
		form.Input("calibrated", "calibrated", "", dated),
		form.Input("due", "due", "", dated),
		form.Input("accuracy", "of reading", "%", valued("%", nil)),
		form.Input("plus", "plus", "V", valued("V", nil)),
		form.Input("range", "made for", "V", valued("V", nil)))
}

func percent(text string) float64 {
	v, _ := parse(text, "%")
	return v / 100
}

// reasoned asks for one line that stands in the log.
func reasoned(title, label, want string, submit func(m Model, reason string) (Model, tea.Cmd)) *prompt {
	return asking(title, func(m Model, f form.Form) (Model, tea.Cmd) { return submit(m, f.Value("reason")) },
		form.Input("reason", label, "", filled(want))).offering("reason")
}

func (m Model) askFail(p walk.Point) *prompt {
	return reasoned("Fail "+p.ID, "why", "say why; it stands in the log", func(m Model, why string) (Model, tea.Cmd) {
		return m.submit(p.ID+" failed", walk.Judge{Point: p.ID, Result: walk.Failed, Note: why})
	}).offering("reason", m.snapshot.State.Assess(p).Because...)
}

func (m Model) askOmit(p walk.Point) *prompt {
	ask := reasoned(p.ID+" is not applicable", "because", "say why; it stands in the log", func(m Model, why string) (Model, tea.Cmd) {
		return m.judge(p, walk.NotApplicable, why)
	}).offering("reason", "this plant has no __", "the bus was dead before the charge", "not reached today: __")
	if m.session.Operator != nil {
		ask.rehearsed = "not provoked in a rehearsal"
	}
	return ask
}

func askNote() *prompt {
	return reasoned("Note", "text", "a note", func(m Model, text string) (Model, tea.Cmd) {
		return m.submit("note", walk.AddNote{Text: text})
	})
}

func askReopen(p walk.Point) *prompt {
	return reasoned("Open "+p.ID+" again; what rests on it opens too", "why", "say why; it stands in the log", func(m Model, why string) (Model, tea.Cmd) {
		return m.submit(p.ID+" reopened", walk.Reopen{Point: p.ID, Why: why})
	}).offering("reason", "wrong value typed", "repeated because __")
}

// askCause asks what the last attempt failed of; the causes that the capture points to come first.
func (m Model) askCause() *prompt {
	var causes []string
	for _, f := range append(m.snapshot.State.Measured("measured.precharge"), m.snapshot.State.Measured("measured.closing")...) {
		for _, c := range f.Cause {
			causes = append(causes, c.ID+", found by __")
		}
	}
	return reasoned("What did the last attempt fail of? No further attempt before it is known", "cause", "the cause, and how it was found",
		func(m Model, cause string) (Model, tea.Cmd) { return m.submit("cause", walk.EnterCause{Cause: cause}) }).
		offering("reason", append(causes, "broken off by hand before anything happened")...)
}

func askOverride(p walk.Point, because string) *prompt {
	return reasoned("Arm before its time? "+because+". Esc waits", "reason", "a reason for coming before its time", func(m Model, reason string) (Model, tea.Cmd) {
		return m.submit("capture armed", walk.Arm{Point: p.ID, Override: reason})
	}).offering("reason", "resistor measured cold: __ °C")
}

func (m Model) askPunch(p walk.Point) *prompt {
	what := p.ID + ": __"
	if note := m.snapshot.State.Status(p.ID).Note; note != "" {
		what = p.ID + ": " + note
	}
	return asking("Punch item", func(m Model, f form.Form) (Model, tea.Cmd) {
		return m.submit("punch item", walk.RaisePunch{What: f.Value("what"), Severity: f.Value("severity")[:1], Owner: f.Value("owner"),
			Due: f.Value("due"), Point: p.ID})
	},
		form.Input("what", "what is open", "", filled("what is open")).WithValue(what),
		form.Choice("severity", "severity", "B before handover", "A before energising", "C later"),
		form.Input("owner", "who closes it", "", filled("a name")),
		form.Input("due", "due", "", dated))
}

// askClear asks which punch item is closed.
func askClear(open []record.Punch) *prompt {
	names := make([]string, len(open))
	for i, k := range open {
		names[i] = k.ID + " " + k.Severity + " " + k.What
	}
	return asking("Clear a punch item", func(m Model, f form.Form) (Model, tea.Cmd) {
		i := slices.Index(names, f.Value("item"))
		return m.submit(open[max(i, 0)].ID+" cleared", walk.ClearPunch{ID: open[max(i, 0)].ID})
	}, form.Choice("item", "item", names...))
}

func askDeviation(p walk.Point, people []record.Person) *prompt {
	names := personNames(people)
	return asking("Accept "+p.ID+" by a deviation", func(m Model, f form.Form) (Model, tea.Cmd) {
		i := slices.Index(names, f.Value("by"))
		if i < 0 {
			m.message, m.refused = "enter who accepts it first (w)", true
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

// askPlace asks where a log that its place no longer takes goes on.
func askPlace(suggested string) *prompt {
	return asking("Go on with the log in another file; the old one stays as it is", func(m Model, f form.Form) (Model, tea.Cmd) {
		move, to := m.session.Move, f.Value("path")
		if move == nil {
			return m, nil
		}
		m.busy = true
		return m, func() tea.Msg { return movedMsg{to, move(to)} }
	}, form.Input("path", "path", "", filled("a path on another disk")).WithValue(suggested))
}
