package link_test

import (
	"encoding/hex"
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"chargehand/protocol/link"
	"chargehand/protocol/link/linktest"
	"chargehand/protocol/registermap"
)

// The tables of the servers in testdata: 200 items each.
func peerWord(f link.Function, address int) uint16 {
	switch {
	case f == link.ReadHoldingRegisters && address == 20:
		return 0x47F1
	case f == link.ReadHoldingRegisters && address == 21:
		return 0x2000
	case f == link.ReadHoldingRegisters:
		return uint16(address*7919 + 13)
	}
	return uint16(address*104729 + 7)
}

func peerBit(f link.Function, address int) bool {
	if f == link.ReadCoils {
		return address*address%7 < 3
	}
	return address%3 == 0
}

// checkPeer reads from a server of another make, which must mean the same by every frame.
func checkPeer(t *testing.T, l *link.Link) {
	t.Helper()
	u := l.Unit(1)
	for _, f := range []link.Function{link.ReadCoils, link.ReadDiscreteInputs, link.ReadHoldingRegisters, link.ReadInputRegisters} {
		for _, n := range []int{1, 2, 7, 8, 9, 19, 50, 125} {
			for _, at := range []int{0, 20, 75} {
				a, err := u.Read(t.Context(), f, at, n)
				if err != nil {
					t.Errorf("Read(%v, %d, %d) = %v, want the table", f, at, n, err)
					continue
				}
				for i, w := range a.Words {
					if w != peerWord(f, at+i) {
						t.Errorf("Read(%v, %d, %d): %v %d = %04x, want %04x", f, at, n, f, at+i, w, peerWord(f, at+i))
					}
				}
				for i, b := range a.Bits {
					if b != peerBit(f, at+i) {
						t.Errorf("Read(%v, %d, %d): %v %d = %v, want %v", f, at, n, f, at+i, b, peerBit(f, at+i))
					}
				}
			}
		}
		_, err := u.Read(t.Context(), f, 199, 2) // one past the end
		if e, ok := errors.AsType[*link.ExceptionError](err); !ok || e.Code != 2 {
			t.Errorf("Read(%v, 199, 2) of 200 = %v, want exception 2", f, err)
		}
	}
	a, err := u.Read(t.Context(), link.ReadHoldingRegisters, 20, 2)
	p := registermap.Point{Table: registermap.Holding, Address: 20, Type: registermap.F32}
	if r := p.Decode(a.Words); err != nil || r.Value != 123456 {
		t.Errorf("f32 at holding 20 = %v, %v, want 123456", r.Value, err)
	}
	if s := l.Status(); s.Connects != 1 || s.Irregular != 0 || s.Unanswered != 0 {
		t.Errorf("Status() = %+v, want one connection and nothing out of order", s)
	}
}

// frames remembers what a server answers to what, without the transaction identifiers.
type frames struct {
	answers map[string][]byte
}

func (f *frames) answer(request []byte) []byte {
	a := f.answers[hex.EncodeToString(request[2:])]
	if a == nil {
		return nil
	}
	return append(append([]byte(nil), request[:2]...), a...)
}

func readFrames(t *testing.T, name string) *frames {
	t.Helper()
	text, err := os.ReadFile(filepath.Join("testdata", name))
	if err != nil {
		t.Fatal(err)
	}
	f := &frames{answers: map[string][]byte{}}
	for line := range strings.Lines(string(text)) {
		request, answer, ok := strings.Cut(strings.TrimSpace(line), " ")
		if strings.HasPrefix(line, "#") || !ok {
			continue
		}
		a, err := hex.DecodeString(answer)
		if err != nil {
			t.Fatal(err)
		}
		f.answers[request] = a
	}
	return f
}

// TestStoredPeers plays the frames that servers of other makes sent; the build tag peer asks the servers themselves.
func TestStoredPeers(t *testing.T) {
	for _, name := range []string{"libmodbus.frames", "pymodbus.frames"} {
		t.Run(name, func(t *testing.T) {
			p := linktest.NewProxy(readFrames(t, name).answer)
			defer p.Close()
			l := link.New(link.Options{Address: "127.0.0.1:502", Dial: p.Dial})
			defer l.Close()
			checkPeer(t, l)
		})
	}
}
