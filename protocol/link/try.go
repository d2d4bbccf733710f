package link

import (
	"context"
	"encoding/binary"
	"errors"
	"fmt"
	"net"
	"time"
)

// past is a deadline that has passed on every clock.
var past = time.Unix(1, 0)

// try sends a request once. again tells that the connection had ended before any byte of an answer, although it had been
// used before, so that the request may be repeated on a new one.
func (l *Link) try(c *call, adu []byte) (reply []byte, again bool, err error) {
	conn := l.current()
	if conn == nil {
		return nil, false, ErrClosed
	}
	if err := l.keepGap(c.ctx); err != nil {
		return nil, false, err
	}
	binary.BigEndian.PutUint16(adu, l.transaction()) // in place: the library compares the answer with this very slice
	where := l.where(adu)
	wait := l.patience.timeout(where.Function, where.Quantity)
	deadline := time.Now().Add(wait)
	if d, ok := c.ctx.Deadline(); ok && d.Before(deadline) {
		deadline, wait = d, time.Until(d)
	}
	if err := conn.SetDeadline(deadline); err != nil {
		return nil, l.used, l.lost(where, err)
	}
	stop := context.AfterFunc(c.ctx, func() { conn.SetDeadline(past) })
	reply, got, err := l.transact(c, conn, adu)
	if !stop() { // it ran, or is about to set its deadline on the next request's connection
		l.drop()
		if err != nil {
			return nil, false, c.ctx.Err()
		}
	}
	switch {
	case err == nil:
		return reply, false, l.received(c, conn, where, adu, reply)
	case l.isClosed():
		return nil, false, ErrClosed
	case isMalformed(err):
		l.count(func(s *Status) { s.Irregular++ })
		return nil, false, l.broken(err)
	case isRefused(err):
		return nil, false, err
	case isTimeout(err) && got == 0:
		return nil, false, l.silent(c, where, adu, wait)
	case isTimeout(err):
		return nil, false, l.broken(&TimeoutError{Where: where, After: wait})
	case got == 0 && l.used:
		return nil, true, l.lost(where, err)
	}
	return nil, false, l.broken(&ClosedError{Where: where, Fresh: !l.used, Err: err})
}

// keepGap lets the quiet time after the last answer pass.
func (l *Link) keepGap(ctx context.Context) error {
	if l.options.Gap <= 0 || l.lastReply.IsZero() {
		return nil
	}
	return pause(ctx, l.options.Gap-time.Since(l.lastReply))
}

func (l *Link) where(adu []byte) Where {
	return Where{l.options.Address, adu[6], Function(adu[7]), int(binary.BigEndian.Uint16(adu[8:])),
		int(binary.BigEndian.Uint16(adu[10:]))}
}

// transact writes the request and reads until its answer is whole. got is how many bytes of it came, or -1
// where the request itself did not get out whole.
func (l *Link) transact(c *call, conn net.Conn, adu []byte) (reply []byte, got int, err error) {
	c.sent = l.options.Now()
	if err := write(conn, adu); err != nil {
		if isTimeout(err) {
			return nil, -1, err // part of the request may be out: this connection's frames no longer line up
		}
		return nil, 0, err
	}
	l.count(func(s *Status) { s.Requests++ })
	for {
		frame, rest, err := l.judge(c, adu, got)
		if err != nil {
			return nil, got, err
		}
		if frame != nil {
			c.received = l.options.Now()
			return frame, got, l.nothingAfter(adu, rest)
		}
		got = rest
		n, err := conn.Read(l.buffer[got:])
		got += n
		if err != nil && n == 0 {
			return nil, got, err
		}
	}
}

// write is the only code that writes to a socket.
func write(conn net.Conn, adu []byte) error {
	if err := allowed(adu); err != nil {
		return err
	}
	_, err := conn.Write(adu)
	return err
}

// judge looks at the bytes read so far. It gives the answer once it is whole, with the number of bytes behind it; else how
// many bytes are still to be kept, after owed answers were thrown away.
func (l *Link) judge(c *call, adu []byte, n int) (frame []byte, rest int, err error) {
	for n >= headerSize {
		request := adu
		late := l.owes(binary.BigEndian.Uint16(l.buffer[:]))
		if late >= 0 {
			request = l.owed[late].request
		} else if id, want := binary.BigEndian.Uint16(l.buffer[:]), binary.BigEndian.Uint16(adu); id != want {
			return nil, n, l.malformed(adu, fmt.Sprintf("answer of transaction %d, want %d", id, want))
		}
		if wrong := wrongHeader(request, l.buffer[:headerSize]); wrong != "" {
			return nil, n, l.malformed(adu, wrong)
		}
		end := headerSize - 1 + int(binary.BigEndian.Uint16(l.buffer[4:]))
		if n < end {
			return nil, n, nil
		}
		if late < 0 {
			frame = append([]byte(nil), l.buffer[:end]...)
			copy(l.buffer[:], l.buffer[end:n])
			return frame, n - end, nil
		}
		if _, wrong := wrongReply(request, l.buffer[:end]); wrong != "" {
			return nil, n, l.malformed(adu, "late "+wrong)
		}
		l.throwAway(late)
		copy(l.buffer[:], l.buffer[end:n])
		n -= end
	}
	return nil, n, nil
}

// throwAway forgets an owed answer that came, and learns how slow the peer is.
func (l *Link) throwAway(i int) {
	l.patience.learn(l.options.Now().Sub(l.owed[i].sent))
	l.patience.heard()
	l.owed = append(l.owed[:i:i], l.owed[i+1:]...)
	l.count(func(s *Status) { s.LateAnswers++ })
}

// nothingAfter refuses an answer that is followed by anything but owed answers: its own bytes may have slipped. The buffer
// has room for more than a frame, so that whatever has come by now was read; what comes later is found before the next
// request.
func (l *Link) nothingAfter(adu []byte, rest int) error {
	for rest >= headerSize {
		late := l.owes(binary.BigEndian.Uint16(l.buffer[:]))
		end := headerSize - 1 + int(binary.BigEndian.Uint16(l.buffer[4:]))
		if late < 0 || rest < end || wrongHeader(l.owed[late].request, l.buffer[:headerSize]) != "" {
			break
		}
		l.throwAway(late)
		copy(l.buffer[:], l.buffer[end:rest])
		rest -= end
	}
	if rest > 0 {
		return l.malformed(adu, "bytes behind the answer")
	}
	return nil
}

func (l *Link) malformed(adu []byte, why string) error { return &MalformedError{l.where(adu), why} }

// received judges a whole frame with the right header.
func (l *Link) received(c *call, conn net.Conn, where Where, adu, reply []byte) error {
	code, wrong := wrongReply(adu, reply)
	if wrong != "" {
		l.count(func(s *Status) { s.Irregular++ })
		return l.broken(&MalformedError{where, wrong})
	}
	if l.options.Gap > 0 {
		l.lastReply = time.Now()
	}
	l.answered(c.received.Sub(c.sent))
	if code != 0 {
		return &ExceptionError{where, code}
	}
	return nil
}

// silent keeps the connection after one silence, so that a late answer is known when it comes, and drops it after two.
func (l *Link) silent(c *call, where Where, adu []byte, wait time.Duration) error {
	err := &TimeoutError{Where: where, After: wait, Clean: true}
	l.count(func(s *Status) { s.Unanswered++ })
	l.patience.silence()
	if l.patience.silences >= silencesToDrop {
		return l.broken(err)
	}
	if len(l.owed) == mostOwed {
		l.owed = l.owed[1:] // should it come after all, its identifier is unknown and the connection dropped
	}
	l.owed = append(l.owed, owed{append([]byte(nil), adu...), c.sent})
	l.failed(err, 0)
	return err
}

// lost drops a connection that ended while idle.
func (l *Link) lost(where Where, err error) error {
	l.drop()
	e := &ClosedError{Where: where, Err: err}
	l.failed(e, 0)
	return e
}

func (l *Link) isClosed() bool {
	l.mu.Lock()
	defer l.mu.Unlock()
	return l.ended
}

func (l *Link) count(add func(*Status)) {
	l.mu.Lock()
	defer l.mu.Unlock()
	add(&l.status)
}

func isMalformed(err error) bool {
	_, ok := errors.AsType[*MalformedError](err)
	return ok
}

func isRefused(err error) bool {
	_, ok := errors.AsType[*RequestError](err)
	return ok
}
