//go:build peer

package main

import (
	"bytes"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strings"
	"syscall"
	"testing"
	"time"

	"chargehand/commission/chlog"
)

// terminal is the real program in a real terminal, a tmux session of its own.
type terminal struct {
	t      *testing.T
	socket string
	home   string
	binary string
}

// shellPrompt is what the shell shows when no program runs in it.
const shellPrompt = "no-program> "

// screenPatience is how long the screen may take to show what is waited for.
const screenPatience = 60 * time.Second

func newTerminal(t *testing.T, width, height int) *terminal {
	t.Helper()
	if _, err := exec.LookPath("tmux"); err != nil {
		t.Fatalf("this test drives the program in tmux: %v", err)
	}
	dir := t.TempDir()
	term := &terminal{t: t, socket: filepath.Join(dir, "tmux"), home: filepath.Join(dir, "home"), binary: filepath.Join(dir, "chargehand")}
	if err := os.MkdirAll(term.home, 0o700); err != nil {
		t.Fatal(err)
	}
	if out, err := exec.Command("go", "build", "-o", term.binary, ".").CombinedOutput(); err != nil {
		t.Fatalf("go build: %v\n%s", err, out)
	}
	term.tmux("-f", "/dev/null", "new-session", "-d", "-x", fmt.Sprint(width), "-y", fmt.Sprint(height), "env", "PS1="+shellPrompt, "sh")
	t.Cleanup(func() { _ = exec.Command("tmux", "-S", term.socket, "kill-server").Run() })
	return term
}

func (term *terminal) tmux(args ...string) string {
	term.t.Helper()
	out, err := exec.Command("tmux", append([]string{"-S", term.socket}, args...)...).CombinedOutput()
	if err != nil {
		term.t.Fatalf("tmux %q: %v\n%s", args, err, out)
	}
	return string(out)
}

// start starts the program in the terminal's shell; its folder is empty and its home the test's.
func (term *terminal) start() {
	term.tmux("send-keys", "-l", fmt.Sprintf("stty sane; reset; cd %s && clear && HOME=%s XDG_STATE_HOME= XDG_CONFIG_HOME= NO_COLOR=1 %s", term.home, term.home, term.binary))
	term.tmux("send-keys", "C-j") // a killed program leaves the terminal as it had it: Enter is no line end to the shell
}

func (term *terminal) screen() string { return term.tmux("capture-pane", "-p") }

func (term *terminal) press(keys ...string) {
	term.tmux(append([]string{"send-keys"}, keys...)...)
}

// sees waits until the screen shows all texts.
func (term *terminal) sees(texts ...string) string {
	term.t.Helper()
	var screen string
	for end := time.Now().Add(screenPatience); time.Now().Before(end); time.Sleep(50 * time.Millisecond) {
		screen = term.screen()
		missing := false
		for _, text := range texts {
			missing = missing || !strings.Contains(screen, text)
		}
		if !missing {
			return screen
		}
	}
	term.t.Fatalf("the screen does not show %q within %s:\n%s", texts, screenPatience, screen)
	return ""
}

// openPoint is the point that the walk's screen shows.
var openPoint = regexp.MustCompile(`(?m)│ ([a-z]+\.[a-z-]+)  `)

// footer is the line of the keys.
func footer(screen string) string {
	lines := strings.Split(strings.TrimRight(screen, "\n "), "\n")
	return lines[len(lines)-1]
}

// walkTo goes the walk by keys alone until the point is open: what the foot of the screen says is what is pressed.
func (term *terminal) walkTo(point string) {
	term.t.Helper()
	for end := time.Now().Add(4 * time.Minute); time.Now().Before(end); time.Sleep(80 * time.Millisecond) {
		screen := term.screen()
		if m := openPoint.FindStringSubmatch(screen); m != nil && m[1] == point {
			return
		}
		term.onward(screen)
	}
	term.t.Fatalf("the walk does not come to %s:\n%s", point, term.screen())
}

// onward presses what goes on from a screen.
func (term *terminal) onward(screen string) {
	switch foot := footer(screen); {
	case strings.Contains(screen, "as noted during the capture"):
		term.press("Enter")
	case strings.Contains(foot, "nothing entered") && strings.Contains(foot, "Ctrl+T"):
		term.press("C-t")
		time.Sleep(200 * time.Millisecond)
		term.press("Enter")
	case strings.Contains(foot, "nothing entered"):
		term.press("Enter")
	case strings.Contains(screen, "plant   o: "):
		term.press("o")
		time.Sleep(300 * time.Millisecond)
	case strings.Contains(foot, "waits for the plant"), strings.Contains(foot, "capture runs"):
	case strings.Contains(foot, "something is missing"):
		// A machine too busy to poll in time leaves gaps in the capture, and then it decides nothing: the point is failed
		// with its reason, and accepted by a deviation.
		term.press("u")
		time.Sleep(200 * time.Millisecond)
		term.press("C-n", "Enter")
		time.Sleep(500 * time.Millisecond)
		term.press("d")
		time.Sleep(200 * time.Millisecond)
		term.tmux("send-keys", "-l", "the machine was too busy to poll in time")
		term.press("Enter", "Enter")
		time.Sleep(500 * time.Millisecond)
	case strings.Contains(foot, "x not applicable"):
		term.press("x")
	case strings.Contains(foot, "not met"):
		term.press("r")
		time.Sleep(500 * time.Millisecond)
	default:
		term.press("Enter")
	}
}

// log is the only log in the state folder.
func (term *terminal) log() (path string, text []byte) {
	term.t.Helper()
	logs, err := filepath.Glob(filepath.Join(term.home, ".local/state/chargehand/*.chlog"))
	if err != nil || len(logs) != 1 {
		term.t.Fatalf("logs = %q, %v; want one", logs, err)
	}
	text, err = os.ReadFile(logs[0])
	if err != nil {
		term.t.Fatal(err)
	}
	return logs[0], text
}

// kill ends the program as a power cut would.
func (term *terminal) kill() {
	term.t.Helper()
	shell := strings.TrimSpace(term.tmux("display-message", "-p", "#{pane_pid}"))
	out, err := exec.Command("ps", "-o", "pid=", "--ppid", shell).Output()
	if err != nil {
		term.t.Fatalf("find the program below shell %s: %v", shell, err)
	}
	var pid int
	if _, err := fmt.Sscan(string(out), &pid); err != nil {
		term.t.Fatalf("find the program in %q: %v", out, err)
	}
	if err := syscall.Kill(pid, syscall.SIGKILL); err != nil {
		term.t.Fatal(err)
	}
	term.sees(strings.TrimSpace(shellPrompt))
}

// TestTerminal goes the rehearsal from the start screen through the pre-charge stage by keys alone, in a real terminal: it is
// made smaller than the least size and larger again, and killed in mid-walk; what was acknowledged on the screen is on disk,
// and Enter goes on where the log ends.
func TestTerminal(t *testing.T) {
	term := newTerminal(t, 100, 30)
	term.start()
	term.sees("chargehand", "rehearse the built-in example", "does not authorise")
	term.press("Enter")
	term.sees("REHEARSAL", "safe.permit", "link good")

	term.press("Enter")
	term.sees("Ctrl+N")
	term.tmux("send-keys", "-l", "PTW-118")
	term.press("Enter")
	acknowledged := term.sees("on disk: what was seen", "PTW-118")
	if _, text := term.log(); !bytes.Contains(text, []byte("PTW-118")) {
		t.Fatalf("the screen acknowledges what the log lacks:\n%s", acknowledged)
	}

	term.tmux("resize-window", "-x", "60", "-y", "20")
	term.sees("chargehand needs 80 columns and 24 rows")
	term.tmux("resize-window", "-x", "140", "-y", "40")
	term.sees("Permit to work", "pre-charge", "pass and sign")
	term.tmux("resize-window", "-x", "80", "-y", "24")
	term.sees("pass and sign", "? keys", "Esc leave")

	term.walkTo("charge.bus-state")
	term.sees("charge.source")
	_, before := term.log()
	term.kill()
	_, after := term.log()
	if !bytes.HasPrefix(after, before) {
		t.Fatal("the kill has changed what was on disk")
	}

	term.start()
	term.sees("not finished", "charge.source")
	term.press("Enter")
	term.sees("REHEARSAL", "charge.bus-state", "link good")
	term.walkTo("charge.rise")
	term.walkTo("rest.sensors")
	term.sees("Pre-charge")

	path, text := term.log()
	for _, want := range []string{`"kind":"resumed"`, `"kind":"attempt"`, `"what":"precharge"`, `"id":"measured.precharge"`, `{"id":"charge.close","result":"`, `"kind":"sign-off"`} {
		if !bytes.Contains(text, []byte(want)) {
			t.Errorf("the log lacks %s", want)
		}
	}
	r := chlog.NewReader(bytes.NewReader(text))
	records := 0
	for {
		if _, err := r.Next(); err != nil {
			break
		}
		records++
	}
	if lines := bytes.Count(text, []byte("\n")); records != lines {
		t.Errorf("%s: %d of %d lines hold together", filepath.Base(path), records, lines)
	}

	term.press("Escape")
	term.sees("not finished")
	term.press("Escape")
	term.sees(strings.TrimSpace(shellPrompt))
}
