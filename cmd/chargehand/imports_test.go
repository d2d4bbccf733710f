package main

import (
	"fmt"
	"go/parser"
	"go/token"
	"io/fs"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
)

// rule says what the files of some packages must not import. A path ending in /... stands for everything below it.
type rule struct {
	of      []string
	not     []string
	but     []string // which may all the same
	why     string
	inTests bool // the rule holds for tests too
}

var families = []string{"chargehand/commission/precharge", "chargehand/commission/closing", "chargehand/commission/discharge",
	"chargehand/commission/source", "chargehand/commission/window", "chargehand/commission/ripple", "chargehand/commission/droop"}

// rules are the directions of import of this program.
var rules = []rule{
	{of: []string{"chargehand/commission/..."}, not: []string{"chargehand/protocol/...", "chargehand/tui/...", "chargehand/cmd/..."},
		why: "the walk and its calculations know neither the wire nor a screen", inTests: false},
	{of: []string{"chargehand/protocol/..."}, not: []string{"chargehand/tui/...", "chargehand/cmd/..."}, why: "the wire knows no screen", inTests: true},
	{of: []string{"chargehand/tui/..."}, not: []string{"chargehand/cmd/..."}, why: "only cmd knows all", inTests: true},
	{of: []string{"chargehand/protocol/circuit"}, not: slices.Concat(families, []string{"chargehand/commission/desk", "chargehand/commission/measured",
		"chargehand/commission/corner", "chargehand/commission/finding"}),
		why: "the simulated plant and the findings check each other only while they share no computation"},
	{of: []string{"chargehand/protocol/simulator"}, not: slices.Concat(families, []string{"chargehand/commission/desk", "chargehand/commission/corner"}),
		why: "the simulated plant must not know what is predicted of it"},
	{of: append([]string{"chargehand/commission/desk", "chargehand/commission/measured", "chargehand/commission/corner"}, families...),
		not: []string{"chargehand/protocol/circuit", "chargehand/protocol/simulator"}, why: "a prediction must not come from the plant it is held against"},
	{of: []string{"chargehand/commission/measured"}, not: []string{"chargehand/protocol/..."}, why: "a cause is found from readings, never from the name of a disturbance"},
	{of: []string{"chargehand/..."}, not: []string{"github.com/goburrow/..."}, but: []string{"chargehand/protocol/link"}, why: "one package speaks to a device, and it only reads"},
	{of: []string{"chargehand/..."}, not: []string{"github.com/simonvetter/..."}, but: []string{"chargehand/protocol/simulator"}, why: "only the simulated plant is a server"},
	{of: []string{"chargehand/commission/...", "chargehand/tui/...", "chargehand/cmd/..."}, not: []string{"net"}, but: []string{"chargehand/commission/signing", "chargehand/commission/site"},
		why: "only protocol/link dials; signing speaks to the key agent of this computer, and a site file's address is only parsed"},
	{of: []string{"chargehand/..."}, not: []string{"net/http", "net/rpc", "net/smtp"}, why: "no network but the configured device"},
	{of: []string{"chargehand/commission/quantity", "chargehand/commission/fit"}, not: []string{"chargehand/..."}, why: "plain numbers know nothing of this program"},
	{of: []string{"chargehand/commission/..."}, not: []string{"chargehand/commission/report"}, why: "a report reads the log; nothing reads a report"},
	{of: []string{"chargehand/commission/chlog"}, not: []string{"chargehand/commission/walk", "chargehand/commission/measured", "chargehand/commission/site"},
		why: "the log can be verified without knowing what a walk is"},
	{of: families, not: families, why: "a family of findings stands by itself"},
	{of: []string{"chargehand/..."}, not: []string{"C", "unsafe"}, why: "one static binary without C"},
}

// allowed are single imports that a rule forbids and that stand with their reason.
var allowed = map[[2]string]string{
	{"chargehand/cmd/chargehand", "net"}: "an address is only parsed, to refuse one that others could reach",
}

func TestImportDirections(t *testing.T) {
	imports := importsOf(t)
	if len(imports) < 30 {
		t.Fatalf("found %d packages, want the whole program", len(imports))
	}
	for _, r := range rules {
		for pkg, files := range imports {
			if !matchesAny(r.of, pkg) || slices.Contains(r.but, pkg) {
				continue
			}
			for _, f := range files {
				if f.isTest && !r.inTests {
					continue
				}
				for _, path := range f.imports {
					if path != pkg && matchesAny(r.not, path) && !sibling(r, pkg, path) && allowed[[2]string{pkg, path}] == "" {
						t.Errorf("%s imports %s: %s", f.name, path, r.why)
					}
				}
			}
		}
	}
}

// sibling tells whether an import of one family by another is one of the few that stand: the family's results are an input
// there, and named as such in its findings.
func sibling(r rule, pkg, path string) bool {
	if !slices.Equal(r.of, families) {
		return false
	}
	return slices.Contains(uses[strings.TrimPrefix(pkg, "chargehand/commission/")], strings.TrimPrefix(path, "chargehand/commission/"))
}

// uses are the families that take another's result as an input (design 6.1).
var uses = map[string][]string{
	"closing":   {"precharge"}, // the circuit that is charged
	"discharge": {"window"},    // it begins at window.bus-high
	"source":    {"window"},    // what its switch breaks is window.current
	"droop":     {"window"},    // the lowest bus stands above window.source-high
}

func TestRulesCatchWhatTheyForbid(t *testing.T) {
	// A rule whose pattern matches nothing would hold for ever.
	imports := importsOf(t)
	for _, r := range rules {
		found := false
		for pkg := range imports {
			found = found || matchesAny(r.of, pkg)
		}
		if !found {
			t.Errorf("rule for %v matches no package: %s", r.of, r.why)
		}
	}
	for path, want := range map[string]bool{"chargehand/protocol/link": true, "chargehand/protocol": true, "chargehand/protocols": false, "chargehand": false} {
		if got := matchesAny([]string{"chargehand/protocol/..."}, path); got != want {
			t.Errorf("matchesAny(chargehand/protocol/..., %s) = %v, want %v", path, got, want)
		}
	}
}

type sourceFile struct {
	name    string
	isTest  bool
	imports []string
}

// importsOf reads every Go file of the repository.
func importsOf(t *testing.T) map[string][]sourceFile {
	t.Helper()
	root := filepath.Join("..", "..")
	found := map[string][]sourceFile{}
	for _, top := range []string{"cmd", "commission", "protocol", "tui"} {
		err := filepath.WalkDir(filepath.Join(root, top), func(path string, d fs.DirEntry, err error) error {
			if err != nil {
				return err
			}
			if d.IsDir() && d.Name() == "testdata" {
				return fs.SkipDir
			}
			if d.IsDir() || !strings.HasSuffix(path, ".go") {
				return nil
			}
			file, err := parser.ParseFile(token.NewFileSet(), path, nil, parser.ImportsOnly)
			if err != nil {
				return fmt.Errorf("%s: %w", path, err)
			}
			rel, err := filepath.Rel(root, path)
			if err != nil {
				return err
			}
			pkg := "chargehand/" + filepath.ToSlash(filepath.Dir(rel))
			f := sourceFile{name: filepath.ToSlash(rel), isTest: strings.HasSuffix(path, "_test.go")}
			for _, spec := range file.Imports {
				name, err := strconv.Unquote(spec.Path.Value)
				if err != nil {
					return err
				}
				f.imports = append(f.imports, name)
			}
			found[pkg] = append(found[pkg], f)
			return nil
		})
		if err != nil {
			t.Fatal(err)
		}
	}
	return found
}

func matchesAny(patterns []string, path string) bool {
	return slices.ContainsFunc(patterns, func(pattern string) bool {
		below, all := strings.CutSuffix(pattern, "/...")
		return path == pattern || all && (path == below || strings.HasPrefix(path, below+"/"))
	})
}
