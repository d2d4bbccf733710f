package link

import (
	"math/rand/v2"
	"time"
)

// Waiting times of the rules in the package's description. Common practice, after public reports of gateways and devices.
const (
	firstTimeout = time.Second            // until a round trip was measured
	floorTimeout = 300 * time.Millisecond // least request time-out
	mostTimeout  = 10 * time.Second
	dialTimeout  = 3 * time.Second

	firstWait = 100 * time.Millisecond
	mostWait  = 10 * time.Second

	firstUnitWait = time.Second
	mostUnitWait  = 30 * time.Second

	keepAliveIdle     = 15 * time.Second
	keepAliveInterval = 5 * time.Second
	keepAliveCount    = 3

	mostDoubled    = 2
	silencesToDrop = 2
	mostOwed       = 4
)

// slowestBaud is the serial line assumed behind a gateway while nothing better is known.
const slowestBaud = 9600

// WireTime is how long a request and its answer occupy a serial line of the given speed: 11 bits a character, 8
// characters asked, 5 and the data answered, twice 3.5 characters of silence (MODBUS over Serial Line V1.02, 2.5.1).
func WireTime(f Function, quantity, baud int) time.Duration {
	characters := 8 + 5 + dataBytes(f, quantity) + 7
	return time.Duration(characters) * 11 * time.Second / time.Duration(baud)
}

// patience holds what was learned of a peer's speed.
type patience struct {
	floor    time.Duration
	smoothed time.Duration // round trip, 0 before the first
	silences int           // in a row on this connection
	doubled  int           // times the time-out is doubled, until the next answer
}

func (p *patience) silence() {
	p.silences++
	p.doubled = min(p.doubled+1, mostDoubled)
}

func (p *patience) heard() { p.silences, p.doubled = 0, 0 }

// timeout is how long to wait for a block: the largest of the floor, four smoothed round trips and twice the block's time
// on a slow serial line; doubled after a silence, since a slow device may only be slower than thought.
func (p *patience) timeout(f Function, quantity int) time.Duration {
	t := max(p.floor, 4*p.smoothed, 2*WireTime(f, quantity, slowestBaud))
	if p.smoothed == 0 {
		t = max(t, firstTimeout)
	}
	return min(t<<p.doubled, mostTimeout)
}

// learn takes a measured round trip. An eighth of the difference is the weight of RFC 6298, 2.3.
func (p *patience) learn(roundTrip time.Duration) {
	if p.smoothed == 0 {
		p.smoothed = roundTrip
		return
	}
	p.smoothed += (roundTrip - p.smoothed) / 8
}

// backoff is the n-th wait in a row (from 0): first doubling to most, of which a random half is taken off so that several
// clients do not come back together.
func backoff(n int, first, most time.Duration, random *rand.Rand) time.Duration {
	wait := most
	if n < 20 && first<<n < most {
		wait = first << n
	}
	return wait/2 + time.Duration(random.Int64N(int64(wait/2)+1))
}
