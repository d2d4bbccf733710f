package main

import (
	"bytes"
	"context"
	"encoding/json"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"testing"
)

// outcome is what one call of the program left.
type outcome struct {
	code     int
	out, err string
}

// called calls the program in a folder, without a terminal and with an empty environment.
func called(folder string, args ...string) outcome {
	var out, err bytes.Buffer
	code := run(context.Background(), args, surroundings{in: strings.NewReader(""), out: &out, err: &err, folder: folder,
		env: func(string) (string, bool) { return "", false }})
	return outcome{code, out.String(), err.String()}
}

// withLog is a folder with the rehearsal that package report is tested with; its verdict is fail.
func withLog(t *testing.T) string {
	t.Helper()
	folder := t.TempDir()
	for _, name := range []string{"rehearsal.chlog", "rehearsal.chlog.sig"} {
		text, err := os.ReadFile(filepath.Join("..", "..", "commission", "report", "testdata", name))
		if err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(filepath.Join(folder, name), text, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	return folder
}

func isPDF(t *testing.T, path string) bool {
	t.Helper()
	text, err := os.ReadFile(path)
	return err == nil && bytes.HasPrefix(text, []byte("%PDF-")) && len(text) > 50000
}

func TestReportOverwritesOnlyByForce(t *testing.T) {
	folder := withLog(t)
	pdf := filepath.Join(folder, "rehearsal.pdf")
	if got := called(folder, "report", "rehearsal.chlog"); got.code != exitFailed || !strings.Contains(got.out, pdf) || !isPDF(t, pdf) {
		t.Fatalf("report = %+v, want exit 1 for a failed walk, and %s", got, pdf)
	}
	if err := os.WriteFile(pdf, []byte("mine"), 0o644); err != nil {
		t.Fatal(err)
	}
	if got := called(folder, "report", "rehearsal.chlog"); got.code != exitUnable || !strings.Contains(got.err, "is there already; --force overwrites it") {
		t.Errorf("report over a file = %+v, want exit 2 and a sentence", got)
	}
	if text, _ := os.ReadFile(pdf); string(text) != "mine" {
		t.Errorf("the file that was there holds %d bytes now, want it untouched", len(text))
	}
	if got := called(folder, "report", "--force", "rehearsal.chlog"); got.code != exitFailed || !isPDF(t, pdf) {
		t.Errorf("report --force = %+v, want the file replaced", got)
	}
	entries, err := os.ReadDir(folder)
	if err != nil || len(entries) != 3 {
		t.Errorf("the folder holds %v (%v), want log, signature and PDF, nothing left over", entries, err)
	}
}

func TestReportSaysWhyItCannotWrite(t *testing.T) {
	folder := withLog(t)
	for _, c := range []struct {
		args []string
		want string
	}{
		{[]string{"--out", "none/x.pdf"}, "does not exist"},
		{[]string{"--out", "rehearsal.chlog.sig/x.pdf"}, "is a file, not a folder"},
		{[]string{"--out", "."}, "it is a folder"},
		{[]string{"--out", "rehearsal.chlog", "--force"}, "would be written over a log"},
		{[]string{"--out", "rehearsal.chlog.sig", "--force"}, "would be written over a log"},
		{[]string{"--csv", "rehearsal.chlog"}, "make the folder for the CSV files"},
		{[]string{"--paper", "a3"}, "write a4 or letter"},
		{[]string{"--json", "--text"}, "exclude each other"},
		{[]string{"--csv", "data", "--out", "x.pdf"}, "--out belongs to"},
		{[]string{"--signers", "nobody"}, "nobody"},
	} {
		got := called(folder, append([]string{"report", "rehearsal.chlog"}, c.args...)...)
		if got.code != exitUnable || !strings.Contains(got.err, c.want) || strings.Count(got.err, "\n") > 2 {
			t.Errorf("report %v = %+v, want exit 2 and %q", c.args, got, c.want)
		}
	}
	for name, text := range map[string]string{"hello.chlog": "hello\n", "empty.chlog": "",
		"newer.chlog": `{"prev":"` + strings.Repeat("0", 64) + `","seq":0,"at":"2026-12-01T09:30:00.000+01:00","kind":"opened","body":{"format":"chargehand-log/2"}}` + "\n"} {
		if err := os.WriteFile(filepath.Join(folder, name), []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
		if got := called(folder, "report", name); got.code != exitUnable || got.err == "" {
			t.Errorf("report %s = %+v, want exit 2 and a sentence", name, got)
		}
	}
	if got := called(folder, "report", "missing.chlog"); got.code != exitUnable {
		t.Errorf("report of no file = %+v, want exit 2", got)
	}
}

func TestReportAsData(t *testing.T) {
	folder := withLog(t)
	got := called(folder, "report", "--csv", "data", "--json", "rehearsal.chlog")
	if got.code != exitFailed || !json.Valid([]byte(got.out[strings.Index(got.out, "{"):])) {
		t.Fatalf("report --csv --json = exit %d, %.300q, want exit 1 and JSON", got.code, got.out)
	}
	entries, err := os.ReadDir(filepath.Join(folder, "data"))
	if err != nil {
		t.Fatal(err)
	}
	var names []string
	for _, e := range entries {
		names = append(names, e.Name())
	}
	want := []string{"capture-c1.csv", "capture-c2.csv", "capture-c3.csv", "findings.csv", "points.csv", "punch.csv", "readings.csv"}
	if !slices.Equal(names, want) {
		t.Errorf("--csv writes %v, want %v", names, want)
	}
	if got := called(folder, "report", "--csv", "data", "rehearsal.chlog"); got.code != exitUnable || !strings.Contains(got.err, "--force") {
		t.Errorf("report --csv over files = %+v, want exit 2", got)
	}
	if got := called(folder, "report", "--text", "rehearsal.chlog"); !strings.HasPrefix(got.out, "REHEARSAL\n") || got.code != exitFailed {
		t.Errorf("report --text begins %.60q, exit %d, want REHEARSAL first and exit 1", got.out, got.code)
	}
}

func TestSheet(t *testing.T) {
	folder := t.TempDir()
	for _, name := range []string{"wagtail.site.toml", "wagtail.map.toml"} {
		text, err := os.ReadFile(filepath.Join("..", "..", "testdata", "sites", name))
		if err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(filepath.Join(folder, name), text, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	if got := called(folder, "sheet", "wagtail.site.toml"); got.code != exitDone || !isPDF(t, filepath.Join(folder, "wagtail.sheet.pdf")) {
		t.Errorf("sheet = %+v, want wagtail.sheet.pdf", got)
	}
	if got := called(folder, "sheet", "wagtail.site.toml"); got.code != exitUnable || !strings.Contains(got.err, "--force overwrites it") {
		t.Errorf("sheet over a file = %+v, want exit 2 and a sentence", got)
	}
	if got := called(folder, "sheet", "none.toml"); got.code != exitUnable {
		t.Errorf("sheet of no site = %+v, want exit 2", got)
	}
}

// TestNoticesNameEveryModule asks the go command what the program is built from here, and for what the fonts are.
func TestNoticesNameEveryModule(t *testing.T) {
	got := called(t.TempDir(), "notices")
	if got.code != exitDone {
		t.Fatalf("notices = exit %d, %s", got.code, got.err)
	}
	out, err := exec.Command("go", "list", "-deps", "-f", "{{with .Module}}{{if not .Main}}{{.Path}} {{.Version}}{{end}}{{end}}", ".").Output()
	if err != nil {
		t.Fatal(err)
	}
	modules := strings.Split(strings.TrimSpace(string(out)), "\n")
	if len(modules) < 20 {
		t.Fatalf("go list names %d packages of other modules, want at least 20", len(modules))
	}
	for _, m := range append(modules, "Go standard library", "github.com/go-fonts/dejavu v0.3.2, LICENSE-DejaVu", "Bitstream Vera") {
		if m = strings.TrimSpace(m); !strings.Contains(got.out, m) {
			t.Errorf("notices lack %s; `go generate ./cmd/chargehand` gathers them anew", m)
		}
	}
}
