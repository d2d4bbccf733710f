package simulator

import (
	"context"
	"io"
	"log"
	"strings"
	"testing"
	"time"

	"chargehand/commission/signal"

	"github.com/simonvetter/modbus"
	"go.uber.org/goleak"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// serve starts a simulator with a clock that runs times as fast as the wall clock, and a client.
func serve(t *testing.T, times float64, disturb ...string) (*Simulator, *modbus.ModbusClient, string) {
	t.Helper()
	begin := time.Now()
	o := Options{Site: wagtail(t), Map: wagtailMap(t), Seed: 3, ReplyDelay: -1, Now: func() time.Time {
		return begin.Add(time.Duration(float64(time.Since(begin)) * times))
	}}
	for _, text := range disturb {
		d, err := ParseDisturbance(text)
		if err != nil {
			t.Fatal(err)
		}
		o.Disturb = append(o.Disturb, d)
	}
	s, err := New(o)
	if err != nil {
		t.Fatal(err)
	}
	address, err := s.Serve(t.Context(), "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	client := dial(t, address)
	t.Cleanup(func() { s.Close() })
	return s, client, address
}

func dial(t *testing.T, address string) *modbus.ModbusClient {
	t.Helper()
	client, err := modbus.NewClient(&modbus.ClientConfiguration{URL: "tcp://" + address, Timeout: 2 * time.Second,
		Logger: log.New(io.Discard, "", 0)})
	if err != nil {
		t.Fatal(err)
	}
	if err := client.Open(); err != nil {
		t.Fatal(err)
	}
	client.SetUnitId(1)
	t.Cleanup(func() { client.Close() })
	return client
}

// eventually waits, at most twenty seconds, until something has come about.
func eventually(t *testing.T, what string, done func() bool) {
	t.Helper()
	for end := time.Now().Add(20 * time.Second); time.Now().Before(end); time.Sleep(5 * time.Millisecond) {
		if done() {
			return
		}
	}
	t.Fatalf("%s has not come about", what)
}

func TestServeAnswersWithThePlantsVoltages(t *testing.T) {
	s, client, _ := serve(t, 1)
	if err := s.Restore(6); err != nil {
		t.Fatal(err)
	}
	eventually(t, "bypass report over Modbus", func() bool {
		states, err := client.ReadRegister(120, modbus.HOLDING_REGISTER)
		return err == nil && states>>3&1 == 1
	})
	block, err := client.ReadRegisters(100, 24, modbus.HOLDING_REGISTER)
	if err != nil {
		t.Fatal(err)
	}
	emf := s.Truth()["source.emf"]
	if got := float64(block[1]) * 0.1; got < emf-6 || got > emf+6 {
		t.Errorf("%s after the bypass closed = %.1f V, want the source's %.1f V within 6 V", signal.SourceVoltage, got, emf)
	}
	if got := float64(block[0]) * 0.1; got < emf-8 || got > emf+35 { // the diodes hold the overshoot of closing on 25 V
		t.Errorf("%s after the bypass closed = %.1f V, want %.1f V to 35 V above", signal.BusVoltage, got, emf)
	}
}

func TestServeRefusesWhatNoMapHas(t *testing.T) {
	s, client, address := serve(t, 1)
	for _, c := range []struct {
		name string
		do   func() error
		want error
	}{
		{"hole beyond max_gap", func() error { _, err := client.ReadRegister(150, modbus.HOLDING_REGISTER); return err }, modbus.ErrIllegalDataAddress},
		{"other table", func() error { _, err := client.ReadRegister(100, modbus.INPUT_REGISTER); return err }, modbus.ErrIllegalDataAddress},
		{"block into a hole", func() error { _, err := client.ReadRegisters(120, 10, modbus.HOLDING_REGISTER); return err }, modbus.ErrIllegalDataAddress},
		{"write register", func() error { return client.WriteRegister(200, 10000) }, modbus.ErrIllegalFunction},
		{"write registers", func() error { return client.WriteRegisters(200, []uint16{1, 2}) }, modbus.ErrIllegalFunction},
		{"write coil of no command", func() error { return client.WriteCoil(5, true) }, modbus.ErrIllegalFunction},
		{"gap within max_gap", func() error { _, err := client.ReadRegisters(100, 24, modbus.HOLDING_REGISTER); return err }, nil},
	} {
		if err := c.do(); err != c.want {
			t.Errorf("%s = %v, want %v", c.name, err, c.want)
		}
	}
	other := dial(t, address)
	other.SetUnitId(9)
	if _, err := other.ReadRegister(100, modbus.HOLDING_REGISTER); err != modbus.ErrGWTargetFailedToRespond {
		t.Errorf("unit 9 = %v, want %v", err, modbus.ErrGWTargetFailedToRespond)
	}
	if writes, commands := s.Writes(); writes != 3 || commands != 0 {
		t.Errorf("Writes() = %d, %d, want 3, 0", writes, commands)
	}
}

func TestCommandCoilsOperateThePlant(t *testing.T) {
	s, client, _ := serve(t, 1)
	for _, coil := range []uint16{commandCoils, commandCoils + 1} {
		if err := client.WriteCoil(coil, true); err != nil {
			t.Fatal(err)
		}
	}
	eventually(t, "isolator and pre-charge", func() bool {
		states, err := client.ReadCoils(commandCoils, 4)
		return err == nil && states[0] && states[1] && !states[2]
	})
	if err := client.WriteCoil(commandCoils+3, true); err != modbus.ErrServerDeviceFailure {
		t.Errorf("release before the bypass closed = %v, want %v", err, modbus.ErrServerDeviceFailure)
	}
	if err := s.Restore(6); err != nil {
		t.Fatal(err)
	}
	if err := client.WriteCoil(commandCoils+3, true); err != nil {
		t.Fatal(err)
	}
	eventually(t, "running", func() bool {
		states, err := client.ReadRegister(120, modbus.HOLDING_REGISTER)
		return err == nil && states>>1&1 == 1
	})
	if behind := s.Behind(); behind < 0 {
		t.Errorf("Behind() = %v, want 0 or more", behind)
	}
	if _, commands := s.Writes(); commands < 3 {
		t.Errorf("Writes() = %d commands, want at least 3", commands)
	}
}

func TestServeEndsWithItsContext(t *testing.T) {
	s, err := New(Options{Site: wagtail(t), Map: wagtailMap(t), Now: time.Now})
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(t.Context())
	address, err := s.Serve(ctx, "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	if strings.HasSuffix(address, ":0") {
		t.Errorf("Serve = %s, want the port that was taken", address)
	}
	if _, err := s.Serve(ctx, "127.0.0.1:0"); err == nil {
		t.Error("Serve twice = nil, want an error")
	}
	cancel()
	if err := s.Close(); err != nil {
		t.Error(err)
	}
}
