package main

import (
	"bufio"
	"context"
	"errors"
	"fmt"
	"maps"
	"path/filepath"
	"slices"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"chargehand/commission/signal"
	"chargehand/protocol/link"
	"chargehand/protocol/poll"
	"chargehand/protocol/registermap"
	"chargehand/tui/theme"
)

type linkOptions struct {
	address     string
	meters      []string
	watch, json bool
}

func (a *app) linkCommand() *cobra.Command {
	var o linkOptions
	cmd := &cobra.Command{
		Use:   "link SITE",
		Short: "Try the link and the map: every signal with its raw words",
		Long: `Connects to the device of a site and reads every signal of its map: place, raw words, value, age, state, and why there
is no value where there is none. Around each signal it reads three registers to each side, in both sister tables, and
nothing else, and shows what the signal would read if one line of the map were otherwise. A star marks what agrees with
what the site expects now, or with what a hand meter says (--meter). At the end it says which line of the map is wrong,
or which lines it may be and what would part them, or that the map is right as far as can be seen.

--watch goes on until interrupted and tells what changes. A hand reading typed then, such as bus-voltage=712.4V, is
one more sample: readings at three levels a tenth apart part most rivals. --json prints one object a poll.

It only reads. Exit code: 0 when every signal has a value, 1 when one has none or the map is doubtful, 2 when there is
no device.`,
		Example: "  chargehand link site.toml\n  chargehand link --meter bus-voltage=712.4V --meter running=off site.toml\n" +
			"  chargehand link --watch --address 192.0.2.21:502 site.toml\n  chargehand link --json site.toml",
		Args: exactly(1, "the path of one site file"),
		RunE: func(cmd *cobra.Command, args []string) error { return a.tryLink(cmd.Context(), args[0], o) },
	}
	f := cmd.Flags()
	f.StringVar(&o.address, "address", "", "the device's `HOST:PORT` instead of the site file's")
	f.StringArrayVar(&o.meters, "meter", nil, "what a hand meter says now, `SIGNAL=VALUE`; may be repeated")
	f.BoolVar(&o.watch, "watch", false, "go on until interrupted")
	f.BoolVar(&o.json, "json", false, "one JSON object a poll")
	return cmd
}

// Times of one look.
const (
	patience   = 8 * time.Second // how long the first answer may take before the device counts as silent
	settled    = 5               // polls after which every signal has had its turn
	freshness  = time.Second     // how long a look for people lasts, to tell how fresh values are
	leastLines = time.Second     // between the lines of a signal that changes, with --watch
)

// linkTrial is one call of `link`.
type linkTrial struct {
	app     *app
	papers  papers
	options linkOptions
	wire    *link.Link
	poller  *poll.Poller
	samples []linkSample
	refused []poll.Refusal
	last    signal.Batch
}

func (a *app) tryLink(ctx context.Context, file string, o linkOptions) error {
	p, err := a.papers(file)
	if err != nil {
		return err
	}
	if !p.hasMap {
		return fmt.Errorf("%s names no register map; give one under [device] map", file)
	}
	meters, err := parseMeters(o.meters, p)
	if err != nil {
		return usageError{err}
	}
	if o.address == "" && p.site.Device != nil {
		o.address = p.site.Device.Address
	}
	if o.address == "" {
		return errors.New("no device address: give [device] address in the site file, or --address")
	}
	wire := link.New(link.Options{Address: o.address, Gap: p.registers.MinInterval})
	defer wire.Close()
	t := &linkTrial{app: a, papers: p, options: o, wire: wire,
		poller: poll.New(poll.Options{Device: deviceOf(p), Link: wire, UnitID: p.unit(), Map: p.registers, MaxAge: maxAge(p)})}
	if !o.json {
		t.printPlan()
	}
	polling, stop := context.WithCancel(ctx)
	done := make(chan struct{})
	batches := t.poller.Batches()
	go func() {
		defer close(done)
		_ = t.poller.Run(polling) // it ends with the context and has no other error
	}()
	err = t.run(ctx, batches, meters)
	stop()
	for range batches { // what was not taken any more
	}
	<-done
	return err
}

func parseMeters(list []string, p papers) (map[signal.Name]expectation, error) {
	meters := map[signal.Name]expectation{}
	for _, text := range list {
		n, e, err := parseMeter(text, p.site, p.registers)
		if err != nil {
			return nil, err
		}
		if _, twice := meters[n]; twice {
			return nil, fmt.Errorf("%s is given twice; readings at other times are typed while --watch runs", n)
		}
		meters[n] = e
	}
	return meters, nil
}

// run waits for a first look, shows and judges it, and with --watch goes on.
func (t *linkTrial) run(ctx context.Context, batches <-chan signal.Batch, meters map[signal.Name]expectation) error {
	if err := t.firstLook(ctx, batches); err != nil || ctx.Err() != nil {
		return err
	}
	t.sample(ctx, meters)
	o := t.opinion()
	if t.options.json {
		t.complainOf(o)
	} else {
		t.printLook()
		t.printOpinion(o)
	}
	if t.options.watch {
		o = t.watch(ctx, batches, o)
	} else if t.options.json {
		if err := writeBatchJSON(t.app.out, t.last); err != nil {
			return err
		}
	}
	if o.accused || !allHaveValues(t.last) {
		return errFailed
	}
	return nil
}

// firstLook polls until every signal has had its turn, or it is plain that nobody answers.
func (t *linkTrial) firstLook(ctx context.Context, batches <-chan signal.Batch) error {
	deadline := time.NewTimer(patience)
	defer deadline.Stop()
	begun := t.wire.Now()
	polls, answered := 0, 0
	for {
		select {
		case b, ok := <-batches:
			if !ok {
				return nil
			}
			t.last, polls = b, polls+1
			if t.options.json && t.options.watch {
				if err := writeBatchJSON(t.app.out, b); err != nil {
					return err
				}
			}
			if hasAnswered(b) {
				answered++
			} else if polls > 1 && answered == 0 && t.isPlain() {
				return t.noDevice(ctx)
			}
			if answered >= settled && (t.options.json || t.wire.Now().Sub(begun) >= freshness) {
				return nil
			}
		case <-deadline.C:
			if answered == 0 {
				return t.noDevice(ctx)
			}
			return nil // it answers now and then: show what there is
		case <-ctx.Done():
			return nil
		}
	}
}

// isPlain tells whether enough was tried to say that there is no device. Nobody at the address is plain at once; a silence is
// waited out twice, the second time twice as long.
func (t *linkTrial) isPlain() bool {
	status := t.wire.Status()
	switch link.KindOf(status.Why) {
	case link.NoHost, link.NoService:
		return true
	case link.Silent, link.NoFault: // without a fault of the link it is its unit that is away
		return status.Requests >= 2
	}
	return status.Requests >= 3
}

// hasAnswered tells whether the device has given anything yet, be it a refusal.
func hasAnswered(b signal.Batch) bool {
	return slices.ContainsFunc(b.Readings, func(r signal.Reading) bool { return !r.At.IsZero() || r.Quality == signal.Bad })
}

func (t *linkTrial) noDevice(ctx context.Context) error {
	why := t.wire.Status().Why
	if why == nil { // the connection is well: whoever is behind it says no
		if blocks := t.poller.Plan().Blocks; len(blocks) > 0 {
			b := blocks[0].Span
			_, why = t.wire.Unit(b.UnitID).Read(ctx, link.Function(b.Table.FunctionCode()), int(b.Address), b.Quantity)
		}
	}
	what, todo := noAnswer(why, t.options.address, t.papers.unit())
	if why != nil {
		what += "\n  " + theme.Clean(why.Error())
	}
	for i, line := range strings.Split(what, "\n") {
		if i == 0 {
			line = "chargehand: " + line
		}
		fmt.Fprintln(t.app.err, t.app.narrow(line))
	}
	fmt.Fprintln(t.app.err, t.app.narrow("hint: "+todo))
	return errUnable
}

// sample reads the neighbourhood once more, unit by unit so that one that is away does not hide the others, and keeps it with
// what was expected at that time. It tells whether every signal that a meter was held against could be read.
func (t *linkTrial) sample(ctx context.Context, meters map[signal.Name]expectation) bool {
	ctx, stop := context.WithTimeout(ctx, patience)
	defer stop()
	s := linkSample{words: registermap.Words{}, meters: meters}
	t.refused = nil
	for _, m := range t.units() {
		survey, _ := poll.Look(ctx, t.wire, t.papers.unit(), m) // the refusals hold the error too
		maps.Copy(s.words, survey.Words)
		t.refused = append(t.refused, survey.Refused...)
	}
	read, silent := map[signal.Name]float64{}, map[signal.Name]bool{}
	for _, r := range t.last.Readings {
		if r.Quality.HasValue() {
			read[r.Name] = r.Value
		}
		silent[r.Name] = r.Quality == signal.Missing
	}
	s.site = expectedNow(t.papers.site, read)
	maps.DeleteFunc(s.site, func(n signal.Name, _ expectation) bool { return silent[n] }) // the device says itself that it has none
	t.samples = append(t.samples, s)
	for n := range meters {
		p, _ := t.papers.registers.Find(n)
		if _, ok := s.words.Of(p, t.papers.unit()); !ok {
			return false
		}
	}
	return true
}

// units are the map parted by unit.
func (t *linkTrial) units() []registermap.Map {
	var all []registermap.Map
	at := map[uint8]int{}
	for _, p := range t.papers.registers.Points {
		id := t.papers.unit()
		if p.HasUnitID {
			id = p.UnitID
		}
		i, ok := at[id]
		if !ok {
			i = len(all)
			at[id] = i
			m := t.papers.registers
			m.Points = nil
			all = append(all, m)
		}
		all[i].Points = append(all[i].Points, p)
	}
	return all
}

func (t *linkTrial) opinion() opinion {
	d, expected := judge(t.papers.registers, t.papers.unit(), t.samples)
	return opinionOf(t.papers, d, expected, t.refused)
}

func allHaveValues(b signal.Batch) bool {
	for _, r := range b.Readings {
		if !r.Quality.HasValue() {
			return false
		}
	}
	return len(b.Readings) > 0
}

func (t *linkTrial) printPlan() {
	tell, m := t.app.printLine, t.papers.registers
	tell(fmt.Sprintf("%s, unit %d, map %s", t.options.address, t.papers.unit(), filepath.Base(t.papers.mapFile)))
	plan := t.poller.Plan()
	tell(fmt.Sprintf("plan: %d requests a poll, %v on a serial line of 9600 baud behind a gateway, %v at 19200; %v between requests",
		plan.Requests(), plan.WireTime(9600).Round(time.Millisecond), plan.WireTime(19200).Round(time.Millisecond), m.MinInterval))
	for _, line := range strings.Split(strings.TrimSpace(plan.String()), "\n") {
		tell("  " + line)
	}
}

// printLook shows the table, what stands around each signal, and the quality of the link.
func (t *linkTrial) printLook() {
	tell, m, own := t.app.printLine, t.papers.registers, t.papers.unit()
	tell("")
	tell(tableHead())
	why := ""
	for i, p := range m.Points {
		r := t.last.Readings[i]
		for _, row := range tableRows(p, r, t.last.At) {
			tell(row)
		}
		if !r.Quality.HasValue() && r.Why != why {
			tell("  no value: " + r.Why)
		}
		why = r.Why
	}
	tell("")
	tell("Around each signal; * agrees with what is expected")
	_, expected := compared(t.samples, narrowly)
	words := t.samples[len(t.samples)-1].words
	for i, p := range m.Points {
		if i > 0 && p.Type == registermap.Bit && sameRegister(p, m.Points[i-1]) {
			continue // its register has just been shown
		}
		e, ok := expected[p.Name]
		for _, line := range detail(p, own, words, e, ok) {
			tell(line)
		}
	}
	tell("")
	t.printQuality()
	t.printRefused()
}

func sameRegister(a, b registermap.Point) bool {
	return b.Type == registermap.Bit && a.Table == b.Table && a.Address == b.Address && a.UnitID == b.UnitID && !a.Table.HasBits()
}

func (t *linkTrial) printQuality() {
	tell, s := t.app.printLine, t.wire.Status()
	tell(fmt.Sprintf("Link: round trip %v, %.1f polls a second, %d requests, %d unanswered, %d late answers thrown away, %d irregular, %d reconnects",
		s.RoundTrip.Round(100*time.Microsecond), t.last.Link.Rate, s.Requests, s.Unanswered, s.LateAnswers, s.Irregular, s.Reconnects()))
	if !t.last.Link.Up {
		what, todo := noAnswer(s.Why, t.options.address, t.papers.unit())
		tell("  " + what + "; " + todo)
	}
	var known []string
	for _, p := range t.papers.registers.Points {
		if r := t.poller.Refresh(p.Name); r.Known {
			known = append(known, fmt.Sprintf("%s %v ± %v", p.Name, r.Period.Round(time.Millisecond), r.Uncertainty.Round(time.Millisecond)))
		}
	}
	if len(known) > 0 {
		tell("Renewed by the device every: " + strings.Join(known, "; "))
	} else {
		first := t.papers.registers.Points[0].Name
		tell(fmt.Sprintf("How often the device renews its values is not known (%s: %s); --watch looks longer.", first, t.poller.Refresh(first).Why))
	}
}

// printRefused says what around the signals could not be read.
func (t *linkTrial) printRefused() {
	tell := t.app.printLine
	kinds := map[link.Kind]int{}
	for _, r := range t.refused {
		kinds[link.KindOf(r.Err)] += r.Span.Quantity
	}
	if n := kinds[link.NoRegister]; n > 0 {
		tell(fmt.Sprintf("Of the neighbours the device has not got %d registers.", n))
	}
	for _, r := range t.refused {
		if kind := link.KindOf(r.Err); kind != link.NoRegister {
			tell(fmt.Sprintf("Around %v nothing could be read: %v", r.Span, r.Err))
		}
	}
}

func (t *linkTrial) printOpinion(o opinion) {
	t.app.printLine("")
	for _, line := range o.lines {
		t.app.printLine(line)
	}
}

// complainOf says beside a JSON result that the map is doubtful, and where.
func (t *linkTrial) complainOf(o opinion) {
	if !o.accused {
		return
	}
	for _, line := range o.lines {
		fmt.Fprintln(t.app.err, t.app.narrow(line))
	}
}

// watch goes on until the context ends: every poll as JSON, or a line for each signal that changed. A hand reading typed in
// is one more sample.
func (t *linkTrial) watch(ctx context.Context, batches <-chan signal.Batch, o opinion) opinion {
	typed := t.typed(ctx)
	shown := newChanges(t.last)
	for {
		select {
		case b, ok := <-batches:
			if !ok {
				return o
			}
			t.last = b
			if t.options.json {
				if writeBatchJSON(t.app.out, b) != nil {
					return o // nobody reads it any more
				}
				continue
			}
			for _, line := range shown.since(t.papers.registers, b) {
				t.app.printLine(line)
			}
		case line := <-typed:
			n, e, err := parseMeter(line, t.papers.site, t.papers.registers)
			if err != nil {
				t.app.complain(err, "")
				continue
			}
			if !t.sample(ctx, map[signal.Name]expectation{n: e}) {
				t.samples = t.samples[:len(t.samples)-1]
				t.app.complain(fmt.Errorf("the device did not give %s while the meter was read", n), "type the reading again when the link is up")
				continue
			}
			o = t.opinion()
			if t.options.json {
				t.complainOf(o)
			} else {
				t.printOpinion(o)
			}
		case <-ctx.Done():
			if !t.options.json {
				t.printQuality()
			}
			return o
		}
	}
}

// typed gives the lines of standard input that are not empty.
func (t *linkTrial) typed(ctx context.Context) <-chan string {
	lines := make(chan string)
	if t.app.in == nil {
		return lines
	}
	go func() {
		scan := bufio.NewScanner(t.app.in)
		for scan.Scan() {
			if strings.TrimSpace(scan.Text()) == "" {
				continue
			}
			select {
			case lines <- scan.Text():
			case <-ctx.Done():
				return
			}
		}
	}()
	return lines
}
