package desk

import (
	"fmt"
	"math"
	"regexp"
	"slices"
	"strings"
	"testing"

	"chargehand/commission/finding"
	"chargehand/commission/finding/findingtest"
	"chargehand/commission/site"
)

// sound checks what holds for the findings of any site, however little it says or however wild its numbers.
func sound(t *testing.T, what string, s site.Site) {
	t.Helper()
	all := Findings(s, tenths{})
	var ids []string
	for _, f := range all {
		if !slices.Contains(ids, f.ID) {
			ids = append(ids, f.ID)
		}
		name := what + ": " + f.ID + " " + f.Subject
		switch {
		case f.Title == "" || f.Unit == "" || f.Basis == "" || f.State == "":
			t.Errorf("%s: title %q, unit %q, basis %q, state %q, want them all", name, f.Title, f.Unit, f.Basis, f.State)
		case f.Verdict == finding.Undecided && (len(f.Because) == 0 || f.State != finding.None):
			t.Errorf("%s: undecided, state %s, because %v, want none and the keys", name, f.State, f.Because)
		case f.State == finding.None && !math.IsNaN(f.Value.Nominal):
			t.Errorf("%s: state none with value %v", name, f.Value)
		case f.State == finding.Finite && math.IsNaN(f.Value.Nominal):
			t.Errorf("%s: state finite with value %v", name, f.Value)
		case f.Value.Low > f.Value.High || f.ID != "window.duty" && !ordered(f.Value):
			t.Errorf("%s: value %v out of order", name, f.Value)
		case f.Limit.IsGiven() == (f.Verdict == finding.Info) && f.Limit.IsGiven():
			t.Errorf("%s: info with a limit", name)
		}
		if f.Explanation != nil && f.State == finding.Finite && !loses(f.ID) {
			if err := findingtest.Redo(f.Explanation, f.Value.Nominal); err != nil {
				t.Errorf("%s: Redo = %v", name, err)
			}
		}
		if _, err := f.MarshalJSON(); err != nil {
			t.Errorf("%s: MarshalJSON = %v", name, err)
		}
	}
	if !slices.Equal(ids, IDs) {
		t.Errorf("%s: ids = %v, want those of the catalogue in its order", what, ids)
	}
}

// loses tells of findings whose printed formula takes differences that wild numbers cancel, or clamps at 0: they are redone
// for the sites themselves.
func loses(id string) bool {
	return strings.HasPrefix(id, "precharge.") || strings.HasPrefix(id, "closing.")
}

// ordered allows for rounding. The nominal of window.duty is another formula than its ends.
func ordered(v finding.Value) bool {
	slack := 1e-9*math.Max(math.Abs(v.Low), math.Abs(v.High)) + 1e-12
	return !(v.Nominal > v.High+slack) && !(v.Nominal < v.Low-slack)
}

const minimal = `format = "chargehand-site/1"
[site]
name = "x"
[source]
kind = "battery"
max_voltage = "800 V"
min_voltage = "600 V"
internal_resistance = "50 mΩ"
[bus]
nominal = "1000 V"
[[bus.capacitance]]
name = "c"
value = "5 mF"
[precharge]
resistance = "100 Ω"
closing_difference = "25 V"
`

func TestMinimalSite(t *testing.T) {
	s, _, err := site.Read("minimal", []byte(minimal))
	if err != nil {
		t.Fatal(err)
	}
	sound(t, "minimal", s)
	sheet := Check(s, nil)
	if sheet.Verdict != finding.Undecided && sheet.Verdict != finding.Fail {
		t.Errorf("Check(minimal).Verdict = %s, want undecided or fail", sheet.Verdict)
	}
	for id, key := range map[string]string{"window.source-high": "source.measurement_error", "window.bus-low": "infeed", "window.margin": "bus.wanted_margin", "window.current": "converter.rated_power",
		"window.choke-peak": "converter.choke_saturation", "ripple.phase": "converter.choke", "ripple.source": "source.max_ripple_current", "droop.advice": "infeed", "droop.share": "load.share_tolerance",
		"droop.instrument": "instrument.accuracy", "cable.drop": "infeed", "bus.insulation-monitor": "bus.earthing", "droop.stability": "load.power"} {
		for _, f := range sheet.Find(id) {
			if f.Verdict != finding.Undecided || !slices.Contains(f.Because, key) {
				t.Errorf("Check(minimal) %s = %s because %v, want undecided naming %s", id, f.Verdict, f.Because, key)
			}
		}
	}
	if f := sheet.Find("ripple.resonance")[0]; f.Verdict != finding.Info || f.State != finding.None {
		t.Errorf("Check(minimal) ripple.resonance = %s, %s, want info without a value: no filter is a fact", f.Verdict, f.State)
	}
}

// Every key and every table of the three sites is taken away by itself, as far as the reader allows, and every kind of
// source is tried.
func TestAnythingMayBeAbsent(t *testing.T) {
	t.Parallel()
	tried := 0
	for _, name := range findingtest.Sites {
		original := string(findingtest.Text(t, name))
		s := findingtest.Load(t, name)
		for _, kind := range []site.SourceKind{site.Battery, site.Supercapacitor, site.FuelCell, site.OtherSource} {
			of := findingtest.Clone(s)
			of.Source.Kind, of.Source.BlockingDiode = kind, kind == site.FuelCell
			sound(t, name+" as "+string(kind), of)
		}
		for what, shorter := range without(original) {
			if s, _, err := site.Read(name, []byte(shorter)); err == nil {
				sound(t, name+" without "+what, s)
				tried++
			}
		}
	}
	if tried < 200 {
		t.Errorf("absences tried = %d, want at least 200", tried)
	}
}

// without gives the file with one line, one entry of an inline table or one whole table less, under what is missing.
func without(original string) map[string]string {
	shorter := map[string]string{}
	lines := strings.SplitAfter(original, "\n")
	for k, line := range lines {
		if strings.TrimSpace(line) == "" {
			continue
		}
		end := k + 1
		if strings.HasPrefix(line, "[") {
			for end < len(lines) && !strings.HasPrefix(lines[end], "[") {
				end++
			}
		}
		name := fmt.Sprintf("line %d, %s", k+1, strings.TrimSpace(line))
		shorter[name] = strings.Join(slices.Concat(lines[:k], lines[end:]), "")
		for _, m := range entry.FindAllStringIndex(line, -1) {
			shorter[name+", "+line[m[0]:m[1]]] = strings.Join(slices.Concat(lines[:k], []string{line[:m[0]], line[m[1]:]}, lines[k+1:]), "")
		}
	}
	return shorter
}

// entry is one entry of an inline table, with the comma after or before it.
var entry = regexp.MustCompile(`[a-z_]+ = ("[^"]*"|[0-9.]+), |, [a-z_]+ = ("[^"]*"|[0-9.]+)`)

// Sizes that no plant has: every number of a site by itself far larger, far smaller, and 0, as far as the reader allows.
func TestWildNumbersStaySound(t *testing.T) {
	t.Parallel()
	tried := 0
	for _, name := range findingtest.Sites[:2] {
		original := string(findingtest.Text(t, name))
		for _, p := range numbers(original) {
			for _, wild := range []string{"0", "0.000001", "1000000000"} {
				if s, _, err := site.Read(name, []byte(original[:p.start]+wild+original[p.end:])); err == nil {
					sound(t, fmt.Sprintf("%s with %s %s", name, p.key, wild), s)
					tried++
				}
			}
		}
	}
	if tried < 300 {
		t.Errorf("wild numbers tried = %d, want at least 300", tried)
	}
}
