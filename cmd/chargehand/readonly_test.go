package main

import (
	"context"
	"io"
	"strings"
	"testing"
	"time"

	"chargehand/protocol/link/linktest"
)

// onlyReads fails unless every request that passed the proxy was one of the four read functions of the MODBUS Application
// Protocol V1.1b3, 6.1 to 6.4, and one did pass.
func onlyReads(t *testing.T, what string, proxy *linktest.Proxy) {
	t.Helper()
	requests := proxy.Requests()
	if len(requests) == 0 {
		t.Errorf("%s sent nothing, so that nothing is proved", what)
	}
	for _, r := range requests {
		if f := r[7]; f < 1 || f > 4 {
			t.Errorf("%s sent function %d (% x), want 1 to 4 only", what, f, r)
		}
	}
	if n := proxy.Writes(); n != 0 {
		t.Errorf("%s wrote %d times, want never", what, n)
	}
}

func TestTheProgramOnlyReads(t *testing.T) {
	t.Parallel()
	tests := []struct {
		name  string
		args  []string
		limit time.Duration // until it is interrupted, where it does not end by itself
	}{
		{"link", []string{"link"}, 0},
		{"link with a wrong meter", []string{"link", "--meter", "bus-voltage=10.2 V"}, 0},
		{"link --watch", []string{"link", "--watch"}, 4 * time.Second},
		{"link --json --watch", []string{"link", "--json", "--watch"}, 2 * time.Second},
		{"walk --unattended", []string{"walk", "--unattended", "--for", "3s"}, 0},
	}
	benches := make([]linkBench, len(tests))
	for i := range benches {
		benches[i] = newLinkBench(t, nil)
		benches[i].signed(t)
	}
	looks := sideBySide(len(tests), func(i int) look {
		ctx, stop := context.WithCancel(t.Context())
		defer stop()
		if tests[i].limit > 0 {
			time.AfterFunc(tests[i].limit, stop)
		}
		return benches[i].chargehand(ctx, append(tests[i].args, benches[i].site())...)
	})
	for i, test := range tests {
		if looks[i].code == exitUnable {
			t.Errorf("%s = exit %d, want it done\n%s%s", test.name, looks[i].code, looks[i].stdout, looks[i].stderr)
		}
		onlyReads(t, test.name, benches[i].proxy)
	}
}

// signed adds to the site whoever a walk needs for its log.
func (b linkBench) signed(t *testing.T) {
	t.Helper()
	text := shared(t, b.siteFile)
	if !strings.Contains(text, "[[person]]") {
		text += "\n[[person]]\nname = \"A. Tester\"\nrole = \"technician\"\n"
	}
	b.write(t, b.siteFile, strings.Replace(text, "192.0.2.21:502", b.proxy.Address(), 1))
}

// A link that is lost, and comes back, is no reason to write either.
func TestTheProgramOnlyReadsOverABadLink(t *testing.T) {
	t.Parallel()
	faults := []linktest.Fault{nil, linktest.CloseAfter(0), linktest.CloseAfter(9), nil, linktest.Exception(6), linktest.Cut(5),
		linktest.Transaction(1), nil, linktest.ForeignUnit(9), linktest.Exception(2), nil, linktest.Exception(11), linktest.Silence, nil}
	calls := [][]string{{"link", "--watch"}, {"link", "--json", "--watch"}, {"walk", "--unattended", "--for", "5s"}}
	benches := make([]linkBench, len(calls))
	for i := range benches {
		benches[i] = newLinkBench(t, nil)
		benches[i].signed(t)
		benches[i].proxy.Script(func(n int, _ []byte) linktest.Fault { return faults[n%len(faults)] })
		time.AfterFunc(3*time.Second, benches[i].proxy.Drop)
	}
	ctx, stop := context.WithTimeout(t.Context(), 6*time.Second)
	defer stop()
	sideBySide(len(calls), func(i int) look { return benches[i].chargehand(ctx, append(calls[i], benches[i].site())...) })
	for i, b := range benches {
		onlyReads(t, strings.Join(calls[i], " "), b.proxy)
		if b.proxy.Accepted() < 2 {
			t.Errorf("%v over a bad link connected %d times, want again after a loss", calls[i], b.proxy.Accepted())
		}
	}
}

// A rehearsal reads its own simulated converter, which counts every request to write.
func TestARehearsalOnlyReads(t *testing.T) {
	t.Parallel()
	b := newLinkBench(t, nil)
	a := &app{surroundings: surroundings{in: strings.NewReader(""), out: io.Discard, err: io.Discard,
		env: b.env, folder: b.folder}, now: time.Now}
	s, err := a.open(t.Context(), walkOptions{site: b.site(), rehearse: true, seed: 1, speed: 1, log: b.folder + "/rehearsal.chlog",
		say: func(string) {}})
	if err != nil {
		t.Fatal(err)
	}
	for _, act := range []string{"isolator close", "precharge close"} {
		if err := s.operator.Do(t.Context(), act); err != nil {
			t.Fatal(err)
		}
	}
	time.Sleep(2 * time.Second)
	if writes, commands := s.operator.simulator.Writes(); writes != 0 || commands != 0 {
		t.Errorf("the rehearsal sent %d writes and %d commands to its converter, want none", writes, commands)
	}
	if err := s.close(); err != nil {
		t.Error(err)
	}
	if n := len(b.proxy.Requests()) + b.proxy.Accepted(); n != 0 {
		t.Errorf("the rehearsal reached the site's device %d times, want never: it dials its own converter only", n)
	}
}
