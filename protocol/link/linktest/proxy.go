package linktest

import (
	"context"
	"net"
	"sync"
	"time"
)

// Proxy stands between a client and an honest device. It knows frames, records every request, and plays a fault on those
// that its script chooses.
type Proxy struct {
	answer func(request []byte) ([]byte, error)

	mu       sync.Mutex
	script   func(n int, request []byte) Fault
	requests [][]byte
	accepted int
	writes   int
	conns    map[net.Conn]bool
	listener net.Listener
	address  string
	wait     sync.WaitGroup
	done     chan struct{}
}

// NewProxy stands before a device in this process; it does not listen before Listen.
func NewProxy(answer func(request []byte) []byte) *Proxy {
	return newProxy(func(r []byte) ([]byte, error) { return answer(r), nil })
}

// NewProxyTo stands before a server at an address. Each request goes over a connection of its own, so that a fault of one
// never reaches the next.
func NewProxyTo(address string) *Proxy {
	return newProxy(func(request []byte) ([]byte, error) {
		c, err := net.DialTimeout("tcp", address, time.Second)
		if err != nil {
			return nil, err
		}
		defer c.Close()
		c.SetDeadline(time.Now().Add(2 * time.Second))
		if _, err := c.Write(request); err != nil {
			return nil, err
		}
		return ReadRequest(c)
	})
}

func newProxy(answer func([]byte) ([]byte, error)) *Proxy {
	return &Proxy{answer: answer, conns: map[net.Conn]bool{}, done: make(chan struct{})}
}

// Script sets what to do with request number n (from 0); nil is honest.
func (p *Proxy) Script(script func(n int, request []byte) Fault) {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.script = script
}

// Requests gives the requests so far, as they came.
func (p *Proxy) Requests() [][]byte {
	p.mu.Lock()
	defer p.mu.Unlock()
	return append([][]byte(nil), p.requests...)
}

// Accepted is how many connections came.
func (p *Proxy) Accepted() int {
	p.mu.Lock()
	defer p.mu.Unlock()
	return p.accepted
}

// Writes is how many requests had another function than 1 to 4. It must stay 0.
func (p *Proxy) Writes() int {
	p.mu.Lock()
	defer p.mu.Unlock()
	return p.writes
}

// Listen opens the port: a free one the first time, the same again later.
func (p *Proxy) Listen() error {
	p.mu.Lock()
	defer p.mu.Unlock()
	address := p.address
	if address == "" {
		address = "127.0.0.1:0"
	}
	ln, err := net.Listen("tcp", address)
	if err != nil {
		return err
	}
	p.listener, p.address = ln, ln.Addr().String()
	p.wait.Go(func() { p.accept(ln) })
	return nil
}

// Address is host:port, also while the port is shut.
func (p *Proxy) Address() string {
	p.mu.Lock()
	defer p.mu.Unlock()
	return p.address
}

// Shut closes the port and every connection; Listen opens it again.
func (p *Proxy) Shut() {
	p.mu.Lock()
	if p.listener != nil {
		p.listener.Close()
		p.listener = nil
	}
	p.mu.Unlock()
	p.Drop()
}

// Drop ends the present connections.
func (p *Proxy) Drop() {
	p.mu.Lock()
	defer p.mu.Unlock()
	for c := range p.conns {
		c.Close()
	}
}

// Close ends everything and waits for it.
func (p *Proxy) Close() {
	close(p.done)
	p.Shut()
	p.wait.Wait()
}

// Dial is a dial function whose connections are pipes, for tests in a time bubble.
func (p *Proxy) Dial(context.Context, string, string) (net.Conn, error) {
	client, server := net.Pipe()
	s := newSender(server)
	p.wait.Go(s.pump)
	p.begin(s)
	return client, nil
}

func (p *Proxy) accept(ln net.Listener) {
	for {
		c, err := ln.Accept()
		if err != nil {
			return
		}
		p.begin(c)
	}
}

func (p *Proxy) begin(c net.Conn) {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.accepted++
	p.conns[c] = true
	select {
	case <-p.done:
		c.Close()
	default:
	}
	p.wait.Go(func() { p.serve(c) })
}

func (p *Proxy) serve(c net.Conn) {
	defer func() {
		if s, ok := c.(*sender); ok {
			s.end()
		} else {
			c.Close()
		}
		p.mu.Lock()
		delete(p.conns, c)
		p.mu.Unlock()
	}()
	for {
		request, err := ReadRequest(c)
		if err != nil {
			return
		}
		fault := p.record(request)
		honest, err := p.answer(request)
		if err != nil {
			return
		}
		for _, s := range fault(request, honest) {
			if !p.play(c, s) {
				return
			}
		}
	}
}

func (p *Proxy) record(request []byte) Fault {
	p.mu.Lock()
	defer p.mu.Unlock()
	n := len(p.requests)
	p.requests = append(p.requests, request)
	if f := request[7]; f < 1 || f > 4 {
		p.writes++
	}
	if p.script != nil {
		if f := p.script(n, request); f != nil {
			return f
		}
	}
	return Honest
}

// play does one step and tells whether the connection goes on.
func (p *Proxy) play(c net.Conn, s Step) bool {
	if s.Wait > 0 {
		t := time.NewTimer(s.Wait)
		defer t.Stop()
		select {
		case <-t.C:
		case <-p.done:
			return false
		}
	}
	if len(s.Bytes) > 0 {
		if _, err := c.Write(s.Bytes); err != nil {
			return false
		}
	}
	if s.Reset {
		if t, ok := c.(*net.TCPConn); ok {
			t.SetLinger(0)
		}
	}
	return !s.Close && !s.Reset
}
