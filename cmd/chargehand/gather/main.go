// Command gather writes the licences of everything that chargehand is built from into one file, which the program embeds:
//
//	go generate ./cmd/chargehand
//
// It asks the go command which modules the program uses on each system it is built for, and takes every licence, notice and
// patent file at the root of each module, and those of the Go standard library. A module without such a file must say in its
// README what its licence is; that section is taken. It needs the modules in the module cache and no network.
package main

import (
	"fmt"
	"maps"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"slices"
	"strings"
)

// program is what the licences are gathered of, seen from its own folder.
const program = "."

// systems are those that the program is built for.
var systems = []string{"linux", "windows", "darwin"}

func main() {
	if len(os.Args) != 2 {
		fmt.Fprintln(os.Stderr, "gather wants the name of the file to write")
		os.Exit(2)
	}
	text, err := gather()
	if err == nil {
		err = os.WriteFile(os.Args[1], []byte(text), 0o644)
	}
	if err != nil {
		fmt.Fprintln(os.Stderr, "gather:", err)
		os.Exit(1)
	}
}

func gather() (string, error) {
	modules := map[string]string{} // path and version → folder
	for _, system := range systems {
		if err := used(system, modules); err != nil {
			return "", err
		}
	}
	root, err := exec.Command("go", "env", "GOROOT").Output()
	if err != nil {
		return "", err
	}
	modules["Go standard library"] = strings.TrimSpace(string(root))
	var b strings.Builder
	b.WriteString("chargehand is built from the modules below. Each stands with its licence, whole.\n")
	for _, name := range slices.Sorted(maps.Keys(modules)) {
		if err := add(&b, name, modules[name]); err != nil {
			return "", err
		}
	}
	return b.String(), nil
}

// used adds the modules that the program uses on one system.
func used(system string, to map[string]string) error {
	cmd := exec.Command("go", "list", "-deps", "-f", "{{with .Module}}{{if not .Main}}{{.Path}} {{.Version}}\t{{.Dir}}{{end}}{{end}}", program)
	cmd.Env = append(os.Environ(), "GOOS="+system, "CGO_ENABLED=0")
	cmd.Stderr = os.Stderr
	out, err := cmd.Output()
	if err != nil {
		return fmt.Errorf("list the modules for %s: %w", system, err)
	}
	for line := range strings.Lines(string(out)) {
		if name, dir, ok := strings.Cut(strings.TrimSpace(line), "\t"); ok {
			to[name] = dir
		}
	}
	return nil
}

var licence = regexp.MustCompile(`(?i)^(licen[cs]e|copying|copyright|notice|patents)`)

// add writes one module's licences; one without any is an error, since it could not be passed on.
func add(b *strings.Builder, name, dir string) error {
	entries, err := os.ReadDir(dir)
	if err != nil {
		return fmt.Errorf("%s: %w; `go mod download` fetches it", name, err)
	}
	found := false
	for _, e := range entries {
		if e.IsDir() || !licence.MatchString(e.Name()) || strings.HasSuffix(e.Name(), ".go") {
			continue
		}
		text, err := os.ReadFile(filepath.Join(dir, e.Name()))
		if err != nil {
			return err
		}
		found = true
		section(b, name+", "+e.Name(), string(text))
	}
	if found {
		return nil
	}
	readme, err := os.ReadFile(filepath.Join(dir, "README.md"))
	stated := statement.FindSubmatch(readme)
	if err != nil || stated == nil {
		return fmt.Errorf("%s has no licence file in %s", name, dir)
	}
	section(b, name+", README.md, which is all it says of its licence", string(stated[1]))
	return nil
}

// statement is the section of a README that names the licence, and what follows it: the author.
var statement = regexp.MustCompile(`(?is)\n#+\s*licen[cs]e\s*\n(.*)$`)

func section(b *strings.Builder, title, text string) {
	rule := strings.Repeat("=", 80)
	fmt.Fprintf(b, "\n%s\n%s\n%s\n\n%s\n", rule, title, rule, strings.Trim(strings.ReplaceAll(text, "\r\n", "\n"), "\n"))
}
