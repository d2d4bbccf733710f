//go:build unix

package poll_test

import (
	"context"
	"encoding/binary"
	"sync"
	"syscall"
	"testing"
	"time"

	"chargehand/commission/signal"
	"chargehand/protocol/link"
	"chargehand/protocol/link/linktest"
	"chargehand/protocol/poll"
	"chargehand/protocol/registermap"
)

// BenchmarkSixteenDevices polls 16 devices with 40 points each 20 times a second for two seconds and gives the CPU time of
// the whole process, the servers it plays to itself included, as a share of one core. It is to be under 10 %.
func BenchmarkSixteenDevices(b *testing.B) {
	const devices, points = 16, 40
	s, err := linktest.Serve(func(r []byte) []byte {
		n := int(binary.BigEndian.Uint16(r[10:]))
		pdu := make([]byte, 2+2*n)
		pdu[0], pdu[1] = r[7], byte(2*n)
		return linktest.Frame(binary.BigEndian.Uint16(r), r[6], pdu...)
	})
	if err != nil {
		b.Fatal(err)
	}
	defer s.Close()
	m := registermap.Map{MaxBlock: 100, MaxGap: 8}
	for i := range points {
		m.Points = append(m.Points, registermap.Point{Name: signal.Names[i%len(signal.Names)], Table: registermap.Holding,
			Address: registermap.Address(100 + i), Type: registermap.U16, Scale: 0.1})
	}
	for b.Loop() {
		ctx, cancel := context.WithTimeout(b.Context(), 2*time.Second)
		var all sync.WaitGroup
		began, before := time.Now(), cpu(b)
		batches := 0
		var mu sync.Mutex
		for range devices {
			l := link.New(link.Options{Address: s.Address()})
			p := poll.New(poll.Options{Link: l, UnitID: 1, Map: m})
			kept := p.Batches()
			all.Go(func() { p.Run(ctx); l.Close() })
			all.Go(func() {
				for range kept {
					mu.Lock()
					batches++
					mu.Unlock()
				}
			})
		}
		all.Wait()
		cancel()
		b.ReportMetric(100*(cpu(b)-before).Seconds()/time.Since(began).Seconds(), "%core")
		b.ReportMetric(float64(batches)/devices/time.Since(began).Seconds(), "polls/s")
	}
}

// cpu is the processor time the process has used.
func cpu(b *testing.B) time.Duration {
	var u syscall.Rusage
	if err := syscall.Getrusage(syscall.RUSAGE_SELF, &u); err != nil {
		b.Fatal(err)
	}
	return time.Duration(u.Utime.Nano() + u.Stime.Nano())
}
