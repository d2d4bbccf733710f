//go:build peer

package simulator

import (
	"context"
	"fmt"
	"math"
	"net"
	"os/exec"
	"regexp"
	"strconv"
	"testing"
	"time"
)

var polled = regexp.MustCompile(`(?m)^\[(\d+)\]:\s+(-?\d+)`)

// TestMbpollReadsTheSimulator lets libmodbus's client read voltages in one block, and meet a hole.
func TestMbpollReadsTheSimulator(t *testing.T) {
	s, _, address := serve(t, 1)
	act, err := ParseAct("isolator close")
	if err != nil {
		t.Fatal(err)
	}
	if err := s.Do(t.Context(), act); err != nil {
		t.Fatal(err)
	}
	_, port, err := net.SplitHostPort(address)
	if err != nil {
		t.Fatal(err)
	}
	poll := func(register, count int) (map[int]float64, error) {
		ctx, cancel := context.WithTimeout(t.Context(), 10*time.Second)
		defer cancel()
		out, err := exec.CommandContext(ctx, "mbpoll", "-m", "tcp", "-p", port, "-a", "1", "-0", "-r", strconv.Itoa(register), "-c",
			strconv.Itoa(count), "-t", "4", "-1", "-q", "127.0.0.1").CombinedOutput()
		values := map[int]float64{}
		for _, m := range polled.FindAllStringSubmatch(string(out), -1) {
			at, _ := strconv.Atoi(m[1])
			values[at], _ = strconv.ParseFloat(m[2], 64)
		}
		if err != nil {
			err = fmt.Errorf("mbpoll: %w: %s", err, out)
		}
		return values, err
	}
	time.Sleep(300 * time.Millisecond)
	values, err := poll(100, 24)
	if err != nil {
		t.Fatal(err)
	}
	if emf := s.Truth()["source.emf"]; math.Abs(values[101]*0.1-emf) > 8 {
		t.Errorf("register 101 by mbpoll = %g, want ten times %.1f V", values[101], emf)
	}
	if values[110] < 250 || values[110] > 400 {
		t.Errorf("register 110 by mbpoll = %g, want ten times the ambient temperature", values[110])
	}
	if _, err := poll(150, 1); err == nil {
		t.Error("mbpoll of a hole = nil, want exception 2")
	}
}
