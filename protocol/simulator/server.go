package simulator

import (
	"context"
	"errors"
	"fmt"
	"io"
	"log"
	"math/rand/v2"
	"net"
	"strings"
	"sync"
	"time"

	"chargehand/protocol/registermap"

	"github.com/simonvetter/modbus"
)

// Habits of the server, by the wall clock.
const (
	wallTick    = 4 * time.Millisecond
	mostClients = 32
)

// server is the Modbus side with its counters and the goroutine that keeps the plant at its clock.
type server struct {
	mu       sync.Mutex
	modbus   *modbus.ModbusServer
	stop     context.CancelFunc
	done     chan struct{}
	jitter   *rand.Rand
	writes   int
	commands int
	last     map[string]request // the last request of each client
}

// request is a block that a client asked for.
type request struct {
	table    registermap.Table
	unit     uint8
	address  int
	quantity int
	answer   []uint16
}

// Serve listens and answers until ctx ends or Close is called. The port may be 0; the address that was taken is returned.
func (s *Simulator) Serve(ctx context.Context, listen string) (address string, err error) {
	l := &s.link
	l.mu.Lock()
	defer l.mu.Unlock()
	if l.modbus != nil {
		return "", errors.New("simulate: serves already")
	}
	for range 5 { // between choosing a free port and taking it another process may have taken it
		if address, err = freePort(listen); err != nil {
			return "", fmt.Errorf("listen on %s: %w", listen, err)
		}
		l.modbus, err = modbus.NewServer(&modbus.ServerConfiguration{URL: "tcp://" + address, Timeout: 120 * time.Second,
			MaxClients: mostClients, Logger: log.New(io.Discard, "", 0)}, handler{s})
		if err != nil {
			return "", fmt.Errorf("listen on %s: %w", address, err)
		}
		if err = l.modbus.Start(); err == nil {
			break
		}
		l.modbus = nil
		if !strings.HasSuffix(listen, ":0") {
			break
		}
	}
	if err != nil {
		return "", fmt.Errorf("listen on %s: %w", listen, err)
	}
	l.jitter = rand.New(rand.NewPCG(uint64(s.options.Seed), 0x6c696e6b))
	l.last = nil
	ctx, l.stop = context.WithCancel(ctx)
	l.done = make(chan struct{})
	go s.run(ctx, l.done)
	return address, nil
}

// freePort replaces port 0 by a port that was free a moment ago: the server cannot say which one it took.
func freePort(listen string) (string, error) {
	host, port, err := net.SplitHostPort(listen)
	if err != nil || port != "0" {
		return listen, err
	}
	probe, err := net.Listen("tcp", net.JoinHostPort(host, "0"))
	if err != nil {
		return "", err
	}
	defer probe.Close()
	return probe.Addr().String(), nil
}

// run keeps the plant at its clock.
func (s *Simulator) run(ctx context.Context, done chan struct{}) {
	defer close(done)
	ticker := time.NewTicker(wallTick)
	defer ticker.Stop()
	for {
		select {
		case <-ctx.Done():
			s.link.mu.Lock()
			s.link.modbus.Stop()
			s.link.mu.Unlock()
			return
		case <-ticker.C:
			if s.catchUp() != nil {
				ticker.Stop() // the plant stands still; Do and Err say why
			}
		}
	}
}

// Err is why the plant has stopped, nil while it runs.
func (s *Simulator) Err() error {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.broken
}

// Writes is how many requests to write came, carried out or refused; Commands is how many of them were the operator's.
func (s *Simulator) Writes() (writes, commands int) {
	s.link.mu.Lock()
	defer s.link.mu.Unlock()
	return s.link.writes, s.link.commands
}

func (l *server) close() error {
	l.mu.Lock()
	stop, done := l.stop, l.done
	l.stop = nil
	l.mu.Unlock()
	if stop == nil {
		return nil
	}
	stop()
	<-done
	return nil
}

// handler answers the requests of all clients.
type handler struct{ s *Simulator }

func (h handler) HandleCoils(r *modbus.CoilsRequest) ([]bool, error) {
	if r.IsWrite {
		return nil, h.s.command(r)
	}
	if r.Addr >= commandCoils {
		return h.s.commandStates(r)
	}
	return bools(h.read(registermap.Coil, r.ClientAddr, r.UnitId, r.Addr, r.Quantity))
}

func (h handler) HandleDiscreteInputs(r *modbus.DiscreteInputsRequest) ([]bool, error) {
	return bools(h.read(registermap.Discrete, r.ClientAddr, r.UnitId, r.Addr, r.Quantity))
}

func (h handler) HandleHoldingRegisters(r *modbus.HoldingRegistersRequest) ([]uint16, error) {
	if r.IsWrite {
		h.s.link.mu.Lock()
		h.s.link.writes++
		h.s.link.mu.Unlock()
		return nil, modbus.ErrIllegalFunction
	}
	return h.read(registermap.Holding, r.ClientAddr, r.UnitId, r.Addr, r.Quantity)
}

func (h handler) HandleInputRegisters(r *modbus.InputRegistersRequest) ([]uint16, error) {
	return h.read(registermap.Input, r.ClientAddr, r.UnitId, r.Addr, r.Quantity)
}

func bools(words []uint16, err error) ([]bool, error) {
	list := make([]bool, len(words))
	for k, w := range words {
		list[k] = w != 0
	}
	return list, err
}

// read answers one block, after a delay.
func (h handler) read(table registermap.Table, client string, unit uint8, address, quantity uint16) ([]uint16, error) {
	s := h.s
	if d := s.link.delay(s.options.ReplyDelay); d > 0 {
		time.Sleep(d)
	}
	return s.answer(client, request{table: table, unit: unit, address: int(address), quantity: int(quantity)})
}

// Registers reads a block as a client would, without network and delay: the plant is brought to what its clock says, and
// the answer, or the error, is the one that would go out now.
func (s *Simulator) Registers(unit uint8, table registermap.Table, address registermap.Address, quantity int) ([]uint16, error) {
	if err := s.catchUp(); err != nil {
		return nil, err
	}
	return s.answer("in process", request{table: table, unit: unit, address: int(address), quantity: quantity})
}

// answer is what goes out to a client's question, with the faults of the link.
func (s *Simulator) answer(client string, r request) ([]uint16, error) {
	s.mu.Lock()
	faults := s.truth.readings
	now := s.elapsed
	words, err := s.block(r.table, r.unit, r.address, r.quantity)
	s.mu.Unlock()
	if spell(now, faults.dropPeriod, faults.dropFor) {
		return nil, modbus.ErrProtocolError // hangs up
	}
	if err != nil {
		return nil, err
	}
	r.answer = words
	return s.link.belated(client, r, faults, now), nil
}

// delay is how long a reply takes: one in fifty five times as long.
func (l *server) delay(typical time.Duration) time.Duration {
	if typical <= 0 {
		return 0
	}
	l.mu.Lock()
	defer l.mu.Unlock()
	d := time.Duration(float64(typical) * (0.6 + 0.8*l.jitter.Float64()))
	if l.jitter.IntN(50) == 0 {
		d *= 5
	}
	return d
}

// block is the words of a block as the image stands. The caller holds the lock.
func (s *Simulator) block(table registermap.Table, unit uint8, address, quantity int) ([]uint16, error) {
	image := s.imageOf(unit)
	if image == nil {
		return nil, modbus.ErrGWTargetFailedToRespond
	}
	answer := make([]uint16, quantity)
	tear := s.truth.readings.torn > 0 && s.noise.Float64() < s.truth.readings.torn
	for k := range answer {
		at := place{unit, table, registermap.Address(address + k)}
		if _, known := image.words[at]; !known {
			return nil, modbus.ErrIllegalDataAddress
		}
		from := place{unit, table, registermap.Address(address + k - s.truth.readings.shift)}
		answer[k] = image.words[from]
	}
	if tear {
		s.tear(image, table, unit, address, answer)
	}
	return answer, nil
}

// tear gives the second half of every wide value as the refresh before left it.
func (s *Simulator) tear(i *image, table registermap.Table, unit uint8, address int, answer []uint16) {
	for _, p := range i.points {
		first := i.at(p)
		if first.table != table || first.unit != unit {
			continue
		}
		for k := p.Type.Words() / 2; k < p.Type.Words() && p.Type.Words() > 1; k++ {
			if n := int(p.Address) + k - address; n >= 0 && n < len(answer) {
				answer[n] = i.before[place{unit, table, p.Address + registermap.Address(k)}]
			}
		}
	}
}

// imageOf is the device behind a unit identifier.
func (s *Simulator) imageOf(unit uint8) *image {
	for _, i := range s.images {
		if i.units[unit] {
			return i
		}
	}
	return nil
}

// belated is the answer that really goes out: the one that was asked for, or an older one.
func (l *server) belated(client string, r request, f readingFaults, now time.Duration) []uint16 {
	l.mu.Lock()
	defer l.mu.Unlock()
	if l.last == nil {
		l.last = map[string]request{}
	}
	switch {
	case f.behind:
		before, has := l.last[client]
		l.last[client] = r
		if !has {
			return r.answer
		}
		answer := make([]uint16, r.quantity) // the answer to the question before, cut or filled to the length asked for
		copy(answer, before.answer)
		return answer
	case spell(now, f.repeatPeriod, f.repeatFor):
		key := fmt.Sprint(r.table, r.unit, r.address, r.quantity) // a gateway remembers by block, whoever asks
		if old, has := l.last[key]; has {
			return old.answer
		}
		l.last[key] = r
	case f.repeatPeriod > 0:
		l.last[fmt.Sprint(r.table, r.unit, r.address, r.quantity)] = r
	}
	return r.answer
}
