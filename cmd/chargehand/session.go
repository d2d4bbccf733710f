package main

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"maps"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"sync"
	"time"

	"chargehand/commission"
	"chargehand/commission/capture"
	"chargehand/commission/chlog"
	"chargehand/commission/clock"
	"chargehand/commission/record"
	"chargehand/commission/signal"
	"chargehand/commission/signing"
	"chargehand/commission/site"
	"chargehand/commission/walk"
	"chargehand/protocol/link"
	"chargehand/protocol/poll"
	"chargehand/protocol/registermap"
	"chargehand/protocol/simulator"
)

// walkOptions say which walk is opened, and how.
type walkOptions struct {
	site     string // path of the site file; empty for the built-in example
	log      string // path of the log; empty for the usual name
	address  string // of the device, instead of the site file's
	key      string
	rehearse bool
	disturb  string
	seed     int64
	speed    float64
	onDisk   func(line chlog.Line) // told of every record; nil where nobody listens
	say      func(text string)     // told what is worth knowing before the walk; a screen must not be written over
}

// session is an open walk with everything that runs for it.
type session struct {
	papers   papers
	peers    []peer
	log      string
	run      *commission.Run
	clock    *clock.Plant
	operator *simulatedPlant // nil on a real device
	signer   signing.Signer
	// throwAway tells that signer was made for this process only.
	throwAway bool
	unsigned  string
	maxAge    time.Duration
	person    string
	begun     walk.State // as the log was when it was opened

	writer *chlog.Writer
	stop   context.CancelFunc
	ending sync.WaitGroup
	closer []func() error
}

// open opens a walk: a log that is there already is gone on with, else a new one is begun.
func (a *app) open(ctx context.Context, o walkOptions) (*session, error) {
	p, err := a.papers(o.site)
	if err != nil {
		return nil, err
	}
	if !p.hasMap {
		return nil, fmt.Errorf("%s names no register map; a walk needs one under [device] map", o.site)
	}
	s := &session{papers: p, clock: clock.NewPlant(a.now), maxAge: maxAge(p)}
	for _, w := range p.warnings {
		o.say(w)
	}
	if s.peers, err = a.readPeers(p); err != nil {
		return nil, err
	}
	if err := a.findSigner(s, o); err != nil {
		return nil, err
	}
	state, err := a.openLog(s, o)
	if err != nil {
		return nil, err
	}
	s.begun = state
	running, stop := context.WithCancel(ctx)
	s.stop = stop
	if err := s.start(running, a, o, state); err != nil {
		return nil, errors.Join(err, s.close())
	}
	if state.Sealed() == nil { // after a night some of it has to be shown anew
		if _, err := s.run.Submit(running, walk.Return{}); err != nil {
			return nil, errors.Join(err, s.close())
		}
	}
	return s, nil
}

func maxAge(p papers) time.Duration {
	if d := p.site.Device; d != nil && d.MaxAge.IsGiven() {
		return time.Duration(float64(d.MaxAge.Nominal) * float64(time.Second))
	}
	return 500 * time.Millisecond
}

// findSigner finds the key. A rehearsal without one signs with a throw-away key, and says so.
func (a *app) findSigner(s *session, o walkOptions) error {
	signer, err := a.signer(o.key)
	switch {
	case err != nil:
		return err
	case signer != nil && (!o.rehearse || o.key != ""):
		s.signer = signer
	case o.rehearse:
		key, err := signing.Generate()
		if err != nil {
			return err
		}
		s.signer, s.throwAway = key, true
		o.say("rehearsal: signed with a throw-away key, " + key.Fingerprint())
	default:
		s.unsigned = "no key was given; chargehand key new makes one"
		o.say("no key to sign with: sign-offs will say so; `chargehand key new` makes one")
	}
	return nil
}

// openLog resumes the log that the options name, or the unfinished one of this site, or begins a new one.
func (a *app) openLog(s *session, o walkOptions) (walk.State, error) {
	path, err := a.logPath(s.papers, o)
	if err != nil {
		return walk.State{}, err
	}
	s.log = path
	started := a.now()
	options := chlog.Options{Now: a.now, Program: version(), Recorded: o.onDisk,
		Monotonic: func() time.Duration { return a.now().Sub(started) }}
	if _, err := os.Lstat(path); err == nil {
		return s.resume(path, options, o)
	} else if !errors.Is(err, fs.ErrNotExist) {
		return walk.State{}, err
	}
	if err := os.MkdirAll(filepath.Dir(path), 0o700); err != nil {
		return walk.State{}, err
	}
	opened := record.Opened{Mode: record.SiteMode, Program: version(), Device: deviceName(s.papers, o), Speed: 1}
	if o.rehearse {
		opened.Mode, opened.Speed, opened.Seed = record.RehearsalMode, o.speed, &o.seed
		opened.Disturb = strings.FieldsFunc(o.disturb, func(r rune) bool { return r == ',' })
	}
	if s.writer, err = chlog.Create(chlog.Disk{}, path, opened, options); err != nil {
		return walk.State{}, err
	}
	return commission.Begin(s.writer, s.papers.forWalk(), a.people(s, o))
}

func (s *session) resume(path string, options chlog.Options, o walkOptions) (walk.State, error) {
	writer, recorded, err := chlog.Resume(chlog.Disk{}, path, options)
	if err != nil {
		return walk.State{}, err
	}
	s.writer = writer
	state, err := commission.Replay(recorded)
	if err != nil {
		return state, errors.Join(err, writer.Close())
	}
	if state.IsRehearsal() != o.rehearse {
		return state, errors.Join(fmt.Errorf("%s is the log of a %s, not of a %s", filepath.Base(path), state.Opened().Mode,
			map[bool]string{true: "rehearsal", false: "walk at a site"}[o.rehearse]), writer.Close())
	}
	if !s.throwAway {
		return state, nil
	}
	return s.rekey(state)
}

// rekey enters the new throw-away key of a rehearsal that is gone on with: the old one was thrown away with its process.
func (s *session) rekey(state walk.State) (walk.State, error) {
	if state.Sealed() != nil || len(state.People()) == 0 {
		return state, nil
	}
	person := state.People()[0]
	fingerprint := s.signer.Fingerprint()
	person.Key = &fingerprint
	line, err := s.writer.Append(person)
	if err != nil {
		return state, err
	}
	return state.With(walk.Line{Seq: line.Seq, At: line.At, Body: person}).Ready(), nil
}

func deviceName(p papers, o walkOptions) string {
	switch {
	case o.rehearse:
		return "simulated converter"
	case o.address != "":
		return o.address
	case p.site.Device != nil:
		return p.site.Device.Address
	}
	return ""
}

// logPath is where the log lies: as named; else the newest unfinished log of a site's walk; else a new name beside the site
// file, or for the built-in example in the user's state folder.
func (a *app) logPath(p papers, o walkOptions) (string, error) {
	if o.log != "" {
		return a.path(o.log), nil
	}
	folder := filepath.Dir(a.path(p.file))
	if o.site == "" {
		state, err := a.stateFolder()
		if err != nil {
			return "", err
		}
		folder = state
	}
	reference := safeName(p.site.Reference)
	if !o.rehearse {
		if path, ok := unfinished(folder, reference); ok {
			return path, nil
		}
	}
	return filepath.Join(folder, reference+"-"+a.now().Format("20060102-150405")+".chlog"), nil
}

// safeName keeps of a reference what every file system takes.
func safeName(reference string) string {
	name := strings.Map(func(r rune) rune {
		if r >= 'a' && r <= 'z' || r >= 'A' && r <= 'Z' || r >= '0' && r <= '9' || r == '-' || r == '_' {
			return r
		}
		return '-'
	}, reference)
	if name == "" {
		return "walk"
	}
	return name
}

// unfinished is the newest unsealed log of a walk at a site with this reference.
func unfinished(folder, reference string) (string, bool) {
	logs, _ := filepath.Glob(filepath.Join(folder, reference+"-*.chlog"))
	slices.Sort(logs)
	for _, path := range slices.Backward(logs) {
		if s, ok := glance(path); ok && s.opened.Mode == record.SiteMode {
			if s.sealed {
				return "", false
			}
			return path, true
		}
	}
	return "", false
}

// people are those the site file names; whoever goes the walk comes first.
func (a *app) people(s *session, o walkOptions) []record.Person {
	var people []record.Person
	for _, p := range s.papers.site.People {
		person := record.Person{ID: fmt.Sprintf("p%d", len(people)+1), Name: p.Name, Role: p.Role, Organisation: p.Organisation}
		people = append(people, person)
	}
	if len(people) == 0 && o.rehearse {
		people = append(people, record.Person{ID: "p1", Name: "rehearsing technician", Role: "technician"})
	}
	if len(people) > 0 && s.signer != nil {
		fingerprint := s.signer.Fingerprint()
		people[0].Key = &fingerprint
	}
	return people
}

// start starts the plant or the way to it, the poller and the walk's owner.
func (s *session) start(ctx context.Context, a *app, o walkOptions, state walk.State) error {
	address := o.address
	if o.rehearse {
		simulated, err := s.simulate(ctx, o, state)
		if err != nil {
			return err
		}
		address = simulated
	} else if address == "" && s.papers.site.Device != nil {
		address = s.papers.site.Device.Address
	}
	if address == "" {
		return fmt.Errorf("no device address: give [device] address in the site file, or --address")
	}
	wire := link.New(link.Options{Address: address, Gap: s.papers.registers.MinInterval, LoopbackOnly: o.rehearse})
	s.closer = append(s.closer, wire.Close)
	poller := poll.New(poll.Options{Device: deviceOf(s.papers), Link: wire, UnitID: s.papers.unit(), Map: s.papers.registers,
		MaxAge: s.maxAge, Now: s.clock.Now, Pace: s.clock.Pace})
	batches := poller.Batches()
	s.ending.Go(func() { _ = poller.Run(ctx) }) // it ends with the context and has no other error
	if len(state.People()) > 0 {
		s.person = state.People()[0].ID
	}
	var signer chlog.Signer
	if s.signer != nil {
		signer = s.signer
	}
	s.run = commission.Start(ctx, commission.Options{
		State: state, Log: s.writer, Signer: signer, Unsigned: s.unsigned, Clock: s.clock, Batches: batches,
		Peers:     s.pollPeers(ctx, o.rehearse, address),
		Focus:     func(names []signal.Name) { poller.Focus(names...) },
		Channels:  channels(s.papers.registers),
		MaxAge:    s.maxAge,
		Registers: s.papers.registersOrNone(),
		Moved:     func(w *chlog.Writer) { s.writer = w },
		Speed:     o.speed,
	})
	return nil
}

// peer is the device of another infeed, with its map as read.
type peer struct {
	site.Peer
	registers registermap.Map
}

// readPeers reads the maps that the site's peers name.
func (a *app) readPeers(p papers) ([]peer, error) {
	var peers []peer
	for _, declared := range p.site.Peers {
		file := filepath.Join(filepath.Dir(p.file), filepath.FromSlash(declared.Map))
		text, err := a.readSmall(file)
		if err != nil {
			return nil, fmt.Errorf("read the map of %s: %w", declared.Infeed, err)
		}
		m, err := registermap.Read(file, text)
		if err != nil {
			return nil, err
		}
		peers = append(peers, peer{declared, m})
	}
	return peers, nil
}

// firstPeerUnit is the unit identifier of the first peer on the simulated plant, which answers for all devices.
const firstPeerUnit = 101

// pollPeers starts a poller for each peer and joins what they bring; nil without any.
func (s *session) pollPeers(ctx context.Context, rehearse bool, simulated string) <-chan signal.Batch {
	if len(s.peers) == 0 {
		return nil
	}
	joined := make(chan signal.Batch)
	var polling sync.WaitGroup
	for i, p := range s.peers {
		address, unit := p.Address, p.UnitID
		if rehearse {
			address, unit = simulated, firstPeerUnit+uint8(i)
		}
		wire := link.New(link.Options{Address: address, Gap: p.registers.MinInterval, LoopbackOnly: rehearse})
		s.closer = append(s.closer, wire.Close)
		poller := poll.New(poll.Options{Device: p.Infeed, Link: wire, UnitID: unit, Map: p.registers, MaxAge: s.maxAge,
			Now: s.clock.Now, Pace: s.clock.Pace})
		batches := poller.Latest() // for the share as it is now; no capture takes them
		s.ending.Go(func() { _ = poller.Run(ctx) })
		polling.Go(func() {
			for b := range batches {
				select {
				case joined <- b:
				case <-ctx.Done():
				}
			}
		})
	}
	s.ending.Go(func() { polling.Wait(); close(joined) })
	return joined
}

func deviceOf(p papers) string {
	if len(p.site.Infeeds) > 0 {
		return p.site.Infeeds[0].Name
	}
	return p.site.Name
}

// channels are the map's signals as a capture keeps them: raw words with a scaling into the coherent unit.
func channels(m registermap.Map) []capture.Channel {
	var all []capture.Channel
	for _, p := range m.Points {
		factor := p.UnitFactor
		if factor == 0 {
			factor = 1
		}
		scale, offset := p.Scale*factor, p.Offset*factor
		if p.SignReversed {
			scale, offset = -scale, -offset
		}
		all = append(all, capture.Channel{Name: p.Name, Unit: p.Name.Unit(), Type: captureType(p), Scale: scale, Offset: offset})
	}
	return all
}

// captureType says how raw words become a value, as package capture reads it: the register type and what differs from the
// ordinary.
func captureType(p registermap.Point) string {
	words := []string{string(p.Type)}
	if p.Type == registermap.Bit && p.BitNumber > 0 {
		words = append(words, strconv.Itoa(p.BitNumber))
	}
	if p.Type.Words() > 1 && p.WordOrder == registermap.LowFirst {
		words = append(words, "low-first")
	}
	if p.ByteOrder == registermap.LowFirst {
		words = append(words, "bytes-low-first")
	}
	for _, raw := range slices.Sorted(maps.Keys(p.Values)) {
		words = append(words, fmt.Sprintf("%d=%g", raw, p.Values[raw]))
	}
	return strings.Join(words, " ")
}

// simulate starts the simulated converter on a free loopback port, in the state that the walk has reached.
func (s *session) simulate(ctx context.Context, o walkOptions, state walk.State) (string, error) {
	disturb, err := simulator.ParseDisturbances(o.disturb)
	if err != nil {
		return "", usageError{err}
	}
	options := simulator.Options{Site: s.papers.site, Map: s.papers.registers, Now: s.clock.Now, Seed: o.seed, Disturb: disturb}
	for i, p := range s.peers {
		options.Peers = append(options.Peers, simulator.Peer{Infeed: p.Infeed, UnitID: firstPeerUnit + uint8(i), Map: p.registers})
	}
	simulated, err := simulator.New(options)
	if err != nil {
		return "", err
	}
	s.closer = append(s.closer, simulated.Close)
	s.operator = newPlant(simulated, s.papers.site)
	if err := s.operator.restore(ctx, state); err != nil {
		return "", err
	}
	return simulated.Serve(ctx, "127.0.0.1:0")
}

// close ends everything that runs for the walk. The log stays as it is.
func (s *session) close() error {
	if s.stop != nil {
		s.stop()
	}
	if s.run != nil {
		s.run.Wait()
	}
	s.ending.Wait()
	var errs []error
	for _, c := range slices.Backward(s.closer) {
		errs = append(errs, c())
	}
	if s.writer != nil {
		errs = append(errs, s.writer.Close())
	}
	return errors.Join(errs...)
}

// finish signs the sealed log and writes the report beside it. It says what was written.
func (s *session) finish(ctx context.Context, a *app) ([]string, error) {
	if err := s.close(); err != nil {
		return nil, err
	}
	written := []string{"log        " + s.log}
	if s.signer != nil {
		signature, err := chlog.SignFile(s.log, s.signer)
		if err != nil {
			return written, fmt.Errorf("sign the log: %w", err)
		}
		written = append(written, "signature  "+signature, "signed by  "+s.signer.Fingerprint())
	}
	pdf := strings.TrimSuffix(s.log, ".chlog") + ".pdf"
	if err := a.writeReport(ctx, s.log, pdf, reportOptions{paper: "a4", force: true}); err != nil {
		return written, fmt.Errorf("write the report: %w", err)
	}
	return append(written, "report     "+pdf), nil
}

// speedLimit keeps a rehearsal's speed sensible.
func speedLimit(speed float64) error {
	if math.IsNaN(speed) || speed < 1 || speed > 100 {
		return usageError{fmt.Errorf("--speed is from 1 to 100, read %v", speed)}
	}
	return nil
}
