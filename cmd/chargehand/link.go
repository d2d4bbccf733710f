package main

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"time"

	"github.com/spf13/cobra"

	"chargehand/commission/quantity"
	"chargehand/commission/signal"
	"chargehand/protocol/link"
	"chargehand/protocol/poll"
	"chargehand/protocol/registermap"
	"chargehand/tui/theme"
)

type linkOptions struct {
	address     string
	watch, json bool
}

func (a *app) linkCommand() *cobra.Command {
	var o linkOptions
	cmd := &cobra.Command{
		Use:   "link SITE",
		Short: "Try the link and the map: every signal with its raw words",
		Long: `Connects to the device of a site, reads every signal of its map once, and shows value, raw words, age and quality,
and why there is no value where there is none. It only reads.

Exit code: 0 when every signal has a value, 1 when one has none, 2 when the device does not answer.`,
		Example: "  chargehand link site.toml\n  chargehand link --watch --address 192.0.2.21:502 site.toml\n  chargehand link --json site.toml",
		Args:    exactly(1, "the path of one site file"),
		RunE:    func(cmd *cobra.Command, args []string) error { return a.tryLink(cmd.Context(), args[0], o) },
	}
	f := cmd.Flags()
	f.StringVar(&o.address, "address", "", "the device's `HOST:PORT` instead of the site file's")
	f.BoolVar(&o.watch, "watch", false, "go on until interrupted")
	f.BoolVar(&o.json, "json", false, "one JSON object a poll")
	return cmd
}

// patience is how long the first answer may take before the device counts as silent.
const patience = 8 * time.Second

func (a *app) tryLink(ctx context.Context, file string, o linkOptions) error {
	p, err := a.papers(file)
	if err != nil {
		return err
	}
	if !p.hasMap {
		return fmt.Errorf("%s names no register map; give one under [device] map", file)
	}
	if o.address == "" && p.site.Device != nil {
		o.address = p.site.Device.Address
	}
	ctx, stop := context.WithCancel(ctx)
	defer stop()
	wire := link.New(link.Options{Address: o.address, Gap: p.registers.MinInterval})
	defer wire.Close()
	poller := poll.New(poll.Options{Device: deviceOf(p), Link: wire, UnitID: p.unit(), Map: p.registers, MaxAge: maxAge(p)})
	if !o.json {
		fmt.Fprintln(a.out, poller.Plan())
	}
	done := make(chan struct{})
	go func() {
		defer close(done)
		_ = poller.Run(ctx)
	}()
	err = a.watchLink(ctx, p.registers, poller.Latest(), o)
	stop()
	<-done
	return err
}

// watchLink prints batches: the first in which every signal has had its turn, or with --watch each until interrupted.
func (a *app) watchLink(ctx context.Context, m registermap.Map, batches <-chan signal.Batch, o linkOptions) error {
	deadline := time.NewTimer(patience)
	defer deadline.Stop()
	polls, answered := 0, false
	var last signal.Batch
	for {
		select {
		case b, ok := <-batches:
			if !ok {
				return nil
			}
			last, answered, polls = b, answered || b.Link.Up, polls+1
			if o.watch && polls%20 != 1 && !o.json {
				continue
			}
			if !o.watch && (!b.Link.Up || polls < 5) {
				continue
			}
			if err := a.printBatch(m, b, o); err != nil || !o.watch {
				return errors.Join(err, allHaveValues(b))
			}
		case <-deadline.C:
			if !answered {
				a.complain(errors.New("the device does not answer: "+last.Link.Why), hintFor(last.Link.Why))
				return unable
			}
		case <-ctx.Done():
			return nil
		}
	}
}

func hintFor(string) string {
	return "check address, port and unit identifier; another client may hold the only connection"
}

func allHaveValues(b signal.Batch) error {
	for _, r := range b.Readings {
		if !r.Quality.HasValue() {
			return failed
		}
	}
	return nil
}

// linkJSON is one poll as `link --json` writes it.
type linkJSON struct {
	At      string       `json:"at"`
	Signals []signalJSON `json:"signals"`
}

type signalJSON struct {
	Name  string   `json:"name"`
	State string   `json:"state"`
	Value *float64 `json:"value,omitempty"`
	Unit  string   `json:"unit"`
	Raw   []uint16 `json:"raw"`
	Age   float64  `json:"age"`
	Why   string   `json:"why,omitempty"`
}

func (a *app) printBatch(m registermap.Map, b signal.Batch, o linkOptions) error {
	if o.json {
		return writeBatchJSON(a.out, b)
	}
	fmt.Fprintf(a.out, "%s  %s, round trip %s, %.0f polls a second\n", b.At.Format(time.TimeOnly), b.Link.Peer, b.Link.RoundTrip.Round(100*time.Microsecond), b.Link.Rate)
	for i, r := range b.Readings {
		value := "no value: " + string(r.Quality)
		if r.Quality.HasValue() {
			value = quantity.Engineering(r.Value, r.Name.Unit(), 4)
		} else if r.Why != "" {
			value += ", " + r.Why
		}
		place := ""
		if i < len(m.Points) {
			place = m.Points[i].Place()
		}
		fmt.Fprintf(a.out, "  %-22s %-26s %-18s %s\n", r.Name, place, registermap.Hex(r.Raw), theme.Clean(value))
	}
	return nil
}

func writeBatchJSON(w io.Writer, b signal.Batch) error {
	out := linkJSON{At: b.At.Format(time.RFC3339Nano)}
	for _, r := range b.Readings {
		s := signalJSON{Name: string(r.Name), State: string(r.Quality), Unit: r.Name.Unit(), Raw: r.Raw, Why: r.Why}
		if s.Raw == nil {
			s.Raw = []uint16{}
		}
		if !r.At.IsZero() {
			s.Age = max(b.At.Sub(r.At).Seconds(), 0)
		}
		if r.Quality.HasValue() {
			value := r.Value
			s.Value = &value
		}
		out.Signals = append(out.Signals, s)
	}
	return json.NewEncoder(w).Encode(out)
}
