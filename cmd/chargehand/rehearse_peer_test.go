//go:build peer

package main

import (
	"bufio"
	"bytes"
	"encoding/json"
	"fmt"
	"io"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
	"time"

	"chargehand/commission/chlog"
	"chargehand/commission/record"
)

// ending is what one run of the program came to.
type ending struct {
	code        int
	out, errs   string
	log         string
	lines       []chlog.Line
	took        time.Duration
	byID        map[string]judgedFinding
	resultOf    map[string]string
	attemptsHad int
}

// judgedFinding is as much of a finding as these tests look at.
type judgedFinding struct {
	ID, Subject, Verdict string
	Because              []string
	Cause                []struct{ ID string }
}

// rehearsed goes a whole unattended rehearsal as a process and reads its log.
func rehearsed(t *testing.T, args ...string) ending {
	t.Helper()
	folder := t.TempDir()
	e := ending{log: filepath.Join(folder, "walk.chlog")}
	var out, errs bytes.Buffer
	c := program(folder, append([]string{"rehearse", "--unattended", "--log", e.log}, args...)...)
	c.Stdout, c.Stderr = &out, &errs
	began := time.Now()
	_ = c.Run()
	e.took, e.code, e.out, e.errs = time.Since(began), c.ProcessState.ExitCode(), out.String(), withoutRecords(errs.String())
	e.read(t)
	return e
}

// withoutRecords leaves the acknowledgements out, so that a failure can be read.
func withoutRecords(text string) string {
	var kept []string
	for _, line := range strings.Split(text, "\n") {
		if !strings.HasPrefix(line, "seq ") {
			kept = append(kept, line)
		}
	}
	return strings.Join(kept, "\n")
}

func (e *ending) read(t *testing.T) {
	t.Helper()
	lines, err := chlog.ReadFile(e.log)
	if err != nil {
		t.Fatalf("%v\n%s", err, e.errs)
	}
	e.lines, e.byID, e.resultOf = lines, map[string]judgedFinding{}, map[string]string{}
	for _, line := range lines {
		body, err := line.Decode()
		if err != nil {
			t.Fatal(err)
		}
		switch b := body.(type) {
		case record.Finding:
			var f judgedFinding
			if err := json.Unmarshal(b.JSON, &f); err != nil {
				t.Fatal(err)
			}
			e.byID[strings.TrimSuffix(f.ID+":"+f.Subject, ":")] = f
		case record.Point:
			e.resultOf[b.ID] = b.Result
		case record.Attempt:
			e.attemptsHad = b.N
		}
	}
}

func TestWholeRehearsal(t *testing.T) {
	e := rehearsed(t)
	if e.code != 0 || !strings.Contains(e.out, "verdict    marginal") {
		t.Fatalf("exit %d, want 0 and marginal (the discharge label)\n%s%s", e.code, e.out, e.errs)
	}
	t.Logf("%d records in %v", len(e.lines), e.took.Round(time.Second))
	for _, id := range []string{"measured.precharge", "measured.closing", "measured.window", "measured.droop:forward string", "measured.setpoint:forward string",
		"measured.current-mode", "measured.discharge", "measured.sensor:bus-voltage", "measured.sensor:source-voltage", "measured.trip:emergency-stop",
		"measured.trip:time-out", "measured.trip:bypass-lost", "measured.trip:over-voltage", "measured.trip:under-voltage",
		"measured.trip:source-withdrawn", "measured.trip:earth-fault"} {
		if got := e.byID[id]; got.Verdict != "pass" && got.Verdict != "marginal" {
			t.Errorf("%s = %+v, want pass, or marginal where a busy computer leaves gaps", id, got)
		}
	}
	if e.attemptsHad != 2 {
		t.Errorf("%d attempts counted, want the charge and the provoked time-out", e.attemptsHad)
	}
	for _, id := range []string{"trip.stop", "trip.time-out", "trip.voltage", "share.keyed", "leave.handover"} {
		if e.resultOf[id] != "pass" {
			t.Errorf("%s = %q, want pass", id, e.resultOf[id])
		}
	}
	for _, name := range []string{e.log + ".sig", strings.TrimSuffix(e.log, ".chlog") + ".pdf"} {
		if info, err := os.Stat(name); err != nil || info.Size() == 0 {
			t.Errorf("%s is missing or empty: %v", filepath.Base(name), err)
		}
	}
	verify := program(filepath.Dir(e.log), "verify", e.log)
	if said, err := verify.CombinedOutput(); err != nil || !bytes.HasPrefix(bytes.TrimSpace(said), []byte("REHEARSAL")) && !bytes.Contains(said, []byte("REHEARSAL")) {
		t.Errorf("verify = %v\n%s\nwant exit 0 and REHEARSAL", err, said)
	}
}

func TestDisturbancesAreNamed(t *testing.T) {
	for _, name := range []string{"resistor-high", "load-left-on"} {
		t.Run(name, func(t *testing.T) {
			t.Parallel()
			e := rehearsed(t, "--disturb", name)
			f := e.byID["measured.precharge"]
			if e.code != 1 || f.Verdict != "fail" || len(f.Cause) == 0 || f.Cause[0].ID != name {
				t.Errorf("exit %d, measured.precharge %+v, want exit 1, fail, and %s first\n%s", e.code, f, name, e.errs)
			}
		})
	}
}

// TestShareOverTwoDevices: a site whose second infeed is polled too has its sharing measured.
func TestShareOverTwoDevices(t *testing.T) {
	folder := t.TempDir()
	for _, name := range []string{"wagtail.site.toml", "wagtail.map.toml"} {
		text := shared(t, name)
		if name == "wagtail.site.toml" {
			text += "\n[[peer]]\ninfeed = \"shore rectifier\"\naddress = \"192.0.2.22:502\"\nunit_id = 3\nmap = \"wagtail.map.toml\"\n"
		}
		if err := os.WriteFile(filepath.Join(folder, name), []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	e := rehearsed(t, filepath.Join(folder, "wagtail.site.toml"))
	if got := e.byID["measured.share:aft string"].Verdict; got != "pass" || e.resultOf["share.share"] != "pass" {
		t.Errorf("measured.share = %q, share.share %q, want both pass\n%s", got, e.resultOf["share.share"], e.errs)
	}
}

// TestKilledAndResumed kills unattended rehearsals without warning and goes on with their logs. What had been acknowledged (a
// line `seq N`) must be there again each time, and every finished log must verify. The first twelve kills fall into the
// twelve stages, later ones at random. CHARGEHAND_KILLS=500 is the long form:
//
//	CHARGEHAND_KILLS=500 go test -tags peer -run TestKilledAndResumed -timeout 90m ./cmd/chargehand
func TestKilledAndResumed(t *testing.T) {
	kills := 12
	if more, err := strconv.Atoi(os.Getenv("CHARGEHAND_KILLS")); err == nil {
		kills = more
	}
	random := rand.New(rand.NewPCG(20261201, uint64(kills)))
	folder := t.TempDir()
	log := filepath.Join(folder, "walk0.chlog")
	finished := 0
	for k := 1; k <= kills; k++ {
		c, _, out, errs := startProgram(t, folder, "rehearse", "--unattended", "--log", log)
		go io.Copy(io.Discard, out)
		acknowledged, said := killAt(t, c.Process, errs, k, random)
		_ = c.Wait()
		ended := c.ProcessState.Exited()
		if ended && c.ProcessState.ExitCode() == exitUnable {
			t.Fatalf("kill %d: %s cannot be gone on with\n%s", k, filepath.Base(log), withoutRecords(said))
		}
		if lastWhole(t, log) < acknowledged {
			t.Fatalf("kill %d: record %d was acknowledged, the log holds %d", k, acknowledged, lastWhole(t, log))
		}
		if ended {
			verified(t, folder, log, c.ProcessState.ExitCode())
			finished++
			log = filepath.Join(folder, fmt.Sprintf("walk%d.chlog", finished))
		}
	}
	if _, err := os.Stat(log); err == nil { // the last one goes to its end
		c := program(folder, "rehearse", "--unattended", "--log", log)
		_ = c.Run()
		verified(t, folder, log, c.ProcessState.ExitCode())
	}
	t.Logf("%d kills, %d walks finished between them", kills, finished)
}

// killAt reads the acknowledgements until the moment comes, and kills. It gives the last record that was acknowledged, and
// all that was said.
func killAt(t *testing.T, p *os.Process, errs io.Reader, k int, random *rand.Rand) (acknowledged int64, said string) {
	t.Helper()
	acknowledged = -1
	lines := make(chan string, 1024)
	go func() {
		defer close(lines)
		for scan := bufio.NewScanner(errs); scan.Scan(); {
			lines <- scan.Text()
		}
	}()
	var due <-chan time.Time
	if k > 12 {
		due = time.After(time.Duration(random.IntN(4000)) * time.Millisecond)
	}
	for {
		select {
		case line, open := <-lines:
			if !open {
				return acknowledged, said
			}
			said += line + "\n"
			var n int64
			if _, err := fmt.Sscanf(line, "seq %d ", &n); err == nil {
				acknowledged = n
			}
			if k <= 12 && strings.HasPrefix(line, fmt.Sprintf("stage %d,", k)) {
				due = time.After(time.Duration(random.IntN(200)) * time.Millisecond)
			}
		case <-due:
			if err := p.Kill(); err != nil {
				t.Log(err) // it has just ended by itself
			}
			for line := range lines { // what was said before the kill counts
				var n int64
				if _, err := fmt.Sscanf(line, "seq %d ", &n); err == nil {
					acknowledged = n
				}
			}
			return acknowledged, said
		case <-time.After(3 * time.Minute):
			t.Fatalf("kill %d: nothing for three minutes", k)
		}
	}
}

// lastWhole is the last whole record of a log; a torn line behind it is not counted. -1 without a log.
func lastWhole(t *testing.T, path string) int64 {
	t.Helper()
	f, err := os.Open(path)
	if err != nil {
		return -1
	}
	defer f.Close()
	last := int64(-1)
	for r := chlog.NewReader(f); ; {
		line, err := r.Next()
		if err != nil {
			return last
		}
		last = line.Seq
	}
}

// verified holds that a finished log is whole.
func verified(t *testing.T, folder, log string, code int) {
	t.Helper()
	if code == 2 {
		t.Errorf("%s: the walk could not be gone on with to its end", filepath.Base(log))
		return
	}
	said, err := program(folder, "verify", log).CombinedOutput()
	if err != nil {
		t.Errorf("verify %s = %v\n%s", filepath.Base(log), err, said)
	}
}
