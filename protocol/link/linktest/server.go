// Package linktest plays the devices that package link meets: an honest one, and every kind of bad one.
//
// Start at [Image] for the device's registers, [Serve] for an honest server and [NewProxy] for one that misbehaves on
// command and records what it was asked. All of it listens on loopback only.
package linktest

import (
	"encoding/binary"
	"io"
	"net"
	"sync"
)

// Image is the tables of one or more units. The zero value answers every address of every unit with 0.
type Image struct {
	mu       sync.Mutex
	words    map[place]uint16
	absent   map[place]bool
	limit    int
	units    map[byte]bool
	refusing byte
}

// place is a register or bit of a unit; function is the one that reads it.
type place struct {
	unit     byte
	function byte
	address  int
}

// Set puts words at an address; function is 1 to 4 after the table, a bit is 0 or 1.
func (m *Image) Set(unit, function byte, address int, words ...uint16) {
	m.mu.Lock()
	defer m.mu.Unlock()
	if m.words == nil {
		m.words = map[place]uint16{}
	}
	for i, w := range words {
		m.words[place{unit, function, address + i}] = w
	}
}

// Get gives a word, 0 where none was set.
func (m *Image) Get(unit, function byte, address int) uint16 {
	m.mu.Lock()
	defer m.mu.Unlock()
	return m.words[place{unit, function, address}]
}

// Remove makes an address one the device has not: every block over it is answered with exception 2.
func (m *Image) Remove(unit, function byte, addresses ...int) {
	m.mu.Lock()
	defer m.mu.Unlock()
	if m.absent == nil {
		m.absent = map[place]bool{}
	}
	for _, a := range addresses {
		m.absent[place{unit, function, a}] = true
	}
}

// Restore takes Remove back.
func (m *Image) Restore(unit, function byte, addresses ...int) {
	m.mu.Lock()
	defer m.mu.Unlock()
	for _, a := range addresses {
		delete(m.absent, place{unit, function, a})
	}
}

// LimitBlock makes the device refuse more than n registers or bits with exception 3; 0 takes it back.
func (m *Image) LimitBlock(n int) {
	m.mu.Lock()
	defer m.mu.Unlock()
	m.limit = n
}

// OnlyUnits makes every unit but these answer with exception 11, as a gateway does.
func (m *Image) OnlyUnits(ids ...byte) {
	m.mu.Lock()
	defer m.mu.Unlock()
	m.units = map[byte]bool{}
	for _, id := range ids {
		m.units[id] = true
	}
}

// Refuse makes the device answer every request with this exception; 0 takes it back.
func (m *Image) Refuse(code byte) {
	m.mu.Lock()
	defer m.mu.Unlock()
	m.refusing = code
}

// Answer gives the honest answer to a request frame. The order of the checks is that of APP V1.1b3, 7: function, quantity,
// address.
func (m *Image) Answer(request []byte) []byte {
	m.mu.Lock()
	defer m.mu.Unlock()
	unit, function := request[6], request[7]
	if m.refusing != 0 {
		return exception(request, m.refusing)
	}
	if m.units != nil && !m.units[unit] {
		return exception(request, 11)
	}
	if function < 1 || function > 4 {
		return exception(request, 1)
	}
	if len(request) != 12 {
		return exception(request, 3)
	}
	address, quantity := int(binary.BigEndian.Uint16(request[8:])), int(binary.BigEndian.Uint16(request[10:]))
	most := 125
	if function < 3 {
		most = 2000
	}
	if quantity < 1 || quantity > most || m.limit > 0 && quantity > m.limit {
		return exception(request, 3)
	}
	if address+quantity > 65536 {
		return exception(request, 2)
	}
	for i := range quantity {
		if m.absent[place{unit, function, address + i}] {
			return exception(request, 2)
		}
	}
	return m.data(request, place{unit, function, address}, quantity)
}

func (m *Image) data(request []byte, at place, quantity int) []byte {
	var data []byte
	if at.function < 3 {
		data = make([]byte, (quantity+7)/8)
		for i := range quantity {
			if m.words[place{at.unit, at.function, at.address + i}] != 0 {
				data[i/8] |= 1 << (i % 8)
			}
		}
	} else {
		data = make([]byte, 0, 2*quantity)
		for i := range quantity {
			data = binary.BigEndian.AppendUint16(data, m.words[place{at.unit, at.function, at.address + i}])
		}
	}
	return Frame(binary.BigEndian.Uint16(request), at.unit, append([]byte{at.function, byte(len(data))}, data...)...)
}

func exception(request []byte, code byte) []byte {
	return Frame(binary.BigEndian.Uint16(request), request[6], request[7]|0x80, code)
}

// Frame puts a header before a protocol data unit (TCP guide V1.0b, 3.1.3).
func Frame(transaction uint16, unit byte, pdu ...byte) []byte {
	f := binary.BigEndian.AppendUint16(nil, transaction)
	f = append(f, 0, 0)
	f = binary.BigEndian.AppendUint16(f, uint16(1+len(pdu)))
	f = append(f, unit)
	return append(f, pdu...)
}

// ReadRequest takes one request frame off a connection.
func ReadRequest(r io.Reader) ([]byte, error) {
	header := make([]byte, 7)
	if _, err := io.ReadFull(r, header); err != nil {
		return nil, err
	}
	n := int(binary.BigEndian.Uint16(header[4:]))
	if n < 2 || n > 254 {
		return nil, io.ErrUnexpectedEOF
	}
	frame := append(header, make([]byte, n-1)...)
	_, err := io.ReadFull(r, frame[7:])
	return frame, err
}

// Server is an honest server.
type Server struct {
	listener net.Listener
	answer   func(request []byte) []byte
	mu       sync.Mutex
	conns    map[net.Conn]bool
	wait     sync.WaitGroup
	closed   bool
}

// Serve answers on a free loopback port until Close.
func Serve(answer func(request []byte) []byte) (*Server, error) {
	ln, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		return nil, err
	}
	s := &Server{listener: ln, answer: answer, conns: map[net.Conn]bool{}}
	s.wait.Go(s.accept)
	return s, nil
}

// Address is the server's host:port.
func (s *Server) Address() string { return s.listener.Addr().String() }

// Close ends the listener and all connections, and waits for them.
func (s *Server) Close() {
	s.listener.Close()
	s.mu.Lock()
	s.closed = true
	for c := range s.conns {
		c.Close()
	}
	s.mu.Unlock()
	s.wait.Wait()
}

func (s *Server) accept() {
	for {
		c, err := s.listener.Accept()
		if err != nil {
			return
		}
		s.mu.Lock()
		if s.closed {
			c.Close()
		}
		s.conns[c] = true
		s.mu.Unlock()
		s.wait.Go(func() { s.serve(c) })
	}
}

func (s *Server) serve(c net.Conn) {
	defer func() {
		c.Close()
		s.mu.Lock()
		delete(s.conns, c)
		s.mu.Unlock()
	}()
	for {
		request, err := ReadRequest(c)
		if err != nil {
			return
		}
		if _, err := c.Write(s.answer(request)); err != nil {
			return
		}
	}
}
