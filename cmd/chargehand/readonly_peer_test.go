//go:build peer

package main

import (
	"context"
	"encoding/json"
	"fmt"
	"io"
	"math"
	"net"
	"os/exec"
	"regexp"
	"strconv"
	"strings"
	"testing"
	"time"

	"chargehand/commission/signal"
)

var (
	servedAt = regexp.MustCompile(`simulated, on (127\.0\.0\.1:\d+) unit 1`)
	pollLine = regexp.MustCompile(`(?m)^\[(\d+)\]:\s+(-?\d+)`)
)

// mbpoll, which is libmodbus's, reads the simulated converter and gets the numbers that `link --json` shows: settings to the
// digit, and measurements within their noise.
func TestMbpollGetsTheNumbersThatLinkShows(t *testing.T) {
	b := newLinkBench(t, nil)
	ctx, stop := context.WithCancel(t.Context())
	stdin, typing := io.Pipe()
	var out, stderr safeBuffer
	ended := make(chan int)
	go func() {
		ended <- run(ctx, []string{"simulate", "--listen", "127.0.0.1:0", b.site()}, surroundings{in: stdin, out: &out, err: &stderr,
			env: b.env, folder: b.folder})
	}()
	defer func() {
		stop()
		typing.Close()
		if code := <-ended; code != exitDone {
			t.Errorf("simulate = exit %d, want %d\n%s", code, exitDone, stderr.String())
		}
	}()
	waitFor := func(text string) {
		t.Helper()
		for range 200 {
			if strings.Contains(out.String(), text) {
				return
			}
			time.Sleep(50 * time.Millisecond)
		}
		t.Fatalf("simulate prints %s%s, want %q", out.String(), stderr.String(), text)
	}
	waitFor("unit 1")
	address := servedAt.FindStringSubmatch(out.String())[1]
	fmt.Fprintln(typing, "isolator close")
	waitFor("done: isolator close")
	time.Sleep(500 * time.Millisecond)

	l := b.chargehand(t.Context(), "link", "--json", "--address", address, b.site())
	if l.code != exitDone {
		t.Fatalf("link --json = exit %d, want %d\n%s", l.code, exitDone, l.stderr)
	}
	var shown linkJSON
	if err := json.Unmarshal([]byte(l.stdout), &shown); err != nil {
		t.Fatal(err)
	}
	measured := mbpoll(t, address, 100, 24)
	settings := mbpoll(t, address, 200, 6)
	noise := map[signal.Name]float64{signal.SourceVoltage: 4, signal.BusVoltage: 4, signal.StarPointVoltage: 4, signal.ResistorTemperature: 1,
		signal.HeatsinkTemperature: 1}
	for i, p := range b.registers.Points {
		s := shown.Signals[i]
		if s.Name != string(p.Name) || s.Value == nil {
			t.Errorf("link --json: signal %d = %+v, want a value of %s", i, s, p.Name)
			continue
		}
		table, within := settings, 0.0
		if p.Address < 200 {
			table = measured
			known := false
			if within, known = noise[p.Name]; !known {
				continue // a count, a state or a current about zero: it says little, or moves
			}
		}
		words := make([]uint16, p.Words())
		for k := range words {
			words[k] = uint16(table[int(p.Address)+k])
		}
		if want := p.Decode(words).Value; math.Abs(*s.Value-want) > within {
			t.Errorf("link --json: %s = %g, want %g within %g, as mbpoll reads %v", p.Name, *s.Value, want, within, words)
		}
	}
	if v := measured[101]; v < 6000 {
		t.Errorf("mbpoll reads %d at holding 101, want the source's voltage in tenths of a volt", v)
	}
}

// mbpoll reads holding registers, counted from 0, by `mbpoll -m tcp -p PORT -a 1 -0 -r FIRST -c COUNT -t 4 -1 -q HOST`.
func mbpoll(t *testing.T, address string, first, count int) map[int]int {
	t.Helper()
	host, port, err := net.SplitHostPort(address)
	if err != nil {
		t.Fatal(err)
	}
	ctx, stop := context.WithTimeout(t.Context(), 10*time.Second)
	defer stop()
	text, err := exec.CommandContext(ctx, "mbpoll", "-m", "tcp", "-p", port, "-a", "1", "-0", "-r", strconv.Itoa(first), "-c", strconv.Itoa(count),
		"-t", "4", "-1", "-q", host).CombinedOutput()
	if err != nil {
		t.Fatalf("mbpoll: %v: %s", err, text)
	}
	values := map[int]int{}
	for _, m := range pollLine.FindAllStringSubmatch(string(text), -1) {
		at, _ := strconv.Atoi(m[1])
		values[at], _ = strconv.Atoi(m[2])
	}
	if len(values) != count {
		t.Fatalf("mbpoll gives %d values, want %d: %s", len(values), count, text)
	}
	return values
}
