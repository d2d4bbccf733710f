//go:build unix

package link

import (
	"net"
	"syscall"
)

// peeker gives a function that looks for bytes that came unasked, without taking them and without waiting; ended tells that
// the peer closed the connection. Control is used rather than Read, which would fail on the deadline of the request before.
// A connection without a socket cannot be looked at.
func peeker(conn net.Conn) func() (bytes, ended bool) {
	sc, ok := conn.(syscall.Conn)
	if !ok {
		return blind
	}
	raw, err := sc.SyscallConn()
	if err != nil {
		return blind
	}
	var one [1]byte
	var bytes, ended bool
	look := func(fd uintptr) {
		n, _, err := syscall.Recvfrom(int(fd), one[:], syscall.MSG_PEEK|syscall.MSG_DONTWAIT)
		bytes = n > 0
		ended = n == 0 && err == nil || err != nil && err != syscall.EAGAIN && err != syscall.EWOULDBLOCK && err != syscall.EINTR
	}
	return func() (bool, bool) {
		bytes, ended = false, false
		if err := raw.Control(look); err != nil {
			return false, true
		}
		return bytes, ended
	}
}

func blind() (bytes, ended bool) { return false, false }
