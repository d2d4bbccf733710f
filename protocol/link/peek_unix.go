//go:build unix

package link

import (
	"net"
	"syscall"
)

// pending looks for bytes that came unasked, without taking them and without waiting. ended tells that the peer closed the
// connection. Control is used rather than Read, which would fail on the deadline of the request before.
func pending(conn net.Conn) (bytes, ended bool) {
	sc, ok := conn.(syscall.Conn)
	if !ok {
		return false, false
	}
	raw, err := sc.SyscallConn()
	if err != nil {
		return false, false
	}
	var one [1]byte
	err = raw.Control(func(fd uintptr) {
		n, _, e := syscall.Recvfrom(int(fd), one[:], syscall.MSG_PEEK|syscall.MSG_DONTWAIT)
		switch {
		case n > 0:
			bytes = true
		case e == nil:
			ended = true // zero bytes and no error: the peer's end
		case e != syscall.EAGAIN && e != syscall.EWOULDBLOCK && e != syscall.EINTR:
			ended = true
		}
	})
	return bytes, ended || err != nil
}
