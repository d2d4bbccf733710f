package walkview

import (
	"slices"
	"strings"

	tea "github.com/charmbracelet/bubbletea"

	"chargehand/commission/site"
	"chargehand/commission/walk"
	"chargehand/tui/deskview"
	"chargehand/tui/form"
)

// changeable are the keys of the site file that a point compares with what is there, the likeliest first.
var changeable = map[string][]string{
	"paper.source": {"source.internal_resistance", "source.max_charge_current", "source.max_discharge_current", "source.cell_max", "source.cell_min",
		"source.cells_in_series", "source.max_voltage", "source.min_voltage"},
	"paper.plates":    {"precharge.resistance", "precharge.rated_power", "converter.choke", "converter.choke_resistance", "converter.switching_frequency", "converter.dead_time"},
	"paper.banks":     {"bus.capacitance.0.value", "bus.capacitance.1.value", "bus.capacitance.2.value"},
	"paper.fuse":      {"source.fuse.rating", "source.fuse.breaking_capacity", "source.fuse.voltage", "source.fuse.pre_arcing_i2t"},
	"paper.switching": {"precharge.contactor.breaking_current", "bypass.making_current", "bypass.carrying_current"},
	"dead.chokes":     {"converter.choke", "converter.choke_resistance"},
	"dead.resistor":   {"precharge.resistance"},
	"dead.discharge":  {"bus.bleeder.0.value"},
	"share.keyed":     {"infeed.0.setpoint", "infeed.0.droop"},
}

var anywhere = []string{"precharge.resistance", "source.internal_resistance", "bus.capacitance.0.value", "infeed.0.setpoint", "infeed.0.droop", "precharge.closing_difference"}

// askChange asks for a value of the site file that is not as on paper, and shows what moves with it.
func (m Model) askChange(p walk.Point) *prompt {
	name, text, _ := m.snapshot.State.SiteFile()
	keys := changeable[p.ID]
	if keys == nil {
		keys = anywhere
	}
	keys = slices.DeleteFunc(slices.Clone(keys), func(k string) bool {
		_, ok := site.Value([]byte(text), k)
		return !ok
	})
	first := ""
	if len(keys) > 0 {
		first = keys[0]
	}
	knownKey := func(key string) (bool, string) {
		v, ok := site.Value([]byte(text), strings.TrimSpace(key))
		if !ok {
			return false, "no such key in " + name
		}
		return true, "now " + v
	}
	ask := asking("A value that is not as on paper", func(m Model, f form.Form) (Model, tea.Cmd) {
		revised, _, err := revision(name, text, f)
		if err != nil {
			return m.refuse(err.Error()), nil
		}
		return m.changeSite(name, string(revised), f.Value("key")+" "+f.Value("value")+": "+f.Value("why"))
	},
		form.Input("key", "key", "", knownKey).WithValue(first),
		form.Input("value", "found", "", filled("the value with its unit")),
		form.Input("why", "why", "", filled("where it was read"))).offering("key", keys...)
	before := m.snapshot.State.Desk()
	check := m.session.Check
	ask.preview = func(f form.Form) []string {
		if f.Value("value") == "" || check == nil {
			return nil
		}
		_, s, err := revision(name, text, f)
		if err != nil {
			return strings.Split(err.Error(), "\n")
		}
		return deskview.Moves(before, check(s))
	}
	return ask
}

// revision is the site file with the typed value in it, and the site it makes.
func revision(name, text string, f form.Form) ([]byte, site.Site, error) {
	revised, err := site.Revise([]byte(text), map[string]string{f.Value("key"): f.Value("value")})
	if err != nil {
		return nil, site.Site{}, err
	}
	s, _, err := site.Read(name, revised)
	return revised, s, err
}

// changeSite takes the revised file into the log and then writes it beside the old one.
func (m Model) changeSite(name, text, why string) (Model, tea.Cmd) {
	m, recorded := m.submit("site file changed, findings calculated anew", walk.ChangeSite{Name: name, Text: text, Why: why})
	keep := m.session.KeepSite
	if recorded == nil || keep == nil {
		return m, recorded
	}
	write := func() tea.Msg {
		path, err := keep(text)
		return keptMsg{path, err}
	}
	return m, tea.Sequence(recorded, write)
}
