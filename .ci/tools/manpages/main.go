// Command manpages writes the manual pages of a program from its own help, one for each command, so that they never say
// anything else.
//
//	manpages PROGRAM FOLDER
//
// It asks PROGRAM for `--help` and then each command that the help lists, and writes PROGRAM.1, PROGRAM-COMMAND.1 and so on.
package main

import (
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
)

func main() {
	if len(os.Args) != 3 {
		fmt.Fprintln(os.Stderr, "usage: manpages PROGRAM FOLDER")
		os.Exit(2)
	}
	if err := write(os.Args[1], os.Args[2], nil, ""); err != nil {
		fmt.Fprintln(os.Stderr, "manpages:", err)
		os.Exit(1)
	}
}

// write writes the page of one command, which short says in a line, and of those below it.
func write(program, folder string, command []string, short string) error {
	text, err := exec.Command(program, append(command, "--help")...).Output()
	if err != nil {
		return fmt.Errorf("%s %s --help: %w", program, strings.Join(command, " "), err)
	}
	name := strings.Join(append([]string{"chargehand"}, command...), "-")
	h := split(string(text))
	if err := os.WriteFile(filepath.Join(folder, name+".1"), []byte(page(name, short, h)), 0o644); err != nil {
		return err
	}
	for _, line := range h.commands() {
		below, short, _ := strings.Cut(strings.TrimSpace(line), " ")
		if below == "" || below == "help" || below == "completion" {
			continue // they say of themselves all there is to say
		}
		if err := write(program, folder, append(command[:len(command):len(command)], below), strings.TrimSpace(short)); err != nil {
			return err
		}
	}
	return nil
}

// help is a help text in its parts.
type help struct {
	description []string
	sections    []section
}

type section struct {
	title string
	lines []string
}

// split takes a help text apart: what stands before "Usage:", then a section for each line that is a heading.
func split(text string) help {
	var h help
	for _, line := range strings.Split(strings.TrimRight(text, "\n"), "\n") {
		switch {
		case isHeading(line, len(h.sections) > 0):
			h.sections = append(h.sections, section{title: strings.TrimSuffix(line, ":")})
		case len(h.sections) == 0:
			h.description = append(h.description, line)
		default:
			s := &h.sections[len(h.sections)-1]
			s.lines = append(s.lines, line)
		}
	}
	return h
}

func isHeading(line string, begun bool) bool {
	return line == "Usage:" || begun && strings.HasSuffix(line, ":") && !strings.HasPrefix(line, " ")
}

// commands are the lines of the section that lists commands.
func (h help) commands() []string {
	for _, s := range h.sections {
		if s.title == "Available Commands" {
			return s.lines
		}
	}
	return nil
}

// titles are the usual names of a manual's sections.
var titles = map[string]string{"Usage": "SYNOPSIS", "Examples": "EXAMPLES", "Available Commands": "COMMANDS", "Flags": "OPTIONS",
	"Global Flags": "OPTIONS OF ALL COMMANDS"}

// page is the manual page in the macros of man(7). Without a short text the first sentence of the description is one.
func page(name, short string, h help) string {
	var b strings.Builder
	if short == "" {
		short, _, _ = strings.Cut(strings.TrimPrefix(strings.Join(h.description, " "), name+" "), ".")
	}
	fmt.Fprintf(&b, ".TH %s 1\n.SH NAME\n%s \\- %s\n", strings.ToUpper(name), name, escape(short))
	for _, s := range h.sections {
		if s.title == "Usage" {
			verbatim(&b, titles[s.title], s.lines)
		}
	}
	verbatim(&b, "DESCRIPTION", h.description)
	for _, s := range h.sections {
		if title := titles[s.title]; title != "" && s.title != "Usage" {
			verbatim(&b, title, s.lines)
		}
	}
	return b.String()
}

// verbatim writes lines as they stand: help texts are laid out already.
func verbatim(b *strings.Builder, title string, lines []string) {
	fmt.Fprintf(b, ".SH %s\n.nf\n", title)
	for _, line := range lines {
		b.WriteString(escape(line) + "\n")
	}
	b.WriteString(".fi\n")
}

// escape keeps a line from being read as a request.
func escape(line string) string {
	line = strings.ReplaceAll(line, `\`, `\e`)
	line = strings.ReplaceAll(line, "-", `\-`)
	if strings.HasPrefix(line, ".") || strings.HasPrefix(line, "'") {
		line = `\&` + line
	}
	return line
}
