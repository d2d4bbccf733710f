package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"strings"
	"sync"
	"time"

	"github.com/charmbracelet/lipgloss"
	"github.com/mattn/go-runewidth"
	"github.com/spf13/cobra"
	"golang.org/x/term"

	"chargehand/tui/theme"
)

// surroundings is everything of the machine that a command may touch.
type surroundings struct {
	in       io.Reader
	out, err io.Writer
	env      func(string) (string, bool)
	folder   string // relative paths are relative to it
}

// The exit codes of design 3.
const (
	exitDone   = 0 // done, nothing failed
	exitFailed = 1 // done, at least one fail
	exitUnable = 2 // could not be done: bad input, no device, bad usage
)

// errFailed is returned by a command that did its work and found a failure; it has been reported already.
var errFailed = errors.New("at least one fail")

// errUnable is returned by a command that has reported on its own why it could not do its work.
var errUnable = errors.New("could not be done")

// usageError is a wrong call.
type usageError struct{ error }

// app is one call of the program.
type app struct {
	surroundings
	now func() time.Time

	themeName    string
	ascii, plain bool
}

// settleLibraries sets, once for all calls side by side, what libraries hold in variables of their own. Widths must not depend on
// the machine's language: the screens count a symbol such as Ω as one column everywhere. A double click on Windows opens the
// start screen.
var settleLibraries = sync.OnceFunc(func() {
	runewidth.DefaultCondition.EastAsianWidth = false
	cobra.MousetrapHelpText = ""
})

// run is the whole program; it returns the exit code.
func run(ctx context.Context, args []string, s surroundings) int {
	settleLibraries()
	a := &app{surroundings: s, now: time.Now}
	root := a.rootCommand()
	root.SetArgs(args)
	root.SetIn(s.in)
	root.SetOut(s.out)
	root.SetErr(s.err)
	switch err := root.ExecuteContext(ctx); {
	case err == nil:
		return exitDone
	case errors.Is(err, errFailed):
		return exitFailed
	case errors.Is(err, errUnable):
		return exitUnable
	default:
		fmt.Fprintln(s.err, "chargehand: "+theme.Clean(err.Error()))
		var usage usageError
		if errors.As(err, &usage) {
			fmt.Fprintln(s.err, "hint: `chargehand --help` lists the commands, `chargehand COMMAND --help` explains one")
		}
		return exitUnable
	}
}

func (a *app) rootCommand() *cobra.Command {
	asked := false
	root := &cobra.Command{
		Use:   "chargehand",
		Short: "Commission the tie of a source to a DC bus: desk checks, dry run, walk, signed log",
		Long: `chargehand proves on site that a battery, supercapacitor or other source tied to a common DC bus through a
bidirectional DC/DC converter is safe and works as designed. Without a command it opens the start screen.

It only reads: no command ever writes to a device. It assists, it does not authorise: local codes, the permit to
work, the makers' instructions and licensed practice prevail, and a displayed, calculated or waited-for voltage
never stands for absence of voltage.`,
		Example: "  chargehand                     open the start screen; Enter rehearses the built-in example\n" +
			"  chargehand check site.toml     all desk findings of a site\n" +
			"  chargehand walk site.toml      the walk at the switchboard",
		Args:          a.noArguments,
		SilenceUsage:  true,
		SilenceErrors: true,
		RunE: func(cmd *cobra.Command, _ []string) error {
			if asked {
				fmt.Fprintln(a.out, "chargehand "+version())
				return nil
			}
			if !a.plain && !a.hasTerminal() {
				_ = cmd.Help()
				return errUnable
			}
			return a.startScreen(cmd.Context())
		},
	}
	root.SetFlagErrorFunc(func(_ *cobra.Command, err error) error { return usageError{err} })
	// Not through the library's template of the version: it links text/template, with which the linker drops no method (4 MB).
	root.Flags().BoolVarP(&asked, "version", "v", false, "the release and the commit it was built from")
	flags := root.PersistentFlags()
	flags.StringVar(&a.themeName, "theme", "auto", "colours: auto, dark, light or none")
	flags.BoolVar(&a.ascii, "ascii", false, "draw with ASCII only")
	flags.BoolVar(&a.plain, "plain", false, "line by line, no drawing")
	root.AddCommand(a.newCommand(), a.checkCommand(), a.sheetCommand(), a.linkCommand(), a.walkCommand(), a.rehearseCommand(),
		a.simulateCommand(), a.keyCommand(), a.signCommand(), a.verifyCommand(), a.reportCommand(), a.noticesCommand())
	withCompletions(root)
	return root
}

func (a *app) noArguments(_ *cobra.Command, args []string) error {
	if len(args) > 0 {
		return usageError{fmt.Errorf("there is no command %q", args[0])}
	}
	return nil
}

// exactly wants n arguments and says what they are.
func exactly(n int, what string) cobra.PositionalArgs {
	return func(cmd *cobra.Command, args []string) error {
		if len(args) != n {
			return usageError{fmt.Errorf("%s wants %s, got %d", cmd.CommandPath(), what, len(args))}
		}
		return nil
	}
}

// atLeast wants n arguments or more.
func atLeast(n int, what string) cobra.PositionalArgs {
	return func(cmd *cobra.Command, args []string) error {
		if len(args) < n {
			return usageError{fmt.Errorf("%s wants %s", cmd.CommandPath(), what)}
		}
		return nil
	}
}

// hasTerminal tells whether a screen can be drawn and keys be read.
func (a *app) hasTerminal() bool { return isTerminal(a.in) && isTerminal(a.out) }

func isTerminal(stream any) bool {
	f, ok := stream.(interface{ Fd() uintptr })
	return ok && term.IsTerminal(int(f.Fd()))
}

// theme chooses colours for an output stream.
func (a *app) theme(out io.Writer) (theme.Theme, error) {
	t, err := theme.Choose(a.themeName, a.ascii, theme.Terminal{IsTerminal: isTerminal(out), LookupEnv: a.env, DarkGround: lipgloss.HasDarkBackground})
	if err != nil {
		return t, usageError{err}
	}
	return t, nil
}

// complain prints an error with what to do about it.
func (a *app) complain(err error, hint string) {
	fmt.Fprintln(a.err, "chargehand: "+theme.Clean(err.Error()))
	if hint != "" {
		fmt.Fprintln(a.err, "hint: "+hint)
	}
}

// lines prints a text of several lines, each cleaned of control characters.
func lines(w io.Writer, text string) {
	for _, line := range strings.Split(text, "\n") {
		fmt.Fprintln(w, theme.Clean(line))
	}
}
