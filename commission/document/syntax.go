package document

import (
	"regexp"
	"strconv"
	"strings"
	"unicode/utf8"

	"github.com/pelletier/go-toml/v2/unstable"
)

// syntax says in a user's words what the parser's message means; the first entry whose word the message holds counts.
var syntax = []struct{ word, wanted, example string }{
	{"strings must be quoted", "text, and a value with its unit, in quotes", `resistance = "33 Ω"`},
	{"at start of value", "text, and a value with its unit, in quotes", `resistance = "33 Ω"`},
	{"expected keyword", "text, and a value with its unit, in quotes; or true or false", `active = true`},
	{"expected value", "a value behind the equals sign", `resistance = "33 Ω"`},
	{"control characters", "text without control characters", ""},
	{"carriage return", "line ends of LF or CR LF, nothing else", ""},
	{"newline but got", "the end of the line; text, and a value with its unit, stand in quotes", `resistance = "33 Ω"`},
	{"after key", "an equals sign behind the key", `name = "text"`},
	{"table name", "a closing bracket behind the table's name", "[bus]"},
	{"start of key", "a key of letters, digits, - and _", `name = "text"`},
	{"expected key", "a key of letters, digits, - and _", `name = "text"`},
	{"unterminated", "a closing quote", `name = "text"`},
	{"not terminated", "a closing quote", `name = "text"`},
	{"leading zeroes", "a number without leading zeroes, or a date as year-month-day", "due = 2026-03-01"},
	{"cannot have new lines", "a closing quote on the same line", `name = "text"`},
	{"escape", `an escape of TOML 1.0, such as \"`, `name = "a \"quoted\" word"`},
	{"array", "a comma or a closing bracket in the list", "range = [0, 1300]"},
	{"inline table", "a comma or a closing brace in the inline table", `{ voltage = "60 V", within = "5 s" }`},
	{"expected value but", "a value in the list", "range = [0, 1300]"},
	{"nested", "lists and tables that are not nested so deeply", ""},
}

// unquotedValue is a line whose value lacks its quotes.
var unquotedValue = regexp.MustCompile(`^[ \t]*([A-Za-z0-9_.-]+)[ \t]*=[ \t]*([^"'\[{#\r\n]*[^"'\[{#\s])[ \t]*(?:#.*)?\r?$`)

// openQuote is a line that lacks only its last quote.
var openQuote = regexp.MustCompile(`^[A-Za-z0-9_.-]+[ \t]*=[ \t]*"[^"#\\]{1,60}$`)

// explainSyntax turns the parser's error into a problem; at is the place, started the start of the expression's first line.
func (f *File) explainSyntax(at, started int, err *unstable.ParserError) {
	wanted, example := "TOML 1.0: "+err.Message, ""
	message := err.Message
	if at < len(f.text) && f.text[at] == '\r' {
		message = "carriage return"
	}
	for _, s := range syntax {
		if strings.Contains(message, s.word) {
			wanted, example = s.wanted, s.example
			break
		}
	}
	if m := unquotedValue.FindSubmatch(f.lineAt(started)); m != nil && strings.Contains(wanted, "in quotes") {
		example = string(m[1]) + " = " + strconv.Quote(string(m[2]))
	}
	if line := strings.TrimSpace(string(f.lineAt(started))); strings.HasPrefix(wanted, "a closing quote") && openQuote.MatchString(line) {
		example = line + `"`
	}
	f.problem(at, f.snippet(at), wanted, example)
}

// snippet quotes what stands at a place, up to the end of its line.
func (f *File) snippet(at int) string {
	rest := strings.TrimRight(string(f.lineAt(at)), "\r")
	if rest == "" {
		return "the end of the line"
	}
	return shortened(rest)
}

// shortened quotes a text, cut to a length that fits a line.
func shortened(s string) string {
	const most = 40
	if utf8.RuneCountInString(s) > most {
		s = string([]rune(s)[:most]) + "…"
	}
	return strconv.Quote(s)
}
