package link_test

import (
	"bytes"
	"context"
	"encoding/binary"
	"errors"
	"fmt"
	"net"
	"slices"
	"testing"
	"testing/synctest"
	"time"

	"go.uber.org/goleak"

	"chargehand/protocol/link"
	"chargehand/protocol/link/linktest"
)

func TestMain(m *testing.M) { goleak.VerifyTestMain(m) }

// bench is a link to an image through a fault proxy.
type bench struct {
	image *linktest.Image
	proxy *linktest.Proxy
	link  *link.Link
}

// overTCP connects through loopback.
func overTCP(t testing.TB, o link.Options) *bench {
	t.Helper()
	b := &bench{image: &linktest.Image{}}
	b.proxy = linktest.NewProxy(b.image.Answer)
	if err := b.proxy.Listen(); err != nil {
		t.Fatal(err)
	}
	o.Address = b.proxy.Address()
	o.LeastTimeout = 5 * time.Second // a busy machine is no slow device
	b.link = link.New(o)
	t.Cleanup(func() { b.link.Close(); b.proxy.Close() })
	return b
}

// overPipe connects through a pipe, for a time bubble. The caller closes it before the bubble ends.
func overPipe(o link.Options) *bench {
	b := &bench{image: &linktest.Image{}}
	b.proxy = linktest.NewProxy(b.image.Answer)
	o.Address, o.Dial = "192.0.2.1:502", b.proxy.Dial
	b.link = link.New(o)
	return b
}

func (b *bench) close() { b.link.Close(); b.proxy.Close() }

func TestReadEachTable(t *testing.T) {
	b := overTCP(t, link.Options{})
	// The data of the worked examples of APP V1.1b3, 6.1 to 6.4.
	for i, bit := range []uint16{1, 0, 1, 1, 0, 0, 1, 1, 1, 1, 0, 1, 0, 1, 1, 0, 1, 0, 1} {
		b.image.Set(17, 1, 19+i, bit)
	}
	b.image.Set(17, 3, 107, 555, 0, 100)
	b.image.Set(17, 4, 8, 10)
	u := b.link.Unit(17)
	a, err := u.Read(t.Context(), link.ReadHoldingRegisters, 107, 3)
	if want := []uint16{555, 0, 100}; err != nil || !slices.Equal(a.Words, want) {
		t.Errorf("Read(holding 107, 3) = %v, %v, want %v", a.Words, err, want)
	}
	a, err = u.Read(t.Context(), link.ReadInputRegisters, 8, 1)
	if want := []uint16{10}; err != nil || !slices.Equal(a.Words, want) {
		t.Errorf("Read(input 8, 1) = %v, %v, want %v", a.Words, err, want)
	}
	a, err = u.Read(t.Context(), link.ReadCoils, 19, 19)
	if got, want := bitString(a.Bits), "1011001111010110101"; err != nil || got != want {
		t.Errorf("Read(coil 19, 19) = %v, %v, want %v", got, err, want)
	}
	if a.Sent.IsZero() || a.Received.Before(a.Sent) || a.Midpoint().Before(a.Sent) || a.Midpoint().After(a.Received) {
		t.Errorf("times of the answer = %v, %v, %v, want sent ≤ midpoint ≤ received", a.Sent, a.Midpoint(), a.Received)
	}
}

func bitString(bits []bool) string {
	var s []byte
	for _, b := range bits {
		c := byte('0')
		if b {
			c = '1'
		}
		s = append(s, c)
	}
	return string(s)
}

// TestStandardFrames compares what goes over the wire with the worked examples, byte for byte but for the transaction.
func TestStandardFrames(t *testing.T) {
	tests := []struct {
		name            string
		source          string
		function        link.Function
		address, number int
		request, answer []byte // protocol data units
		words           []uint16
		bits            string
		exception       byte
	}{
		{name: "read coils", source: "APP V1.1b3, 6.1, p. 12", function: link.ReadCoils, address: 19, number: 19,
			request: []byte{0x01, 0x00, 0x13, 0x00, 0x13}, answer: []byte{0x01, 0x03, 0xCD, 0x6B, 0x05},
			bits: "1011001111010110101"},
		{name: "read discrete inputs", source: "APP V1.1b3, 6.2", function: link.ReadDiscreteInputs, address: 196, number: 22,
			request: []byte{0x02, 0x00, 0xC4, 0x00, 0x16}, answer: []byte{0x02, 0x03, 0xAC, 0xDB, 0x35},
			bits: "0011010111011011101011"},
		{name: "read holding registers", source: "APP V1.1b3, 6.3, p. 15", function: link.ReadHoldingRegisters, address: 107,
			number: 3, request: []byte{0x03, 0x00, 0x6B, 0x00, 0x03},
			answer: []byte{0x03, 0x06, 0x02, 0x2B, 0x00, 0x00, 0x00, 0x64}, words: []uint16{555, 0, 100}},
		{name: "read input registers", source: "APP V1.1b3, 6.4", function: link.ReadInputRegisters, address: 8, number: 1,
			request: []byte{0x04, 0x00, 0x08, 0x00, 0x01}, answer: []byte{0x04, 0x02, 0x00, 0x0A}, words: []uint16{10}},
		{name: "exception", source: "APP V1.1b3, 7, p. 47", function: link.ReadCoils, address: 0x04A1, number: 1,
			request: []byte{0x01, 0x04, 0xA1, 0x00, 0x01}, answer: []byte{0x81, 0x02}, exception: 2},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			b := overTCP(t, link.Options{})
			b.proxy.Script(func(int, []byte) linktest.Fault { return linktest.PDU(tt.answer...) })
			a, err := b.link.Unit(0x11).Read(t.Context(), tt.function, tt.address, tt.number)
			if e, ok := errors.AsType[*link.ExceptionError](err); tt.exception != 0 && (!ok || e.Code != tt.exception) {
				t.Errorf("Read(%s) = %v, want exception %d", tt.source, err, tt.exception)
			}
			if tt.exception == 0 && (err != nil || !slices.Equal(a.Words, tt.words) || bitString(a.Bits) != tt.bits) {
				t.Errorf("Read(%s) = %v %s, %v, want %v %s", tt.source, a.Words, bitString(a.Bits), err, tt.words, tt.bits)
			}
			// Header after TCP guide V1.0b, 3.1.3: protocol 0, length of what follows, unit.
			want := append([]byte{0, 0, 0, 6, 0x11}, tt.request...)
			if got := b.proxy.Requests()[0][2:]; !bytes.Equal(got, want) {
				t.Errorf("request of %s = % x, want % x", tt.source, got, want)
			}
		})
	}
}

func TestQuantityAndAddressEdges(t *testing.T) {
	b := overTCP(t, link.Options{})
	u := b.link.Unit(1)
	for _, tt := range []struct {
		f       link.Function
		address int
		n       int
		ok      bool
	}{ // APP V1.1b3, 6.1 and 6.3: 1 to 2000 bits, 1 to 125 registers; addresses end at 65535
		{link.ReadHoldingRegisters, 0, 0, false}, {link.ReadHoldingRegisters, 0, 1, true},
		{link.ReadHoldingRegisters, 0, 125, true}, {link.ReadHoldingRegisters, 0, 126, false},
		{link.ReadCoils, 0, 0, false}, {link.ReadCoils, 0, 2000, true}, {link.ReadCoils, 0, 2001, false},
		{link.ReadInputRegisters, 65535, 1, true}, {link.ReadInputRegisters, 65535, 2, false},
		{link.ReadInputRegisters, -1, 1, false}, {link.ReadInputRegisters, 65411, 125, true},
		{link.Function(6), 0, 1, false}, {link.Function(0x83), 0, 1, false},
	} {
		before := len(b.proxy.Requests())
		_, err := u.Read(t.Context(), tt.f, tt.address, tt.n)
		if (err == nil) != tt.ok {
			t.Errorf("Read(%v, %d, %d) = %v, want ok %v", tt.f, tt.address, tt.n, err, tt.ok)
		}
		if sent := len(b.proxy.Requests()) - before; !tt.ok && sent != 0 {
			t.Errorf("Read(%v, %d, %d) sent %d requests, want none", tt.f, tt.address, tt.n, sent)
		}
	}
}

// TestRecoversWithinOneRetry is the table of hostile answers: after each, an error or the right value, and the right value
// at the latest at the next request. Request: unit 1, holding 0, two registers.
func TestRecoversWithinOneRetry(t *testing.T) {
	forged := func(add int) func([]byte) []byte {
		return func(r []byte) []byte {
			return linktest.Frame(binary.BigEndian.Uint16(r)+uint16(add), r[6], 3, 4, 0xBA, 0xD0, 0xBA, 0xD1)
		}
	}
	rubbish := func(n int) func([]byte) []byte { return func([]byte) []byte { return bytes.Repeat([]byte{0xA5}, n) } }
	zeros := func(n int) func([]byte) []byte { return func([]byte) []byte { return make([]byte, n) } }
	tests := []struct {
		name  string
		fault linktest.Fault
		right bool // the request itself may be answered with the right value
	}{
		{"one register for two", linktest.PDU(3, 2, 0xDE, 0xAD), false},
		{"three registers for two", linktest.PDU(3, 6, 0xDE, 0xAD, 0xBE, 0xEF, 0xDE, 0xAD), false},
		{"odd count", linktest.PDU(3, 3, 0xDE, 0xAD, 0xBE), false},
		{"zero bytes as success", linktest.PDU(3, 0), false},
		{"125 registers for two", linktest.PDU(append([]byte{3, 250}, make([]byte, 250)...)...), false},
		{"count above the data", linktest.PDU(3, 6, 0xDE, 0xAD, 0xBE, 0xEF), false},
		{"count below the data", linktest.PDU(3, 2, 0xDE, 0xAD, 0xBE, 0xEF), false},
		{"length field too small", linktest.Length(5), false},
		{"length field too large", linktest.Length(9), false},
		{"length 0", linktest.Length(0), false},
		{"length 1", linktest.Length(1), false},
		{"length 2", linktest.Length(2), false},
		{"length 255", linktest.Length(255), false},
		{"length 65535", linktest.Length(65535), false},
		{"a forged next answer behind", linktest.Followed(0, forged(1)), false},
		{"a forged next answer a little later", linktest.Followed(time.Millisecond, forged(1)), true},
		{"a forged same answer behind", linktest.Followed(0, forged(0)), false},
		{"doubled at once", linktest.Followed(0, func(r []byte) []byte { return forged(0)(r) }), false},
		{"doubled later", linktest.Doubled(time.Millisecond), true},
		{"3 bytes behind", linktest.Followed(0, rubbish(3)), false},
		{"3 bytes later", linktest.Followed(time.Millisecond, rubbish(3)), true},
		{"300 bytes behind", linktest.Followed(0, rubbish(300)), false},
		{"100 kB behind", linktest.Followed(0, zeros(100_000)), false},
		{"length 65535 hiding a forged answer", func(r, h []byte) []linktest.Step {
			f := slices.Clone(h)
			binary.BigEndian.PutUint16(f[4:], 65535)
			return []linktest.Step{{Bytes: append(f, forged(1)(r)...)}}
		}, false},
		{"wrong function", linktest.PDU(4, 4, 0xDE, 0xAD, 0xBE, 0xEF), false},
		{"wrong function looking like an exception 2", linktest.PDU(4, 2, 0xDE, 0xAD), false},
		{"function 0", linktest.PDU(0, 4, 0xDE, 0xAD, 0xBE, 0xEF), false},
		{"exception of another function", linktest.PDU(0x84, 2), false},
		{"exception without a code", linktest.PDU(0x83), false},
		{"exception 0", linktest.PDU(0x83, 0), false},
		{"exception with 4 bytes behind its code", linktest.PDU(0x83, 2, 0, 0, 0, 0), false},
		{"write echoed", linktest.PDU(6, 0, 0, 0, 1), false},
		{"foreign unit", linktest.ForeignUnit(2), false},
		{"unit 0", linktest.ForeignUnit(0), false},
		{"unit 255", linktest.ForeignUnit(255), false},
		{"transaction + 1", linktest.Transaction(1), false},
		{"transaction − 1", linktest.Transaction(-1), false},
		{"protocol 1", linktest.Protocol(1), false},
		{"HTTP", linktest.Raw([]byte("HTTP/1.1 400 Bad Request\r\n\r\n")...), false},
		{"an RTU frame", linktest.Raw(1, 3, 4, 0xDE, 0xAD, 0xBE, 0xEF, 0x12, 0x34), false},
		{"1 MiB of zeros", linktest.Raw(make([]byte, 1<<20)...), false},
		{"drip feed", linktest.DripFeed(time.Millisecond), true},
		{"answer, then end", linktest.AnswerThenClose, true},
	}
	for n := range 13 { // ended and reset at every byte of the answer
		tests = append(tests, struct {
			name  string
			fault linktest.Fault
			right bool
		}{fmt.Sprintf("ended after %d bytes", n), linktest.CloseAfter(n), n == 0}, struct {
			name  string
			fault linktest.Fault
			right bool
		}{fmt.Sprintf("reset after %d bytes", n), linktest.ResetAfter(n), n == 0})
	}
	for _, tt := range tests {
		for _, first := range []bool{true, false} {
			t.Run(fmt.Sprintf("%s, first %v", tt.name, first), func(t *testing.T) {
				b := overTCP(t, link.Options{})
				b.image.Set(1, 3, 0, 0x1234, 0x5678)
				at := 1
				if first {
					at = 0
				}
				b.proxy.Script(func(n int, _ []byte) linktest.Fault {
					if n == at {
						return tt.fault
					}
					return nil
				})
				u := b.link.Unit(1)
				for i := range 6 {
					a, err := u.Read(t.Context(), link.ReadHoldingRegisters, 0, 2)
					if i != at && err != nil {
						t.Errorf("request %d after a fault at %d = %v, want the value", i, at, err)
					}
					if err == nil && !slices.Equal(a.Words, []uint16{0x1234, 0x5678}) {
						t.Errorf("request %d = %04x, a wrong reading", i, a.Words)
					}
					if i == at && err == nil && !tt.right {
						t.Errorf("request %d = %04x, want an error", i, a.Words)
					}
					if i == at && tt.right {
						time.Sleep(3 * time.Millisecond) // until what comes late is there: no timing is judged by it
					}
				}
			})
		}
	}
}

func TestExceptionsKeepTheConnection(t *testing.T) {
	b := overPipe(link.Options{})
	defer b.close()
	for code := byte(1); code < 255; code++ {
		b.proxy.Script(func(int, []byte) linktest.Fault { return linktest.Exception(code) })
		_, err := b.link.Unit(code).Read(t.Context(), link.ReadHoldingRegisters, 0, 1)
		if e, ok := errors.AsType[*link.ExceptionError](err); !ok || e.Code != code {
			t.Errorf("Read answered with exception %d = %v, want it as ExceptionError", code, err)
		}
	}
	if n := b.proxy.Accepted(); n != 1 {
		t.Errorf("connections after 254 exceptions = %d, want 1", n)
	}
}

func TestLateAnswerIsThrownAway(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		b := overPipe(link.Options{})
		defer b.close()
		b.proxy.Script(func(n int, _ []byte) linktest.Fault {
			if n%5 == 2 {
				return linktest.Late(1200 * time.Millisecond)
			}
			return nil
		})
		timeouts := 0
		for i := range 200 {
			b.image.Set(1, 3, 0, uint16(i))
			a, err := b.link.Unit(1).Read(t.Context(), link.ReadHoldingRegisters, 0, 1)
			if _, ok := errors.AsType[*link.TimeoutError](err); ok {
				timeouts++
				continue
			}
			if err != nil || a.Words[0] != uint16(i) {
				t.Fatalf("request %d = %v, %v, want %d", i, a.Words, err, i)
			}
		}
		s := b.link.Status()
		if timeouts == 0 || s.LateAnswers != timeouts || s.Connects != 1 {
			t.Errorf("%d time-outs, %d late answers thrown away over %d connections, want as many of both and 1", timeouts,
				s.LateAnswers, s.Connects)
		}
	})
}

func TestSecondSilenceDrops(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		b := overPipe(link.Options{})
		defer b.close()
		b.proxy.Script(func(n int, _ []byte) linktest.Fault {
			if n < 2 {
				return linktest.Silence
			}
			return nil
		})
		u := b.link.Unit(1)
		began := time.Now()
		for range 2 {
			_, err := u.Read(t.Context(), link.ReadHoldingRegisters, 0, 1)
			if e, ok := errors.AsType[*link.TimeoutError](err); !ok || !e.Clean || link.KindOf(err) != link.Silent {
				t.Errorf("Read of a silent device = %v, want a clean TimeoutError", err)
			}
		}
		if got, want := time.Since(began), 3*time.Second; got != want {
			t.Errorf("two silences took %v, want %v: one second, then doubled", got, want)
		}
		if _, err := u.Read(t.Context(), link.ReadHoldingRegisters, 0, 1); err != nil {
			t.Errorf("Read after two silences = %v, want the value over a new connection", err)
		}
		if s := b.link.Status(); s.Connects != 2 || !s.Up || s.Why != nil {
			t.Errorf("Status() = %+v, want 2 connections and up", s)
		}
	})
}

func TestBackoffDoublesAndSaysWhen(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		dials := 0
		refused := errors.New("refused for the test")
		l := link.New(link.Options{Address: "192.0.2.1:502", Dial: func(context.Context, string, string) (net.Conn, error) {
			dials++
			return nil, refused
		}})
		defer l.Close()
		u := l.Unit(1)
		var waits []time.Duration
		for range 12 {
			_, err := u.Read(t.Context(), link.ReadHoldingRegisters, 0, 1)
			if _, ok := errors.AsType[*link.ConnectError](err); !ok || !errors.Is(err, refused) {
				t.Fatalf("Read = %v, want a ConnectError", err)
			}
			before := dials
			_, err = u.Read(t.Context(), link.ReadHoldingRegisters, 0, 1)
			e, ok := errors.AsType[*link.BackoffError](err)
			if !ok || dials != before {
				t.Fatalf("Read while waiting = %v after %d dials, want a BackoffError at once", err, dials-before)
			}
			if next := l.Status().NextTry; !next.Equal(e.NextTry) {
				t.Errorf("Status().NextTry = %v, want %v", next, e.NextTry)
			}
			waits = append(waits, e.Wait)
			time.Sleep(e.Wait)
		}
		for i, w := range waits {
			full := min(100*time.Millisecond<<i, 10*time.Second)
			if w < full/2 || w > full {
				t.Errorf("wait %d = %v, want %v to %v", i, w, full/2, full)
			}
		}
	})
}

func TestCancelFreesTheLinkAtOnce(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		b := overPipe(link.Options{})
		defer b.close()
		b.proxy.Script(func(n int, _ []byte) linktest.Fault {
			if n == 0 {
				return linktest.Silence
			}
			return nil
		})
		ctx, cancel := context.WithTimeout(t.Context(), 40*time.Millisecond)
		defer cancel()
		began := time.Now()
		_, err := b.link.Unit(1).Read(ctx, link.ReadHoldingRegisters, 0, 1)
		if err == nil || time.Since(began) != 40*time.Millisecond {
			t.Errorf("Read = %v after %v, want an error at 40ms", err, time.Since(began))
		}
		if _, err := b.link.Unit(1).Read(t.Context(), link.ReadHoldingRegisters, 0, 1); err != nil {
			t.Errorf("Read after a cancelled one = %v, want the value", err)
		}
	})
}

func TestCloseEndsARequestInFlight(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		b := overPipe(link.Options{})
		defer b.close()
		b.proxy.Script(func(int, []byte) linktest.Fault { return linktest.Silence })
		time.AfterFunc(50*time.Millisecond, func() { b.link.Close() })
		began := time.Now()
		for range 2 {
			if _, err := b.link.Unit(1).Read(t.Context(), link.ReadHoldingRegisters, 0, 1); !errors.Is(err, link.ErrClosed) {
				t.Errorf("Read on a closed link = %v, want ErrClosed", err)
			}
		}
		if d := time.Since(began); d != 50*time.Millisecond {
			t.Errorf("a closed link held its requests for %v, want 50ms", d)
		}
	})
}

func TestUnitsTakeTurns(t *testing.T) {
	synctest.Test(t, func(t *testing.T) {
		b := overPipe(link.Options{Gap: 10 * time.Millisecond})
		defer b.close()
		done := make(chan byte, 400)
		for id := byte(1); id <= 4; id++ {
			go func() {
				for range 100 {
					if _, err := b.link.Unit(id).Read(t.Context(), link.ReadHoldingRegisters, int(id), 1); err != nil {
						t.Errorf("Read of unit %d = %v", id, err)
					}
					done <- id
				}
			}()
		}
		count := map[byte]int{}
		for range 200 {
			count[<-done]++
		}
		for id := byte(1); id <= 4; id++ {
			if count[id] < 49 || count[id] > 51 {
				t.Errorf("unit %d had %d of the first 200 turns, want 50", id, count[id])
			}
		}
		for range 200 {
			<-done
		}
	})
}

func TestAUnitThatIsAwayWaitsAlone(t *testing.T) {
	for _, tt := range []struct {
		name  string
		fault linktest.Fault
		kind  link.Kind
	}{{"exception 11", linktest.Exception(11), link.NoUnit}, {"silence", linktest.Silence, link.Silent}} {
		t.Run(tt.name, func(t *testing.T) {
			synctest.Test(t, func(t *testing.T) {
				b := overPipe(link.Options{})
				defer b.close()
				b.proxy.Script(func(_ int, r []byte) linktest.Fault {
					if r[6] == 9 {
						return tt.fault
					}
					return nil
				})
				good, waits := 0, 0
				for range 600 {
					if _, err := b.link.Unit(1).Read(t.Context(), link.ReadHoldingRegisters, 0, 1); err == nil {
						good++
					}
					_, err := b.link.Unit(9).Read(t.Context(), link.ReadHoldingRegisters, 0, 1)
					if e, ok := errors.AsType[*link.BackoffError](err); ok && e.OneUnit && e.Unit == 9 {
						waits++
					}
					if link.KindOf(err) != tt.kind {
						t.Fatalf("KindOf(%v) = %q, want %q", err, link.KindOf(err), tt.kind)
					}
					time.Sleep(50 * time.Millisecond)
				}
				if good != 600 || waits < 580 {
					t.Errorf("the good unit answered %d of 600, the other waited %d times, want 600 and nearly all", good, waits)
				}
			})
		})
	}
}

func TestKindsOfNoAnswer(t *testing.T) {
	b := overTCP(t, link.Options{})
	u := b.link.Unit(1)
	read := func() link.Kind {
		_, err := u.Read(t.Context(), link.ReadHoldingRegisters, 0, 1)
		return link.KindOf(err)
	}
	script := func(f linktest.Fault) { b.proxy.Script(func(int, []byte) linktest.Fault { return f }) }
	if k := read(); k != link.NoFault {
		t.Errorf("kind of an honest answer = %q, want none", k)
	}
	script(linktest.Exception(2))
	if k := read(); k != link.NoRegister {
		t.Errorf("kind of exception 2 = %q, want %q", k, link.NoRegister)
	}
	script(linktest.Exception(10))
	if k := read(); k != link.NoUnit {
		t.Errorf("kind of exception 10 = %q, want %q", k, link.NoUnit)
	}
	script(linktest.CloseAfter(0))
	if k := read(); k != link.Taken {
		t.Errorf("kind of connections ended at once = %q, want %q", k, link.Taken)
	}
	b.proxy.Shut()
	if k := read(); k != link.NoService {
		t.Errorf("kind of a shut port = %q, want %q", k, link.NoService)
	}
	nowhere := link.New(link.Options{Address: "host.invalid:502", Dial: func(context.Context, string, string) (net.Conn, error) {
		return nil, &net.DNSError{Err: "no such host", Name: "host.invalid", IsNotFound: true}
	}})
	defer nowhere.Close()
	if _, err := nowhere.Unit(1).Read(t.Context(), link.ReadHoldingRegisters, 0, 1); link.KindOf(err) != link.NoHost {
		t.Errorf("kind of an unknown host = %q, want %q", link.KindOf(err), link.NoHost)
	}
}

func TestLoopbackOnly(t *testing.T) {
	for address, ok := range map[string]bool{"127.0.0.1:502": true, "[::1]:502": true, "localhost:502": true,
		"127.9.9.9:1": true, "192.0.2.21:502": false, "example.org:502": false, "[::]:502": false, "0.0.0.0:502": false} {
		dialled := false
		l := link.New(link.Options{Address: address, LoopbackOnly: true,
			Dial: func(context.Context, string, string) (net.Conn, error) { dialled = true; return nil, errors.New("no") }})
		l.Unit(1).Read(t.Context(), link.ReadHoldingRegisters, 0, 1)
		if dialled != ok {
			t.Errorf("a loopback-only link to %s dialled %v, want %v", address, dialled, ok)
		}
		l.Close()
	}
}
