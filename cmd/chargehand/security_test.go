package main

import (
	"bytes"
	"crypto/sha256"
	"encoding/json"
	"fmt"
	"go/ast"
	"go/parser"
	"go/token"
	"io"
	"io/fs"
	"math"
	"os"
	"path/filepath"
	"runtime"
	"slices"
	"strconv"
	"strings"
	"testing"
	"time"

	"chargehand/commission/chlog"
	"chargehand/commission/chlog/chlogtest"
	"chargehand/commission/record"
	"chargehand/commission/walk"
	"chargehand/tui/deskview"
	"chargehand/tui/start"
	"chargehand/tui/theme"
	"chargehand/tui/walkview"
)

// hostile is a text that turns a terminal's title, clears it, colours it (ESC and the one-byte CSI of ECMA-48, 5.4), rings,
// turns the direction of writing and goes on in a line of its own.
const hostile = "\x1b]0;owned\a\x1b[2J\u009b31m\u202egnp\u2066\x7f\r\nforged line"

// hostileTOML is the same inside a TOML basic string.
const hostileTOML = `\u001b]0;owned\u0007\u001b[2J\u009b31m\u202Egnp\u2066\u007f\r\nforged line`

// turning is the worst that an intact log can hold: marks that turn the direction of writing, since no control character passes
// its reader, written as an escape or not.
const turning = "\u202egnp\u2066\u200f\u061c word"

// wantHarmless fails where an output holds a control character other than its own line ends, or one that turns the writing.
func wantHarmless(t *testing.T, what, output string) {
	t.Helper()
	for i, r := range output {
		turns := r == 0x061C || r == 0x200E || r == 0x200F || r >= 0x202A && r <= 0x202E || r >= 0x2066 && r <= 0x2069
		lineEnd := r == '\n' || r == '\r' && strings.HasPrefix(output[i:], "\r\n")
		if r < ' ' && !lineEnd || r >= 0x7F && r < 0xA0 || turns {
			from, to := max(0, i-60), min(len(output), i+60)
			t.Errorf("%s holds %U at byte %d: %q", what, r, i, output[from:to])
			return
		}
	}
	if slices.Contains(strings.Split(output, "\n"), "forged line") {
		t.Errorf("%s holds a line that a file has put there:\n%s", what, output)
	}
}

// hostileSite is a folder with the example site, the words of whose files are hostile.
func hostileSite(t *testing.T) string {
	t.Helper()
	folder := t.TempDir()
	siteText := strings.NewReplacer("Ferry Wagtail, aft battery string", hostileTOML, `"DC/DC converter"`, `"`+hostileTOML+`"`,
		"Aldermere slipway", hostileTOML).Replace(shared(t, "wagtail.site.toml"))
	siteText += "\n[[person]]\nname = \"" + hostileTOML + "\"\nrole = \"technician\"\norganisation = \"" + hostileTOML + "\"\n"
	keep(t, folder, "wagtail.site.toml", siteText)
	keep(t, folder, "wagtail.map.toml", shared(t, "wagtail.map.toml"))
	return folder
}

func keep(t *testing.T, folder, name, text string) string {
	t.Helper()
	path := filepath.Join(folder, name)
	if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
	return path
}

func TestAHostileSiteOrMapSendsNothingToTheTerminal(t *testing.T) {
	folder := hostileSite(t)
	mapText := shared(t, "wagtail.map.toml")
	keep(t, folder, "name.map.toml", strings.Replace(mapText, `"bus-voltage"`, `"`+hostileTOML+`"`, 1))
	keep(t, folder, "name.site.toml", strings.Replace(shared(t, "wagtail.site.toml"), "wagtail.map.toml", "name.map.toml", 1))
	keep(t, folder, "raw.site.toml", "format = \""+hostile+"\"\n"+hostile+" = 1\n")
	keep(t, folder, "key.site.toml", strings.Replace(shared(t, "wagtail.site.toml"), "[bus]", "[bus]\n\""+hostileTOML+"\" = \""+hostileTOML+"\"", 1))
	for _, file := range []string{"wagtail.site.toml", "name.site.toml", "raw.site.toml", "key.site.toml", hostile + ".site.toml"} {
		for _, args := range [][]string{{"check"}, {"check", "--json"}, {"check", "--csv"}, {"check", "--explain", "precharge.peak-current"},
			{"sheet", "--force"}, {"link"}} {
			if args[0] == "link" && file == "wagtail.site.toml" {
				continue // it would dial; a device of its own is in the next test
			}
			got := called(folder, append(args, file)...)
			what := fmt.Sprintf("%q of %q", args, file)
			wantHarmless(t, what+" on standard output", got.out)
			wantHarmless(t, what+" on standard error", got.err)
			if got.out+got.err == "" {
				t.Errorf("%s printed nothing, so that nothing is proved", what)
			}
		}
	}
}

// The screens are drawn without colour, so that every escape in them would be a file's. The log that is gone on with holds
// hostile words, and so do the names of a site file and of a log.
func TestAHostileLogSendsNothingToTheScreens(t *testing.T) {
	folder := t.TempDir()
	keep(t, folder, "wagtail.site.toml", shared(t, "wagtail.site.toml"))
	keep(t, folder, "wagtail.map.toml", shared(t, "wagtail.map.toml"))
	keep(t, folder, hostile+".site.toml", "format = 1")
	a := &app{surroundings: surroundings{in: strings.NewReader(""), out: io.Discard, err: io.Discard, folder: folder,
		env: func(name string) (string, bool) { return folder, name == "HOME" }}, now: time.Now}
	h := &host{app: a, ctx: t.Context(), options: walkOptions{seed: 1, speed: 1}}
	plain := theme.New(theme.Options{})
	log := filepath.Join(folder, "x.chlog")
	begun, err := h.Open(t.Context(), start.Entry{Kind: start.Rehearse, Site: "wagtail.site.toml", Log: log})
	if err != nil {
		t.Fatal(err)
	}
	if err := begun.Close(); err != nil {
		t.Fatal(err)
	}
	text, err := os.ReadFile(log)
	if err != nil {
		t.Fatal(err)
	}
	text = chained(t, text, record.Person{ID: "p9", Name: turning, Role: turning, Organisation: turning}, record.Note{Text: turning},
		record.Punch{ID: "k1", What: turning}, record.Deviation{Point: "permit.scope", Reason: turning, AcceptedBy: "p9"})
	keep(t, folder, "x.chlog", string(text))
	keep(t, folder, hostile+".chlog", string(text))
	entries := h.Entries(t.Context())
	if !slices.ContainsFunc(entries, func(e start.Entry) bool { return strings.Contains(e.Log, hostile) }) {
		t.Errorf("the start screen is offered %+v, want the log with the hostile name among them", entries)
	}
	wantHarmless(t, "the start screen", start.New(entries, plain, 140, 40).View())
	session, err := h.Open(t.Context(), start.Entry{Kind: start.Resume, Site: "wagtail.site.toml", Log: log})
	if err != nil {
		t.Fatal(err)
	}
	session.Notes = append(session.Notes, hostile)
	first := <-session.Run.Snapshots()
	if people := first.State.People(); !slices.ContainsFunc(people, func(p record.Person) bool { return p.Name == turning }) {
		t.Errorf("the resumed walk has the people %+v, want the hostile one among them", people)
	}
	wantHarmless(t, "the walk screen", walkview.New(session, plain, 140, 40, first).View())
	all := append(first.State.Measured(""), first.State.Desk()...)
	wantHarmless(t, "the findings screen", deskview.New(first.State.Site(), all, plain, 140, 40).View())
	if err := session.Close(); err != nil {
		t.Error(err)
	}
}

// A device answers with the largest, the smallest and no numbers in every register.
func TestAHostileDeviceIsOnlyRead(t *testing.T) {
	t.Parallel()
	var names []string
	var benches []linkBench
	for name, word := range map[string]uint16{"all ones": 0xFFFF, "least": 0x8000, "greatest": 0x7FFF, "infinite": 0x7F80} {
		b := newLinkBench(t, nil)
		b.signed(t)
		for _, p := range b.registers.Points {
			words, err := p.Encode(0)
			if err != nil {
				t.Fatal(err)
			}
			for i := range words {
				words[i] = word
			}
			b.image.Set(1, p.Table.FunctionCode(), int(p.Address), words...)
		}
		names, benches = append(names, name), append(benches, b)
	}
	calls := [][]string{{"link"}, {"link", "--json"}, {"walk", "--unattended", "--for", "1s"}}
	looks := sideBySide(len(benches)*len(calls), func(i int) look {
		b := benches[i/len(calls)]
		return b.chargehand(t.Context(), append(slices.Clone(calls[i%len(calls)]), b.site())...)
	})
	for i, got := range looks {
		what, args := names[i/len(calls)], calls[i%len(calls)]
		wantHarmless(t, fmt.Sprintf("%s: %q", what, args), got.stdout+got.stderr)
		if got.stdout+got.stderr == "" {
			t.Errorf("%s: %q printed nothing", what, args)
		}
		if slices.Contains(args, "--json") && !json.Valid([]byte(got.stdout)) {
			t.Errorf("%s: link --json is no JSON: %.300s", what, got.stdout)
		}
		onlyReads(t, what, benches[i/len(calls)].proxy)
	}
}

// hostileLog is a well chained log, written by somebody who chose every word in it and did not ask this program to write it.
func hostileLog(t *testing.T, folder, name, words string) string {
	t.Helper()
	opened := chlogtest.Opened(record.RehearsalMode)
	opened.Format, opened.Log = record.Format, strings.Repeat("0f", 16)
	opened.Program, opened.Device = words, words
	siteText := shared(t, "wagtail.site.toml")
	return keep(t, folder, name, string(chained(t, nil, opened,
		record.Person{ID: "p1", Name: words, Role: words, Organisation: words},
		record.File{Role: "site", Name: "../../" + words + ".toml", SHA256: hexSum([]byte(siteText)), Text: siteText, Why: words},
		record.Capture{ID: "../../../escaped", Part: 1, Parts: 1, Stage: words, What: words, T0: words,
			Signals: []record.CaptureSignal{{Name: words, Unit: words, Scale: math.MaxFloat64, Type: words}},
			Samples: []json.RawMessage{json.RawMessage(`[0,1e300]`)}, Gaps: []json.RawMessage{}},
		record.Note{Text: words}, record.Note{Text: `=HYPERLINK("http://192.0.2.1","x")`},
		record.Punch{ID: `=1+1`, What: `=cmd|' /C calc'!A0`},
		record.Deviation{Point: words, Reason: words, AcceptedBy: words},
		record.Link{Event: words, Peer: words, Why: words})))
}

// chained goes on with a log by lines that are chained as they should be.
func chained(t *testing.T, log []byte, bodies ...record.Body) []byte {
	t.Helper()
	for _, body := range bodies {
		text, err := json.Marshal(body)
		if err != nil {
			t.Fatal(err)
		}
		prev, seq := chlog.NoPrev, bytes.Count(log, []byte("\n"))
		if seq > 0 {
			last := bytes.LastIndexByte(log[:len(log)-1], '\n') + 1
			prev = hexSum(log[last:])
		}
		log = fmt.Appendf(log, `{"prev":"%s","seq":%d,"at":"%s","kind":"%s","body":%s}`+"\n", prev, seq,
			chlog.FormatTime(chlogtest.Start.Add(time.Duration(seq)*time.Second)), body.Kind(), text)
	}
	return log
}

func hexSum(text []byte) string { return fmt.Sprintf("%x", sha256.Sum256(text)) }

func TestAHostileLogStaysInItsFolder(t *testing.T) {
	outer := t.TempDir()
	folder := filepath.Join(outer, "a", "b", "c")
	if err := os.MkdirAll(folder, 0o700); err != nil {
		t.Fatal(err)
	}
	hostileLog(t, folder, "turning.chlog", turning)
	hostileLog(t, folder, "hostile.chlog", hostile)
	for _, args := range [][]string{{"verify"}, {"verify", "--json"}, {"report", "--force"}, {"report", "--text"}, {"report", "--json"}, {"report", "--force", "--csv", "data"}} {
		refused := called(folder, append(args, "hostile.chlog")...)
		wantHarmless(t, fmt.Sprintf("%q of control characters", args), refused.out+refused.err)
		if refused.code == exitDone || !strings.Contains(refused.out+refused.err, "control character") {
			t.Errorf("%q of control characters = %+v, want them refused", args, refused)
		}
		got := called(folder, append(args, "turning.chlog")...)
		wantHarmless(t, fmt.Sprintf("%q", args), got.out+got.err)
		if got.code == exitUnable {
			t.Errorf("%q of a hostile log = exit %d, %s: nothing is proved", args, got.code, got.err)
		}
	}
	if got := called(folder, "verify", "turning.chlog"); !strings.Contains(got.out, "9 records, head") {
		t.Errorf("verify of the hostile log = %s, want all of it intact", got.out)
	}
	formulas := 0
	err := filepath.WalkDir(outer, func(path string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		if in, err := filepath.Rel(folder, path); err != nil || strings.HasPrefix(in, "..") {
			t.Errorf("%s was written outside the folder", path)
		}
		if filepath.Ext(path) != ".csv" {
			return nil
		}
		text, err := os.ReadFile(path)
		wantHarmless(t, path, string(text))
		for _, line := range strings.Split(string(text), "\n") {
			if strings.Contains(line, ",=") || strings.Contains(line, `,"=`) || strings.HasPrefix(line, "=") {
				t.Errorf("%s holds a formula: %s", path, line)
			}
			if strings.Contains(line, "'=") {
				formulas++
			}
		}
		return err
	})
	if err != nil || formulas == 0 {
		t.Errorf("%d formulas made harmless (%v), want at least one", formulas, err)
	}
}

// A log that is gone on with names a site file of another folder: it is looked for beside the log only.
func TestALogNamesNoFileElsewhere(t *testing.T) {
	folder := filepath.Join("logs", "here")
	for name, want := range map[string]string{"wagtail.site.toml": "wagtail.site.toml", "../../etc/x.toml": "x.toml", "/etc/x.toml": "x.toml"} {
		if got := besideLog(filepath.Join(folder, "a.chlog"), name); got != filepath.Join(folder, want) {
			t.Errorf("besideLog(%q) = %q, want %q", name, got, filepath.Join(folder, want))
		}
	}
	for _, reference := range []string{"../../x", `..\..\x`, "/etc/x", "C:x", "a\x00b", "con.", ""} {
		if got := safeName(reference); got == "" || strings.ContainsAny(got, `/\.:`+"\x00") {
			t.Errorf("safeName(%q) = %q, want a name that stays in its folder", reference, got)
		}
	}
}

// Whatever is written, a symbolic link that somebody put there is not written through.
func TestNothingIsWrittenThroughALink(t *testing.T) {
	folder, elsewhere := withLog(t), t.TempDir()
	treasure := keep(t, elsewhere, "treasure", "")
	keep(t, folder, "wagtail.site.toml", shared(t, "wagtail.site.toml"))
	keep(t, folder, "wagtail.map.toml", shared(t, "wagtail.map.toml"))
	newLink := func(name, to string) {
		t.Helper()
		path := filepath.Join(folder, name)
		if err := os.MkdirAll(filepath.Dir(path), 0o700); err != nil {
			t.Fatal(err)
		}
		os.Remove(path)
		if err := os.Symlink(to, path); err != nil {
			t.Fatal(err)
		}
	}
	dangling := filepath.Join(elsewhere, "made")
	for _, to := range []string{treasure, dangling} {
		for name, args := range map[string][]string{
			"rehearsal.pdf":           {"report", "rehearsal.chlog"},
			"forced.pdf":              {"report", "--force", "--out", "forced.pdf", "rehearsal.chlog"},
			"text.txt":                {"report", "--force", "--text", "--out", "text.txt", "rehearsal.chlog"},
			"data/findings.csv":       {"report", "--force", "--csv", "data", "rehearsal.chlog"},
			"wagtail.sheet.pdf":       {"sheet", "--force", "wagtail.site.toml"},
			"own.site.toml":           {"new", "own.site.toml"},
			"other.map.toml":          {"new", "other.site.toml"},
			"id":                      {"key", "new", "--no-passphrase", "id"},
			"second.pub":              {"key", "new", "--no-passphrase", "second"},
			"log.chlog":               {"rehearse", "--unattended", "--log", "log.chlog", "wagtail.site.toml"},
			"locked.chlog.lock":       {"rehearse", "--unattended", "--log", "locked.chlog", "wagtail.site.toml"},
			"rehearsal.chlog.2.sig":   {"sign", "--key", "key", "rehearsal.chlog"},
			".config/chargehand/file": {"notices"},
		} {
			newLink(name, to)
			var out, err bytes.Buffer
			run(t.Context(), args, surroundings{in: strings.NewReader(""), out: &out, err: &err, folder: folder,
				env: func(name string) (string, bool) { return folder, name == "HOME" }})
			if text, readErr := os.ReadFile(treasure); readErr != nil || len(text) > 0 {
				t.Errorf("%q wrote %d bytes through the link %s (%v)", args, len(text), name, readErr)
				keep(t, elsewhere, "treasure", "")
			}
			if _, statErr := os.Lstat(dangling); statErr == nil {
				t.Errorf("%q made the file that the link %s names\n%s%s", args, name, out.String(), err.String())
				os.Remove(dangling)
			}
		}
	}
}

// sparse makes a sparse file of 1 GB: to its reader, one line of zeros that does not end.
func sparse(t *testing.T, folder, name, begin string) {
	t.Helper()
	path := keep(t, folder, name, begin)
	if err := os.Truncate(path, 1<<30); err != nil {
		t.Fatal(err)
	}
}

// deepLine is a second line that is chained as it should be and has a body of arrays in arrays.
func deepLine(first []byte, deep string) string {
	sum := sha256.Sum256(append(bytes.Clone(first), '\n'))
	return fmt.Sprintf(`{"prev":"%x","seq":1,"at":"%s","kind":"note","body":%s%s}`+"\n", sum, chlog.FormatTime(chlogtest.Start), deep,
		strings.Repeat("]", len(deep)))
}

// No file makes the program take more than 300 MB more from the system, whatever its size or the depth of what is in it. The
// most was 202 MB, for a key of 400,000 parts in a file that is just below the 1 MB that a site file may have.
func TestNoFileExhaustsMemory(t *testing.T) {
	folder := withLog(t)
	whole, err := os.ReadFile(filepath.Join(folder, "rehearsal.chlog"))
	if err != nil {
		t.Fatal(err)
	}
	first, _, _ := bytes.Cut(whole, []byte("\n"))
	sparse(t, folder, "zeros.chlog", "")
	sparse(t, folder, "second-line.chlog", string(first)+"\n{")
	sparse(t, folder, "rehearsal.chlog.2.sig", "-----BEGIN SSH SIGNATURE-----\n")
	sparse(t, folder, "huge.site.toml", "format = \"chargehand-site/1\"\n")
	deep := strings.Repeat("[", 500_000)
	keep(t, folder, "deep.site.toml", "format = "+deep)
	keep(t, folder, "dotted.site.toml", "a"+strings.Repeat(".a", 400_000)+" = 1")
	keep(t, folder, "tables.site.toml", strings.Repeat("[[bus.capacitance]]\n", 50_000))
	keep(t, folder, "long.site.toml", "format = \"chargehand-site/1\"\n#"+strings.Repeat("x", 10<<20))
	keep(t, folder, "mine.site.toml", strings.Replace(shared(t, "wagtail.site.toml"), "wagtail.map.toml", "huge.site.toml", 1))
	keep(t, folder, "deep.chlog", string(first)+"\n"+deepLine(first, deep))
	var before, after runtime.MemStats
	for _, args := range [][]string{
		{"verify", "zeros.chlog"}, {"verify", "second-line.chlog"}, {"report", "zeros.chlog"}, {"report", "--text", "second-line.chlog"},
		{"verify", "rehearsal.chlog"}, {"check", "huge.site.toml"}, {"check", "deep.site.toml"}, {"check", "dotted.site.toml"},
		{"check", "tables.site.toml"}, {"check", "long.site.toml"}, {"check", "mine.site.toml"}, {"verify", "deep.chlog"},
	} {
		runtime.GC()
		runtime.ReadMemStats(&before)
		got := called(folder, args...)
		runtime.ReadMemStats(&after)
		if got.code == exitDone {
			t.Errorf("%q = exit 0, want it refused", args)
		}
		if n := len(got.out) + len(got.err); n == 0 || n > 1<<20 {
			t.Errorf("%q printed %d bytes, want a sentence", args, n)
		}
		if took := int64(after.Sys) - int64(before.Sys); took > 300e6 {
			t.Errorf("%q took %d MB, want at most 300", args, took/1e6)
		}
	}
}

// A device file has no size to ask for and no end.
func TestAnEndlessFileIsRefused(t *testing.T) {
	if _, err := os.Stat("/dev/zero"); err != nil {
		return // a system without device files has none to be named
	}
	folder := t.TempDir()
	up := strings.Repeat("../", strings.Count(filepath.ToSlash(folder), "/")+1)
	keep(t, folder, "wagtail.site.toml", strings.Replace(shared(t, "wagtail.site.toml"), "wagtail.map.toml", up+"dev/zero", 1))
	for _, file := range []string{"wagtail.site.toml", up + "dev/zero"} {
		if got := called(folder, "check", file); got.code != exitUnable || !strings.Contains(got.err, "gives more than") {
			t.Errorf("check %s = exit %d, %.200q, want it refused for its size", file, got.code, got.err)
		}
	}
}

// Modes: a key is its owner's alone; nobody else may write to what is written; no file is executable.
func TestModesAndSecrets(t *testing.T) {
	if runtime.GOOS == "windows" {
		return // its files have no such modes
	}
	folder := t.TempDir()
	if got := called(folder, "key", "new", "--no-passphrase", "keys/id"); got.code != exitDone {
		t.Fatal(got.err)
	}
	keep(t, folder, "wagtail.site.toml", shared(t, "wagtail.site.toml")+"\n[[person]]\nname = \"A. Tester\"\nrole = \"technician\"\n")
	keep(t, folder, "wagtail.map.toml", shared(t, "wagtail.map.toml"))
	a := &app{surroundings: surroundings{in: strings.NewReader(""), out: io.Discard, err: io.Discard, folder: folder,
		env: func(name string) (string, bool) { return folder, name == "HOME" }}, now: time.Now}
	var said strings.Builder
	s, err := a.open(t.Context(), walkOptions{site: "wagtail.site.toml", rehearse: true, seed: 1, speed: 1, key: "keys/id", log: filepath.Join(folder, "w.chlog"),
		say: func(text string) { said.WriteString(text) }})
	if err != nil {
		t.Fatal(err)
	}
	if _, err := s.run.Submit(t.Context(), walk.Seal{Person: s.person}); err != nil {
		t.Fatal(err)
	}
	if _, err := s.finish(t.Context(), a); err != nil {
		t.Fatal(err)
	}
	secret, err := os.ReadFile(filepath.Join(folder, "keys", "id"))
	if err != nil {
		t.Fatal(err)
	}
	var secretLines []string // but the first, which holds little more than the public half
	for _, line := range strings.Split(string(secret), "\n") {
		if len(line) > 20 && !strings.HasPrefix(line, "-----") {
			secretLines = append(secretLines, line)
		}
	}
	want := map[string]fs.FileMode{"keys": 0o700, "keys/id": 0o600, "keys/id.pub": 0o644, "w.chlog": 0o644, "w.chlog.sig": 0o644, "w.pdf": 0o644}
	for name, mode := range want {
		info, err := os.Stat(filepath.Join(folder, name))
		if err != nil {
			t.Error(err)
		} else if got := info.Mode().Perm(); got&^mode != 0 {
			t.Errorf("%s has mode %v, want at most %v", name, got, mode)
		}
		if name == "keys" || name == "keys/id" {
			continue
		}
		text, err := os.ReadFile(filepath.Join(folder, name))
		if err != nil {
			t.Error(err)
		}
		for _, line := range secretLines[1:] {
			if bytes.Contains(text, []byte(line)) || strings.Contains(said.String(), line) {
				t.Errorf("%s holds a line of the private key", name)
			}
		}
	}
}

// The program's own code starts no process, loads no code and goes round no memory safety, so that no input can make it. What
// gathers the notices at build time is no part of the program.
func TestTheProgramRunsNothing(t *testing.T) {
	barred := map[string]bool{"os/exec": true, "plugin": true, "unsafe": true, "C": true, "net/http": true, "text/template": true, "html/template": true}
	calls := map[string]bool{"StartProcess": true, "ForkExec": true, "ExecProcess": true, "Exec": true}
	files := 0
	err := filepath.WalkDir(filepath.Join("..", ".."), func(path string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() || !strings.HasSuffix(path, ".go") || strings.HasSuffix(path, "_test.go") ||
			strings.Contains(path, ".ci") || filepath.Base(filepath.Dir(path)) == "gather" || strings.HasSuffix(filepath.Dir(path), "test") {
			return err
		}
		file, err := parser.ParseFile(token.NewFileSet(), path, nil, 0)
		if err != nil {
			return err
		}
		files++
		for _, i := range file.Imports {
			if name, _ := strconv.Unquote(i.Path.Value); barred[name] {
				t.Errorf("%s imports %s", path, name)
			}
		}
		ast.Inspect(file, func(n ast.Node) bool {
			if s, ok := n.(*ast.SelectorExpr); ok && calls[s.Sel.Name] {
				t.Errorf("%s uses %s, which starts a process", path, s.Sel.Name)
			}
			return true
		})
		return nil
	})
	if err != nil || files < 100 {
		t.Errorf("looked at %d files (%v), want the whole program", files, err)
	}
}
