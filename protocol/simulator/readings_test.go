package simulator

import (
	"testing"
	"time"

	"github.com/simonvetter/modbus"

	"chargehand/commission/signal"
	"chargehand/protocol/registermap"
)

func TestWordsSwappedShowsInWideValues(t *testing.T) {
	read := func(disturb ...string) float64 {
		b := newBench(t, 3, disturb...)
		if err := b.Restore(8); err != nil {
			t.Fatal(err)
		}
		b.do("load 50 %", "1s")
		return b.shown(signal.Power)
	}
	if sound, swapped := read(), read("words-swapped"); sound < 30e3 || swapped > -1e6 && swapped < 1e6 {
		t.Errorf("power = %g W, with words-swapped %g W, want another size altogether", sound, swapped)
	}
}

func TestTornWordsMixTwoRefreshes(t *testing.T) {
	spikes := func(disturb ...string) int {
		b := newBench(t, 3, disturb...)
		if err := b.Restore(9); err != nil {
			t.Fatal(err)
		}
		b.do("mode current")
		n, last := 0, 0.0
		for k := range 400 {
			if k%40 == 0 {
				b.do([]string{"power 20 kW", "power -20 kW"}[k/40%2])
			}
			b.wait(20 * time.Millisecond)
			v := b.shown(signal.Power)
			if v-last > 30e3 || v-last < -30e3 {
				n++
			}
			last = v
		}
		return n
	}
	if sound, torn := spikes(), spikes("torn-words=1"); sound != 0 || torn == 0 {
		t.Errorf("spikes of 65536 W: %d sound, %d torn", sound, torn)
	}
}

func TestReadingsSlowRepeatThemselves(t *testing.T) {
	different := func(disturb ...string) int {
		b := newBench(t, 3, disturb...)
		b.do("isolator close", "200ms", "precharge close")
		seen := map[float64]bool{}
		for range 100 {
			b.wait(20 * time.Millisecond)
			seen[b.shown(signal.BusVoltage)] = true
		}
		return len(seen)
	}
	if sound, slow := different(), different("readings-slow"); sound < 70 || slow > 5 {
		t.Errorf("different bus voltages in 2 s of charging: %d sound, %d slow", sound, slow)
	}
}

// ask reads register 101, and the registers around it, over the wire.
func ask(client *modbus.ModbusClient, first, n uint16) ([]uint16, error) {
	return client.ReadRegisters(first, n, modbus.HOLDING_REGISTER)
}

func TestAnswersOneBehind(t *testing.T) {
	_, client, _ := serve(t, 1, "answers-one-behind")
	ask(client, 200, 2)
	got, err := ask(client, 100, 2)
	if err != nil || got[0] != 10300 {
		t.Errorf("registers 100 and 101 = %v, %v, want the setpoint of 1030.0 V asked for before", got, err)
	}
}

func TestGatewayRepeatsOldAnswers(t *testing.T) {
	_, client, _ := serve(t, 4, "gateway-repeats-old")
	beats := map[uint16]int{}
	longest := 0
	for end := time.Now().Add(2 * time.Second); time.Now().Before(end); time.Sleep(2 * time.Millisecond) {
		v, err := ask(client, 123, 1)
		if err != nil {
			t.Fatal(err)
		}
		if beats[v[0]]++; beats[v[0]] > longest {
			longest = beats[v[0]]
		}
	}
	if longest < 40 || len(beats) < 50 {
		t.Errorf("the heartbeat stood still for %d answers and had %d values, want a long pause and many values", longest, len(beats))
	}
}

func TestLinkDropsAndComesBack(t *testing.T) {
	_, _, address := serve(t, 10, "link-drops")
	lost, answered := 0, 0
	client := dial(t, address)
	for end := time.Now().Add(1500 * time.Millisecond); time.Now().Before(end); time.Sleep(5 * time.Millisecond) {
		if _, err := ask(client, 100, 2); err != nil {
			lost++
			client.Close()
			client = dial(t, address)
			continue
		}
		answered++
	}
	if lost == 0 || answered < 5*lost {
		t.Errorf("%d requests lost, %d answered, want some lost and most answered", lost, answered)
	}
}

func TestPeersAnswerOnTheirOwnUnits(t *testing.T) {
	begin := time.Now()
	s, err := New(Options{Site: wagtail(t), Map: wagtailMap(t), Seed: 3, ReplyDelay: -1,
		Now:   func() time.Time { return begin.Add(20 * time.Since(begin)) },
		Peers: []Peer{{Infeed: "shore rectifier", UnitID: 7, Map: peerMap()}}})
	if err != nil {
		t.Fatal(err)
	}
	defer s.Close()
	if err := s.Restore(8); err != nil {
		t.Fatal(err)
	}
	address, err := s.Serve(t.Context(), "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	if err := s.Do(t.Context(), Act{Verb: Load, On: true, Value: 0.5, Fraction: true}); err != nil {
		t.Fatal(err)
	}
	client := dial(t, address)
	client.SetUnitId(7)
	eventually(t, "half of 100 kW from the peer", func() bool {
		v, err := ask(client, 10, 2)
		return err == nil && v[1] > 400 && v[1] < 620 && v[0] > 10000
	})
}

func peerMap() registermap.Map {
	point := func(n signal.Name, a registermap.Address) registermap.Point {
		return registermap.Point{Name: n, Table: registermap.Holding, Address: a, Type: registermap.I16, Scale: 0.1, UnitFactor: 1,
			WordOrder: registermap.HighFirst, ByteOrder: registermap.HighFirst}
	}
	return registermap.Map{Points: []registermap.Point{point(signal.BusVoltage, 10), point(signal.BusCurrent, 11)}}
}
