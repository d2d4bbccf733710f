package siteform

import (
	"fmt"
	"regexp"
	"strings"

	"chargehand/commission/site"
)

// section is one table of the file with its values.
type section struct {
	name   string // "source", "infeed 2"
	fields []field
}

// field is one value: where it stands, what it is called, and what the file's comment says of it.
type field struct {
	path, label, says string
}

var (
	tableLine = regexp.MustCompile(`^\[\[?([a-z_.]+)\]?\]`)
	keyLine   = regexp.MustCompile(`^([a-z_0-9]+)\s*=\s*(.*)$`)
	innerKey  = regexp.MustCompile(`([a-z_0-9]+)\s*=\s*`)
)

// sections finds the values of a file that reads, in the file's order. Lists of values are left to an editor.
func sections(text string) []section {
	var all []section
	counts := map[string]int{}
	path := ""
	for _, line := range strings.Split(text, "\n") {
		line = strings.TrimSpace(line)
		if m := tableLine.FindStringSubmatch(line); m != nil {
			name := m[1]
			path = name
			if strings.HasPrefix(line, "[[") {
				path = fmt.Sprintf("%s.%d", name, counts[name])
				counts[name]++
				name = fmt.Sprintf("%s %d", name, counts[name])
			}
			all = append(all, section{name: name})
			continue
		}
		m := keyLine.FindStringSubmatch(line)
		if m == nil || len(all) == 0 {
			continue
		}
		last := &all[len(all)-1]
		value, comment := apart(m[2])
		last.fields = append(last.fields, fieldsOf(text, path+"."+m[1], m[1], value, comment)...)
	}
	return all
}

// fieldsOf are the values of one line: itself, or those of a table in braces.
func fieldsOf(text, path, label, value, says string) []field {
	if !strings.HasPrefix(value, "{") {
		if _, ok := site.Value([]byte(text), path); !ok {
			return nil
		}
		return []field{{path, words(label), says}}
	}
	var inner []field
	for _, m := range innerKey.FindAllStringSubmatch(unquoted(value), -1) {
		if _, ok := site.Value([]byte(text), path+"."+m[1]); ok {
			inner = append(inner, field{path + "." + m[1], words(label) + ": " + words(m[1]), says})
		}
	}
	return inner
}

func words(key string) string { return strings.ReplaceAll(key, "_", " ") }

// apart parts a value from the comment behind it; a number sign inside quotes begins none.
func apart(line string) (value, comment string) {
	quoted := false
	for i, r := range line {
		switch {
		case r == '"':
			quoted = !quoted
		case r == '#' && !quoted:
			return strings.TrimSpace(line[:i]), strings.TrimSpace(line[i+1:])
		}
	}
	return strings.TrimSpace(line), ""
}

// unquoted blanks what stands in quotes.
func unquoted(value string) string {
	var b strings.Builder
	quoted := false
	for _, r := range value {
		switch {
		case r == '"':
			quoted = !quoted
		case quoted:
			r = ' '
		}
		b.WriteRune(r)
	}
	return b.String()
}
