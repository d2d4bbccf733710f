//go:build linux

package main

import (
	"bytes"
	"cmp"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strconv"
	"syscall"
	"testing"
	"time"

	"golang.org/x/sys/unix"
)

// pseudoTerminal opens a pseudo-terminal of 140 by 40: the side that a person has, and the side that the program has.
func pseudoTerminal(b *testing.B) (ours, theirs *os.File) {
	b.Helper()
	ours, err := os.OpenFile("/dev/ptmx", os.O_RDWR|syscall.O_NOCTTY, 0)
	if err != nil {
		b.Fatal(err)
	}
	fd := int(ours.Fd())
	if err := unix.IoctlSetPointerInt(fd, unix.TIOCSPTLCK, 0); err != nil {
		b.Fatal(err)
	}
	n, err := unix.IoctlGetInt(fd, unix.TIOCGPTN)
	if err != nil {
		b.Fatal(err)
	}
	if err := unix.IoctlSetWinsize(fd, unix.TIOCSWINSZ, &unix.Winsize{Row: 40, Col: 140}); err != nil {
		b.Fatal(err)
	}
	theirs, err = os.OpenFile("/dev/pts/"+strconv.Itoa(n), os.O_RDWR|syscall.O_NOCTTY, 0)
	if err != nil {
		b.Fatal(err)
	}
	return ours, theirs
}

// BenchmarkStart starts the real program in a terminal of its own, which answers what terminals are asked, waits for the start
// screen and ends it by Ctrl+C. It gives the time from the start of the process to the screen, and the CPU time of the whole
// process, both as medians; to compare, the CPU time of a process that only prints its version. At most 100 ms of CPU are
// wanted.
func BenchmarkStart(b *testing.B) {
	program := filepath.Join(b.TempDir(), "chargehand")
	if out, err := exec.Command("go", "build", "-trimpath", "-o", program, ".").CombinedOutput(); err != nil {
		b.Fatalf("%v: %s", err, out)
	}
	home := b.TempDir()
	var screen, cpu, bare []time.Duration
	for b.Loop() {
		ours, theirs := pseudoTerminal(b)
		cmd := exec.Command(program)
		cmd.Stdin, cmd.Stdout, cmd.Stderr, cmd.Dir = theirs, theirs, theirs, home
		cmd.Env = []string{"HOME=" + home, "TERM=xterm-256color"}
		cmd.SysProcAttr = &syscall.SysProcAttr{Setsid: true, Setctty: true}
		began := time.Now()
		if err := cmd.Start(); err != nil {
			b.Fatal(err)
		}
		theirs.Close()
		guard := time.AfterFunc(10*time.Second, func() { cmd.Process.Kill() })
		var seen []byte
		answered := false // the question for ground colour and place of the cursor
		for part := make([]byte, 4096); !bytes.Contains(seen, []byte("built-in example")); {
			n, err := ours.Read(part)
			if err != nil {
				b.Fatalf("the program ended without its start screen (%v): %q", err, seen)
			}
			seen = append(seen, part[:n]...)
			if !answered && bytes.Contains(seen, []byte("\x1b[6n")) {
				answered = true
				if _, err := ours.WriteString("\x1b]11;rgb:0000/0000/0000\x1b\\\x1b[1;1R"); err != nil {
					b.Fatal(err)
				}
			}
		}
		screen = append(screen, time.Since(began))
		if _, err := ours.Write([]byte{3}); err != nil {
			b.Fatal(err)
		}
		for part := make([]byte, 4096); ; {
			if _, err := ours.Read(part); err != nil {
				break // it has let go of its terminal
			}
		}
		if err := cmd.Wait(); err != nil {
			b.Fatal(err)
		}
		guard.Stop()
		ours.Close()
		cpu = append(cpu, cmd.ProcessState.UserTime()+cmd.ProcessState.SystemTime())
		version := exec.Command(program, "--version")
		if err := version.Run(); err != nil {
			b.Fatal(err)
		}
		bare = append(bare, version.ProcessState.UserTime()+version.ProcessState.SystemTime())
	}
	b.ReportMetric(milliseconds(middle(screen)), "ms-to-screen")
	b.ReportMetric(milliseconds(middle(cpu)), "ms-CPU")
	b.ReportMetric(milliseconds(middle(bare)), "ms-CPU-version")
}

func milliseconds(d time.Duration) float64 { return float64(d) / 1e6 }

func middle[T cmp.Ordered](all []T) T {
	slices.Sort(all)
	return all[len(all)/2]
}
