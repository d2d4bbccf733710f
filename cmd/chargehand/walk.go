package main

import (
	"context"
	"errors"
	"fmt"
	"time"

	tea "github.com/charmbracelet/bubbletea"
	"github.com/spf13/cobra"

	"chargehand/commission/chlog"
	"chargehand/commission/finding"
	"chargehand/commission/unattended"
	"chargehand/commission/walk"
	"chargehand/protocol/simulator"
	"chargehand/tui"
	"chargehand/tui/plain"
	"chargehand/tui/start"
	"chargehand/tui/theme"
)

func (a *app) walkCommand() *cobra.Command {
	var o walkOptions
	var alone bool
	var limit time.Duration
	cmd := &cobra.Command{
		Use:   "walk SITE",
		Short: "The walk on the real device; goes on where it was left",
		Long: `Opens the walk of a site: twelve stages from the permit to the signature, with live readings of the device against
what is predicted. An unfinished log of this site is gone on with. The program only reads the device.

--unattended shows no screen and only watches: it arms captures by itself, writes down what it sees and leaves
undecided whatever needs a hand. It ends when the pre-charge, the loaded bus and the discharge have been seen, or
after --for.`,
		Example: "  chargehand walk site.toml\n  chargehand walk --unattended --for 2h site.toml",
		Args:    exactly(1, "the path of one site file"),
		RunE: func(cmd *cobra.Command, args []string) error {
			o.site, o.speed = args[0], 1
			if alone {
				return a.observe(cmd.Context(), o, limit)
			}
			return a.screen(cmd.Context(), start.Entry{Kind: start.Walk, Site: o.site, Log: o.log}, o)
		},
	}
	walkFlags(cmd, &o, &alone)
	cmd.Flags().StringVar(&o.address, "address", "", "the device's `HOST:PORT` instead of the site file's")
	cmd.Flags().DurationVar(&limit, "for", 0, "with --unattended: end after this `DURATION`, such as 90m")
	return cmd
}

func walkFlags(cmd *cobra.Command, o *walkOptions, alone *bool) {
	cmd.Flags().StringVar(&o.log, "log", "", "the log `FILE`; an unsealed one is gone on with")
	cmd.Flags().BoolVar(alone, "unattended", false, "no screen; one line a record on stderr")
	keyFlag(cmd, &o.key)
}

func (a *app) rehearseCommand() *cobra.Command {
	o := walkOptions{rehearse: true}
	var alone, list bool
	cmd := &cobra.Command{
		Use:   "rehearse [SITE]",
		Short: "The same walk on the simulated converter",
		Long: `Goes the walk on a simulated converter of the site, or of the built-in example. It is marked REHEARSAL in the log's
first record, in every signature and on every page, and dials nothing but this computer. Without --key it signs
with a throw-away key.

--disturb puts faults into the plant that the walk should find; --unattended plays the operator too and writes
log, signature and report.`,
		Example: "  chargehand rehearse\n  chargehand rehearse --unattended --disturb resistor-high,load-left-on=0.5 site.toml",
		Args:    atMostOne("the path of a site file"),
		RunE: func(cmd *cobra.Command, args []string) error {
			if list {
				a.listDisturbances()
				return nil
			}
			if len(args) == 1 {
				o.site = args[0]
			}
			if err := speedLimit(o.speed); err != nil {
				return err
			}
			if alone {
				return a.rehearseAlone(cmd.Context(), o)
			}
			return a.screen(cmd.Context(), start.Entry{Kind: start.Rehearse, Site: o.site, Log: o.log}, o)
		},
	}
	walkFlags(cmd, &o, &alone)
	f := cmd.Flags()
	f.StringVar(&o.disturb, "disturb", "", "`NAME[=SIZE],…` of what is wrong with the plant")
	f.BoolVar(&list, "list-disturbances", false, "what can be wrong with the plant, and what each stands for on site")
	f.Int64Var(&o.seed, "seed", 1, "`NUMBER` from which the plant's true values are drawn")
	f.Float64Var(&o.speed, "speed", 100, "waits pass up to `FACTOR` times as fast; a capture stays slow enough to be sampled well")
	return cmd
}

func (a *app) listDisturbances() {
	group := ""
	for _, d := range simulator.Disturbances() {
		if d.Group != group {
			group = d.Group
			fmt.Fprintf(a.out, "%s\n", group)
		}
		size := ""
		if d.Unit != "" || d.DefaultSize != 0 {
			size = fmt.Sprintf("=%g %s", d.DefaultSize, d.Unit)
		}
		fmt.Fprintf(a.out, "  %-32s %s\n", d.Name+size, d.Meaning)
	}
}

// progressLine says on stderr that a record is on disk.
func (a *app) progressLine(line chlog.Line) {
	fmt.Fprintf(a.err, "seq %d %s %s\n", line.Seq, chlog.FormatTime(line.At), line.Kind)
}

func (a *app) say(text string) { fmt.Fprintln(a.err, theme.Clean(text)) }

// rehearseAlone goes the whole walk on the simulated converter without a screen.
func (a *app) rehearseAlone(ctx context.Context, o walkOptions) error {
	o.onDisk, o.say = a.progressLine, a.say
	s, err := a.open(ctx, o)
	if err != nil {
		return err
	}
	verdict, err := unattended.Rehearse(ctx, s.run, s.operator, s.person, firstInstrument(s), s.unsigned, a.say)
	return a.ended(ctx, s, verdict, err)
}

func firstInstrument(s *session) string {
	if len(s.papers.site.Instruments) > 0 {
		return "i1"
	}
	return ""
}

// observe watches the real device without a screen.
func (a *app) observe(ctx context.Context, o walkOptions, limit time.Duration) error {
	o.onDisk, o.say = a.progressLine, a.say
	s, err := a.open(ctx, o)
	if err != nil {
		return err
	}
	if err := s.nameWatch(ctx); err != nil {
		return errors.Join(err, s.close())
	}
	verdict, err := unattended.Observe(ctx, s.run, s.person, s.unsigned, limit, a.say)
	return a.ended(ctx, s, verdict, err)
}

// nameWatch enters that nobody was named where the site file names no person: the seal of what was watched says so, and
// who countersigns it stands for it.
func (s *session) nameWatch(ctx context.Context) error {
	if s.person != "" {
		return nil
	}
	watch := walk.AddPerson{Name: "unattended watch, nobody named", Role: "witness"}
	if s.signer != nil {
		watch.Key = s.signer.Fingerprint()
	}
	recorded, err := s.run.Submit(ctx, watch)
	if err != nil {
		return fmt.Errorf("name the watch: %w", err)
	}
	people := recorded.State.People()
	s.person = people[len(people)-1].ID
	return nil
}

// ended finishes a walk that went without a screen: signature, report, verdict.
func (a *app) ended(ctx context.Context, s *session, verdict finding.Verdict, err error) error {
	if err != nil {
		return errors.Join(err, s.close())
	}
	written, err := s.finish(context.WithoutCancel(ctx), a)
	for _, line := range written {
		fmt.Fprintln(a.out, theme.Clean(line))
	}
	if err != nil {
		return err
	}
	fmt.Fprintf(a.out, "verdict    %s\n", verdict)
	if verdict == finding.Fail {
		return errFailed
	}
	return nil
}

// screen opens one walk in the terminal.
func (a *app) screen(ctx context.Context, entry start.Entry, o walkOptions) error {
	if a.plain {
		h := &host{app: a, ctx: ctx, options: o}
		return h.lineByLine(ctx, entry, plain.Lines(ctx, a.in))
	}
	if !a.hasTerminal() {
		return fmt.Errorf("there is no terminal to draw on; --plain and --unattended need none")
	}
	t, err := a.theme(a.out)
	if err != nil {
		return err
	}
	return a.program(ctx, tui.Opening(&host{app: a, ctx: ctx, options: o}, t, entry))
}

// startScreen opens the start screen.
func (a *app) startScreen(ctx context.Context) error {
	if a.plain {
		h := &host{app: a, ctx: ctx, options: walkOptions{seed: 1, speed: 100}}
		lines := plain.Lines(ctx, a.in)
		chosen, ok := plain.Choose(ctx, h.Entries(ctx), lines, a.out)
		switch {
		case !ok:
			return nil
		case chosen.Kind == start.Check:
			_, sheet, err := h.Check(ctx, chosen.Site)
			if err != nil {
				return err
			}
			return sheet.WriteTable(a.out, finding.TableOptions{Width: a.columns(), ASCII: a.ascii})
		}
		return h.lineByLine(ctx, chosen, lines)
	}
	t, err := a.theme(a.out)
	if err != nil {
		return err
	}
	return a.program(ctx, tui.New(&host{app: a, ctx: ctx, options: walkOptions{seed: 1, speed: 100}}, t))
}

// lineByLine goes a walk without drawing.
func (h *host) lineByLine(ctx context.Context, entry start.Entry, lines <-chan string) error {
	session, err := h.Open(ctx, entry)
	if err != nil {
		return err
	}
	return errors.Join(plain.Walk(ctx, session, lines, h.app.out), session.Close())
}

func (a *app) program(ctx context.Context, m tui.Model) error {
	_, err := tea.NewProgram(m, tea.WithAltScreen(), tea.WithContext(ctx), tea.WithInput(a.in), tea.WithOutput(a.out)).Run()
	if errors.Is(err, tea.ErrProgramKilled) && ctx.Err() != nil {
		return nil // ended from outside; the log is as far as it was acknowledged
	}
	return err
}
