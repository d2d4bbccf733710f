package link_test

import (
	"context"
	"encoding/binary"
	"math/rand/v2"
	"slices"
	"testing"
	"testing/synctest"
	"time"

	"chargehand/protocol/link"
	"chargehand/protocol/link/linktest"
)

// anyFault draws a fault. None of them changes data bytes of a frame that is right in all else: nothing in the protocol could
// tell.
func anyFault(r *rand.Rand) linktest.Fault {
	random := make([]byte, r.IntN(300))
	for i := range random {
		random[i] = byte(r.Uint32())
	}
	later := time.Duration(r.IntN(850)) * time.Millisecond // a device away for longer than two time-outs is no single fault
	soon := later / 4
	forged := func(req []byte) []byte {
		return linktest.Frame(binary.BigEndian.Uint16(req)+uint16(1+r.IntN(4)), req[6], req[7], 2, 0xBA, 0xD0)
	}
	faults := []linktest.Fault{
		linktest.Silence,
		linktest.Late(later),
		linktest.Doubled(0), linktest.Doubled(soon),
		linktest.Cut(r.IntN(12)),
		linktest.CloseAfter(r.IntN(12)), linktest.AnswerThenClose,
		linktest.DripFeed(time.Duration(r.IntN(30)) * time.Millisecond),
		linktest.Transaction(1 + r.IntN(65535)),
		linktest.Protocol(uint16(1 + r.IntN(65535))),
		linktest.Length(uint16(r.IntN(65536))),
		linktest.ForeignUnit(byte(r.IntN(256))),
		linktest.Exception(byte(r.IntN(256))),
		linktest.PDU(random[:min(len(random), 253)]...),
		linktest.PDU(3), linktest.PDU(3, 0), linktest.PDU(4, 2, 1, 2), linktest.PDU(3, 2, 1), linktest.PDU(0x83),
		linktest.Raw(random...),
		linktest.Followed(0, forged), linktest.Followed(soon, forged),
		linktest.Followed(0, func([]byte) []byte { return random }),
		linktest.Mangled(r), linktest.Mangled(r), linktest.Mangled(r), linktest.Mangled(r),
	}
	return faults[r.IntN(len(faults))]
}

// content is what the device holds: other at every address and in every session, so that no answer fits another question.
func content(session uint64, address int) uint16 {
	r := rand.NewPCG(session, uint64(address))
	return uint16(r.Uint64())
}

// TestTenThousandHostileSessions: one fault in three requests, drawn at random. No wrong word is delivered, and each fault
// costs one request at most.
func TestTenThousandHostileSessions(t *testing.T) {
	const sessions = 10_000
	synctest.Test(t, func(t *testing.T) {
		good, failed := 0, 0
		for s := range uint64(sessions) {
			g, f := hostileSession(t, s)
			good += g
			failed += f
			if t.Failed() {
				return
			}
		}
		if good < 6*sessions || failed < sessions {
			t.Errorf("%d good and %d failed requests, want faults to bite and most requests to succeed", good, failed)
		}
	})
}

// hostileSession makes nine requests; every third meets a fault.
func hostileSession(t *testing.T, s uint64) (good, failed int) {
	const requests = 9
	r := rand.New(rand.NewPCG(s, 1))
	b := overPipe(link.Options{Random: rand.NewPCG(s, 2)})
	defer b.close()
	next := make(chan linktest.Fault, 1) // a request repeated on a new connection is answered well
	b.proxy.Script(func(int, []byte) linktest.Fault {
		select {
		case f := <-next:
			return f
		default:
			return nil
		}
	})
	var ok [requests]bool
	for i := range requests {
		if i%3 == 0 {
			next <- anyFault(r)
		}
		address, quantity := r.IntN(1000), 1+r.IntN(20)
		want := make([]uint16, quantity)
		for k := range want {
			want[k] = content(s, address+k)
		}
		b.image.Set(1, 3, address, want...)
		a, err := b.link.Unit(1).Read(t.Context(), link.ReadHoldingRegisters, address, quantity)
		if ok[i] = err == nil; !ok[i] {
			failed++
			continue
		}
		good++
		if !slices.Equal(a.Words, want) {
			t.Errorf("session %d, request %d: %04x, a wrong reading, want %04x", s, i, a.Words, want)
		}
	}
	for i := 0; i < requests; i += 3 {
		if !ok[i] && !ok[i+1] || !ok[i+2] {
			t.Errorf("session %d: requests answered %v, want no fault to cost more than one request", s, ok)
		}
	}
	return good, failed
}

// TestHostileSessionsOverTCP is the same over sockets, with the faults that need no waiting, so that what the system's
// buffers do is in it.
func TestHostileSessionsOverTCP(t *testing.T) {
	for s := range uint64(300) {
		r := rand.New(rand.NewPCG(s, 3))
		b := overTCP(t, link.Options{})
		quick := []linktest.Fault{linktest.CloseAfter(r.IntN(12)), linktest.ResetAfter(r.IntN(12)), linktest.AnswerThenClose,
			linktest.Transaction(1 + r.IntN(65535)), linktest.ForeignUnit(byte(2 + r.IntN(254))), linktest.Doubled(0),
			linktest.Followed(0, func([]byte) []byte { return []byte{0} }), linktest.PDU(3, 0), linktest.Length(0)}
		fault := quick[r.IntN(len(quick))]
		b.proxy.Script(func(n int, _ []byte) linktest.Fault {
			if n == 2 {
				return fault
			}
			return nil
		})
		failed := 0
		for i := range 8 {
			address := r.IntN(1000)
			b.image.Set(1, 3, address, content(s, address))
			a, err := b.link.Unit(1).Read(t.Context(), link.ReadHoldingRegisters, address, 1)
			if err != nil {
				failed++
			} else if a.Words[0] != content(s, address) {
				t.Fatalf("session %d, request %d: a wrong reading", s, i)
			}
		}
		if failed > 1 {
			t.Errorf("session %d: one fault cost %d requests, want one at most", s, failed)
		}
		b.link.Close()
	}
}

// FuzzReply sends any bytes for an answer: what is delivered must be a right frame's content, and nothing panics. Each run
// ends the connection behind the bytes, so that none waits.
func FuzzReply(f *testing.F) {
	f.Add(byte(3), uint16(0), byte(2), []byte{0, 0, 0, 7, 1, 3, 4, 0xDE, 0xAD, 0xBE, 0xEF}, true)
	f.Add(byte(1), uint16(19), byte(19), []byte{0, 0, 0, 6, 1, 1, 3, 0xCD, 0x6B, 0x05}, true)
	f.Add(byte(4), uint16(8), byte(1), []byte{0, 0, 0, 3, 1, 0x84, 2}, true)
	f.Add(byte(3), uint16(0), byte(2), []byte("HTTP/1.1 400 Bad Request\r\n\r\n"), false)
	f.Add(byte(3), uint16(0), byte(2), []byte{0, 0, 0xFF, 0xFF, 1, 3, 4, 0xDE, 0xAD, 0xBE, 0xEF}, true)
	f.Fuzz(func(t *testing.T, function byte, address uint16, quantity byte, reply []byte, rightTransaction bool) {
		if function < 1 || function > 4 || quantity < 1 || quantity > 125 || int(address)+int(quantity) > 65536 {
			return
		}
		ctx, cancel := context.WithTimeout(t.Context(), 5*time.Second)
		defer cancel()
		p := linktest.NewProxy((&linktest.Image{}).Answer)
		defer p.Close()
		p.Script(func(n int, request []byte) linktest.Fault {
			all := reply
			if rightTransaction {
				all = append(slices.Clone(request[:2]), reply...)
			}
			return func(_, _ []byte) []linktest.Step { return []linktest.Step{{Bytes: all, Close: true}} }
		})
		l := link.New(link.Options{Address: "192.0.2.1:502", Dial: p.Dial})
		defer l.Close()
		a, err := l.Unit(1).Read(ctx, link.Function(function), int(address), int(quantity))
		if err != nil {
			return
		}
		data := 2 * int(quantity)
		if function < 3 {
			data = (int(quantity) + 7) / 8
		}
		want := append([]byte{0, 0, 0, byte(3 + data), 1, function, byte(data)}, reply[min(len(reply), 7):]...)
		if !rightTransaction || len(reply) != 7+data || !slices.Equal(reply, want) {
			t.Fatalf("Read took % x as an answer to function %d, %d items", reply, function, quantity)
		}
		if len(a.Words)+len(a.Bits) != int(quantity) {
			t.Fatalf("Read gives %d words and %d bits, want %d", len(a.Words), len(a.Bits), quantity)
		}
	})
}
