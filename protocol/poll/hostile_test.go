package poll_test

import (
	"math/rand/v2"
	"testing"
	"testing/synctest"
	"time"

	"chargehand/commission/signal"
	"chargehand/protocol/link/linktest"
	"chargehand/protocol/poll"
)

// TestNoWrongReadingUnderFaults polls a hostile device for ten minutes of its time. Every word of it tells its own address and
// the second it was read in, so that a value from another register or another time is known at once.
func TestNoWrongReadingUnderFaults(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		r := newRig(voltages(), poll.Options{})
		began := time.Now()
		second := func(at time.Time) int { return int(at.Sub(began) / time.Second) }
		random := rand.New(rand.NewPCG(5, 6))
		late := time.Duration(0)
		r.proxy.Script(func(n int, _ []byte) linktest.Fault {
			for _, p := range voltages().Points { // bus-voltage at 100 reads 1000 + s, the next 2000 + s, and so on
				r.image.Set(1, 3, int(p.Address)+p.Words()-1, uint16(1000*(1+int(p.Address)-100)+second(time.Now())))
				if p.Words() == 2 {
					r.image.Set(1, 3, int(p.Address), 0)
				}
			}
			late = time.Duration(random.IntN(900)) * time.Millisecond
			faults := []linktest.Fault{linktest.Silence, linktest.Late(late), linktest.Doubled(late / 4), linktest.Cut(random.IntN(20)),
				linktest.CloseAfter(random.IntN(20)), linktest.Transaction(1 + random.IntN(65535)), linktest.ForeignUnit(2),
				linktest.PDU(3, 0), linktest.PDU(3, 2, 1, 2), linktest.Exception(byte(1 + random.IntN(11))), linktest.Mangled(random),
				linktest.Mangled(random), linktest.Length(uint16(random.Uint32()))}
			if random.IntN(4) == 0 {
				return faults[random.IntN(len(faults))]
			}
			return nil
		})
		r.run(t.Context())
		defer r.close(t)
		values, withdrawn := 0, 0
		for _, b := range r.batches(10 * time.Minute) {
			for i, p := range voltages().Points {
				g := b.Readings[i]
				if !g.Quality.HasValue() {
					withdrawn++
					if g.Why == "" || g.Value != 0 {
						t.Errorf("%s without a value = %v, %q", g.Name, g.Value, g.Why)
					}
					continue
				}
				values++
				raw := int(p.Number(g.Raw)) - 1000*(1+int(p.Address)-100)
				if from, to := second(g.At.Add(-g.Uncertainty)), second(g.At.Add(g.Uncertainty)); raw < from || raw > to {
					t.Fatalf("%s = raw %d, of second %d, read in %d to %d: a wrong reading", g.Name, int(p.Number(g.Raw)), raw, from, to)
				}
				if b.At.Sub(g.At) > 500*time.Millisecond {
					t.Errorf("%s is shown %v after its time", g.Name, b.At.Sub(g.At))
				}
			}
		}
		if values < 4000 || withdrawn == 0 {
			t.Errorf("%d values, %d withdrawn, want both in plenty", values, withdrawn)
		}
		if b := last(r.batches(time.Second)); b.Find(signal.BusVoltage).Name != signal.BusVoltage {
			t.Errorf("the last batch lacks its signals: %+v", b)
		}
	})
}
