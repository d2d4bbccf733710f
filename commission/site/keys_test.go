package site

import (
	"reflect"
	"regexp"
	"slices"
	"strings"
	"testing"
)

// quantities finds every value with a unit in wagtail's file: key, number, and the unit with what follows.
var quantities = regexp.MustCompile(`([a-z_0-9]+)(\s*= ")(-?[0-9]+(?:\.[0-9]+)?)( (?:[µmkM]?[VAΩFHWJs]|Ah|A²s|mm²|°C|K/W|kHz|%|m|nH|µs|kA)(?: ±[0-9]+ %)?)"`)

// Every value of the file ends up in the Site: with another number the Site is another one.
func TestEveryQuantityIsKept(t *testing.T) {
	wagtail := load(t, "wagtail.site.toml")
	plain := readFile(t, "wagtail.site.toml")
	all := quantities.FindAllStringSubmatchIndex(wagtail, -1)
	if len(all) != 108 { // 109 quoted values begin with a digit, and one of them is the address
		t.Errorf("wagtail's file has %d values with a unit, want 108", len(all))
	}
	for _, m := range all {
		number := wagtail[m[6]:m[7]]
		more := number + ".001"
		if strings.Contains(number, ".") {
			more = number + "01"
		}
		if number == "100" && strings.HasPrefix(wagtail[m[8]:], " %") {
			more = "99.9" // a state of charge
		}
		if strings.HasPrefix(wagtail[m[8]:], " mm²") {
			more = "95" // the next size of the standard
		}
		text := wagtail[:m[6]] + more + wagtail[m[7]:]
		s, _, err := Read("x", []byte(text))
		if err != nil {
			t.Errorf("%s changed to %s: %v", wagtail[m[0]:m[1]], more, err)
			continue
		}
		if reflect.DeepEqual(s, plain) {
			t.Errorf("%s changed to %s leaves the Site as it was", wagtail[m[0]:m[1]], more)
		}
	}
}

// A tolerance stands only on the value of a part that one can hold in the hand; elsewhere it would be lost without a word.
func TestWhichKeysTakeATolerance(t *testing.T) {
	wagtail := load(t, "wagtail.site.toml")
	var got []string
	for _, m := range quantities.FindAllStringSubmatchIndex(wagtail, -1) {
		unit := strings.Fields(wagtail[m[8]:m[9]])[0]
		tolerance := " ±1 %"
		switch unit {
		case "%":
			tolerance = " ±0.1 points"
		case "°C":
			tolerance = " ±1 K"
		}
		text := wagtail[:m[8]] + " " + unit + tolerance + wagtail[m[9]:]
		if _, _, err := Read("x", []byte(text)); err == nil {
			got = append(got, wagtail[m[2]:m[3]])
		}
	}
	slices.Sort(got)
	got = slices.Compact(got)
	want := []string{"capacitance", "choke", "choke_resistance", "esl", "esr", "inductance", "internal_resistance", "resistance", "value"}
	if !slices.Equal(got, want) {
		t.Errorf("keys that take a tolerance = %v, want %v", got, want)
	}
	if _, _, err := Read("x", []byte(strings.Replace(wagtail, `"0.22 K/W"`, `"0.22 K/W ±5 %"`, 1))); err == nil {
		t.Error("the thermal resistance takes a tolerance, want it refused")
	}
}
