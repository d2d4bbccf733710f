package walk_test

import (
	"math"
	"slices"
	"strings"
	"testing"
	"time"

	"chargehand/commission/finding"
	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/commission/site"
	"chargehand/commission/walk"
)

func TestHoldsAreNotPassedUnsigned(t *testing.T) {
	b := example(t)
	b.refused(walk.Enter{Stage: 0}, "no stage 0")
	b.refused(walk.Enter{Stage: 13}, "no stage 13")
	b.refused(walk.Enter{Stage: 2}, "safe.permit is not signed")
	b.refused(walk.Judge{Point: "safe.isolate", Result: walk.Passed}, "safe.permit is not signed")
	b.refused(walk.Sign{Point: "safe.permit", Person: "p1"}, "no result")
	b.refused(walk.Judge{Point: "safe.permit", Result: walk.Passed}, "nothing was entered")
	b.seen("safe.permit")
	b.do(walk.Judge{Point: "safe.permit", Result: walk.Passed})
	b.refused(walk.Judge{Point: "safe.isolate", Result: walk.Failed}, "safe.permit is not signed")
	b.refused(walk.Take{Reading: record.Reading{Point: "safe.isolate", Source: record.Observed, Text: "locked"}}, "safe.permit is not signed")
	b.refused(walk.Sign{Point: "safe.permit", Person: "p9"}, "nobody entered them")
	b.do(walk.Sign{Point: "safe.permit", Person: "p1"})
	b.refused(walk.Sign{Point: "safe.permit", Person: "p1"}, "has signed it")
	b.do(walk.Sign{Point: "safe.permit", Person: "p2"})
	b.seen("safe.isolate")
}

func TestNoTickWithoutAValue(t *testing.T) {
	b := example(t)
	one := 1.0
	nan := math.NaN()
	b.passTo("safe.dead")
	reading := func(r record.Reading) walk.Take { r.Point = "safe.dead"; return walk.Take{Reading: r} }
	i1, i9 := "i1", "i9"
	for _, c := range []struct {
		name    string
		take    walk.Take
		because string
	}{
		{"nothing in it", reading(record.Reading{Source: record.Observed}), "no tick without a value"},
		{"not a number", reading(record.Reading{Value: &nan, Unit: "V", Source: record.Observed}), "no number"},
		{"no source", reading(record.Reading{Value: &one, Unit: "V"}), "no source"},
		{"wrong unit", reading(record.Reading{Signal: "bus-voltage", Value: &one, Unit: "kV", Source: record.Observed}), `read in "V"`},
		{"no instrument", reading(record.Reading{Value: &one, Unit: "V", Source: record.FromInstrument}), "names no instrument"},
		{"unknown instrument", reading(record.Reading{Value: &one, Unit: "V", Source: record.FromInstrument, Instrument: &i9}), "nobody entered it"},
		{"unknown point", walk.Take{Reading: record.Reading{Point: "safe.none", Text: "x", Source: record.Observed, Instrument: &i1}}, "no such point"},
	} {
		t.Run(c.name, func(t *testing.T) { b.t = t; b.refused(c.take, c.because) })
	}
	b.t = t
	b.refused(walk.Judge{Point: "safe.dead", Result: walk.Passed}, "no instrument reading")
	b.refused(walk.Judge{Point: "safe.dead", Result: "fine"}, "pass, fail or not-applicable")
	b.refused(walk.Judge{Point: "safe.dead", Result: walk.NotApplicable, Note: "no time"}, "cannot be left out")
	if err := b.read("safe.dead", "highest voltage found", 61, "V", record.FromInstrument); err != nil {
		t.Fatal(err)
	}
	b.seen("safe.dead")
	b.refused(walk.Judge{Point: "safe.dead", Result: walk.Passed}, "wanted at most 60.00 V (bus.touch_safe.voltage)")
	if err := b.read("safe.dead", "highest voltage found", 0.4, "V", record.FromInstrument); err != nil {
		t.Fatal(err)
	}
	b.do(walk.Judge{Point: "safe.dead", Result: walk.Passed})
	if err := b.read("safe.dead", "highest voltage found", 0.4, "V", record.FromInstrument); err == nil || !strings.Contains(err.Error(), "has its result") {
		t.Errorf("Take under a result = %v, want a refusal", err)
	}
	b.refused(walk.Judge{Point: "safe.dead", Result: walk.Failed}, "not written over")
}

func TestUnfitInstruments(t *testing.T) {
	for _, c := range []struct {
		name    string
		record  record.Instrument
		because string
	}{
		{"overdue since yesterday", record.Instrument{Name: "old meter", Due: "2026-11-30", MaxVoltage: 1500}, "calibration was due 2026-11-30"},
		{"no date", record.Instrument{Name: "somebody's meter", MaxVoltage: 1500}, "calibration date is not known"},
		{"below the over-voltage trip of 1130 V", record.Instrument{Name: "small meter", Due: "2027-01-01", MaxVoltage: 1000}, "range ends at 1000 V, 1130 V are wanted"},
	} {
		t.Run(c.name, func(t *testing.T) {
			b := example(t)
			b.passTo("safe.dead")
			b.do(walk.AddInstrument{Record: c.record})
			id, v := "i2", 0.2
			take := walk.Take{Reading: record.Reading{Point: "safe.dead", Signal: "highest voltage found", Value: &v, Unit: "V",
				Source: record.FromInstrument, Instrument: &id}}
			b.refused(take, c.because)
			b.do(walk.Deviate{Point: "safe.dead", Reason: "the only one on site", AcceptedBy: "p2"}, take)
			if st := b.state.Status("safe.dead"); st.Granted == nil || st.Accepted != nil {
				t.Errorf("Status after a deviation for an instrument = %+v, want it granted and no result accepted", st)
			}
		})
	}
	b := example(t)
	b.passTo("safe.dead")
	b.do(walk.AddInstrument{Record: record.Instrument{Name: "due today", Due: "2026-12-01", MaxVoltage: 1500}})
	id, v := "i2", 0.2
	b.do(walk.Take{Reading: record.Reading{Point: "safe.dead", Value: &v, Unit: "V", Source: record.FromInstrument, Instrument: &id}})
	b.refused(walk.AddInstrument{}, "no name")
}

func TestAFailedPointNeedsADeviationOrAPunchItem(t *testing.T) {
	b := example(t)
	b.passTo("safe.isolate")
	b.do(walk.Judge{Point: "safe.isolate", Result: walk.Failed, Note: "lock missing"})
	b.refused(walk.Sign{Point: "safe.isolate", Person: "p1"}, "nobody accepted it")
	b.refused(walk.Deviate{Point: "safe.isolate", AcceptedBy: "p2"}, "no reason")
	b.refused(walk.Deviate{Point: "safe.isolate", Reason: "guard posted", AcceptedBy: "p7"}, "somebody who was entered")
	b.refused(walk.Deviate{Point: "safe.none", Reason: "guard posted", AcceptedBy: "p2"}, "no such point")
	b.refused(walk.RaisePunch{What: "lock", Severity: "A", Owner: "yard"}, "not whole")
	b.refused(walk.RaisePunch{What: "lock", Severity: "D", Owner: "yard", Due: "2026-12-02"}, "severity")
	b.refused(walk.ClearPunch{ID: "k1"}, "not open")
	b.do(walk.RaisePunch{What: "lock", Severity: "A", Owner: "yard", Due: "2026-12-02", Point: "safe.isolate"})
	b.do(walk.ClearPunch{ID: "k1"})
	b.refused(walk.Sign{Point: "safe.isolate", Person: "p1"}, "nobody accepted it")
	b.do(walk.Deviate{Point: "safe.isolate", Reason: "guard posted", AcceptedBy: "p2"}, walk.Sign{Point: "safe.isolate", Person: "p1"})
	p, _ := b.state.Point("safe.isolate")
	if !b.state.IsDone(p) || b.state.Verdict() != finding.Fail {
		t.Errorf("accepted failure: done %v, verdict %s, want done and fail", b.state.IsDone(p), b.state.Verdict())
	}
}

func TestADeviationFromBeforeDoesNotAcceptALaterFailure(t *testing.T) {
	b := example(t)
	b.passTo("safe.isolate")
	b.do(walk.Deviate{Point: "safe.isolate", Reason: "for an instrument", AcceptedBy: "p2"})
	b.do(walk.Judge{Point: "safe.isolate", Result: walk.Failed})
	b.refused(walk.Sign{Point: "safe.isolate", Person: "p1"}, "nobody accepted it")
}

func TestReopeningTakesAwayWhatRestsOnIt(t *testing.T) {
	b := example(t)
	b.passTo("paper.source")
	b.refused(walk.Reopen{Point: "safe.sources"}, "needs a reason")
	b.refused(walk.Reopen{Point: "paper.source", Why: "x"}, "no result to take back")
	b.refused(walk.Reopen{Point: "safe.none", Why: "x"}, "no such point")
	b.do(walk.Reopen{Point: "safe.sources", Why: "a shaft turns"})
	for id, want := range map[string]walk.Result{"safe.sources": walk.Open, "safe.dead": walk.Open, "safe.stop": walk.Open, "safe.isolate": walk.Passed} {
		if got := b.state.Status(id).Result; got != want {
			t.Errorf("Status(%s) after reopening safe.sources = %q, want %q", id, got, want)
		}
	}
	if n := b.state.Status("safe.dead").Reopened; n != 1 {
		t.Errorf("safe.dead reopened %d times, want 1", n)
	}
	b.refused(walk.Enter{Stage: 2}, "safe.dead is not signed")
}

func TestReopeningGoesOnFromPointToPoint(t *testing.T) {
	b := example(t)
	b.passTo("power.keyed")
	b.do(walk.Reopen{Point: "link.known", Why: "another map"})
	// link.known reopens rest.*, and rest.sensors what rests on it; charge.* stands nearer and goes too.
	for _, id := range []string{"charge.source", "charge.curve", "rest.sensors", "boost.setpoint", "share.droop"} {
		if got := b.state.Status(id).Result; got != walk.Open {
			t.Errorf("Status(%s) after reopening link.known = %q, want open", id, got)
		}
	}
	for _, n := range []signal.Name{signal.VoltageSetpoint, signal.BusVoltage, signal.BusCurrent} {
		if b.state.IsProved(n) {
			t.Errorf("%s is still proved, and the point that proved it is open", n)
		}
	}
	if got := b.state.Measured(""); len(got) != 0 {
		t.Errorf("Measured after reopening link.known = %v, want none to stand", got)
	}
}

func TestAFailureReopensToo(t *testing.T) {
	b := example(t)
	b.passTo("dead.contactors")
	if b.state.Status("paper.findings").Result != walk.Passed {
		t.Fatal("paper.findings is not passed")
	}
	b.do(walk.Judge{Point: "dead.contactors", Result: walk.Failed, Note: "bypass sticks"})
	if got := b.state.Status("dead.bus").Result; got != walk.Open {
		t.Errorf("dead.bus after a failed contactor = %q, want open", got)
	}
}

func TestAsFoundComesBeforeAsLeft(t *testing.T) {
	b := example(t)
	k := record.Setting{Name: "droop-setting", When: "as-left", Value: 0.136, Unit: "V/A", Source: record.FromDevice}
	b.refused(walk.Keep{Setting: k}, "never recorded as found")
	bad := k
	bad.When = "as-seen"
	b.refused(walk.Keep{Setting: bad}, "as-found or as-left")
	found := k
	found.When = "as-found"
	bad = found
	bad.Value = math.Inf(1)
	b.refused(walk.Keep{Setting: bad}, "no number")
	b.do(walk.Keep{Setting: found})
	b.refused(walk.Keep{Setting: found}, "recorded already")
	b.do(walk.Keep{Setting: k})
}

func TestKeyedSettingsOpenWhatWasMeasuredWithTheOldOnes(t *testing.T) {
	for _, c := range []struct {
		name   string
		keyed  float64
		stands walk.Result
	}{{"nothing keyed", 1030, walk.Passed}, {"another setpoint", 1034, walk.Open}} {
		t.Run(c.name, func(t *testing.T) {
			b := example(t)
			b.do(walk.Keep{Setting: record.Setting{Name: "voltage-setpoint", When: "as-found", Value: 1030, Unit: "V"}})
			b.passTo("share.keyed")
			if err := b.read("share.keyed", "voltage-setpoint", c.keyed, "V", record.FromDevice); err != nil {
				t.Fatal(err)
			}
			b.seen("share.keyed")
			b.do(walk.Judge{Point: "share.keyed", Result: walk.Passed})
			for _, id := range []string{"boost.setpoint", "share.stairs", "share.droop"} {
				if got := b.state.Status(id).Result; got != c.stands {
					t.Errorf("Status(%s) = %q, want %q", id, got, c.stands)
				}
			}
		})
	}
}

func TestArmingNeedsThePointsBefore(t *testing.T) {
	b := example(t)
	b.refused(walk.Arm{Point: "charge.rise"}, "not signed")
	b.refused(walk.Arm{Point: "charge.close"}, "no capture belongs to it")
	b.passTo("charge.difference")
	b.refused(walk.Arm{Point: "charge.rise"}, "the point has its result")
}

func TestNoSecondAttemptBeforeCauseAndCooling(t *testing.T) {
	b := example(t) // 3 attempts every 90 s, thermal time constant 300 s
	b.passTo("charge.rise")
	arm := walk.Arm{Point: "charge.rise"}
	b.do(arm)
	if !b.state.CauseIsMissing() {
		t.Error("CauseIsMissing after an attempt that has no finding = false, want true: it was broken off")
	}
	b.measured("measured.precharge", "", finding.Fail)
	b.now = b.now.Add(89 * time.Second)
	b.refused(arm, "cools for another 1 s")
	b.now = b.now.Add(time.Second)
	b.refused(arm, "cause of the last one is not entered")
	b.refused(walk.Arm{Point: "charge.rise", Override: "hurry"}, "cause of the last one is not entered")
	b.refused(walk.EnterCause{}, "cause is empty")
	b.do(walk.EnterCause{Cause: "bank-missing"})
	b.refused(walk.EnterCause{Cause: "again"}, "did not fail")
	b.do(arm)
	if n := len(b.state.Attempts()); n != 2 || b.state.Attempts()[0].Cause != "bank-missing" {
		t.Fatalf("Attempts = %+v, want two, the first with its cause", b.state.Attempts())
	}
	b.measured("measured.precharge", "", finding.Pass)
	b.refused(walk.EnterCause{Cause: "none"}, "did not fail")
	b.refused(arm, "cools for another 90 s")
	b.do(walk.Arm{Point: "charge.rise", Override: "the owner's engineer insists"})
	last := b.state.Attempts()[2]
	if last.N != 3 || last.Override == nil || *last.Override != "the owner's engineer insists" {
		t.Errorf("third attempt = %+v, want its override kept", last)
	}
	b.measured("measured.precharge", "", finding.Pass)
	third := b.now
	b.now = third.Add(100 * time.Second)
	b.refused(arm, "3 permitted attempts are used up")
	if got, want := b.state.CoolsFor(b.now), 1400*time.Second; got != want {
		t.Errorf("CoolsFor 100 s after the third attempt = %v, want %v: five thermal time constants of 300 s", got, want)
	}
	b.now = third.Add(1500 * time.Second)
	b.do(arm)
}

func TestObservingArmsWithoutTheHolds(t *testing.T) {
	b := example(t)
	b.do(walk.Arm{Point: "charge.rise", Observing: true})
	if a := b.state.Attempts(); len(a) != 1 || a[0].Override == nil || !strings.Contains(*a[0].Override, "operated by others") {
		t.Errorf("Attempts = %+v, want one that says who operated", a)
	}
}

func TestUnprovedSignalsGiveNoVerdict(t *testing.T) {
	b := example(t)
	b.passTo("charge.difference")
	if b.state.IsProved(signal.BusVoltage) {
		t.Fatal("bus-voltage is proved before it was compared at a value that is not zero")
	}
	b.measured("measured.precharge", "", finding.Pass)
	curve, _ := b.state.Point("charge.curve")
	if got := b.state.Assess(curve); got.Result != walk.Open || !strings.Contains(strings.Join(got.Because, " "), "bus-voltage not proved yet") {
		t.Errorf("Assess(charge.curve) with an unproved signal = %q %v, want open", got.Result, got.Because)
	}
	for _, r := range []struct {
		value  float64
		source string
	}{{700, record.FromDevice}, {702, record.FromInstrument}} {
		if err := b.read("charge.difference", "bus-voltage", r.value, "V", r.source); err != nil {
			t.Fatal(err)
		}
	}
	if !b.state.IsProved(signal.BusVoltage) {
		t.Error("bus-voltage is not proved by 700 V against 702 V, with 5 V of error allowed (0.5 % of 1000 V)")
	}
	if err := b.read("charge.curve", "bus-voltage", 700, "V", record.FromDevice); err != nil {
		t.Fatal(err)
	}
	if got := b.state.Assess(curve); got.Result != walk.Passed {
		t.Errorf("Assess(charge.curve) with a proved signal = %q %v, want pass", got.Result, got.Because)
	}
	b.measured("measured.sensor", "bus-voltage", finding.Fail)
	if b.state.IsProved(signal.BusVoltage) {
		t.Error("bus-voltage is still proved after its sensor has failed")
	}
}

func TestZeroAndDisagreementProveNothing(t *testing.T) {
	b := example(t)
	b.passTo("charge.source")
	for _, v := range []float64{0, 0} {
		for _, source := range []string{record.FromDevice, record.FromInstrument} {
			if err := b.read("charge.source", "bus-voltage", v, "V", source); err != nil {
				t.Fatal(err)
			}
		}
	}
	if b.state.IsProved(signal.BusVoltage) {
		t.Error("bus-voltage is proved by two zeros")
	}
	for source, v := range map[string]float64{record.FromDevice: 651.6, record.FromInstrument: 724} { // 0.9 of it
		if err := b.read("charge.source", "source-voltage", v, "V", source); err != nil {
			t.Fatal(err)
		}
	}
	if b.state.IsProved(signal.SourceVoltage) {
		t.Error("source-voltage is proved by 651.6 V against 724 V")
	}
	b.refused(walk.Judge{Point: "charge.source", Result: walk.Passed}, "the device reads 651.6 V")
}

func TestALiveBusTakesTheOtherWay(t *testing.T) {
	b := example(t)
	b.passTo("charge.bus-state")
	if err := b.read("charge.bus-state", "bus-voltage", 1012, "V", record.FromDevice); err != nil {
		t.Fatal(err)
	}
	b.seen("charge.bus-state")
	b.do(walk.Judge{Point: "charge.bus-state", Result: walk.Passed}, walk.Sign{Point: "charge.bus-state", Person: "p1"})
	b.pass("charge.clear")
	b.do(walk.Judge{Point: "charge.rise", Result: walk.NotApplicable, Note: "live bus"}, walk.Sign{Point: "charge.rise", Person: "p1"})
	b.refused(walk.Judge{Point: "charge.live-bus", Result: walk.NotApplicable, Note: "too long"}, "the bus was found live")

	dead := example(t)
	dead.passTo("charge.rise")
	if got := dead.state.BusBefore(); got != walk.BusDead {
		t.Errorf("BusBefore with 3 V on the bus = %q, want dead", got)
	}
	dead.refused(walk.Judge{Point: "charge.rise", Result: walk.NotApplicable, Note: "no time"}, "the bus was found dead")
}

func TestWitnessesAreInvitedAndTheirAbsenceIsLogged(t *testing.T) {
	b := example(t)
	b.do(walk.Enter{Stage: 1})
	b.passTo("paper.source")
	b.do(walk.Enter{Stage: 2})
	b.passTo("dead.joints")
	b.do(walk.Enter{Stage: 3})
	note := func() string {
		for _, l := range b.lines {
			if n, ok := l.Body.(record.Note); ok && strings.Contains(n.Text, "without a witness") {
				return n.Text
			}
		}
		return ""
	}
	if got := note(); !strings.Contains(got, "paper.source") {
		t.Errorf("note about the witness = %q, want paper.source named", got)
	}
	signed := example(t)
	signed.do(walk.Enter{Stage: 1})
	signed.passTo("paper.source")
	signed.do(walk.Enter{Stage: 2})
	signed.pass("paper.source")
	signed.do(walk.Sign{Point: "paper.source", Person: "p2"})
	signed.passTo("dead.joints")
	signed.do(walk.Enter{Stage: 3})
	b = signed
	if got := note(); got != "" {
		t.Errorf("note about the witness = %q, want none: the owner signed", got)
	}
}

func TestANewDayBeginsWithADeadPlant(t *testing.T) {
	b := example(t)
	b.passTo("paper.source")
	lines := len(b.lines)
	b.do(walk.Return{})
	if len(b.lines) != lines {
		t.Error("Return on the same day wrote something")
	}
	b.now = b.now.Add(24 * time.Hour)
	b.do(walk.Return{})
	if b.state.Status("safe.dead").Result != walk.Open || b.state.Status("safe.stop").Result != walk.Open {
		t.Error("after a night absence of voltage and the emergency stop still stand")
	}
	live := example(t)
	live.passTo("charge.bus-state")
	live.now = live.now.Add(24 * time.Hour)
	live.do(walk.Return{})
	if live.state.Status("safe.dead").Result != walk.Passed || live.state.Status("safe.stop").Result != walk.Open {
		t.Error("with the source on, only the emergency stop is shown anew")
	}
}

func TestChangedSiteFile(t *testing.T) {
	b := example(t)
	b.passTo("dead.contactors")
	text, _ := site.Example()
	_, _, old := b.state.SiteFile()
	b.refused(walk.ChangeSite{Name: "example.rev1.site.toml", Text: text}, "without a reason")
	b.do(walk.ChangeSite{Name: "example.rev1.site.toml", Text: strings.ReplaceAll(text, `"100 Ω ±5 %"`, `"102 Ω ±1 %"`), Why: "measured cold"})
	name, _, hash := b.state.SiteFile()
	var written record.File
	for _, l := range b.lines {
		if f, ok := l.Body.(record.File); ok {
			written = f
		}
	}
	if name != "example.rev1.site.toml" || hash == old || written.Replaces == nil || *written.Replaces != old || written.SHA256 != hash {
		t.Errorf("file record = %s replaces %v, state %s %s, want the old hash %s and the new one", written.SHA256, written.Replaces, name, hash, old)
	}
	if got := b.state.Status("paper.findings").Result; got != walk.Open {
		t.Errorf("paper.findings after a changed site file = %q, want open", got)
	}
	if r := b.state.Site().Precharge.Resistance; math.Abs(float64(r.Nominal)-102) > 1e-9 {
		t.Errorf("resistance = %v, want 102 Ω", r)
	}
}

func TestNothingAfterTheSeal(t *testing.T) {
	b := example(t)
	b.refused(walk.Seal{Person: "p8"}, "nobody entered them")
	b.do(walk.Seal{Person: "p1", UnsignedBecause: "a test"})
	for _, e := range everyEvent() {
		b.refused(e, "sealed")
	}
	if b.state.Sealed() == nil || b.state.Sealed().Verdict != string(finding.Undecided) {
		t.Errorf("Sealed = %+v, want undecided: no point has a result", b.state.Sealed())
	}
}

func everyEvent() []walk.Event {
	return []walk.Event{walk.Enter{Stage: 1}, walk.AddPerson{Name: "C", Role: "witness"}, walk.AddInstrument{Record: record.Instrument{Name: "m"}},
		walk.Take{}, walk.TakeLive{}, walk.Judge{}, walk.Sign{}, walk.Deviate{}, walk.RaisePunch{}, walk.ClearPunch{}, walk.AddNote{Text: "x"},
		walk.Reopen{}, walk.Keep{}, walk.Arm{}, walk.StopCapture{}, walk.EnterCause{}, walk.ChangeSite{}, walk.Seal{}, walk.Captured{},
		walk.LinkChanged{}, walk.Hastened{}, walk.Return{}}
}

func TestPeopleNotesAndHaste(t *testing.T) {
	b := example(t)
	b.refused(walk.AddPerson{Role: "witness"}, "no name")
	b.refused(walk.AddPerson{Name: "C. Example", Role: "captain"}, "technician, witness, surveyor, owner")
	b.refused(walk.AddNote{}, "empty")
	far := int64(100000)
	b.refused(walk.AddNote{Text: "wrong line", Corrects: &far}, "no such line")
	b.refused(walk.Hastened{Hastened: record.Hastened{What: "cool-down", Factor: 50}}, "real plant is not shortened")
	b.refused(walk.TakeLive{Point: "safe.dead"}, "belongs to the owner of the captures")
	b.do(walk.AddPerson{Name: "C. Example", Role: "surveyor", Key: "SHA256:abc"}, walk.AddNote{Text: "rain"})
	if people := b.state.People(); people[2].ID != "p3" || people[2].Key == nil {
		t.Errorf("third person = %+v, want p3 with its key", people[2])
	}
}

func TestAWholeWalkPasses(t *testing.T) {
	b := example(t)
	b.passTo("leave.handover")
	b.pass("leave.handover")
	if got := b.state.Verdict(); got != finding.Undecided && got != finding.Marginal {
		// without a register map droop.registers stays undecided; the discharge label is the example's marginal finding
		t.Errorf("Verdict = %s, want undecided or marginal", got)
	}
	if p, open := b.state.NextOpen(); open {
		t.Errorf("NextOpen = %s, want none", p.ID)
	}
	if i := slices.IndexFunc(b.state.Desk(), func(f finding.Finding) bool { return f.Verdict == finding.Fail }); i >= 0 {
		t.Errorf("desk finding %s fails", b.state.Desk()[i].ID)
	}
}

func TestALaterPersonReplacesTheEarlierOne(t *testing.T) {
	b := example(t)
	key := "SHA256:new"
	b.take(record.Person{ID: "p1", Name: "A. Example", Role: "technician", Key: &key})
	people := b.state.People()
	if len(people) != 2 || people[0].Key == nil || *people[0].Key != key {
		t.Errorf("People = %+v, want two, the first with the new key", people)
	}
}
