package main

import (
	"bufio"
	"context"
	"fmt"
	"net"
	"net/netip"
	"strings"

	"github.com/spf13/cobra"

	"chargehand/protocol/simulator"
	"chargehand/tui/theme"
)

type simulateOptions struct {
	listen, disturb string
	seed            int64
}

func (a *app) simulateCommand() *cobra.Command {
	var o simulateOptions
	cmd := &cobra.Command{
		Use:   "simulate SITE",
		Short: "The simulated converter alone, as a Modbus TCP server",
		Long: `Runs the simulated converter of a site as a Modbus TCP server, encoded by the site's register map, until it is
interrupted. Any Modbus client can read it. What the operator of the plant would do is typed on standard input;
"help" lists the acts. It listens on a loopback address only.`,
		Example: "  chargehand simulate site.toml\n  chargehand simulate --listen 127.0.0.1:1502 --disturb resistor-high=0.3 site.toml",
		Args:    exactly(1, "the path of one site file"),
		RunE:    func(cmd *cobra.Command, args []string) error { return a.simulate(cmd.Context(), args[0], o) },
	}
	f := cmd.Flags()
	f.StringVar(&o.listen, "listen", "127.0.0.1:1502", "loopback `ADDRESS` to listen on")
	f.StringVar(&o.disturb, "disturb", "", "`NAME[=SIZE],…` of what is wrong with the plant")
	f.Int64Var(&o.seed, "seed", 1, "`NUMBER` from which the plant's true values are drawn")
	return cmd
}

// isLoopback tells whether an address can be reached from this computer only.
func isLoopback(address string) bool {
	host, _, err := net.SplitHostPort(address)
	if err != nil {
		return false
	}
	ip, err := netip.ParseAddr(host)
	return host == "localhost" || err == nil && ip.IsLoopback()
}

func (a *app) simulate(ctx context.Context, file string, o simulateOptions) error {
	if !isLoopback(o.listen) {
		return usageError{fmt.Errorf("--listen %s: the simulated converter listens on a loopback address only, such as 127.0.0.1:1502", o.listen)}
	}
	p, err := a.papers(file)
	if err != nil {
		return err
	}
	if !p.hasMap {
		return fmt.Errorf("%s names no register map; the simulated converter needs one under [device] map", file)
	}
	for _, w := range p.warnings {
		a.say(w)
	}
	disturb, err := simulator.ParseDisturbances(o.disturb)
	if err != nil {
		return usageError{err}
	}
	s, err := simulator.New(simulator.Options{Site: p.site, Map: p.registers, Now: a.now, Seed: o.seed, Disturb: disturb})
	if err != nil {
		return err
	}
	defer s.Close()
	address, err := s.Serve(ctx, o.listen)
	if err != nil {
		return err
	}
	fmt.Fprintf(a.out, "%s, simulated, on %s unit %d; help lists the acts, Ctrl-C ends it\n", theme.Clean(p.site.Name), address, p.unit())
	a.console(ctx, s)
	<-ctx.Done()
	return nil
}

// console does the acts typed on standard input until it ends; the server goes on without it.
func (a *app) console(ctx context.Context, s *simulator.Simulator) {
	typed := make(chan string)
	go func() {
		defer close(typed)
		scan := bufio.NewScanner(a.in)
		for scan.Scan() {
			select {
			case typed <- scan.Text():
			case <-ctx.Done():
				return
			}
		}
	}()
	for {
		select {
		case line, ok := <-typed:
			if !ok {
				return
			}
			a.act(ctx, s, strings.TrimSpace(line))
		case <-ctx.Done():
			return
		}
	}
}

func (a *app) act(ctx context.Context, s *simulator.Simulator, line string) {
	switch line {
	case "":
	case "help", "?":
		for _, l := range simulator.ActHelp() {
			fmt.Fprintln(a.out, l)
		}
	default:
		act, err := simulator.ParseAct(line)
		if err == nil {
			err = s.Do(ctx, act)
		}
		if err != nil {
			fmt.Fprintln(a.err, theme.Clean(err.Error()))
			return
		}
		fmt.Fprintln(a.out, "done: "+theme.Clean(line))
	}
}
