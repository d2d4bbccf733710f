package link_test

import (
	"encoding/binary"
	"fmt"
	"slices"
	"testing"
	"time"

	"github.com/goburrow/modbus"

	"chargehand/commission/signal"
	"chargehand/protocol/link"
	"chargehand/protocol/link/linktest"
	"chargehand/protocol/registermap"
)

// rawServer answers with as little work as possible, so that the client is what is measured.
func rawServer(b *testing.B) *linktest.Server {
	b.Helper()
	s, err := linktest.Serve(func(r []byte) []byte {
		n := int(binary.BigEndian.Uint16(r[10:]))
		f := make([]byte, 9+2*n)
		copy(f, r[:8])
		binary.BigEndian.PutUint16(f[4:], uint16(3+2*n))
		f[8] = byte(2 * n)
		return f
	})
	if err != nil {
		b.Fatal(err)
	}
	b.Cleanup(s.Close)
	return s
}

// BenchmarkWholeStackOfBareClient gives the request rate of the whole stack, decoding included, as a share of that of the
// bare goburrow client in the same run: short rounds of both take turns, so that other load on the machine falls on both, and
// the median rounds are compared. The metric ratio is to be 0.8 at least.
func BenchmarkWholeStackOfBareClient(b *testing.B) {
	for _, quantity := range []int{1, 10, 50, 125} {
		b.Run(fmt.Sprintf("%d registers", quantity), func(b *testing.B) {
			s := rawServer(b)
			h := modbus.NewTCPClientHandler(s.Address())
			h.Timeout, h.SlaveId = time.Second, 1
			defer h.Close()
			bare := modbus.NewClient(h)
			l := link.New(link.Options{Address: s.Address()})
			defer l.Close()
			u := l.Unit(1)
			points := make([]registermap.Point, min(quantity, len(signal.Names))) // a map has no more signals than there are names
			for i := range points {
				points[i] = registermap.Point{Name: signal.Names[i], Table: registermap.Holding, Type: registermap.U16, Scale: 0.1,
					Address: registermap.Address(i * quantity / len(points))}
			}
			const round = 20
			var bareTimes, ownTimes []time.Duration
			for i := 0; i < b.N; i += round {
				began := time.Now()
				for range round {
					if _, err := bare.ReadHoldingRegisters(0, uint16(quantity)); err != nil {
						b.Fatal(err)
					}
				}
				middle := time.Now()
				for range round {
					a, err := u.Read(b.Context(), link.ReadHoldingRegisters, 0, quantity)
					if err != nil {
						b.Fatal(err)
					}
					for k := range points {
						at := points[k].Address
						if r := points[k].Decode(a.Words[at : at+1]); !r.Quality.HasValue() {
							b.Fatal(r.Why)
						}
					}
				}
				ownTimes = append(ownTimes, time.Since(middle))
				bareTimes = append(bareTimes, middle.Sub(began))
			}
			slices.Sort(bareTimes)
			slices.Sort(ownTimes)
			b.ReportMetric(bareTimes[len(bareTimes)/2].Seconds()/ownTimes[len(ownTimes)/2].Seconds(), "ratio")
		})
	}
}
