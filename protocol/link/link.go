package link

import (
	"context"
	crand "crypto/rand"
	"encoding/binary"
	"fmt"
	"math/rand/v2"
	"net"
	"net/netip"
	"sync"
	"time"

	"github.com/goburrow/modbus"
)

// Options say how to reach a peer. Only Address is required.
type Options struct {
	Address      string        // host:port
	Gap          time.Duration // least quiet time from an answer to the next request
	Settle       time.Duration // quiet time after connecting, which some devices need
	LeastTimeout time.Duration // of a request, 300 ms where 0; more for a device known to be slow, or a machine that is
	LoopbackOnly bool          // refuse to dial anything but a loopback address

	Dial   func(ctx context.Context, network, address string) (net.Conn, error) // TCP with keep-alive 15/5/3 s where nil
	Now    func() time.Time                                                     // stamps answers and tries; time.Now where nil
	Random rand.Source                                                          // transaction identifiers, jitter; unforeseeable where nil
}

// Link is one connection to one host and port. It is safe for concurrent use; it holds no goroutine.
type Link struct {
	options Options
	turn    chan struct{} // holds one token while a request is in flight; waiters are served in order
	closed  chan struct{}
	random  *rand.Rand

	// Owned by whoever has the turn.
	buffer    [2 * maxFrame]byte
	patience  patience
	used      bool // the connection has given an answer
	peek      func() (bytes, ended bool)
	failures  int // in a row, without a good answer between
	owed      []owed
	recent    [16]uint16 // transaction identifiers not to be used again soon
	recentAt  int
	lastReply time.Time
	units     map[byte]*unitState

	mu     sync.Mutex // guards what follows
	conn   net.Conn
	ended  bool
	status Status
}

// owed is a request that stayed without an answer; its answer may still come.
type owed struct {
	request []byte
	sent    time.Time
}

// unitState keeps a unit that does not answer from using up its neighbours' time.
type unitState struct {
	failures int
	nextTry  time.Time
	cause    error
}

// Status is a link's condition, for the screen.
type Status struct {
	Peer          string
	Up            bool      // connected, and the last request was answered
	Why           error     // the last failure, nil while up or before the first request
	NextTry       time.Time // zero unless the link waits
	RoundTrip     time.Duration
	Requests      int // written
	Connects      int
	LateAnswers   int // thrown away
	Unanswered    int // silences
	Irregular     int // answers refused for their form
	LastReconnect time.Time
}

// Reconnects is how often the connection was made again.
func (s Status) Reconnects() int { return max(0, s.Connects-1) }

// New gives a link that connects at its first request.
func New(o Options) *Link {
	if o.Dial == nil {
		o.Dial = dialTCP
	}
	if o.Now == nil {
		o.Now = time.Now
	}
	if o.LeastTimeout <= 0 {
		o.LeastTimeout = floorTimeout
	}
	if o.Random == nil {
		var seed [32]byte
		crand.Read(seed[:]) // never fails since Go 1.24
		o.Random = rand.NewChaCha8(seed)
	}
	return &Link{
		options:  o,
		turn:     make(chan struct{}, 1),
		closed:   make(chan struct{}),
		random:   rand.New(o.Random),
		patience: patience{floor: o.LeastTimeout},
		units:    map[byte]*unitState{},
		status:   Status{Peer: o.Address},
	}
}

func dialTCP(ctx context.Context, network, address string) (net.Conn, error) {
	d := net.Dialer{KeepAliveConfig: net.KeepAliveConfig{Enable: true, Idle: keepAliveIdle, Interval: keepAliveInterval,
		Count: keepAliveCount}}
	return d.DialContext(ctx, network, address)
}

// Unit gives a unit of the link by its identifier: 1 to 247 behind a gateway; a plain device may want 255 or 0 (TCP guide
// V1.0b, 4.4.2).
func (l *Link) Unit(id byte) Unit {
	h := modbus.NewTCPClientHandler("") // used as packager only; its transporter is never dialled
	h.SlaveId = id
	return Unit{link: l, id: id, packager: h}
}

// Now is the time by the clock that stamps answers.
func (l *Link) Now() time.Time { return l.options.Now() }

// Status gives the link's condition now. It never waits for a request.
func (l *Link) Status() Status {
	l.mu.Lock()
	defer l.mu.Unlock()
	return l.status
}

// Close ends the connection; a request in flight fails with ErrClosed, and so does every later one.
func (l *Link) Close() error {
	l.mu.Lock()
	defer l.mu.Unlock()
	if l.ended {
		return nil
	}
	l.ended = true
	close(l.closed)
	l.status.Up, l.status.Why = false, ErrClosed
	if l.conn == nil {
		return nil
	}
	err := l.conn.Close()
	l.conn = nil
	return err
}

// exchange takes its turn, then sends a request and gives its answer: a frame that fits the request in every way.
func (l *Link) exchange(c *call, adu []byte) ([]byte, error) {
	if err := c.ctx.Err(); err != nil {
		return nil, err
	}
	select {
	case l.turn <- struct{}{}:
	case <-l.closed:
		return nil, ErrClosed
	case <-c.ctx.Done():
		return nil, c.ctx.Err()
	}
	defer func() { <-l.turn }()
	unit := l.unitState(adu[6])
	if err := l.unitWaits(unit, adu[6]); err != nil {
		return nil, err
	}
	reply, err := l.tryTwice(c, adu)
	l.judgeUnit(unit, err)
	return reply, err
}

// tryTwice repeats a request once where a connection used before turned out to have ended.
func (l *Link) tryTwice(c *call, adu []byte) ([]byte, error) {
	if err := l.connected(c.ctx); err != nil {
		return nil, err
	}
	reply, again, err := l.try(c, adu)
	if !again {
		return reply, err
	}
	if err := l.connect(c.ctx); err != nil {
		return nil, err
	}
	reply, _, err = l.try(c, adu)
	return reply, err
}

// connected makes sure of a connection on which nothing unasked waits.
func (l *Link) connected(ctx context.Context) error {
	conn := l.current()
	if conn == nil {
		if err := l.waits(); err != nil {
			return err
		}
		return l.connect(ctx)
	}
	bytes, ended := l.peek()
	if ended || bytes && len(l.owed) == 0 {
		l.drop()
		return l.connect(ctx)
	}
	return nil
}

func (l *Link) current() net.Conn {
	l.mu.Lock()
	defer l.mu.Unlock()
	return l.conn
}

// waits gives a BackoffError while the link waits after failures.
func (l *Link) waits() error {
	l.mu.Lock()
	defer l.mu.Unlock()
	if l.ended {
		return ErrClosed
	}
	if left := l.status.NextTry.Sub(l.options.Now()); !l.status.NextTry.IsZero() && left > 0 {
		return &BackoffError{Peer: l.options.Address, NextTry: l.status.NextTry, Wait: left, Cause: l.status.Why}
	}
	return nil
}

func (l *Link) connect(ctx context.Context) error {
	if l.options.LoopbackOnly && !isLoopback(l.options.Address) {
		return &RequestError{fmt.Sprintf("%s is no loopback address, and a rehearsal dials nothing else", l.options.Address)}
	}
	dialling, cancel := context.WithTimeout(ctx, dialTimeout)
	defer cancel()
	conn, err := l.options.Dial(dialling, "tcp", l.options.Address)
	if err != nil {
		if ctx.Err() != nil {
			return ctx.Err()
		}
		err = &ConnectError{Peer: l.options.Address, Kind: connectKind(err), Err: err}
		l.failures++
		l.failed(err, backoff(l.failures-1, firstWait, mostWait, l.random))
		return err
	}
	l.used = false
	l.peek = peeker(conn)
	l.owed = nil
	l.patience.silences = 0
	l.mu.Lock()
	if l.ended {
		l.mu.Unlock()
		conn.Close()
		return ErrClosed
	}
	l.conn = conn
	l.status.Connects++
	l.status.LastReconnect = l.options.Now()
	l.status.NextTry = time.Time{}
	l.mu.Unlock()
	return pause(ctx, l.options.Settle)
}

// isLoopback judges an address by its figures; of names only localhost counts, since others are what a name server says.
func isLoopback(address string) bool {
	host, _, err := net.SplitHostPort(address)
	if err != nil {
		return false
	}
	ip, err := netip.ParseAddr(host)
	return host == "localhost" || err == nil && ip.IsLoopback()
}

// failed notes why the link is down and when the next try may be.
func (l *Link) failed(why error, wait time.Duration) {
	l.mu.Lock()
	defer l.mu.Unlock()
	if l.ended {
		return
	}
	l.status.Up, l.status.Why = false, why
	l.status.NextTry = time.Time{}
	if wait > 0 {
		l.status.NextTry = l.options.Now().Add(wait)
	}
}

// drop ends the connection without a word.
func (l *Link) drop() {
	l.mu.Lock()
	defer l.mu.Unlock()
	if l.conn != nil {
		l.conn.Close()
		l.conn = nil
	}
	l.owed = nil
}

// broken drops a connection that failed. The first failure after a good answer may be mended at once; later ones wait.
func (l *Link) broken(why error) error {
	l.drop()
	l.failures++
	wait := time.Duration(0)
	if l.failures > 1 {
		wait = backoff(l.failures-2, firstWait, mostWait, l.random)
	}
	l.failed(why, wait)
	return why
}

// answered notes a good answer.
func (l *Link) answered(roundTrip time.Duration) {
	l.failures = 0
	l.used = true
	l.patience.heard()
	l.patience.learn(roundTrip)
	l.mu.Lock()
	defer l.mu.Unlock()
	if l.ended {
		return
	}
	l.status.Up, l.status.Why, l.status.NextTry = true, nil, time.Time{}
	l.status.RoundTrip = l.patience.smoothed
}

func (l *Link) unitState(id byte) *unitState {
	u := l.units[id]
	if u == nil {
		u = &unitState{}
		l.units[id] = u
	}
	return u
}

func (l *Link) unitWaits(u *unitState, id byte) error {
	if u.nextTry.IsZero() {
		return nil
	}
	if left := u.nextTry.Sub(l.options.Now()); left > 0 {
		return &BackoffError{Peer: l.options.Address, OneUnit: true, Unit: id, NextTry: u.nextTry, Wait: left, Cause: u.cause}
	}
	return nil
}

// judgeUnit lets a unit wait that a gateway could not reach, or that is silent while it shares the link: from the second
// time in a row 1 s, doubling to 30 s. Once alone means little: gateways give exception 11 now and then.
func (l *Link) judgeUnit(u *unitState, err error) {
	away := false
	switch KindOf(err) {
	case NoUnit:
		away = true
	case Silent:
		away = len(l.units) > 1
	case NoFault, NoRegister, DeviceRefuses:
	default:
		return // says nothing of the unit
	}
	if !away {
		*u = unitState{}
		return
	}
	u.failures++
	if u.failures > 1 {
		u.nextTry = l.options.Now().Add(backoff(u.failures-2, firstUnitWait, mostUnitWait, l.random))
		u.cause = err
	}
}

// transaction draws an identifier that neither an owed answer nor a repeated recent one can carry.
func (l *Link) transaction() uint16 {
	for {
		id := uint16(l.random.Uint32())
		if l.isRecent(id) {
			continue
		}
		l.recent[l.recentAt%len(l.recent)] = id
		l.recentAt++
		return id
	}
}

func (l *Link) isRecent(id uint16) bool {
	for _, r := range l.recent {
		if r == id {
			return true
		}
	}
	return l.owes(id) >= 0
}

// owes gives the position of the owed answer with this transaction, or -1.
func (l *Link) owes(id uint16) int {
	for i, o := range l.owed {
		if binary.BigEndian.Uint16(o.request) == id {
			return i
		}
	}
	return -1
}

// pause waits, or ends early with the context.
func pause(ctx context.Context, d time.Duration) error {
	if d <= 0 {
		return nil
	}
	t := time.NewTimer(d)
	defer t.Stop()
	select {
	case <-t.C:
		return nil
	case <-ctx.Done():
		return ctx.Err()
	}
}
