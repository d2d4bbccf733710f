package desk

import (
	"flag"
	"fmt"
	"os"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"testing"

	"chargehand/commission/finding/findingtest"
	"chargehand/commission/site"
)

var update = flag.Bool("update", false, "rewrite the golden files")

// place is one number of a site file: the key it belongs to and where it stands.
type place struct {
	key        string
	start, end int
}

var (
	header = regexp.MustCompile(`^\[\[?([a-z_.]+)\]\]?`)
	topKey = regexp.MustCompile(`^([a-z_]+)\s*=\s*`)
	inner  = regexp.MustCompile(`([a-z_0-9]+)\s*=\s*("[^"]*"|[0-9.]+)`)
	digits = regexp.MustCompile(`([±+-]?)\s?([0-9]+(?:\.[0-9]+)?)`)
	date   = regexp.MustCompile(`^[0-9]{4}-[0-9]{2}-[0-9]{2}`)
)

// worded are keys whose value is a text, whatever digits it holds.
var worded = []string{".format", "site.", "device.address", "device.map", ".serial", ".name", ".category", ".where"}

// numbers finds every number of a site file: of quantities, their tolerances ("key ±"), and bare; entries of lists are
// numbered from 1.
func numbers(text string) []place {
	var found []place
	table, offset, seen := "", 0, map[string]int{}
	for line := range strings.Lines(text) {
		at := offset
		offset += len(line)
		if m := header.FindStringSubmatch(line); m != nil {
			table = m[1]
			if strings.HasPrefix(line, "[[") {
				seen[table]++
				table = fmt.Sprintf("%s[%d]", table, seen[table])
			}
			continue
		}
		line, _, _ = strings.Cut(line, " #")
		m := topKey.FindStringSubmatchIndex(line)
		if m == nil {
			continue
		}
		key, value := table+"."+line[m[2]:m[3]], line[m[1]:]
		if !strings.ContainsAny(value[:1], "{[") {
			found = append(found, inText(key, value, at+m[1])...)
			continue
		}
		for _, n := range inner.FindAllStringSubmatchIndex(value, -1) {
			name := key
			if value[0] == '[' {
				name = fmt.Sprintf("%s[%d]", key, 1+strings.Count(value[:n[0]], "}"))
			}
			found = append(found, inText(name+"."+value[n[2]:n[3]], value[n[4]:n[5]], at+m[1]+n[4])...)
		}
	}
	return found
}

func inText(key, value string, at int) []place {
	number := strings.TrimPrefix(value, `"`)
	if slices.ContainsFunc(worded, func(w string) bool { return strings.Contains(key, w) }) || date.MatchString(number) || !strings.ContainsAny(number[:1], "-0123456789") {
		return nil
	}
	var found []place
	for k, m := range digits.FindAllStringSubmatchIndex(value, -1) {
		name := key
		if k > 0 {
			name += " ±"
		}
		found = append(found, place{name, at + m[4], at + m[5]})
	}
	return found
}

// unmoved are the numbers that no finding depends on, and why.
var unmoved = map[string]string{
	"source.capacity":             "only the simulated converter drains the source",
	"source.fuse.rating":          "the fuse is judged by its Joule integral, breaking capacity and voltage",
	"source.soc[2].soc":           "full power is reached below the first point of this table",
	"source.soc[2].cell":          "as its state of charge",
	"source.soc[3].soc":           "as the second point",
	"source.soc[3].cell":          "as the second point",
	"source.soc[4].soc":           "as the second point",
	"source.soc[4].cell":          "as the second point",
	"source.soc[5].soc":           "as the second point",
	"source.soc[5].cell":          "as the second point",
	"device.unit_id":              "how to reach the device, not what it is",
	"device.max_age":              "how long a reading is shown",
	"instrument[1].max_voltage":   "which readings the instrument may be used for; the walk asks for it",
	"bus.chopper.off":             "the ladder of limits ends where the chopper starts",
	"bus.chopper.power":           "above load.regeneration, which is all it may have to take",
	"bus.auxiliary.stops_at":      "matters only where the auxiliary supply hiccups, which this site's does not",
	"bus.bleeder[1].power":        "the finding of the discharge asks for its resistance alone",
	"precharge.derating.zero_at":  "no attempt of this site starts hotter than full_to",
	"precharge.overload.multiple": "the pulse figures cover the durations that matter and stand before the overload",
	"precharge.overload.duration": "as the multiple",
	"bypass.carrying_current":     "above the converter's rated current, which is the limit",
	"bypass.voltage":              "no finding of the catalogue asks for it; the papers stage of the walk compares it with the nameplate",
}

// Every number of the example site is changed by itself, a twentieth up, or else down or further; the findings whose JSON changes are
// listed in testdata/moves.golden, which is read like code. A number that moves nothing must have its reason above.
func TestEveryNumberMovesWhatItShould(t *testing.T) {
	original := string(findingtest.Text(t, "wagtail"))
	before := written(t, findingtest.Load(t, "wagtail"))
	var lines []string
	for _, p := range numbers(original) {
		moved, changed := moves(t, original, p, before)
		if !changed {
			t.Errorf("%s: no change of %q reads", p.key, original[p.start:p.end])
			continue
		}
		reason, excused := unmoved[p.key]
		switch {
		case len(moved) == 0 && !excused:
			t.Errorf("%s moves no finding, and no reason is given", p.key)
		case len(moved) > 0 && excused:
			t.Errorf("%s moves %v, and a reason says it moves none: %s", p.key, moved, reason)
		case len(moved) == 0:
			moved = []string{"(none: " + reason + ")"}
		}
		lines = append(lines, p.key+": "+strings.Join(moved, " "))
	}
	got := strings.Join(lines, "\n") + "\n"
	const golden = "testdata/moves.golden"
	if *update {
		if err := os.MkdirAll("testdata", 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(golden, []byte(got), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(golden)
	if err != nil {
		t.Fatal(err)
	}
	if got != string(want) {
		t.Errorf("moves changed: compare with -update\n%s", difference(string(want), got))
	}
	for key := range unmoved {
		if !slices.ContainsFunc(numbers(original), func(p place) bool { return p.key == key }) {
			t.Errorf("unmoved[%q]: the example site has no such number", key)
		}
	}
}

// moves gives the findings that move with one number; changed is false where no changed file reads.
func moves(t *testing.T, original string, p place, before []string) (moved []string, changed bool) {
	t.Helper()
	number := original[p.start:p.end]
	v, err := strconv.ParseFloat(number, 64)
	if err != nil {
		t.Fatalf("%s: %q: %v", p.key, number, err)
	}
	candidates := []string{short(v * 1.05), short(v * 0.95), short(v * 0.9), short(v + 5), short(v * 1.25)} // the last is the next size of a cable
	if bare := original[p.start-1] != '"' && !strings.HasSuffix(p.key, "±"); bare {                         // a count, or the class of a conductor
		candidates = []string{short(v + 1), short(v - 1), "2"}
	}
	for _, c := range candidates {
		s, _, err := site.Read("changed", []byte(original[:p.start]+c+original[p.end:]))
		if err != nil {
			continue
		}
		changed = true
		for _, id := range compare(before, written(t, s)) {
			if !slices.Contains(moved, id) {
				moved = append(moved, id)
			}
		}
		if len(moved) > 0 {
			break
		}
	}
	return moved, changed
}

func short(v float64) string { return strconv.FormatFloat(v, 'f', -1, 64) }

// written is every finding's JSON after its id and subject.
func written(t *testing.T, s site.Site) []string {
	t.Helper()
	var all []string
	for _, f := range Findings(s, tenths{}) {
		text, err := f.MarshalJSON()
		if err != nil {
			t.Fatal(err)
		}
		all = append(all, f.ID+" "+string(text))
	}
	return all
}

func compare(before, after []string) []string {
	var moved []string
	for k := range max(len(before), len(after)) {
		switch {
		case k >= len(before):
			moved = append(moved, "+"+id(after[k]))
		case k >= len(after):
			moved = append(moved, "-"+id(before[k]))
		case before[k] != after[k]:
			moved = append(moved, id(after[k]))
		}
	}
	return moved
}

func id(line string) string {
	id, _, _ := strings.Cut(line, " ")
	return id
}

func difference(want, got string) string {
	old := strings.Split(want, "\n")
	var lines []string
	for line := range strings.Lines(got) {
		if line = strings.TrimSuffix(line, "\n"); !slices.Contains(old, line) {
			lines = append(lines, "+ "+line)
		}
	}
	return strings.Join(lines, "\n")
}
