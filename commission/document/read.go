package document

import (
	"fmt"
	"math"
	"strconv"
	"strings"
	"time"

	"chargehand/commission/quantity"
)

// Table gives the table at a key, or nil.
func (t *Table) Table(key string) *Table {
	e := t.ask(key)
	if e == nil {
		return nil
	}
	if e.value.kind != table {
		t.wrongKind(e, "a table", "{ … }")
		return nil
	}
	e.value.table.named(t.name, key)
	return e.value.table
}

// Tables gives the tables of a list: those under [[key]] headers, or inline in brackets.
func (t *Table) Tables(key string) []*Table {
	e := t.ask(key)
	if e == nil {
		return nil
	}
	if e.value.kind != tables && e.value.kind != list {
		t.wrongKind(e, "a list of tables", "[ { … }, { … } ]")
		return nil
	}
	var all []*Table
	for _, item := range e.value.items {
		if item.kind != table {
			if item.kind != invalid {
				t.file.problem(item.at, t.file.describe(item), "a table in the list", key+" = [ { … }, { … } ]")
			}
			continue
		}
		item.table.named(t.name, key)
		all = append(all, item.table)
	}
	return all
}

// named gives an inline table the name that messages use.
func (t *Table) named(outer, key string) {
	if t.name == "" || t.defined == dotted {
		t.name = key
		if outer != "" {
			t.name = outer + "." + key
		}
	}
}

// Text reads a text that is not empty.
func (t *Table) Text(key string, into *string, example string) {
	e := t.ask(key)
	switch {
	case e == nil:
	case e.value.kind != text:
		t.wrongKind(e, "text in quotes", quote(example))
	case strings.TrimSpace(e.value.text) != e.value.text || e.value.text == "":
		t.Refuse(key, "text that is not empty, without space before or after", key+" = "+quote(example))
	default:
		*into = e.value.text
	}
}

// Choice reads a text that is one of a few.
func Choice[S ~string](t *Table, key string, into *S, options ...S) {
	e := t.ask(key)
	if e == nil {
		return
	}
	if e.value.kind == text {
		for _, o := range options {
			if string(o) == e.value.text {
				*into = o
				return
			}
		}
	}
	names := make([]string, len(options))
	for i, o := range options {
		names[i] = string(o)
	}
	example := names[0]
	if near := Nearest(e.value.text, names); near != "" {
		example = near
	}
	wanted := "one of " + strings.Join(names, ", ")
	if len(names) == 1 {
		wanted = names[0]
	}
	t.wrongKind(e, wanted, quote(example))
}

// Bool reads true or false.
func (t *Table) Bool(key string, into *bool) {
	e := t.ask(key)
	switch {
	case e == nil:
	case e.value.kind != boolean:
		t.wrongKind(e, "true or false, without quotes", "true")
	default:
		*into = string(t.file.text[e.value.at:e.value.end]) == "true"
	}
}

// Whole reads a whole number from least to most.
func (t *Table) Whole(key string, into *int, least, most int) {
	e := t.ask(key)
	if e == nil {
		return
	}
	v, err := strconv.ParseInt(t.number(e, integer), 0, 64)
	if err != nil || v < int64(least) || v > int64(most) {
		t.wrongKind(e, fmt.Sprintf("a whole number from %d to %d, without quotes", least, most), t.wholeExample(e, least, most))
		return
	}
	*into = int(v)
}

// wholeExample is the number that was probably meant, "3" or 3.0, or the least.
func (t *Table) wholeExample(e *entry, least, most int) string {
	meant := e.value.text
	if e.value.kind == float {
		meant = strings.TrimSuffix(string(t.file.text[e.value.at:e.value.end]), ".0")
	}
	if n, err := strconv.Atoi(meant); err == nil && n >= least && n <= most {
		return strconv.Itoa(n)
	}
	return strconv.Itoa(least)
}

// Number reads a finite number without unit.
func (t *Table) Number(key string, into *float64) {
	e := t.ask(key)
	if e == nil {
		return
	}
	v, ok := t.finite(e.value)
	if !ok {
		t.wrongKind(e, "a finite number without unit and quotes", "0.1")
		return
	}
	*into = v
}

// Numbers reads a list of exactly count finite numbers; nil where there is none or it is refused.
func (t *Table) Numbers(key string, count int, example string) []float64 {
	e := t.ask(key)
	if e == nil {
		return nil
	}
	var all []float64
	if e.value.kind == list {
		for _, item := range e.value.items {
			if v, ok := t.finite(item); ok {
				all = append(all, v)
			}
		}
	}
	if len(all) != count || len(e.value.items) != count {
		t.wrongKind(e, fmt.Sprintf("a list of %d numbers", count), example)
		return nil
	}
	return all
}

// Texts reads one text or a list of them.
func (t *Table) Texts(key, example string) []string {
	e := t.ask(key)
	if e == nil {
		return nil
	}
	if e.value.kind == text {
		return []string{e.value.text}
	}
	var all []string
	for _, item := range e.value.items {
		if item.kind == text {
			all = append(all, item.text)
		}
	}
	if e.value.kind != list || len(all) == 0 || len(all) != len(e.value.items) {
		t.wrongKind(e, "text in quotes, or a list of it", example)
		return nil
	}
	return all
}

// Keys are the keys of the table in the order of the file, all taken as known; for a table whose keys are data.
func (t *Table) Keys() []string {
	if t == nil {
		return nil
	}
	var all []string
	for _, e := range t.entries {
		e.asked = true
		all = append(all, e.key)
	}
	return all
}

// number is the source of a number of the wanted kind, or "" where it is another kind or has underscores.
func (t *Table) number(e *entry, wanted kind) string {
	s := string(t.file.text[e.value.at:e.value.end])
	if e.value.kind != wanted || strings.Contains(s, "_") {
		return ""
	}
	return s
}

func (t *Table) finite(v *value) (float64, bool) {
	s := string(t.file.text[v.at:v.end])
	if v.kind != integer && v.kind != float || strings.Contains(s, "_") {
		return 0, false
	}
	if v.kind == integer {
		n, err := strconv.ParseInt(s, 0, 64)
		return float64(n), err == nil
	}
	n, err := strconv.ParseFloat(s, 64)
	return n, err == nil && !math.IsNaN(n) && !math.IsInf(n, 0)
}

// Date reads a date, at midnight UTC.
func (t *Table) Date(key string, into *time.Time) {
	e := t.ask(key)
	if e == nil {
		return
	}
	if e.value.kind == date {
		*into, _ = time.Parse(time.DateOnly, string(t.file.text[e.value.at:e.value.end])) // checked when it was parsed
		return
	}
	t.wrongKind(e, "a date as year-month-day, without quotes", "2026-03-01")
}

// Quantity reads a value with its unit, and warns of an implausible size.
func Quantity[Q quantity.Scalar](t *Table, key string, into *quantity.Entered[Q], rule quantity.Rule) {
	typed(t, key, into, func(s string) (quantity.Entered[Q], *quantity.Refusal) { return quantity.Parse[Q](s, rule) })
	if doubt := quantity.Doubt(*into, rule); doubt != "" {
		t.Warn(key, doubt)
	}
}

// ErrorBound reads an error in volts or per cent.
func (t *Table) ErrorBound(key string, into *quantity.ErrorBound) {
	typed(t, key, into, quantity.ParseErrorBound)
}

// Droop reads a droop in per cent or volts per ampere.
func (t *Table) Droop(key string, into *quantity.DroopSetting) {
	typed(t, key, into, quantity.ParseDroop)
}

// typed reads the text of a quantity, or reports why it is none. A bare number is told the unit that it lacks.
func typed[E any](t *Table, key string, into *E, parse func(string) (E, *quantity.Refusal)) {
	e := t.ask(key)
	if e == nil || e.value.kind == invalid {
		return
	}
	read := t.file.describe(e.value)
	if e.value.kind == text {
		entered, r := parse(e.value.text)
		if r == nil {
			*into = entered
			return
		}
		t.file.problem(e.value.at, r.Read, r.Wanted, key+" = "+quote(r.Example))
		return
	}
	bare := ""
	if e.value.kind == integer || e.value.kind == float {
		bare = read
	}
	if _, r := parse(bare); r != nil {
		t.file.problem(e.value.at, read, "a value with its unit, in quotes", key+" = "+quote(r.Example))
	}
}

// IsText tells whether the key has a text for its value.
func (t *Table) IsText(key string) bool {
	e := t.find(key)
	return e != nil && e.value.kind == text
}
