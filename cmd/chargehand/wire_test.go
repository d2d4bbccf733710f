package main

import (
	"context"
	"encoding/binary"
	"io"
	"math"
	"net"
	"path/filepath"
	"slices"
	"sync"
	"testing"
	"time"

	"chargehand/commission"
	"chargehand/commission/capture"
	"chargehand/commission/chlog"
	"chargehand/commission/clock"
	"chargehand/commission/desk"
	"chargehand/commission/finding"
	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/commission/site"
	"chargehand/commission/walk"
	"chargehand/protocol/link"
	"chargehand/protocol/poll"
	"chargehand/protocol/registermap"
	"chargehand/protocol/simulator"
)

// scaling is a proxy between program and device that multiplies one holding register in every answer.
type scaling struct {
	address  string // of the device
	register int
	factor   float64
}

// listen starts the proxy and gives its address. It ends with the test.
func (p scaling) listen(t *testing.T) string {
	t.Helper()
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	var serving sync.WaitGroup
	t.Cleanup(func() { l.Close(); serving.Wait() })
	serving.Go(func() {
		for {
			c, err := l.Accept()
			if err != nil {
				return
			}
			serving.Go(func() { p.pass(c) })
		}
	})
	return l.Addr().String()
}

// pass hands requests to the device one by one and changes its answers on the way back. A frame of the MODBUS Messaging on
// TCP/IP Guide V1.0b has its length in bytes 4 and 5.
func (p scaling) pass(client net.Conn) {
	defer client.Close()
	device, err := net.Dial("tcp", p.address)
	if err != nil {
		return
	}
	defer device.Close()
	for {
		request, err := frame(client)
		if err != nil {
			return
		}
		if _, err := device.Write(request); err != nil {
			return
		}
		answer, err := frame(device)
		if err != nil {
			return
		}
		first := int(binary.BigEndian.Uint16(request[8:]))
		if at := 9 + 2*(p.register-first); request[7] == 3 && answer[7] == 3 && at >= 9 && at+2 <= len(answer) {
			word := float64(binary.BigEndian.Uint16(answer[at:]))
			binary.BigEndian.PutUint16(answer[at:], uint16(math.Round(word*p.factor)))
		}
		if _, err := client.Write(answer); err != nil {
			return
		}
	}
}

func frame(c net.Conn) ([]byte, error) {
	head := make([]byte, 6)
	if _, err := io.ReadFull(c, head); err != nil {
		return nil, err
	}
	body := make([]byte, binary.BigEndian.Uint16(head[4:]))
	_, err := io.ReadFull(c, body)
	return append(head, body...), err
}

// charged is what one observed pre-charge of the example came to.
type charged struct {
	band     commission.Band
	findings []finding.Finding // on paper, as the log has them
	measured finding.Finding
	capture  capture.Capture
}

// observeCharge watches one pre-charge of the simulated converter through a proxy; it takes the time that a charge takes.
func observeCharge(t *testing.T, disturb string, factor float64) charged {
	t.Helper()
	siteText, mapText := site.Example()
	s, _, err := site.Read(site.ExampleName, []byte(siteText))
	if err != nil {
		t.Fatal(err)
	}
	m, err := registermap.Read(site.ExampleMapName, []byte(mapText))
	if err != nil {
		t.Fatal(err)
	}
	plantClock := clock.NewPlant(time.Now)
	wrong, err := simulator.ParseDisturbances(disturb)
	if err != nil {
		t.Fatal(err)
	}
	plant, err := simulator.New(simulator.Options{Site: s, Map: m, Now: plantClock.Now, Seed: 3, Disturb: wrong})
	if err != nil {
		t.Fatal(err)
	}
	ctx, stop := context.WithCancel(t.Context())
	address, err := plant.Serve(ctx, "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	wire := link.New(link.Options{Address: scaling{address, 100, factor}.listen(t), Gap: m.MinInterval, LoopbackOnly: true})
	poller := poll.New(poll.Options{Device: "forward string", Link: wire, UnitID: 1, Map: m, MaxAge: time.Second, Now: plantClock.Now, Pace: plantClock.Pace})
	batches := poller.Batches()
	var polling sync.WaitGroup
	polling.Go(func() { _ = poller.Run(ctx) })
	path := filepath.Join(t.TempDir(), "seen.chlog")
	log, err := chlog.Create(chlog.Disk{}, path, record.Opened{Mode: record.RehearsalMode, Speed: 1}, chlog.Options{Now: time.Now, Program: "test"})
	if err != nil {
		t.Fatal(err)
	}
	state, err := commission.Begin(log, commission.Papers{SiteName: site.ExampleName, SiteText: siteText, MapName: site.ExampleMapName, MapText: mapText,
		Findings: desk.Findings(s, m)}, nil)
	if err != nil {
		t.Fatal(err)
	}
	run := commission.Start(ctx, commission.Options{State: state, Log: log, Unsigned: "a test", Clock: plantClock, Batches: batches,
		Focus: func(n []signal.Name) { poller.Focus(n...) }, Channels: channels(m), MaxAge: time.Second, Registers: m, Speed: 1})
	defer func() {
		stop()
		run.Wait()
		polling.Wait()
		wire.Close()
		plant.Close()
		log.Close()
	}()

	do := func(act string) {
		t.Helper()
		parsed, err := simulator.ParseAct(act)
		if err == nil {
			err = plant.Do(ctx, parsed)
		}
		if err != nil {
			t.Fatal(err)
		}
	}
	until := func(what string, wanted func(commission.Snapshot) bool) commission.Snapshot {
		t.Helper()
		limit := time.After(30 * time.Second)
		for {
			select {
			case snapshot := <-run.Snapshots():
				if wanted(snapshot) {
					return snapshot
				}
			case <-limit:
				t.Fatalf("waited 30 s for %s", what)
			}
		}
	}
	do("isolator close")
	until("the source", func(s commission.Snapshot) bool { return s.Reading(signal.SourceVoltage).Value > 600 })
	if _, err := run.Submit(ctx, walk.Arm{Point: "charge.rise", Observing: true}); err != nil {
		t.Fatal(err)
	}
	armed := until("the armed capture", func(s commission.Snapshot) bool { return s.Capture != nil })
	do("precharge close")
	ended := until("the end of the charge", func(s commission.Snapshot) bool { return s.Capture == nil })
	found := ended.State.Measured("measured.precharge")
	if len(found) != 1 {
		t.Fatalf("%d findings measured.precharge, want one", len(found))
	}
	c, err := capture.FromRecords(ended.State.Captured(capture.Precharge))
	if err != nil {
		t.Fatal(err)
	}
	return charged{armed.Capture.Band, ended.State.Desk(), found[0], c}
}

func TestTheWireDecidesAndThePredictionDoesNot(t *testing.T) {
	t.Parallel()
	var straight, scaled, faulty charged
	t.Run("charges", func(t *testing.T) { // side by side
		t.Run("straight", func(t *testing.T) { t.Parallel(); straight = observeCharge(t, "", 1) })
		t.Run("scaled", func(t *testing.T) { t.Parallel(); scaled = observeCharge(t, "", 0.9) })
		t.Run("faulty", func(t *testing.T) { t.Parallel(); faulty = observeCharge(t, "resistor-high", 1) })
	})
	if t.Failed() {
		return
	}
	t.Run("what is shown comes from the wire", func(t *testing.T) { comesFromTheWire(t, straight, scaled) })
	t.Run("the prediction does not know the truth", func(t *testing.T) { doesNotKnow(t, straight, faulty) })
}

func comesFromTheWire(t *testing.T, straight, scaled charged) {
	if straight.measured.Verdict != finding.Pass {
		t.Fatalf("measured.precharge straight from the device = %s %v, want pass", straight.measured.Verdict, straight.measured.Because)
	}
	if scaled.measured.Verdict != finding.Fail {
		t.Errorf("measured.precharge at 0.9 of the bus voltage = %s %v, want fail", scaled.measured.Verdict, scaled.measured.Because)
	}
	top := func(c capture.Capture) float64 { _, v := c.Series(signal.BusVoltage); return slices.Max(v) }
	if got, want := top(scaled.capture)/top(straight.capture), 0.9; math.Abs(got-want) > 0.01 {
		t.Errorf("highest bus voltage of the trace, through the proxy over straight = %.3f, want %.3f", got, want)
	}
	difference := func(f finding.Finding) float64 { // the fitted final voltage's distance to the source
		for _, p := range f.Parts {
			if p.Unit == "V" {
				return p.Value.Nominal
			}
		}
		return math.NaN()
	}
	if a, b := difference(straight.measured), difference(scaled.measured); math.IsNaN(a) || math.IsNaN(b) || math.Abs(a-b) < 30 {
		t.Errorf("fitted voltages straight %.1f V, scaled %.1f V, want the fit to move by tens of volts", a, b)
	}
}

func doesNotKnow(t *testing.T, healthy, faulty charged) {
	if math.Abs(healthy.measured.Value.Nominal/faulty.measured.Value.Nominal-1) < 0.02 {
		t.Errorf("time constants %.3f s and %.3f s: the plant's truth has not changed, so nothing is proved", healthy.measured.Value.Nominal, faulty.measured.Value.Nominal)
	}
	if len(healthy.band.X) != len(faulty.band.X) || len(healthy.band.X) == 0 {
		t.Fatalf("bands of %d and %d points", len(healthy.band.X), len(faulty.band.X))
	}
	for i := range healthy.band.X { // the band starts from the source as read, to a register's digit
		if math.Abs(healthy.band.Nominal[i]-faulty.band.Nominal[i]) > 0.5 || math.Abs(healthy.band.Low[i]-faulty.band.Low[i]) > 0.5 {
			t.Fatalf("predicted band at %.2f s: %.2f V and %.2f V, want the same", healthy.band.X[i], healthy.band.Nominal[i], faulty.band.Nominal[i])
		}
	}
	for i, f := range healthy.findings {
		if g := faulty.findings[i]; f.ID != g.ID || f.Verdict != g.Verdict || f.State == finding.Finite && f.Value != g.Value {
			t.Errorf("finding on paper %s moves with the plant's truth", f.ID)
		}
	}
}
