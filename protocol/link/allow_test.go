package link

import (
	"encoding/binary"
	"errors"
	"net"
	"slices"
	"testing"
	"time"
)

// tally is a connection that counts what is written to it.
type tally struct {
	net.Conn
	written int
}

func (c *tally) Write(b []byte) (int, error)      { c.written += len(b); return len(b), nil }
func (c *tally) Read([]byte) (int, error)         { return 0, errors.New("nothing to read") }
func (c *tally) SetDeadline(time.Time) error      { return nil }
func (c *tally) SetReadDeadline(time.Time) error  { return nil }
func (c *tally) SetWriteDeadline(time.Time) error { return nil }

// TestOnlyFourFunctionCodesReachTheSocket sends each of the 256 codes, in frames of the shape of a read and of other
// lengths, past everything above to the last function before the socket.
func TestOnlyFourFunctionCodesReachTheSocket(t *testing.T) {
	read := []byte{0x12, 0x34, 0, 0, 0, 6, 1, 0, 0, 0, 0, 1}
	for code := range 256 {
		adu := slices.Clone(read)
		adu[7] = byte(code)
		c := &tally{}
		err := write(c, adu)
		if isRead := code >= 1 && code <= 4; isRead != (c.written == 12 && err == nil) {
			t.Errorf("write(function %d) wrote %d bytes, %v, want a read and nothing else to pass", code, c.written, err)
		} else if !isRead && c.written != 0 {
			t.Errorf("write(function %d) wrote %d bytes, want 0", code, c.written)
		}
		for n := range 30 { // the right length alone opens nothing, and a wrong one closes even a read
			if n == 12 {
				continue
			}
			long := append(slices.Clone(adu), make([]byte, 30)...)[:n]
			if n >= 6 {
				binary.BigEndian.PutUint16(long[4:], uint16(max(0, n-6)))
			}
			c := &tally{}
			if err := write(c, long); err == nil || c.written != 0 {
				t.Errorf("write(function %d, %d bytes) wrote %d bytes, %v, want an error and nothing written", code, n, c.written, err)
			}
		}
	}
	for _, spoil := range []func([]byte){
		func(b []byte) { b[2] = 1 },                           // protocol
		func(b []byte) { b[5] = 7 },                           // length
		func(b []byte) { b[11] = 0 },                          // quantity 0
		func(b []byte) { b[11] = 126 },                        // above 125
		func(b []byte) { b[8], b[9] = 0xFF, 0xFF; b[11] = 2 }, // past the last address
	} {
		adu := slices.Clone(read)
		adu[7] = 3
		spoil(adu)
		c := &tally{}
		if err := write(c, adu); err == nil || c.written != 0 {
			t.Errorf("write(% x) wrote %d bytes, %v, want an error and nothing written", adu, c.written, err)
		}
	}
}

func TestTransactionsDoNotRepeat(t *testing.T) {
	l := New(Options{Address: "192.0.2.1:502"})
	var last []uint16
	followed := 0
	for range 20000 {
		id := l.transaction()
		if slices.Contains(last, id) {
			t.Fatalf("transaction() = %d, used among the last 16", id)
		}
		if len(last) > 0 && id == last[len(last)-1]+1 {
			followed++
		}
		last = append(last, id)
		if len(last) > 15 {
			last = last[1:]
		}
	}
	if followed > 10 { // 20000/65536 are expected to follow by chance
		t.Errorf("transaction() counted on %d times in 20000, want chance alone", followed)
	}
}

func TestTimeoutFollowsSizeAndRoundTrip(t *testing.T) {
	for _, tt := range []struct {
		name     string
		p        patience
		quantity int
		want     time.Duration
		source   string
	}{
		{"unmeasured", patience{floor: floorTimeout}, 1, time.Second, "first time-out"},
		{"fast peer, one register", patience{floor: floorTimeout, smoothed: time.Millisecond}, 1, 300 * time.Millisecond, "floor"},
		{"fast peer, full block", patience{floor: floorTimeout, smoothed: time.Millisecond}, 125, 2 * 270 * 11 * time.Second / 9600,
			"twice the wire time at 9600 baud: (8 + 5 + 250 + 7) characters of 11 bits, by hand"},
		{"slow peer", patience{floor: floorTimeout, smoothed: 400 * time.Millisecond}, 1, 1600 * time.Millisecond, "four round trips"},
		{"slower than allowed", patience{floor: floorTimeout, smoothed: 9 * time.Second}, 1, 10 * time.Second, "most"},
		{"after a silence", patience{floor: floorTimeout, smoothed: time.Millisecond, doubled: 1}, 1, 600 * time.Millisecond, "doubled"},
	} {
		if got := tt.p.timeout(ReadHoldingRegisters, tt.quantity).Round(time.Microsecond); got != tt.want.Round(time.Microsecond) {
			t.Errorf("timeout(%s) = %v, want %v (%s)", tt.name, got, tt.want, tt.source)
		}
	}
}
