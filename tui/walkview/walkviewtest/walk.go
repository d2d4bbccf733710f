// Package walkviewtest opens walks for tests of the screens: a real owner over a log in memory, with readings that the test
// hands in and a clock that stands still. Nothing of it dials anything.
package walkviewtest

import (
	"context"
	"fmt"
	"math"
	"testing"
	"time"

	"chargehand/commission"
	"chargehand/commission/capture"
	"chargehand/commission/chlog"
	"chargehand/commission/chlog/chlogtest"
	"chargehand/commission/clock"
	"chargehand/commission/desk"
	"chargehand/commission/finding"
	"chargehand/commission/precharge"
	"chargehand/commission/quantity"
	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/commission/site"
	"chargehand/commission/walk"
	"chargehand/tui/walkview"
)

// Now is the time that stands still in these walks.
var Now = time.Date(2026, 12, 1, 9, 30, 0, 0, time.FixedZone("", 3600))

// Log is the path of the log in memory.
const Log = "PIP-001.chlog"

// Walk is an open walk.
type Walk struct {
	Session walkview.Session
	Disk    *chlogtest.Disk
	Batches chan<- signal.Batch
	Acts    *[]string // what the plant's hand has done
}

// Open opens a walk of the built-in example at a point: every point before it is passed and its holds are signed.
func Open(t testing.TB, mode, point string) Walk {
	text, _ := site.Example()
	return OpenSite(t, mode, point, text)
}

// OpenSite is Open for another site file.
func OpenSite(t testing.TB, mode, point, text string) Walk {
	t.Helper()
	disk := chlogtest.NewDisk()
	log, err := chlog.Create(disk, Log, record.Opened{Mode: mode, Program: "1.0.0", Device: "simulated converter", Speed: 100,
		Log: "0123456789abcdef0123456789abcdef"}, chlog.Options{Now: func() time.Time { return Now }, Program: "1.0.0"})
	if err != nil {
		t.Fatal(err)
	}
	state := Begin(t, log, text)
	state = Passed(t, log, state, point)
	batches, acts := make(chan signal.Batch), &[]string{}
	ctx, cancel := context.WithCancel(context.Background())
	run := commission.Start(ctx, commission.Options{State: state, Log: log, Unsigned: "a test", Batches: batches,
		Clock: clock.NewPlant(func() time.Time { return Now }), MaxAge: 500 * time.Millisecond, Speed: 100})
	t.Cleanup(func() { cancel(); run.Wait(); _ = log.Close() })
	w := Walk{Disk: disk, Batches: batches, Acts: acts, Session: walkview.Session{Run: run, Log: Log, MaxAge: 500 * time.Millisecond, Unsigned: "a test",
		Places:   map[signal.Name]string{signal.BusVoltage: "holding 100, 40101", signal.SourceVoltage: "holding 101, 40102"},
		Check:    func(s site.Site) []finding.Finding { return desk.Findings(s, nil) },
		KeepSite: func(string) (string, error) { return "example.rev1.site.toml", nil },
		Move:     func(path string) error { return run.MoveLog(ctx, path) },
		Finish: func(context.Context) ([]string, error) {
			return []string{"log        PIP-001.chlog", "signature  PIP-001.chlog.sig", "report     PIP-001.pdf"}, nil
		},
		Close: func() error { cancel(); run.Wait(); return nil }}}
	if mode == record.RehearsalMode {
		w.Session.Operator = hand{acts}
	}
	return w
}

// hand is a plant that does whatever it is told and whose meter shows fixed values.
type hand struct{ acts *[]string }

func (h hand) Do(_ context.Context, act string) error {
	*h.acts = append(*h.acts, act)
	return nil
}

func (h hand) Measure(_ context.Context, what string) (float64, string, error) {
	switch what {
	case string(signal.BusVoltage):
		return 784.3, "V", nil
	case string(signal.SourceVoltage):
		return 795.1, "V", nil
	case "difference across the bypass":
		return 10.8, "V", nil
	case "highest voltage found":
		return 0.4, "V", nil
	}
	return 0, "", fmt.Errorf("no place to read %q", what)
}

// Begin writes what a log of a site starts with.
func Begin(t testing.TB, log *chlog.Writer, text string) walk.State {
	t.Helper()
	s, _, err := site.Read(site.ExampleName, []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	state, err := commission.Begin(log, commission.Papers{SiteName: site.ExampleName, SiteText: text, Findings: desk.Findings(s, nil)},
		[]record.Person{{ID: "p1", Name: "rehearsing technician", Role: "technician"}})
	if err != nil {
		t.Fatal(err)
	}
	return state
}

// Passed writes a pass under every point before one, and a sign-off under its holds.
func Passed(t testing.TB, log *chlog.Writer, state walk.State, point string) walk.State {
	t.Helper()
	write := func(body record.Body) {
		line, err := log.Append(body)
		if err != nil {
			t.Fatal(err)
		}
		state = state.With(walk.Line{Seq: line.Seq, At: line.At, Body: body})
	}
	for _, p := range state.Points() {
		if p.Stage != state.Stage() {
			write(record.Stage{Stage: walk.StageTitles[p.Stage-1], Event: record.Entered, Invalidates: []int64{}})
		}
		if p.ID == point {
			break
		}
		write(record.Point{ID: p.ID, Result: string(walk.Passed), Readings: []int64{}})
		if p.Kind == walk.Hold {
			line, err := log.SignOff("p1", p.ID, nil, "a test")
			if err != nil {
				t.Fatal(err)
			}
			body, err := line.Decode()
			if err != nil {
				t.Fatal(err)
			}
			state = state.With(walk.Line{Seq: line.Seq, At: line.At, Body: body})
		}
	}
	return state.Ready()
}

// Live are readings of a plant at rest with its bus at some voltage, 12 ms old.
func Live(bus, source float64) map[signal.Name]signal.Reading {
	values := map[signal.Name]float64{signal.BusVoltage: bus, signal.SourceVoltage: source, signal.StarPointVoltage: bus - 1.5,
		signal.SourceCurrent: 0.4, signal.BusCurrent: 0.3, signal.PhaseCurrent1: 0.1, signal.PhaseCurrent2: 0.2, signal.PhaseCurrent3: 0.1,
		signal.Power: 120, signal.ResistorTemperature: 34.1, signal.HeatsinkTemperature: 33.7, signal.InsulationResistance: 491e3,
		signal.Ready: 0, signal.Running: 0, signal.PrechargeClosed: 0, signal.BypassClosed: 0, signal.ChopperActive: 0, signal.Fault: 0,
		signal.FaultCode: 0, signal.Mode: 0, signal.VoltageSetpoint: 1030, signal.DroopSetting: 0.1364, signal.ChargeLimit: 260,
		signal.DischargeLimit: 400, signal.PowerReference: 0}
	live := map[signal.Name]signal.Reading{}
	for name, v := range values {
		live[name] = signal.Reading{Name: name, Value: v, At: Now.Add(-12 * time.Millisecond), Quality: signal.Good, Raw: []uint16{uint16(int(v * 10))}}
	}
	return live
}

// Link is a link that works.
var Link = signal.Link{Up: true, Peer: "127.0.0.1:1502", RoundTrip: 1200 * time.Microsecond, Rate: 20}

// Snapshot is the walk with readings put in.
func (w Walk) Snapshot(t testing.TB, live map[signal.Name]signal.Reading) commission.Snapshot {
	t.Helper()
	s := <-w.Session.Run.Snapshots()
	s.Now, s.Link, s.Live = Now, Link, live
	return s
}

// Batch is one poll that brought the readings.
func Batch(live map[signal.Name]signal.Reading, at time.Time) signal.Batch {
	b := signal.Batch{At: at, Link: Link}
	for _, name := range signal.Names {
		if r, ok := live[name]; ok {
			r.At = at
			b.Readings = append(b.Readings, r)
		}
	}
	return b
}

// Charging is a pre-charge of the built-in example under way: its band as predicted, its trace an exponential of 1.14 s
// that ends 10 V below the source.
func Charging(s site.Site, elapsed time.Duration) commission.Progress {
	emf := quantity.Spread[quantity.Voltage]{Low: 791, Nominal: 795, High: 799}
	predicted := precharge.Predict(s, emf, 0)
	p := commission.Progress{Point: "charge.rise", Kind: capture.Precharge, Attempt: 1, Phase: commission.Running, Elapsed: elapsed, Longest: 16 * time.Second}
	for _, b := range predicted.Band {
		p.Band.X = append(p.Band.X, b.At.Seconds())
		p.Band.Low, p.Band.Nominal, p.Band.High = append(p.Band.Low, float64(b.Bus.Low)), append(p.Band.Nominal, float64(b.Bus.Nominal)), append(p.Band.High, float64(b.Bus.High))
	}
	for x := -0.5; x < elapsed.Seconds(); x += 0.025 {
		p.X, p.Y = append(p.X, x), append(p.Y, 785*(1-math.Exp(-math.Max(x, 0)/1.14)))
	}
	p.Rise = &commission.Rise{At: predicted.EarlyRise.At, AtLeast: float64(predicted.EarlyRise.AtLeast)}
	if elapsed > p.Rise.At {
		seen := 785 * (1 - math.Exp(-p.Rise.At.Seconds()/1.14))
		p.Rise.Seen = &seen
		p.SoFar = []string{"so far 1.14 s ± 0.009 s"}
	}
	return p
}

// Stairs is a row of load steps under way.
func Stairs() commission.Progress {
	p := commission.Progress{Point: "share.stairs", Kind: capture.Droop, Phase: commission.Running, Elapsed: 9 * time.Second}
	for x := -220.0; x <= 220; x += 22 {
		nominal := 1030 - 0.136*x
		p.Band.X, p.Band.Low = append(p.Band.X, x), append(p.Band.Low, nominal-2-0.01*math.Abs(x))
		p.Band.Nominal, p.Band.High = append(p.Band.Nominal, nominal), append(p.Band.High, nominal+2+0.01*math.Abs(x))
	}
	for _, current := range []float64{0.4, 19.5, 38.2, 57.6} {
		p.X, p.Y = append(p.X, current), append(p.Y, 1031.4-0.1358*current)
		p.Steps = append(p.Steps, commission.Settled{Current: current, Voltage: 1031.4 - 0.1358*current})
	}
	p.Line = &commission.Line{NoLoad: 1031.4, Droop: 0.1358, At: func(i float64) float64 { return 1031.4 - 0.1358*i },
		StandardErrorAt: func(i float64) float64 { return 0.2 + 0.002*math.Abs(i-30) }}
	return p
}
