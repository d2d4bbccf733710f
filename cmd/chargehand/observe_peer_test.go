//go:build peer

package main

import (
	"bufio"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// TestObserveARunningPlant lets the simulated converter run as a process of its own, has it operated by its console, and
// watches it from charge to discharge with `walk --unattended`: nothing is operated from here and no point is decided.
func TestObserveARunningPlant(t *testing.T) {
	folder := t.TempDir()
	// A quicker discharge: a smaller bleeder, and a bus that counts as safe sooner. A much smaller bleeder would keep the bypass
	// open. The auxiliary load, which a prediction of the discharge leaves out, matters near the full voltage: it is small.
	text := shared(t, "wagtail.site.toml")
	for _, change := range [][2]string{{`touch_safe         = { voltage = "60 V"`, `touch_safe         = { voltage = "960 V"`}, {`value = "22 kΩ ±5 %"`, `value = "9 kΩ ±5 %"`},
		{`power     = "40 W"`, `power     = "1 W"`}} {
		if !strings.Contains(text, change[0]) {
			t.Fatalf("the site has no %s", change[0])
		}
		text = strings.Replace(text, change[0], change[1], 1)
	}
	text += "\n[[person]]\nrole = \"technician\"\nname = \"A. Example\"\n"
	site := filepath.Join(folder, "wagtail.site.toml")
	for name, content := range map[string]string{"wagtail.site.toml": text, "wagtail.map.toml": shared(t, "wagtail.map.toml")} {
		if err := os.WriteFile(filepath.Join(folder, name), []byte(content), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	_, console, out, _ := startProgram(t, folder, "simulate", "--listen", "127.0.0.1:0", site)
	said := bufio.NewReader(out)
	first, err := said.ReadString('\n')
	if err != nil {
		t.Fatal(err)
	}
	address := strings.Fields(first[strings.Index(first, " on ")+4:])[0]
	go io.Copy(io.Discard, said)
	do := func(act string) {
		t.Helper()
		if _, err := io.WriteString(console, act+"\n"); err != nil {
			t.Fatal(err)
		}
	}

	e := ending{log: filepath.Join(folder, "seen.chlog")}
	c, _, walkOut, walkErr := startProgram(t, folder, "walk", "--unattended", "--for", "2m", "--log", e.log, "--address", address, site)
	var all strings.Builder
	results := make(chan string, 1)
	go func() { text, _ := io.ReadAll(walkOut); results <- string(text) }()
	loading := false
	for scan := bufio.NewScanner(walkErr); scan.Scan(); {
		line := scan.Text()
		fmt.Fprintln(&all, line)
		switch {
		case strings.HasPrefix(line, "armed: First rise"):
			do("isolator close")
			time.Sleep(500 * time.Millisecond)
			do("precharge close")
		case strings.Contains(line, " note") && !loading && strings.Contains(all.String(), " capture"):
			loading = true
			do("release") // the charge is over
		case strings.HasPrefix(line, "armed: Load stairs"):
			for _, act := range []string{"load off", "load 20 %", "load 40 %", "load 60 %", "load 30 %", "load off"} {
				do(act)
				time.Sleep(1300 * time.Millisecond)
			}
			do("block")
		case strings.HasPrefix(line, "armed: Discharge"):
			time.Sleep(300 * time.Millisecond)
			do("discharge")
		}
	}
	_ = c.Wait()
	e.code, e.out, e.errs = c.ProcessState.ExitCode(), <-results, withoutRecords(all.String())
	e.read(t)
	if e.code != 0 || !strings.Contains(e.out, "verdict    undecided") {
		t.Errorf("exit %d\n%s%s\nwant 0 and undecided: what needs a hand is open", e.code, e.out, e.errs)
	}
	for _, id := range []string{"measured.precharge", "measured.closing", "measured.droop:aft string", "measured.discharge"} {
		if f := e.byID[id]; f.Verdict == "" || f.Verdict == "fail" {
			t.Errorf("%s = %+v, want it measured and not failed", id, f)
		}
	}
	if len(e.resultOf) != 0 {
		t.Errorf("points decided: %v, want none without a hand", e.resultOf)
	}
	last := e.lines[len(e.lines)-1]
	if last.Kind != "seal" {
		t.Errorf("the last record is a %s, want the seal", last.Kind)
	}
	if strings.Contains(e.errs, "the time to watch is over") {
		t.Error("it ended by its limit, want by the end of the discharge")
	}
}
