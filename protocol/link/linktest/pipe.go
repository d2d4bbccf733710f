package linktest

import (
	"net"
	"sync"
)

// sender is a pipe's end whose writes do not wait for the reader, as a socket's do not.
type sender struct {
	net.Conn
	mu     sync.Mutex
	queue  [][]byte
	ended  bool
	wake   chan struct{}
	closed chan struct{}
	once   sync.Once
}

func newSender(c net.Conn) *sender {
	return &sender{Conn: c, wake: make(chan struct{}, 1), closed: make(chan struct{})}
}

// pump writes what is queued until the pipe ends.
func (s *sender) pump() {
	defer s.Conn.Close()
	for {
		s.mu.Lock()
		queue, ended := s.queue, s.ended
		s.queue = nil
		s.mu.Unlock()
		for _, b := range queue {
			if _, err := s.Conn.Write(b); err != nil {
				return
			}
		}
		if ended && len(queue) == 0 {
			return
		}
		if len(queue) > 0 {
			continue
		}
		select {
		case <-s.wake:
		case <-s.closed:
			return
		}
	}
}

func (s *sender) Write(b []byte) (int, error) {
	s.mu.Lock()
	s.queue = append(s.queue, append([]byte(nil), b...))
	s.mu.Unlock()
	s.signal()
	return len(b), nil
}

// end closes the pipe once everything queued was read, as an orderly end of a connection does.
func (s *sender) end() {
	s.mu.Lock()
	s.ended = true
	s.mu.Unlock()
	s.signal()
}

func (s *sender) signal() {
	select {
	case s.wake <- struct{}{}:
	default:
	}
}

func (s *sender) Close() error {
	s.once.Do(func() { close(s.closed) })
	return s.Conn.Close()
}
