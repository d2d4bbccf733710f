package link

import (
	"context"
	"encoding/binary"
	"errors"
	"time"

	"github.com/goburrow/modbus"
)

// Answer is what one request brought. Words or Bits is set, after the function.
type Answer struct {
	Words    []uint16
	Bits     []bool
	Sent     time.Time // just before the request was written
	Received time.Time // after the answer's last byte
}

// RoundTrip is the time from request to answer.
func (a Answer) RoundTrip() time.Duration { return a.Received.Sub(a.Sent) }

// Midpoint is the best single time for the values; the truth lies within half a round trip of it.
func (a Answer) Midpoint() time.Time { return a.Sent.Add(a.RoundTrip() / 2) }

// Unit is one device behind a link: itself, or one of several behind a gateway.
type Unit struct {
	link     *Link
	id       byte
	packager modbus.Packager // its unit identifier is set once and never changed: changing it is a race upstream
}

// ID is the unit identifier.
func (u Unit) ID() byte { return u.id }

// Read asks for quantity registers or bits from address on (from 0, as on the wire). All of them come, or an error: one of
// the types of this package, ErrClosed, or the context's.
func (u Unit) Read(ctx context.Context, f Function, address, quantity int) (Answer, error) {
	if err := allowedBlock(f, address, quantity); err != nil {
		return Answer{}, err
	}
	c := &call{ctx: ctx, link: u.link}
	client := modbus.NewClient2(u.packager, c)
	data, err := read(client, f, uint16(address), uint16(quantity))
	if err != nil {
		return Answer{}, u.own(err, f, address, quantity)
	}
	a := Answer{Sent: c.sent, Received: c.received}
	if f.readsBits() {
		a.Bits = bits(data, quantity)
	} else {
		a.Words = words(data)
	}
	return a, nil
}

// own keeps the errors of this package; one of the library's, which the checks before it should leave nothing to find,
// becomes a MalformedError.
func (u Unit) own(err error, f Function, address, quantity int) error {
	if KindOf(err) != NotSent || errors.Is(err, ErrClosed) || errors.Is(err, context.Canceled) ||
		errors.Is(err, context.DeadlineExceeded) {
		return err
	}
	if _, ok := errors.AsType[*RequestError](err); ok {
		return err
	}
	return &MalformedError{Where{u.link.options.Address, u.id, f, address, quantity}, err.Error()}
}

func read(c modbus.Client, f Function, address, quantity uint16) ([]byte, error) {
	switch f {
	case ReadCoils:
		return c.ReadCoils(address, quantity)
	case ReadDiscreteInputs:
		return c.ReadDiscreteInputs(address, quantity)
	case ReadHoldingRegisters:
		return c.ReadHoldingRegisters(address, quantity)
	default:
		return c.ReadInputRegisters(address, quantity)
	}
}

// call carries one request's context through the library's Send, which has none, and its times back.
type call struct {
	ctx            context.Context
	link           *Link
	sent, received time.Time
}

// Send is the library's Transporter.
func (c *call) Send(adu []byte) ([]byte, error) { return c.link.exchange(c, adu) }

func words(data []byte) []uint16 {
	w := make([]uint16, len(data)/2)
	for i := range w {
		w[i] = binary.BigEndian.Uint16(data[2*i:])
	}
	return w
}

func bits(data []byte, quantity int) []bool {
	b := make([]bool, quantity)
	for i := range b {
		b[i] = data[i/8]>>(i%8)&1 == 1
	}
	return b
}
