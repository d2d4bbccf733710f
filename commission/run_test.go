package commission_test

import (
	"context"
	"errors"
	"math"
	"strings"
	"testing"
	"testing/synctest"
	"time"

	"go.uber.org/goleak"

	"chargehand/commission"
	"chargehand/commission/capture"
	"chargehand/commission/chlog/chlogtest"
	"chargehand/commission/finding"
	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/commission/site"
	"chargehand/commission/walk"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

func TestPrechargeIsCapturedFromArmedToEnded(t *testing.T) {
	on(t, options{}, func(b *bench) {
		b.set(map[signal.Name]float64{signal.BusVoltage: 0, signal.SourceVoltage: 724})
		b.poll()
		b.do(walk.Arm{Point: "charge.rise", Observing: true})
		b.poll()
		if c := b.last.Capture; c == nil || c.Phase != commission.Armed || len(c.Band.X) == 0 || c.Rise == nil {
			t.Fatalf("Capture after Arm = %+v, want it armed, with its prediction and its early check", c)
		}
		if n := len(b.focus); n != 1 || len(b.focus[0]) == 0 {
			t.Errorf("Focus called %d times with %v, want once with the capture's signals", n, b.focus)
		}
		b.charge()
		c := b.last.Capture
		if c == nil || c.Phase != commission.Running || c.OpenNow != "" || c.Rise.Seen == nil || len(c.SoFar) == 0 {
			t.Fatalf("Capture while charging = %+v, want it running, the rise seen, a fit so far and no alarm", c)
		}
		b.bypass()
		if b.last.Capture != nil {
			t.Fatalf("Capture a second after the bypass closed = %+v, want it ended", b.last.Capture)
		}
		if n := len(b.focus); n != 2 || b.focus[1] != nil {
			t.Errorf("Focus after the capture = %v, want all signals again", b.focus[1:])
		}
		captures := records[record.Capture](b)
		if len(captures) != 1 || captures[0].Attempt != 1 || captures[0].Stage != "Pre-charge" {
			t.Fatalf("%d captures on disk, want one of attempt 1: %+v", len(captures), captures)
		}
		got := b.last.State.Measured("measured.precharge")
		// 100 Ω · 11.7 mF = 1.17 s, within half a per cent at samples every 25 ms.
		if len(got) != 1 || got[0].Verdict != finding.Pass || math.Abs(got[0].Value.Nominal-1.17) > 0.006 {
			t.Errorf("measured.precharge = %+v, want pass at 1.17 s", got)
		}
		b.replays()
	})
}

func TestOpenNowIsDecidedFromEverySample(t *testing.T) {
	on(t, options{}, func(b *bench) {
		b.set(map[signal.Name]float64{signal.BusVoltage: 0, signal.SourceVoltage: 724, signal.PrechargeClosed: 0, signal.BypassClosed: 0})
		b.poll()
		b.do(walk.Arm{Point: "charge.rise", Observing: true})
		b.during(200*time.Millisecond, nil)
		closed := time.Now()
		var alarm time.Duration
		at := b.last.Capture.Rise.At
		b.during(time.Second, func(float64) {
			b.set(map[signal.Name]float64{signal.PrechargeClosed: 1, signal.BusVoltage: 0.3, signal.SourceCurrent: 7.2})
			if c := b.last.Capture; alarm == 0 && c != nil && c.OpenNow != "" {
				alarm = time.Since(closed)
			}
		})
		if alarm < at || alarm > at+60*time.Millisecond {
			t.Errorf("open now after %v, want it with the first sample after %v", alarm, at)
		}
		b.set(map[signal.Name]float64{signal.PrechargeClosed: 0})
		b.during(1200*time.Millisecond, nil)
		if !b.last.State.CauseIsMissing() {
			t.Error("CauseIsMissing after a charge onto a short = false, want true")
		}
	})
}

func TestGapsAndALostLinkAreRecorded(t *testing.T) {
	on(t, options{}, func(b *bench) {
		b.set(map[signal.Name]float64{signal.BusVoltage: 0, signal.SourceVoltage: 724, signal.PrechargeClosed: 0, signal.BypassClosed: 0})
		b.poll()
		b.do(walk.Arm{Point: "charge.rise", Observing: true})
		b.during(200*time.Millisecond, nil)
		rise := func(from float64) func(float64) {
			return func(t float64) {
				v := 724 * (1 - math.Exp(-(from+t)/1.17))
				b.set(map[signal.Name]float64{signal.PrechargeClosed: 1, signal.BusVoltage: v, signal.SourceCurrent: (724 - v) / 100})
			}
		}
		b.during(2*time.Second, rise(0))
		b.link = signal.Link{Peer: b.link.Peer, Why: "connection reset"}
		b.during(time.Second, nil)
		if r := b.last.Reading(signal.BusVoltage); r.Quality.HasValue() {
			t.Errorf("bus voltage with the link lost = %+v, want it withdrawn", r)
		}
		b.link = signal.Link{Up: true, Peer: b.link.Peer}
		b.during(5*time.Second, rise(3))
		b.bypass()
		var events []string
		for _, l := range records[record.Link](b) {
			events = append(events, l.Event+" "+l.Why)
		}
		if got := strings.Join(events, ", "); got != "up , lost connection reset, reconnected " {
			t.Errorf("link records = %q, want up, lost with its reason, reconnected", got)
		}
		captures := records[record.Capture](b)
		if len(captures) != 1 || len(captures[0].Gaps) != 1 {
			t.Fatalf("captures = %d with gaps %v, want one with one gap", len(captures), captures)
		}
		c, err := capture.FromRecords(captures)
		if err != nil {
			t.Fatal(err)
		}
		if g := c.Gaps[0]; math.Abs(g.From.Seconds()-2) > 0.1 || math.Abs(g.To.Seconds()-3) > 0.1 {
			t.Errorf("gap = %+v, want 2 s to 3 s after the pre-charge closed", g)
		}
	})
}

func TestOldReadingsAreWithdrawn(t *testing.T) {
	on(t, options{passed: "link.answer"}, func(b *bench) {
		b.set(map[signal.Name]float64{signal.BusVoltage: 12})
		b.poll()
		time.Sleep(maxAge)
		b.do(walk.TakeLive{Point: "link.answer"})
		time.Sleep(time.Millisecond)
		b.do(walk.TakeLive{Point: "link.answer"})
		var seen []string
		for _, r := range records[record.Reading](b) {
			if r.Signal == "bus-voltage" {
				seen = append(seen, r.Quality)
				if (r.Value != nil) != (r.Quality == "good") {
					t.Errorf("reading %+v: a value goes with good only", r)
				}
			}
		}
		if got := strings.Join(seen, " "); got != "good stale" {
			t.Errorf("qualities at and after max_age = %q, want good stale", got)
		}
	})
}

func TestALogThatFailsSaysSoAndGoesOnElsewhere(t *testing.T) {
	on(t, options{}, func(b *bench) {
		b.set(map[signal.Name]float64{signal.BusVoltage: 0, signal.SourceVoltage: 724, signal.PrechargeClosed: 0, signal.BypassClosed: 0})
		b.poll()
		b.do(walk.Arm{Point: "charge.rise", Observing: true})
		b.charge()
		b.disk.FailAt, b.disk.Err, b.disk.Once = b.disk.Calls()+1, chlogtest.ErrGone, true
		_, err := b.submit(walk.AddNote{Text: "rain"})
		if !errors.Is(err, chlogtest.ErrGone) || b.last.Failure == nil {
			t.Fatalf("Submit on a disk that is gone = %v, snapshot's failure %v, want both to say so", err, b.last.Failure)
		}
		b.bypass() // the capture ends while nothing can be written
		if _, err := b.submit(walk.AddNote{Text: "rain"}); err == nil {
			t.Fatal("Submit after a failure = nil, want the failure")
		}
		if n := len(records[record.Capture](b)); n != 0 {
			t.Fatalf("%d captures on the failed disk, want none", n)
		}
		b.path = "stick.chlog"
		if err := b.run.MoveLog(b.t.Context(), b.path); err != nil {
			t.Fatal(err)
		}
		b.look()
		if n := len(records[record.Capture](b)); n != 1 || b.last.Failure != nil {
			t.Errorf("after MoveLog: %d captures, failure %v, want the one that was kept and no failure", n, b.last.Failure)
		}
		if got := b.last.State.Measured("measured.precharge"); len(got) != 1 {
			t.Errorf("measured.precharge after MoveLog = %v, want one", got)
		}
		b.do(walk.AddNote{Text: "rain"})
		b.replays()
	})
}

func TestSealingEndsARunningCapture(t *testing.T) {
	on(t, options{}, func(b *bench) {
		b.set(map[signal.Name]float64{signal.BusVoltage: 0, signal.SourceVoltage: 724, signal.PrechargeClosed: 0, signal.BypassClosed: 0})
		b.poll()
		b.do(walk.Arm{Point: "charge.rise", Observing: true})
		b.charge()
		b.do(walk.Seal{Person: "p1"})
		if n := len(records[record.Capture](b)); n != 1 {
			t.Errorf("%d captures under the seal, want the running one", n)
		}
		if _, err := b.submit(walk.AddNote{Text: "late"}); err == nil || !strings.Contains(err.Error(), "sealed") {
			t.Errorf("Submit after the seal = %v, want a refusal", err)
		}
	})
}

func TestOneCaptureAtATime(t *testing.T) {
	on(t, options{}, func(b *bench) {
		b.poll()
		if _, err := b.submit(walk.StopCapture{}); err == nil {
			t.Error("StopCapture with none running = nil, want a refusal")
		}
		b.do(walk.Arm{Point: "share.stairs", Observing: true})
		if _, err := b.submit(walk.Arm{Point: "down.discharge", Observing: true}); err == nil || !strings.Contains(err.Error(), "share.stairs") {
			t.Errorf("second Arm = %v, want the first named", err)
		}
		b.do(walk.StopCapture{})
		notes := records[record.Note](b)
		if len(notes) == 0 || !strings.Contains(notes[len(notes)-1].Text, "before anything happened") {
			t.Errorf("notes = %v, want one that nothing happened", notes)
		}
	})
}

func TestSettingsAsFoundAndAsLeft(t *testing.T) {
	on(t, options{passed: "paper.settings"}, func(b *bench) {
		b.set(map[signal.Name]float64{signal.VoltageSetpoint: 1030, signal.ChargeLimit: 260})
		b.poll()
		b.do(walk.Take{Reading: record.Reading{Point: "paper.settings", Signal: "seen", Source: record.Observed, Text: "file 12"}},
			walk.Judge{Point: "paper.settings", Result: walk.Passed})
		found := records[record.Setting](b)
		if len(found) != 2 || found[0].When != "as-found" || found[0].Value != 1030 || found[0].Raw == nil || *found[0].Raw != 10300 {
			t.Fatalf("settings as found = %+v, want 1030 V, raw 10300, and the charge limit", found)
		}
		b.do(walk.Reopen{Point: "paper.settings", Why: "another look"})
		b.do(walk.Take{Reading: record.Reading{Point: "paper.settings", Signal: "seen", Source: record.Observed, Text: "file 12"}},
			walk.Judge{Point: "paper.settings", Result: walk.Passed})
		if n := len(records[record.Setting](b)); n != 2 {
			t.Errorf("%d settings after a second look, want the two as found first", n)
		}
	})
	on(t, options{passed: "leave.settings"}, func(b *bench) {
		b.set(map[signal.Name]float64{signal.VoltageSetpoint: 1034, signal.DroopSetting: 0.1})
		b.do(walk.Keep{Setting: record.Setting{Name: "voltage-setpoint", When: "as-found", Value: 1030, Unit: "V"}})
		b.poll()
		if _, err := b.submit(walk.Judge{Point: "leave.settings", Result: walk.Passed}); err == nil {
			t.Error("leave.settings passed with no document entered")
		}
		if n := len(records[record.Setting](b)); n != 1 {
			t.Errorf("%d settings after a refused pass, want the one as found only", n)
		}
		b.do(walk.Take{Reading: record.Reading{Point: "leave.settings", Signal: "seen", Source: record.Observed, Text: "file 13"}},
			walk.Judge{Point: "leave.settings", Result: walk.Passed})
		left := records[record.Setting](b)
		if len(left) != 2 || left[1].When != "as-left" || left[1].Value != 1034 {
			t.Errorf("settings = %+v, want 1034 V as left, and nothing that was never found", left)
		}
	})
}

func TestPointsConcludeMeasuredFindings(t *testing.T) {
	id := "i1"
	hand := func(point, what string, v float64, unit string) walk.Event {
		return walk.Take{Reading: record.Reading{Point: point, Signal: what, Value: &v, Unit: unit, Source: record.FromInstrument, Instrument: &id}}
	}
	setpoint := 1030.0
	display := walk.Take{Reading: record.Reading{Point: "boost.setpoint", Signal: "voltage-setpoint", Value: &setpoint, Unit: "V", Source: record.Observed}}
	for _, c := range []struct {
		point   string
		plant   map[signal.Name]float64
		hand    []walk.Event
		finding string
		want    finding.Verdict
		result  walk.Result
	}{
		{"rest.sensors", map[signal.Name]float64{signal.SourceVoltage: 724, signal.BusVoltage: 724},
			[]walk.Event{hand("rest.sensors", "source-voltage", 724.5, "V"), hand("rest.sensors", "bus-voltage", 723.8, "V")}, "measured.sensor:bus-voltage", finding.Pass, walk.Passed},
		{"rest.sensors", map[signal.Name]float64{signal.SourceVoltage: 724, signal.BusVoltage: 651.6}, // 0.9 of the truth
			[]walk.Event{hand("rest.sensors", "source-voltage", 724.5, "V"), hand("rest.sensors", "bus-voltage", 724, "V")}, "measured.sensor:bus-voltage", finding.Fail, walk.Open},
		{"boost.setpoint", map[signal.Name]float64{signal.BusVoltage: 1029, signal.VoltageSetpoint: 1030},
			[]walk.Event{display, hand("boost.setpoint", "bus-voltage", 1029.4, "V")}, "measured.setpoint", finding.Pass, walk.Passed},
		{"boost.setpoint", map[signal.Name]float64{signal.BusVoltage: 1020, signal.VoltageSetpoint: 1030},
			[]walk.Event{display, hand("boost.setpoint", "bus-voltage", 1019, "V")}, "measured.setpoint", finding.Fail, walk.Open},
	} {
		on(t, options{passed: c.point}, func(b *bench) {
			b.set(c.plant)
			b.poll()
			b.do(walk.TakeLive{Point: c.point})
			b.do(c.hand...)
			_, err := b.submit(walk.Judge{Point: c.point, Result: walk.Passed})
			got := b.last.State.Measured(c.finding)
			if len(got) != 1 || got[0].Verdict != c.want {
				t.Errorf("%s concludes %s = %+v, want %s", c.point, c.finding, got, c.want)
			}
			if result := b.last.State.Status(c.point).Result; result != c.result {
				t.Errorf("%s came to %q (%v), want %q", c.point, result, err, c.result)
			}
			before := len(b.lines())
			_, _ = b.submit(walk.Judge{Point: c.point, Result: walk.Passed})
			if len(b.lines()) != before {
				t.Errorf("%s judged twice wrote %d lines more", c.point, len(b.lines())-before)
			}
		})
	}
}

func TestTripsAreJudgedByTheirCapture(t *testing.T) {
	const pulses, contactor = signal.Running, signal.BypassClosed
	for _, c := range []struct {
		name, point string
		at          func(b *bench, t float64)
		finding     string
		want        finding.Verdict
	}{
		{"emergency stop", "trip.stop", func(b *bench, t float64) {
			b.set(map[signal.Name]float64{signal.Fault: 1, pulses: 0})
			if t > 0.1 {
				b.set(map[signal.Name]float64{contactor: 0})
			}
		}, "measured.trip:emergency-stop", finding.Pass},
		{"contactors before pulses", "trip.stop", func(b *bench, t float64) {
			b.set(map[signal.Name]float64{contactor: 0})
			if t > 0.2 {
				b.set(map[signal.Name]float64{pulses: 0})
			}
		}, "measured.trip:emergency-stop", finding.Fail},
		{"contactors stay", "trip.stop", func(b *bench, _ float64) { b.set(map[signal.Name]float64{pulses: 0}) }, "measured.trip:emergency-stop", finding.Fail},
		{"pulses go on without the report", "trip.bypass-lost", func(b *bench, t float64) {
			b.set(map[signal.Name]float64{contactor: 0})
			if t > 0.4 {
				b.set(map[signal.Name]float64{pulses: 0})
			}
		}, "measured.trip:bypass-lost", finding.Fail},
		{"source withdrawn at no current", "trip.source", func(b *bench, t float64) {
			b.set(map[signal.Name]float64{signal.SourceCurrent: 0})
			if t > 0.3 {
				b.set(map[signal.Name]float64{pulses: 0, signal.Fault: 1})
			}
		}, "measured.trip:source-withdrawn", finding.Pass},
		{"source withdrawn under current", "trip.source", func(b *bench, _ float64) {
			b.set(map[signal.Name]float64{pulses: 0, signal.Fault: 1, signal.SourceCurrent: 0})
		}, "measured.trip:source-withdrawn", finding.Fail},
		{"earth fault", "trip.earth", func(b *bench, _ float64) {
			b.set(map[signal.Name]float64{signal.InsulationResistance: 2000, signal.Fault: 1})
		}, "measured.trip:earth-fault", finding.Pass},
	} {
		on(t, options{}, func(b *bench) {
			b.set(map[signal.Name]float64{pulses: 1, contactor: 1, signal.PrechargeClosed: 0, signal.Fault: 0, signal.SourceCurrent: 40,
				signal.BusVoltage: 1010, signal.InsulationResistance: 5000})
			b.poll()
			b.do(walk.Arm{Point: c.point, Observing: true})
			b.during(300*time.Millisecond, nil)
			b.during(2*time.Second, func(t float64) { c.at(b, t) })
			if b.last.Capture != nil {
				t.Fatalf("%s: the capture has not ended", c.name)
			}
			if got := b.last.State.Measured(c.finding); len(got) != 1 || got[0].Verdict != c.want {
				t.Errorf("%s: %s = %+v, want %s", c.name, c.finding, got, c.want)
			}
		})
	}
}

func TestTimeOutIsMeasured(t *testing.T) {
	for _, c := range []struct {
		opens time.Duration
		want  finding.Verdict
	}{{10400 * time.Millisecond, finding.Pass}, {12500 * time.Millisecond, finding.Fail}, {3 * time.Second, finding.Fail}} {
		on(t, options{}, func(b *bench) {
			b.set(map[signal.Name]float64{signal.PrechargeClosed: 0, signal.BypassClosed: 0, signal.BusVoltage: 700, signal.Fault: 0, signal.Running: 0})
			b.poll()
			b.do(walk.Arm{Point: "trip.time-out", Observing: true})
			b.during(300*time.Millisecond, nil)
			b.during(c.opens+2*time.Second, func(t float64) {
				b.set(map[signal.Name]float64{signal.PrechargeClosed: 1})
				if t > c.opens.Seconds() {
					b.set(map[signal.Name]float64{signal.PrechargeClosed: 0, signal.Fault: 1})
				}
			})
			got := b.last.State.Measured("measured.trip:time-out")
			if len(got) != 1 || got[0].Verdict != c.want || math.Abs(got[0].Value.Nominal-c.opens.Seconds()) > 0.03 {
				t.Errorf("time-out of 10.5 s that opens after %v: %+v, want %s at that time", c.opens, got, c.want)
			}
			if n := len(b.last.State.Attempts()); n != 1 {
				t.Errorf("%d attempts counted, want 1", n)
			}
		})
	}
}

func TestShareIsJudgedFromSimultaneousCurrents(t *testing.T) {
	for _, c := range []struct {
		own, other float64
		want       finding.Verdict
	}{
		{93.6, 106.4, finding.Pass}, // 200 A by 220 : 250
		{130, 70, finding.Fail},     // 36.4 A of 220 A too much: 17 %, 10 % permitted
	} {
		on(t, options{passed: "share.share"}, func(b *bench) {
			b.set(map[signal.Name]float64{signal.BusCurrent: c.own, signal.BusVoltage: 1010})
			b.poll()
			b.peers <- signal.Batch{Device: "shore rectifier", At: time.Now(), Readings: []signal.Reading{
				{Name: signal.BusCurrent, Value: c.other, At: time.Now(), Quality: signal.Good}}}
			synctest.Wait()
			b.do(walk.TakeLive{Point: "share.share"})
			_, _ = b.submit(walk.Judge{Point: "share.share", Result: walk.Passed})
			if got := b.last.State.Measured("measured.share"); len(got) != 1 || got[0].Verdict != c.want {
				t.Errorf("measured.share of %g A beside %g A = %+v, want %s", c.own, c.other, got, c.want)
			}
		})
	}
}

func TestAChangedSiteFileMovesFindingsAndJudgesAgain(t *testing.T) {
	on(t, options{}, func(b *bench) {
		b.set(map[signal.Name]float64{signal.BusVoltage: 0, signal.SourceVoltage: 724, signal.PrechargeClosed: 0, signal.BypassClosed: 0})
		b.poll()
		b.do(walk.Arm{Point: "charge.rise", Observing: true})
		b.charge()
		b.bypass()
		_, text, old := b.last.State.SiteFile()
		if _, err := b.submit(walk.ChangeSite{Name: "x.site.toml", Text: "nonsense", Why: "x"}); err == nil {
			t.Error("ChangeSite with a text that is no site file = nil, want its problem")
		}
		b.do(walk.ChangeSite{Name: "example.rev1.site.toml", Text: strings.ReplaceAll(text, `"100 Ω ±5 %"`, `"150 Ω ±1 %"`), Why: "measured cold"})
		files := records[record.File](b)
		last := files[len(files)-1]
		if last.Replaces == nil || *last.Replaces != old || last.SHA256 == old {
			t.Errorf("file record = %+v, want both hashes", last)
		}
		notes := records[record.Note](b)
		if got := notes[len(notes)-1].Text; !strings.Contains(got, "precharge.time-constant 1.245 s (info) → 1.863 s (info)") || !strings.Contains(got, "measured.precharge 1.170 s (pass) → 1.170 s (fail)") {
			t.Errorf("note = %q, want what moved from and to", got)
		}
		b.replays()
	})
}

func TestMovedNamesWhatCameAndWent(t *testing.T) {
	f := func(id string, v float64, verdict finding.Verdict) finding.Finding {
		return finding.Finding{ID: id, Unit: "V", State: finding.Finite, Value: finding.Exactly(v), Verdict: verdict}
	}
	moved := commission.Moved([]finding.Finding{f("a", 1, finding.Pass), f("b", 2, finding.Pass), f("c", 3, finding.Pass)},
		[]finding.Finding{f("a", 1, finding.Pass), f("b", 2.5, finding.Fail), f("d", 4, finding.Pass)})
	var lines []string
	for _, m := range moved {
		lines = append(lines, m.String())
	}
	want := "b 2.000 V (pass) → 2.500 V (fail)\nd none → 4.000 V (pass)\nc 3.000 V (pass) → none"
	if got := strings.Join(lines, "\n"); got != want {
		t.Errorf("Moved = %q, want %q", got, want)
	}
}

func TestClockThatWasSetIsInTheLogOnce(t *testing.T) {
	on(t, options{}, func(b *bench) {
		b.do(walk.AddNote{Text: "before"})
		b.wall = -time.Hour
		b.do(walk.AddNote{Text: "after"}, walk.AddNote{Text: "later"})
		steps := records[record.Clock](b)
		if len(steps) != 1 || math.Abs(steps[0].WallStep+3600) > 0.01 {
			t.Errorf("clock records = %+v, want one of -3600 s", steps)
		}
		b.replays()
	})
}

func TestHastenedDischargeIsSampledEvenly(t *testing.T) {
	on(t, options{mode: record.RehearsalMode, speed: 40}, func(b *bench) {
		// In fake time the plant's clock runs with the bench's; hastening it must leave samples that are evenly apart.
		b.set(map[signal.Name]float64{signal.BusVoltage: 1030, signal.PrechargeClosed: 0, signal.BypassClosed: 0, signal.Running: 0})
		b.poll()
		b.do(walk.Arm{Point: "down.discharge", Observing: true})
		began := b.last.Now
		for i := 0; i < 3000 && b.last.Capture != nil; i++ {
			fallAt(b, began)
			time.Sleep(25 * time.Millisecond)
		}
		c, err := capture.FromRecords(records[record.Capture](b))
		if err != nil {
			t.Fatal(err)
		}
		var steps []float64
		for i := 1; i < len(c.Samples); i++ {
			steps = append(steps, (c.Samples[i].At - c.Samples[i-1].At).Seconds())
		}
		for _, s := range steps {
			if s < 0.4 || s > 1.6 {
				t.Fatalf("samples %g s apart, want all about 1 s (25 ms at 40 times the pace): %v", s, steps[:min(len(steps), 10)])
			}
		}
		if got := b.last.State.Measured("measured.discharge"); len(got) != 1 || got[0].Verdict != finding.Pass {
			t.Errorf("measured.discharge = %+v, want pass", got)
		}
	})
}

// fallAt polls a bus that has fallen since began with 22 kΩ on 11.7 mF, by the plant's clock.
func fallAt(b *bench, began time.Time) {
	now := b.clock.Now()
	b.set(map[signal.Name]float64{signal.BusVoltage: 1030 * math.Exp(-now.Sub(began).Seconds()/257)})
	b.pollAt(now)
}

func TestTheRunEndsWithItsContext(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		b := newBench(t, options{})
		close(b.batches)
		close(b.peers)
		b.stop()
		b.run.Wait()
		if _, err := b.run.Submit(context.Background(), walk.AddNote{Text: "x"}); !errors.Is(err, commission.ErrEnded) {
			t.Errorf("Submit after the end = %v, want ErrEnded", err)
		}
	})
}

func TestSiteExampleHasWhatTheseTestsTakeForGranted(t *testing.T) {
	text, _ := site.Example()
	for _, figure := range []string{`resistance         = "100 Ω ±5 %"`, `timeout            = "10.5 s"`, `rated_current  = "220 A"`, `rated_current  = "250 A"`} {
		if !strings.Contains(text, figure) {
			t.Errorf("the example has no %s", figure)
		}
	}
}
