package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"net"
	"os"
	"os/exec"
	ossignal "os/signal"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"
	"time"
)

// asProgram in the environment makes the test's own binary the program, so that it can run, and die, as a process.
const asProgram = "CHARGEHAND_AS_PROGRAM"

func TestMain(m *testing.M) {
	if os.Getenv(asProgram) == "" {
		os.Exit(m.Run())
	}
	ctx, stop := ossignal.NotifyContext(context.Background(), os.Interrupt)
	code := run(ctx, os.Args[1:], surroundings{in: os.Stdin, out: os.Stdout, err: os.Stderr, env: os.LookupEnv, folder: "."})
	stop()
	os.Exit(code)
}

// program is the program as a process of its own, in a folder that is its home too.
func program(folder string, args ...string) *exec.Cmd {
	c := exec.Command(os.Args[0], args...)
	c.Dir = folder
	c.Env = []string{asProgram + "=1", "HOME=" + folder, "USERPROFILE=" + folder, "LocalAppData=" + folder, "AppData=" + folder,
		"PATH=" + os.Getenv("PATH"), "SystemRoot=" + os.Getenv("SystemRoot"), "TMPDIR=" + os.TempDir()}
	return c
}

// TestScripts runs what testdata/script writes down of the command line. A script is a txtar file: lines first, then files that
// lie in its folder beside the sites of the repository.
//
//	exits CODE ARGS...     runs the program, which must end with that code
//	background ARGS...     starts it and goes on; `stop` interrupts it and takes its output
//	stdin FILE             what the next program reads
//	answers ADDRESS        waits until something listens there; $ADDRESS is a free one
//	[!] stdout|stderr RE   what the last program said, or must not have said
//	[!] grep RE FILE, exists FILE..., cp FROM TO, replace FILE OLD NEW, append FILE TEXT [FILE]
func TestScripts(t *testing.T) {
	scripts, err := filepath.Glob(filepath.Join("testdata", "script", "*.txtar"))
	if err != nil || len(scripts) == 0 {
		t.Fatalf("no scripts: %v", err)
	}
	for _, path := range scripts {
		t.Run(strings.TrimSuffix(filepath.Base(path), ".txtar"), func(t *testing.T) {
			t.Parallel()
			text, err := os.ReadFile(path)
			if err != nil {
				t.Fatal(err)
			}
			newScript(t, path).run(string(text))
		})
	}
}

type script struct {
	*testing.T
	name, folder, address string
	line                  int
	stdin                 string
	stdout, stderr        string
	background            *exec.Cmd
	said                  [2]bytes.Buffer
}

func newScript(t *testing.T, name string) *script {
	s := &script{T: t, name: name, folder: t.TempDir()}
	for _, site := range []string{"wagtail.site.toml", "wagtail.map.toml", "nightjar.site.toml", "ouzel.site.toml"} {
		text, err := os.ReadFile(filepath.Join("..", "..", "testdata", "sites", site))
		if err != nil {
			t.Fatal(err)
		}
		s.write(site, string(text))
	}
	free, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	s.address = free.Addr().String()
	free.Close()
	t.Cleanup(func() {
		if s.background != nil {
			s.background.Process.Kill()
			s.background.Wait()
		}
	})
	return s
}

func (s *script) fail(format string, args ...any) {
	s.Helper()
	s.Fatalf("%s:%d: %s\nstdout:\n%s\nstderr:\n%s", s.name, s.line, fmt.Sprintf(format, args...), s.stdout, s.stderr)
}

func (s *script) path(name string) string {
	if filepath.IsAbs(name) {
		return name
	}
	return filepath.Join(s.folder, name)
}

func (s *script) write(name, text string) {
	s.Helper()
	if err := os.WriteFile(s.path(name), []byte(text), 0o600); err != nil {
		s.Fatal(err)
	}
}

func (s *script) read(name string) string {
	s.Helper()
	text, err := os.ReadFile(s.path(name))
	if err != nil {
		s.fail("%v", err)
	}
	return string(text)
}

func (s *script) run(text string) {
	lines, files, _ := strings.Cut(text, "\n-- ")
	for _, file := range strings.Split(files, "\n-- ") {
		if name, content, ok := strings.Cut(file, " --"); ok {
			s.write(name, strings.TrimPrefix(content, "\n"))
		}
	}
	for _, line := range strings.Split(lines, "\n") {
		s.line++
		if words := s.words(line); len(words) > 0 {
			s.do(words)
		}
	}
}

// words splits a line at spaces; 'quoted words' stay whole.
func (s *script) words(line string) []string {
	if strings.HasPrefix(strings.TrimSpace(line), "#") {
		return nil
	}
	var words []string
	for i, part := range strings.Split(line, "'") {
		part = strings.ReplaceAll(part, "$ADDRESS", s.address)
		if i%2 == 1 {
			words = append(words, part)
			continue
		}
		words = append(words, strings.Fields(part)...)
	}
	return words
}

func (s *script) do(words []string) {
	s.Helper()
	wanted := words[0] != "!"
	if !wanted {
		words = words[1:]
	}
	word, args := words[0], words[1:]
	switch word {
	case "exits":
		s.exits(args[0], args[1:])
	case "background":
		s.start(args)
	case "stop":
		s.stop()
	case "stdin":
		s.stdin = s.read(args[0])
	case "answers":
		s.answers(args[0])
	case "stdout":
		s.match(word, s.stdout, args[0], wanted)
	case "stderr":
		s.match(word, s.stderr, args[0], wanted)
	case "grep":
		s.match(args[1], s.read(args[1]), args[0], wanted)
	case "exists":
		for _, name := range args {
			if _, err := os.Stat(s.path(name)); err != nil {
				s.fail("%v", err)
			}
		}
	case "cp":
		s.write(args[1], s.read(args[0]))
	case "replace":
		text := s.read(args[0])
		if !strings.Contains(text, args[1]) {
			s.fail("%s has no %q", args[0], args[1])
		}
		s.write(args[0], strings.Replace(text, args[1], args[2], 1))
	case "append":
		text := strings.ReplaceAll(args[1], `\n`, "\n")
		if len(args) > 2 {
			text += s.read(args[2])
		}
		before, _ := os.ReadFile(s.path(args[0]))
		s.write(args[0], string(before)+text)
	default:
		s.fail("a script has no %q", word)
	}
}

func (s *script) exits(code string, args []string) {
	s.Helper()
	var out, errs bytes.Buffer
	c := program(s.folder, args...)
	c.Stdin, c.Stdout, c.Stderr = strings.NewReader(s.stdin), &out, &errs
	err := c.Run()
	s.stdin, s.stdout, s.stderr = "", out.String(), errs.String()
	var exit *exec.ExitError
	if err != nil && !errors.As(err, &exit) {
		s.fail("%v", err)
	}
	if got := strconv.Itoa(c.ProcessState.ExitCode()); got != code {
		s.fail("%s = exit %s, want %s", strings.Join(args, " "), got, code)
	}
}

func (s *script) start(args []string) {
	s.Helper()
	s.background = program(s.folder, args...)
	s.said = [2]bytes.Buffer{}
	s.background.Stdin, s.background.Stdout, s.background.Stderr = strings.NewReader(s.stdin), &s.said[0], &s.said[1]
	s.stdin = ""
	if err := s.background.Start(); err != nil {
		s.fail("%v", err)
	}
}

func (s *script) stop() {
	s.Helper()
	if err := s.background.Process.Signal(os.Interrupt); err != nil {
		s.fail("%v", err)
	}
	_ = s.background.Wait() // how it ends is not the matter here
	s.background = nil
	s.stdout, s.stderr = s.said[0].String(), s.said[1].String()
}

func (s *script) answers(address string) {
	s.Helper()
	for range 400 {
		if c, err := net.Dial("tcp", address); err == nil {
			c.Close()
			return
		}
		time.Sleep(25 * time.Millisecond)
	}
	s.fail("nothing listens at %s", address)
}

func (s *script) match(what, text, pattern string, wanted bool) {
	s.Helper()
	re, err := regexp.Compile("(?m)" + pattern)
	if err != nil {
		s.fail("%v", err)
	}
	if re.MatchString(text) != wanted {
		s.fail("%s matches %q: %v, want %v", what, pattern, !wanted, wanted)
	}
}

// startProgram starts the program with its input and output open, and ends it with the test.
func startProgram(t *testing.T, folder string, args ...string) (c *exec.Cmd, in io.WriteCloser, out, errs io.Reader) {
	t.Helper()
	c = program(folder, args...)
	in, err := c.StdinPipe()
	if err != nil {
		t.Fatal(err)
	}
	if out, err = c.StdoutPipe(); err != nil {
		t.Fatal(err)
	}
	if errs, err = c.StderrPipe(); err != nil {
		t.Fatal(err)
	}
	if err := c.Start(); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() {
		c.Process.Kill()
		c.Wait()
	})
	return c, in, out, errs
}
