package oneline

import (
	"fmt"
	"os"
	"os/exec"
	"regexp"
	"strings"
	"testing"
	"time"

	"pgregory.net/rapid"

	"chargehand/commission/quantity"
	"chargehand/commission/signal"
	"chargehand/commission/site"
	"chargehand/tui/golden"
	"chargehand/tui/theme"
)

func entered[Q quantity.Scalar](v Q, text string) quantity.Entered[Q] {
	return quantity.Entered[Q]{Spread: quantity.Exactly(v), Text: text}
}

// wagtail is a battery site with everything a diagram can hold.
func wagtail() site.Site {
	return site.Site{
		Source:    site.Source{Kind: site.Battery, Fuse: &site.Fuse{Rating: entered[quantity.Current](500, "500 A")}},
		Precharge: site.Precharge{Resistance: entered[quantity.Resistance](100, "100 Ω ±5 %")},
		Converter: &site.Converter{
			Phases: 3, Choke: entered[quantity.Inductance](0.42e-3, "0.42 mH ±10 %"), RatedCurrent: entered[quantity.Current](400, "400 A"),
			Filter: &site.Filter{Capacitance: entered[quantity.Capacitance](0.8e-3, "0.8 mF ±10 %"), Position: site.AtStar},
		},
		Bus: site.Bus{
			Capacitances: []site.Bank{
				{Name: "DC/DC converter", Value: entered[quantity.Capacitance](5.6e-3, "5.6 mF ±20 %")},
				{Name: "port propulsion drive", Value: entered[quantity.Capacitance](3.9e-3, "3.9 mF ±20 %")},
				{Name: "hotel supply", Value: entered[quantity.Capacitance](2.2e-3, "2.2 mF ±20 %"), Isolated: true},
			},
			Bleeders:  []site.Bleeder{{Name: "discharge resistor", Value: entered[quantity.Resistance](22e3, "22 kΩ ±5 %")}},
			Chopper:   &site.Chopper{Power: entered[quantity.Power](150e3, "150 kW")},
			Auxiliary: &site.Auxiliary{Power: entered[quantity.Power](40, "40 W")},
		},
		Infeeds: []site.Infeed{{Name: "aft string"}, {Name: "shore rectifier", RatedCurrent: entered[quantity.Current](250, "250 A")}},
	}
}

// nightjar is a supercapacitor site without filter, chopper and bleeder, its units typed in ASCII.
func nightjar() site.Site {
	return site.Site{
		Source:    site.Source{Kind: site.Supercapacitor, Fuse: &site.Fuse{Rating: entered[quantity.Current](500, "500 A")}},
		Precharge: site.Precharge{Resistance: entered[quantity.Resistance](47, "47 ohm +-5 %")},
		Converter: &site.Converter{Phases: 3, Choke: entered[quantity.Inductance](0.25e-3, "0.25 mH +-12 %")},
		Bus: site.Bus{Capacitances: []site.Bank{
			{Name: "hoist inverter", Value: entered[quantity.Capacitance](7.5e-3, "7.5 mF -10/+30 %")},
			{Name: "buffer converter", Value: entered[quantity.Capacitance](4.7e-3, "4700 uF +-20 %")},
		}},
		Infeeds: []site.Infeed{{Name: "buffer"}, {Name: "grid rectifier", RatedCurrent: entered[quantity.Current](260, "260 A")}},
	}
}

// fuelCell has two phases, a blocking diode, its filter at the source and no fuse stated.
func fuelCell() site.Site {
	s := wagtail()
	s.Source = site.Source{Kind: site.FuelCell, BlockingDiode: true}
	s.Converter.Phases, s.Converter.Filter.Position = 2, site.AtSource
	return s
}

const maxAge = 500 * time.Millisecond

var now = time.Date(2026, 12, 1, 14, 2, 11, 0, time.UTC)

type readings = map[signal.Name]signal.Reading

func at(age time.Duration, values map[signal.Name]float64) readings {
	live := readings{}
	for name, v := range values {
		live[name] = signal.Reading{Name: name, Value: v, At: now.Add(-age), Quality: signal.Good}
	}
	return live
}

func charging() readings {
	return at(12*time.Millisecond, map[signal.Name]float64{
		signal.SourceVoltage: 812.4, signal.StarPointVoltage: 498.2, signal.SourceCurrent: 3.14, signal.BusVoltage: 497.6,
		signal.BusCurrent: 3.1, signal.Power: 1545, signal.MainClosed: 1, signal.PrechargeClosed: 1, signal.BypassClosed: 0,
		signal.ResistorTemperature: 39.2, signal.HeatsinkTemperature: 31, signal.InsulationResistance: 2.1e6,
		signal.PhaseCurrent1: 1.05, signal.PhaseCurrent2: 1.02, signal.PhaseCurrent3: 1.07, signal.ChopperActive: 0,
		signal.Ready: 1, signal.Running: 0, signal.Mode: 0,
	})
}

// faulty is a converter that runs into the source, with a fault and a lost bus voltage.
func faulty() readings {
	live := at(20*time.Millisecond, map[signal.Name]float64{
		signal.SourceVoltage: 655.1, signal.SourceCurrent: -212.4, signal.MainClosed: 1, signal.BypassClosed: 1,
		signal.Running: 1, signal.Mode: 1, signal.Fault: 1, signal.FaultCode: 17, signal.ChopperActive: 1,
	})
	for name, r := range at(12*time.Second, map[signal.Name]float64{signal.BusVoltage: 1033.7, signal.PrechargeClosed: 0}) {
		live[name] = r
	}
	return live
}

var unproved = map[signal.Name]bool{signal.StarPointVoltage: true, signal.PhaseCurrent2: true}

func TestGolden(t *testing.T) {
	scenes := map[string]struct {
		site site.Site
		live readings
	}{"charging": {wagtail(), charging()}, "faulty": {nightjar(), faulty()}, "fuel-cell": {fuelCell(), charging()}}
	for name, s := range scenes {
		for _, size := range [][2]int{{80, 7}, {100, 9}, {140, 14}} {
			file := fmt.Sprintf("%s-%d", name, size[0])
			draw := func(o theme.Options) string {
				return View(NewPlan(s.site), s.live, unproved, now, maxAge, theme.New(o), size[0], size[1])
			}
			golden.Compare(t, file, draw(theme.Options{}))
			golden.Compare(t, file+"-colour", draw(theme.Options{Colour: true, Dark: true}))
			golden.Compare(t, file+"-ascii", draw(theme.Options{ASCII: true}))
		}
	}
}

// In a country where some libraries count drawing characters double the picture must be the same.
func TestGoldenUnderAnotherLocale(t *testing.T) {
	test := exec.Command(os.Args[0], "-test.run=^TestGolden$")
	test.Env = append(os.Environ(), "LC_ALL=ja_JP.UTF-8", "LANG=ja_JP.UTF-8")
	if out, err := test.CombinedOutput(); err != nil {
		t.Errorf("golden test under LC_ALL=ja_JP.UTF-8: %v\n%s", err, out)
	}
}

func draw(live readings, width, height int) string {
	return View(NewPlan(wagtail()), live, nil, now, maxAge, theme.Theme{}, width, height)
}

var sizes = [][2]int{{60, 7}, {80, 7}, {140, 14}}

func TestHeights(t *testing.T) {
	for _, c := range []struct{ width, height, want int }{
		{80, 24, 7}, {80, 7, 7}, {100, 30, 7}, {140, 40, 13}, {140, 12, 12}, {140, 11, 7}, {139, 40, 7}, {80, 5, 5}, {20, 3, 3}, {80, 0, 0}, {0, -1, 0},
	} {
		got := Height(c.width, c.height)
		view := draw(charging(), c.width, c.height)
		if got != c.want || c.width > 0 && c.height > 0 && strings.Count(view, "\n")+1 != c.want {
			t.Errorf("Height(%d, %d) = %d, want %d, drawn\n%s", c.width, c.height, got, c.want, view)
		}
	}
}

// The three positions of a contact look different, and so does one whose state is too old.
func TestContactShapes(t *testing.T) {
	for _, name := range []signal.Name{signal.MainClosed, signal.PrechargeClosed, signal.BypassClosed} {
		for _, size := range sizes {
			for _, ascii := range []bool{false, true} {
				seen := map[string]string{}
				for state, change := range map[string]func(*signal.Reading){
					"open":   func(r *signal.Reading) { r.Value = 0 },
					"closed": func(r *signal.Reading) { r.Value = 1 },
					"old":    func(r *signal.Reading) { r.Value, r.At = 1, now.Add(-time.Hour) },
				} {
					live := charging()
					r := live[name]
					change(&r)
					live[name] = r
					view := View(NewPlan(wagtail()), live, nil, now, maxAge, theme.New(theme.Options{ASCII: ascii}), size[0], size[1])
					// Without the words only the shapes are left to tell the states apart.
					shape := regexp.MustCompile(`open|closed|unknown`).ReplaceAllString(view, "-")
					if other, ok := seen[shape]; ok && size[0] >= CompactWidth {
						t.Errorf("%s %s looks like %s at %v:\n%s", name, state, other, size, view)
					}
					seen[shape] = state
				}
			}
		}
	}
}

// Whatever was read too long ago, no digit of it is left on the screen, in any drawing, and neither is the difference
// that was calculated from it.
func TestOldReadingsAreWithdrawn(t *testing.T) {
	for _, size := range sizes {
		live := charging()
		for name, r := range live {
			r.At = now.Add(-maxAge - 3*time.Second)
			live[name] = r
		}
		view := draw(live, size[0], size[1])
		for _, number := range []string{"812.4", "498.2", "497.6", "314.2", "3.1", "1.5", "39.2", "31.0", "2.1", "1.0", "closed", "open", "ready", "to bus"} {
			if strings.Contains(view, number) {
				t.Errorf("View at %v with old readings still shows %s:\n%s", size, number, view)
			}
		}
		for _, word := range []string{"no value", "3.5 s", "unknown"} {
			if !strings.Contains(view, word) {
				t.Errorf("View at %v with old readings does not say %q:\n%s", size, word, view)
			}
		}
	}
}

func TestReadingsStandWithTheirUnits(t *testing.T) {
	for _, size := range sizes[1:] {
		view := draw(charging(), size[0], size[1])
		for _, want := range []string{"812.4 V", "498.2 V", "497.6 V", "+3.1 A", "+1.54 kW", "39.2 °C", "2.10 MΩ", "difference 314.2 V", "fuse 500 A", "100 Ω", "0.8 mF"} {
			if !strings.Contains(view, want) {
				t.Errorf("View at %v lacks %q:\n%s", size, want, view)
			}
		}
	}
}

func TestUnprovedIsMarked(t *testing.T) {
	for _, size := range sizes[1:] {
		view := View(NewPlan(wagtail()), charging(), map[signal.Name]bool{signal.SourceVoltage: true, signal.BypassClosed: true}, now, maxAge, theme.Theme{}, size[0], size[1])
		for _, want := range []string{"812.4 V?", "open?", "314.2 V?", "? not yet proved"} {
			if !strings.Contains(view, want) {
				t.Errorf("View at %v lacks %q:\n%s", size, want, view)
			}
		}
		if strings.Contains(view, "497.6 V?") {
			t.Errorf("View at %v marks the proved bus voltage:\n%s", size, view)
		}
	}
}

func TestFlow(t *testing.T) {
	for _, c := range []struct {
		current     float64
		arrow, want string
	}{{120, "▸", "to bus"}, {-120, "◂", "to source"}, {0.4, "∙", "no flow"}} {
		live := at(0, map[signal.Name]float64{signal.SourceCurrent: c.current})
		for _, size := range sizes[1:] {
			if view := draw(live, size[0], size[1]); !strings.Contains(view, c.arrow+" "+c.want) {
				t.Errorf("View at %v with %v A lacks %q:\n%s", size, c.current, c.arrow+" "+c.want, view)
			}
		}
	}
	// Without a source current the bus current and then the power tell the direction.
	for _, name := range []signal.Name{signal.BusCurrent, signal.Power} {
		i := instant{live: at(0, map[signal.Name]float64{name: -50e3}), now: now, maxAge: maxAge}
		if _, words, _ := i.flow(NewPlan(wagtail())); words != "to source" {
			t.Errorf("flow(%s = -50000) = %q, want to source", name, words)
		}
	}
}

func TestFaultIsSeen(t *testing.T) {
	for _, size := range sizes {
		if view := draw(faulty(), size[0], size[1]); !strings.Contains(view, "FAULT 17") {
			t.Errorf("View at %v lacks the fault:\n%s", size, view)
		}
	}
}

// A chopper that burns power is never hidden behind "and 3 more".
func TestWorkingChopperIsSeen(t *testing.T) {
	live := charging()
	live[signal.ChopperActive] = signal.Reading{Value: 1, At: now, Quality: signal.Good}
	for _, size := range sizes[1:] {
		if view := draw(live, size[0], size[1]); !strings.Contains(view, "chopper ON") {
			t.Errorf("View at %v lacks the working chopper:\n%s", size, view)
		}
	}
}

func TestRated(t *testing.T) {
	for in, want := range map[string]string{
		"100 Ω ±5 %": "100 Ω", "24 mohm +-20 %": "24 mΩ", "4700 uF +-20 %": "4700 µF", "7.5 mF -10/+30 %": "7.5 mF",
		"1e-3 F": "1e-3 F", "-5 A": "-5 A", "14 F −10/+20 %": "14 F", "\x1b[1m": "^[[1m", "": "",
	} {
		if got := rated(quantity.Entered[quantity.Resistance]{Text: in}, "Ω"); got != want {
			t.Errorf("rated(%q) = %q, want %q", in, got, want)
		}
	}
}

func TestASCIIFormIsASCII(t *testing.T) {
	for _, size := range sizes {
		for _, s := range []site.Site{wagtail(), nightjar(), fuelCell()} {
			for _, live := range []readings{charging(), faulty(), nil} {
				view := View(NewPlan(s), live, unproved, now, maxAge, theme.New(theme.Options{ASCII: true}), size[0], size[1])
				if i := strings.IndexFunc(view, func(r rune) bool { return r > '~' }); i >= 0 {
					t.Errorf("View under ASCII holds %q:\n%s", []rune(view[i:])[0], view)
				}
			}
		}
	}
}

// Any site with any names and any readings gives exactly the size, and nothing in it steers the terminal.
func TestAnySizeAndSite(t *testing.T) {
	text := rapid.OneOf(rapid.String(), rapid.SampledFrom([]string{"\x1b[2J", "電池システム一号", "a\u0301\u0301\u0301\u0301", "\u202e\u200b"}))
	rapid.Check(t, func(t *rapid.T) {
		width, height := rapid.IntRange(-1, 220).Draw(t, "width"), rapid.IntRange(-1, 20).Draw(t, "height")
		s := wagtail()
		s.Source.Kind = rapid.SampledFrom([]site.SourceKind{"", site.Battery, site.Supercapacitor, site.FuelCell, site.OtherSource, "\x1b"}).Draw(t, "kind")
		s.Source.BlockingDiode = rapid.Bool().Draw(t, "diode")
		s.Precharge.Resistance.Text, s.Source.Fuse.Rating.Text = text.Draw(t, "resistor"), text.Draw(t, "fuse")
		s.Converter.Phases = rapid.IntRange(0, 12).Draw(t, "phases")
		s.Converter.Choke.Text, s.Converter.Filter.Capacitance.Text = text.Draw(t, "choke"), text.Draw(t, "filter")
		for i := range s.Bus.Capacitances {
			s.Bus.Capacitances[i].Name = text.Draw(t, "bank")
		}
		if rapid.Bool().Draw(t, "bare") {
			s = site.Site{}
		}
		live := readings{}
		for _, name := range signal.Names {
			live[name] = signal.Reading{Name: name, Value: rapid.Float64().Draw(t, "value"), At: now.Add(-time.Duration(rapid.Int64Range(-1e9, 1e12).Draw(t, "age"))),
				Quality: rapid.SampledFrom([]signal.Quality{signal.Good, signal.Bad, signal.Never, "?"}).Draw(t, "quality")}
		}
		view := View(NewPlan(s), live, unproved, now, maxAge, theme.Theme{}, width, height)
		if rows := Height(width, height); rows > 0 && strings.Count(view, "\n")+1 != rows {
			t.Fatalf("View at %dx%d has %d rows, want %d", width, height, strings.Count(view, "\n")+1, rows)
		}
		for _, row := range strings.Split(view, "\n") {
			if w := theme.Width(row); view != "" && w != max(width, 0) {
				t.Fatalf("View at %dx%d has a row of %d columns: %q", width, height, w, row)
			}
			if strings.ContainsAny(row, "\x1b\a\u202e\u009b") {
				t.Fatalf("View holds an escape sequence: %q", row)
			}
		}
	})
}

func BenchmarkView140(b *testing.B) {
	plan, live, th := NewPlan(wagtail()), charging(), theme.New(theme.Options{Colour: true, Dark: true})
	for b.Loop() {
		View(plan, live, unproved, now, maxAge, th, 140, 40)
	}
}
