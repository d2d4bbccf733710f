package main

import (
	"bytes"
	"context"
	"encoding/json"
	"fmt"
	"io"
	"maps"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"sync"
	"testing"
	"time"

	"chargehand/commission/signal"
	"chargehand/protocol/link/linktest"
	"chargehand/protocol/registermap"
	"chargehand/tui/theme"
)

// linkBench is a site in a folder of its own, with a device behind a recording proxy.
type linkBench struct {
	folder, siteFile, mapFile string
	image                     *linktest.Image
	proxy                     *linktest.Proxy
	registers                 registermap.Map // of the device, which the map file may get wrong
}

// boosting is a plant that holds its bus, every signal of the example map given.
var boosting = map[signal.Name]float64{signal.BusVoltage: 1024.3, signal.SourceVoltage: 724.8, signal.StarPointVoltage: 724.1,
	signal.SourceCurrent: 72.4, signal.BusCurrent: 50.1, signal.PhaseCurrent1: 24.3, signal.PhaseCurrent2: 23.9, signal.PhaseCurrent3: 24.2,
	signal.Power: 52480, signal.ResistorTemperature: 36.4, signal.HeatsinkTemperature: 41.7, signal.InsulationResistance: 2.31e6,
	signal.Ready: 1, signal.Running: 1, signal.BypassClosed: 1, signal.Mode: 1, signal.VoltageSetpoint: 1030, signal.DroopSetting: 0.1364,
	signal.PowerReference: 0, signal.ChargeLimit: 260, signal.DischargeLimit: 400}

// newLinkBench sets up the example site. edit changes its map file; the device keeps to the map as it was.
func newLinkBench(t *testing.T, edit func(mapText string) string) linkBench {
	t.Helper()
	b := linkBench{folder: t.TempDir(), siteFile: "wagtail.site.toml", mapFile: "wagtail.map.toml", image: &linktest.Image{}}
	siteText := shared(t, b.siteFile)
	mapText := shared(t, b.mapFile)
	m, err := registermap.Read(b.mapFile, []byte(mapText))
	if err != nil {
		t.Fatal(err)
	}
	b.registers = m
	b.set(t, boosting)
	for a := range 300 {
		if a < 95 || a > 130 && a < 195 || a > 210 {
			b.image.Remove(1, 3, a)
		}
		b.image.Remove(1, 4, a)
	}
	b.proxy = linktest.NewProxy(b.image.Answer)
	if err := b.proxy.Listen(); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(b.proxy.Close)
	if edit != nil {
		mapText = edit(mapText)
	}
	siteText = strings.Replace(siteText, "192.0.2.21:502", b.proxy.Address(), 1)
	b.write(t, b.siteFile, siteText)
	b.write(t, b.mapFile, mapText)
	return b
}

func shared(t *testing.T, name string) string {
	t.Helper()
	text, err := os.ReadFile(filepath.Join("..", "..", "testdata", "sites", name))
	if err != nil {
		t.Fatal(err)
	}
	return string(text)
}

func (b linkBench) write(t *testing.T, name, text string) {
	t.Helper()
	if err := os.WriteFile(filepath.Join(b.folder, name), []byte(text), 0o600); err != nil {
		t.Fatal(err)
	}
}

// set puts values into the device's registers by its own map.
func (b linkBench) set(t *testing.T, values map[signal.Name]float64) {
	t.Helper()
	bits := map[registermap.Address]uint16{}
	for _, p := range b.registers.Points {
		words, err := p.Encode(values[p.Name])
		if err != nil {
			t.Fatal(err)
		}
		if p.Type == registermap.Bit {
			bits[p.Address] |= words[0]
			words = []uint16{bits[p.Address]}
		}
		b.image.Set(1, p.Table.FunctionCode(), int(p.Address), words...)
	}
}

// look is what one call of the program printed.
type look struct {
	stdout, stderr string
	code           int
}

// chargehand runs the program in the bench's folder.
func (b linkBench) chargehand(ctx context.Context, args ...string) look {
	var out, err safeBuffer
	code := run(ctx, args, surroundings{in: strings.NewReader(""), out: &out, err: &err, env: b.env, folder: b.folder})
	return look{out.String(), err.String(), code}
}

// sideBySide takes n looks at once, since they wait most of their time.
func sideBySide(n int, take func(i int) look) []look {
	looks := make([]look, n)
	var wait sync.WaitGroup
	for i := range n {
		wait.Go(func() { looks[i] = take(i) })
	}
	wait.Wait()
	return looks
}

// env is an environment without anything but a home.
func (b linkBench) env(name string) (string, bool) {
	if name == "HOME" || strings.HasPrefix(name, "XDG_") {
		return b.folder, true
	}
	return "", false
}

// safeBuffer may be written to from several goroutines.
type safeBuffer struct {
	mu sync.Mutex
	b  bytes.Buffer
}

func (s *safeBuffer) Write(p []byte) (int, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.b.Write(p)
}

func (s *safeBuffer) String() string {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.b.String()
}

func (b linkBench) site() string { return filepath.Join(b.folder, b.siteFile) }

// in edits the table of one signal in a map file.
func in(name signal.Name, old, new string) func(string) string {
	return func(text string) string {
		at := strings.Index(text, `"`+string(name)+`"`)
		end := len(text)
		if next := strings.Index(text[at:], "[[signal]]"); next >= 0 {
			end = at + next
		}
		return text[:at] + strings.Replace(text[at:end], old, new, 1) + text[end:]
	}
}

// end is what a look ends with: the quality of the link and what is to be thought of the map.
func end(out string) string { return out[max(0, strings.LastIndex(out, "Link: ")):] }

var addressLine = regexp.MustCompile(`address = \d+`)

func TestLinkSaysWhatIsWrongWithTheMap(t *testing.T) {
	t.Parallel()
	everyAddress := func(text string) string {
		return addressLine.ReplaceAllStringFunc(text, func(line string) string {
			var at int
			fmt.Sscanf(line, "address = %d", &at)
			return fmt.Sprintf("address = %d", at+1)
		})
	}
	tests := []struct {
		name string
		edit func(string) string
		args []string
		code int
		want []string
		not  []string
	}{
		{name: "the right map", code: exitDone,
			want: []string{"holding 100 (40101)", "1024.3 V", "The map is right as far as can be seen", "Hold a hand meter against one value"}},
		{name: "the right map and a meter", args: []string{"--meter", "bus-voltage=1023.9 V", "--meter", "running=on"}, code: exitDone,
			want: []string{"The map is right as far as can be seen"}, not: []string{"Hold a hand meter"}},
		{name: "every address one too high", edit: everyAddress, code: exitFailed,
			want: []string{"wagtail.map.toml: every address -1", "voltage-setpoint"}},
		{name: "one address one too low", edit: in(signal.BusVoltage, "100", "99"), args: []string{"--meter", "bus-voltage=1024.0V"}, code: exitFailed,
			want: []string{"bus-voltage reads 0.0 V", ":10: address = 99", "write instead: address = 100  # 40101"}},
		{name: "scale", edit: in(signal.BusVoltage, "0.1", "0.01"), args: []string{"--meter", "bus-voltage=1024.0V"}, code: exitFailed,
			want: []string{"bus-voltage reads 102.43 V", "write instead: scale = 0.1"}},
		{name: "swapped words", edit: in(signal.Power, `"i32"`, "\"i32\"\nword_order = \"low-first\""), args: []string{"--meter", "power=52.5 kW"},
			code: exitFailed, want: []string{`write instead: word_order = "high-first"`}},
		{name: "sign", edit: in(signal.SourceCurrent, "scale", "sign_reversed = true\nscale"), args: []string{"--meter", "source-current=72 A"},
			code: exitFailed, want: []string{"source-current reads -72.4 A", "write instead: sign_reversed = false"}},
		{name: "the neighbour's like value", edit: in(signal.SourceVoltage, "101", "102"), args: []string{"--meter", "source-voltage=724.9V"},
			code: exitDone, want: []string{"holding 101: 724.8 V*"}},
	}
	benches := make([]linkBench, len(tests))
	for i, test := range tests {
		benches[i] = newLinkBench(t, test.edit)
	}
	looks := sideBySide(len(tests), func(i int) look {
		return benches[i].chargehand(t.Context(), append([]string{"link", benches[i].site()}, tests[i].args...)...)
	})
	for i, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			out, stderr, code := looks[i].stdout, looks[i].stderr, looks[i].code
			if code != test.code {
				t.Errorf("link = exit %d, want %d\n%s%s", code, test.code, end(out), stderr)
			}
			for _, want := range test.want {
				if !strings.Contains(out, want) {
					t.Errorf("link prints\n%s\nwant it to hold %q", end(out), want)
				}
			}
			for _, not := range test.not {
				if strings.Contains(out, not) {
					t.Errorf("link prints\n%s\nwant it not to hold %q", end(out), not)
				}
			}
			for _, line := range strings.Split(out, "\n") {
				if theme.Width(line) > linkWidth {
					t.Errorf("link prints %d columns, want %d at most: %s", theme.Width(line), linkWidth, line)
				}
			}
		})
	}
}

func TestLinkTellsTheKindsOfNoAnswerApart(t *testing.T) {
	t.Parallel()
	always := func(f linktest.Fault) func(linkBench) {
		return func(b linkBench) { b.proxy.Script(func(int, []byte) linktest.Fault { return f }) }
	}
	tests := []struct {
		name string
		set  func(linkBench)
		code int
		want string
	}{
		{"no service", func(b linkBench) { b.proxy.Shut() }, exitUnable, "no service: a host is there"},
		{"connection taken", always(linktest.CloseAfter(0)), exitUnable, "connection taken:"},
		{"no unit, 0B", func(b linkBench) { b.image.OnlyUnits(7) }, exitUnable, "no unit: a gateway"},
		{"no unit, 0A", always(linktest.Exception(10)), exitUnable, "no unit: a gateway"},
		{"silence", always(linktest.Silence), exitUnable, "no unit, or silent:"},
		{"no register", func(b linkBench) { b.image.Remove(1, 3, 121) }, exitFailed, "exception 2, illegal data address"},
		{"no value", func(b linkBench) { b.image.Set(1, 3, 111, 0x8000) }, exitFailed, "missing"},
		{"no protocol", always(linktest.Raw('H', 'T', 'T', 'P', '/', '1', '.', '0', ' ', '4', '0', '0')), exitUnable, "wrong answer:"},
	}
	benches := make([]linkBench, len(tests))
	for i, test := range tests {
		benches[i] = newLinkBench(t, nil)
		test.set(benches[i])
	}
	looks := sideBySide(len(tests), func(i int) look { return benches[i].chargehand(t.Context(), "link", benches[i].site()) })
	for i, test := range tests {
		all := strings.Join(strings.Fields(looks[i].stdout+looks[i].stderr), " ")
		if looks[i].code != test.code || !strings.Contains(all, test.want) {
			t.Errorf("%s: link = exit %d, %s, want exit %d and %q", test.name, looks[i].code, all, test.code, test.want)
		}
	}
}

func TestLinkJSON(t *testing.T) {
	t.Parallel()
	b := newLinkBench(t, nil)
	b.image.Set(1, 3, 111, 0x8000)
	look := b.chargehand(t.Context(), "link", "--json", b.site())
	out, stderr, code := look.stdout, look.stderr, look.code
	if code != exitFailed || stderr != "" {
		t.Errorf("link --json = exit %d, %s, want %d since one signal has no value, and nothing on stderr", code, stderr, exitFailed)
	}
	var poll struct {
		At      time.Time        `json:"at"`
		Signals []map[string]any `json:"signals"`
	}
	if err := json.Unmarshal([]byte(out), &poll); err != nil || strings.Count(out, "\n") != 1 {
		t.Fatalf("link --json = %s, %v, want one object on one line", out, err)
	}
	if len(poll.Signals) != len(b.registers.Points) {
		t.Errorf("link --json gives %d signals, want %d", len(poll.Signals), len(b.registers.Points))
	}
	for _, s := range poll.Signals {
		_, hasValue := s["value"]
		state := s["state"]
		if hasValue != (state == "good" || state == "late") {
			t.Errorf("link --json gives %v, want a value only when good or late", s)
		}
		for key := range s {
			if !strings.Contains(" name state value unit raw age ", " "+key+" ") {
				t.Errorf("link --json gives a key %q of its own", key)
			}
		}
		switch s["name"] {
		case "bus-voltage":
			if s["value"] != 1024.3 || s["unit"] != "V" || s["raw"].([]any)[0] != 10243.0 {
				t.Errorf("link --json gives %v, want 1024.3 V from 10243", s)
			}
		case "heatsink-temperature":
			if state != "missing" || s["raw"].([]any)[0] != 32768.0 {
				t.Errorf("link --json gives %v, want missing from 32768", s)
			}
		}
	}
}

// Readings at several levels come while the link is watched; then the rivals of one sample are parted.
func TestLinkWatchTakesHandReadings(t *testing.T) {
	t.Parallel()
	b := newLinkBench(t, in(signal.BusVoltage, "0.1", "0.01"))
	ctx, stop := context.WithCancel(t.Context())
	defer stop()
	stdin, typing := io.Pipe()
	defer typing.Close()
	keyboard := func(line string) { fmt.Fprintln(typing, line) }
	var out, stderr safeBuffer
	done := make(chan int)
	go func() {
		done <- run(ctx, []string{"link", "--watch", b.site()}, surroundings{in: stdin, out: &out, err: &stderr,
			env: b.env, folder: b.folder})
	}()
	until := func(n int, text string) {
		t.Helper()
		for range 300 {
			if strings.Count(out.String(), text) >= n {
				return
			}
			time.Sleep(50 * time.Millisecond)
		}
		t.Fatalf("link --watch prints\n%s%s\nwant %d times %q", end(out.String()), stderr.String(), n, text)
	}
	until(1, "At rest, this")
	for i, level := range []struct {
		volts float64
		typed string
	}{{1024.3, "1024.3 V"}, {900, "900.1 V"}, {820, "819.8 V"}} {
		values := maps.Clone(boosting)
		values[signal.BusVoltage] = level.volts
		b.set(t, values)
		keyboard("bus-voltage=" + level.typed)
		until(i+1, " V, hand meter.")
	}
	until(3, "All of them have scale = 0.1.")
	until(1, "above 3277 V would part")
	keyboard("bus-voltage=12")
	keyboard("bus-voltage=819.8 V")
	until(4, " V, hand meter.")
	stop()
	if code := <-done; code != exitFailed {
		t.Errorf("link --watch = exit %d, want %d", code, exitFailed)
	}
	if !strings.Contains(out.String(), "bus-voltage           2328") {
		t.Errorf("link --watch prints\n%s\nwant a line of the bus at 2328", end(out.String()))
	}
	if !strings.Contains(stderr.String(), "bus-voltage=12: ") {
		t.Errorf("link --watch on a reading without unit says %q, want what is wanted", stderr.String())
	}
}

func TestLinkWatchJSONIsOneObjectAPoll(t *testing.T) {
	t.Parallel()
	b := newLinkBench(t, nil)
	ctx, stop := context.WithTimeout(t.Context(), 2*time.Second)
	defer stop()
	lines := strings.Split(strings.TrimSpace(b.chargehand(ctx, "link", "--json", "--watch", b.site()).stdout), "\n")
	if len(lines) < 5 {
		t.Errorf("link --json --watch gives %d objects in 2 s, want more than 5", len(lines))
	}
	for _, line := range lines {
		if !json.Valid([]byte(line)) {
			t.Errorf("link --json --watch gives %s, want an object a line", line)
		}
	}
}

func TestLinkUsage(t *testing.T) {
	t.Parallel()
	b := newLinkBench(t, nil)
	for _, args := range [][]string{{"--meter", "bus-voltage"}, {"--meter", "bus-voltage=12"}, {"--meter", "nonsense=1"},
		{"--meter", "main-closed=1"}, {"--meter", "power=1kW", "--meter", "power=2kW"}, {"--address"}} {
		if l := b.chargehand(t.Context(), append([]string{"link", b.site()}, args...)...); l.code != exitUnable || l.stderr == "" {
			t.Errorf("link %v = exit %d, %q, want %d and a reason", args, l.code, l.stderr, exitUnable)
		}
	}
	if n := len(b.proxy.Requests()); n != 0 {
		t.Errorf("link with bad usage sent %d requests, want none", n)
	}
}

func TestLinkInASCII(t *testing.T) {
	t.Parallel()
	b := newLinkBench(t, nil)
	out := b.chargehand(t.Context(), "link", "--ascii", "--meter", "heatsink-temperature=12 °C", b.site()).stdout
	for i, r := range out {
		if r > '~' {
			t.Fatalf("link --ascii prints %q in %q, want ASCII only", r, out[max(0, i-40):i+4])
		}
	}
	if !strings.Contains(out, "41.7 degC") {
		t.Errorf("link --ascii prints\n%s\nwant degC spelt out", out)
	}
}

// A doubtful map is told beside a JSON result, never in it.
func TestLinkJSONOfAWrongMap(t *testing.T) {
	t.Parallel()
	b := newLinkBench(t, in(signal.BusVoltage, "0.1", "0.01"))
	l := b.chargehand(t.Context(), "link", "--json", "--meter", "bus-voltage=1024.0 V", b.site())
	if l.code != exitFailed || !strings.Contains(l.stderr, "write instead: scale = 0.1") {
		t.Errorf("link --json of a wrong map = exit %d, %s, want %d and the line to change on stderr", l.code, l.stderr, exitFailed)
	}
	if !json.Valid([]byte(l.stdout)) || strings.Contains(l.stdout, "scale") {
		t.Errorf("link --json of a wrong map prints %s, want one object and nothing else", l.stdout)
	}
}
