package link

import (
	"context"
	"errors"
	"fmt"
	"net"
	"os"
	"syscall"
	"time"
)

// ErrClosed is returned by requests on a link that was closed by its owner.
var ErrClosed = errors.New("link is closed")

// Where says which request met an error.
type Where struct {
	Peer     string // host:port
	Unit     byte
	Function Function
	Address  int // from 0, as on the wire
	Quantity int // registers or bits
}

func (w Where) String() string {
	block := fmt.Sprintf("%v %d", w.Function, w.Address)
	if w.Quantity > 1 {
		block = fmt.Sprintf("%v %d to %d", w.Function, w.Address, w.Address+w.Quantity-1)
	}
	return fmt.Sprintf("%s, unit %d, at %s", block, w.Unit, w.Peer)
}

// RequestError is a request that was refused before the socket.
type RequestError struct {
	Why string
}

func (e *RequestError) Error() string { return "request not sent: " + e.Why }

// ExceptionError is a device's refusal. Code has no 0x80 bit.
type ExceptionError struct {
	Where
	Code byte
}

func (e *ExceptionError) Error() string {
	return fmt.Sprintf("%v: exception %d, %s", e.Where, e.Code, exceptionText(e.Code))
}

// exceptionText names the codes of APP V1.1b3, 7.
func exceptionText(code byte) string {
	switch code {
	case 1:
		return "illegal function"
	case 2:
		return "illegal data address"
	case 3:
		return "illegal data value"
	case 4:
		return "server device failure"
	case 5:
		return "acknowledge"
	case 6:
		return "server device busy"
	case 8:
		return "memory parity error"
	case 10:
		return "gateway path unavailable"
	case 11:
		return "gateway target device failed to respond"
	}
	return "a code outside the standard"
}

// Class sorts exceptions by what to do about them.
type Class string

// The classes of exceptions.
const (
	Configuration Class = "configuration" // 1, 2, 3: the map asks for what the device has not
	DeviceFault   Class = "device fault"  // 4, 8
	Busy          Class = "busy"          // 5, 6: ask again a little later
	Gateway       Class = "gateway"       // 10, 11: the unit behind the gateway is away
	Unknown       Class = "unknown"
)

// Class gives the exception's class.
func (e *ExceptionError) Class() Class {
	switch e.Code {
	case 1, 2, 3:
		return Configuration
	case 4, 8:
		return DeviceFault
	case 5, 6:
		return Busy
	case 10, 11:
		return Gateway
	}
	return Unknown
}

// TimeoutError is a request without a whole answer in time. Clean tells that not one byte came.
type TimeoutError struct {
	Where
	After time.Duration
	Clean bool
}

func (e *TimeoutError) Error() string {
	if e.Clean {
		return fmt.Sprintf("%v: no answer within %v", e.Where, e.After.Round(time.Millisecond))
	}
	return fmt.Sprintf("%v: answer broke off, incomplete after %v", e.Where, e.After.Round(time.Millisecond))
}

// Timeout makes a TimeoutError a net.Error in spirit: callers may ask without knowing the type.
func (e *TimeoutError) Timeout() bool { return true }

// MalformedError is an answer that does not fit its request. The connection was dropped.
type MalformedError struct {
	Where
	Why string
}

func (e *MalformedError) Error() string { return fmt.Sprintf("%v: %s", e.Where, e.Why) }

// ClosedError is a connection that the peer ended before a whole answer.
type ClosedError struct {
	Where
	Fresh bool // it ended before it ever gave an answer: another client may hold the device's only connection
	Err   error
}

func (e *ClosedError) Error() string {
	if e.Fresh {
		return fmt.Sprintf("%v: connection accepted and ended without an answer", e.Where)
	}
	return fmt.Sprintf("%v: connection ended by the peer", e.Where)
}

func (e *ClosedError) Unwrap() error { return e.Err }

// ConnectError is a connection that could not be made.
type ConnectError struct {
	Peer string
	Kind Kind // NoHost or NoService
	Err  error
}

func (e *ConnectError) Error() string {
	what := "no connection"
	switch e.Kind {
	case NoHost:
		what = "no such host, or it does not answer"
	case NoService:
		what = "connection refused"
	}
	return fmt.Sprintf("%s: %s (%v)", e.Peer, what, e.Err)
}

func (e *ConnectError) Unwrap() error { return e.Err }

// BackoffError is a request that was not tried, since the link or the unit waits after failures.
type BackoffError struct {
	Peer    string
	OneUnit bool // only Unit waits; the others behind the gateway do not
	Unit    byte
	NextTry time.Time
	Wait    time.Duration // from the request to the next try
	Cause   error         // the failure before
}

func (e *BackoffError) Error() string {
	who := e.Peer
	if e.OneUnit {
		who = fmt.Sprintf("unit %d at %s", e.Unit, e.Peer)
	}
	return fmt.Sprintf("%s: next try in %v, after: %v", who, e.Wait.Round(100*time.Millisecond), e.Cause)
}

func (e *BackoffError) Unwrap() error { return e.Cause }

// Kind tells the ways of having no answer apart.
type Kind string

// The kinds of no answer.
const (
	NoFault        Kind = ""
	NoHost         Kind = "no host"
	NoService      Kind = "no service"
	Taken          Kind = "connection taken"  // accepted, then ended without an answer
	NoUnit         Kind = "no unit"           // exception 10 or 11
	Silent         Kind = "no unit or silent" // connected, no answer: a wrong unit identifier looks like this
	NoRegister     Kind = "no register"       // exception 1, 2 or 3
	DeviceRefuses  Kind = "device refuses"    // any other exception
	WrongAnswer    Kind = "wrong answer"
	ConnectionLost Kind = "connection lost"
	NotSent        Kind = "not sent"
)

// KindOf gives the kind of a request's error; that of a BackoffError is the kind of the failure before.
func KindOf(err error) Kind {
	if err == nil {
		return NoFault
	}
	if e, ok := errors.AsType[*ConnectError](err); ok {
		return e.Kind
	}
	if e, ok := errors.AsType[*ExceptionError](err); ok {
		switch e.Class() {
		case Gateway:
			return NoUnit
		case Configuration:
			return NoRegister
		}
		return DeviceRefuses
	}
	if e, ok := errors.AsType[*ClosedError](err); ok {
		if e.Fresh {
			return Taken
		}
		return ConnectionLost
	}
	if _, ok := errors.AsType[*TimeoutError](err); ok {
		return Silent
	}
	if _, ok := errors.AsType[*MalformedError](err); ok {
		return WrongAnswer
	}
	return NotSent
}

// windowsRefused is WSAECONNREFUSED, which the syscall package does not map to ECONNREFUSED.
const windowsRefused = syscall.Errno(10061)

// connectKind tells a host that does not answer from one that has no service at the port.
func connectKind(err error) Kind {
	if errors.Is(err, syscall.ECONNREFUSED) || errors.Is(err, windowsRefused) {
		return NoService
	}
	return NoHost
}

func isTimeout(err error) bool {
	if errors.Is(err, os.ErrDeadlineExceeded) || errors.Is(err, context.DeadlineExceeded) {
		return true
	}
	n, ok := errors.AsType[net.Error](err)
	return ok && n.Timeout()
}
