package linktest

import (
	"encoding/binary"
	"math/rand/v2"
	"slices"
	"time"
)

// Step is one thing a bad device does: wait, then send bytes, then perhaps end the connection.
type Step struct {
	Wait  time.Duration
	Bytes []byte
	Close bool // an orderly end
	Reset bool // a reset, where the connection can
}

// Fault turns a request and its honest answer into what really goes over the wire. It must not keep or change its
// arguments.
type Fault func(request, honest []byte) []Step

func send(b []byte) []Step { return []Step{{Bytes: b}} }

// Honest is no fault.
func Honest(_, honest []byte) []Step { return send(honest) }

// Silence gives no answer at all.
func Silence(_, _ []byte) []Step { return nil }

// Late gives the answer after a time.
func Late(d time.Duration) Fault {
	return func(_, honest []byte) []Step { return []Step{{Wait: d, Bytes: honest}} }
}

// Doubled gives the answer twice, the second after a time.
func Doubled(after time.Duration) Fault {
	return func(_, honest []byte) []Step { return []Step{{Bytes: honest}, {Wait: after, Bytes: honest}} }
}

// Cut ends the answer after n bytes and stays silent.
func Cut(n int) Fault {
	return func(_, honest []byte) []Step { return send(honest[:min(n, len(honest))]) }
}

// CloseAfter ends the connection after n bytes of the answer.
func CloseAfter(n int) Fault {
	return func(_, honest []byte) []Step { return []Step{{Bytes: honest[:min(n, len(honest))], Close: true}} }
}

// ResetAfter resets the connection after n bytes of the answer.
func ResetAfter(n int) Fault {
	return func(_, honest []byte) []Step { return []Step{{Bytes: honest[:min(n, len(honest))], Reset: true}} }
}

// AnswerThenClose answers well and then ends the connection.
func AnswerThenClose(_, honest []byte) []Step { return []Step{{Bytes: honest, Close: true}} }

// DripFeed sends one byte at a time.
func DripFeed(each time.Duration) Fault {
	return func(_, honest []byte) []Step {
		var steps []Step
		for _, b := range honest {
			steps = append(steps, Step{Wait: each, Bytes: []byte{b}})
		}
		return steps
	}
}

// Transaction adds to the answer's transaction identifier.
func Transaction(add int) Fault {
	return altered(func(f []byte) []byte {
		binary.BigEndian.PutUint16(f, binary.BigEndian.Uint16(f)+uint16(add))
		return f
	})
}

// Protocol sets the protocol identifier.
func Protocol(p uint16) Fault {
	return altered(func(f []byte) []byte { binary.BigEndian.PutUint16(f[2:], p); return f })
}

// Length sets the length field alone.
func Length(n uint16) Fault {
	return altered(func(f []byte) []byte { binary.BigEndian.PutUint16(f[4:], n); return f })
}

// ForeignUnit answers as another unit.
func ForeignUnit(id byte) Fault {
	return altered(func(f []byte) []byte { f[6] = id; return f })
}

// PDU answers with these bytes after a right header.
func PDU(pdu ...byte) Fault {
	return func(request, _ []byte) []Step {
		return send(Frame(binary.BigEndian.Uint16(request), request[6], pdu...))
	}
}

// Exception answers with an exception.
func Exception(code byte) Fault {
	return func(request, _ []byte) []Step { return send(exception(request, code)) }
}

// Followed answers well and sends more behind it, after a time.
func Followed(after time.Duration, more func(request []byte) []byte) Fault {
	return func(request, honest []byte) []Step {
		if after == 0 {
			return send(append(slices.Clone(honest), more(request)...))
		}
		return []Step{{Bytes: honest}, {Wait: after, Bytes: more(request)}}
	}
}

// Raw sends these bytes instead of an answer.
func Raw(b ...byte) Fault { return func(_, _ []byte) []Step { return send(b) } }

// Mangled changes, removes or inserts one byte of the answer's header or shape; never of its data, which nothing in the
// protocol could tell.
func Mangled(r *rand.Rand) Fault {
	return func(_, honest []byte) []Step {
		f := slices.Clone(honest)
		at := r.IntN(min(9, len(f)))
		switch r.IntN(3) {
		case 0:
			f[at] ^= byte(1 + r.IntN(255))
		case 1:
			f = slices.Delete(f, at, at+1)
		default:
			f = slices.Insert(f, at, byte(r.IntN(256)))
		}
		if slices.Equal(f, honest) || slices.Equal(f[:min(len(f), len(honest))], honest) {
			return Silence(nil, nil)
		}
		return send(f)
	}
}

func altered(change func([]byte) []byte) Fault {
	return func(_, honest []byte) []Step { return send(change(slices.Clone(honest))) }
}
