package main

import (
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
	"strings"

	tea "github.com/charmbracelet/bubbletea"
	"github.com/spf13/cobra"

	"chargehand/commission/desk"
	"chargehand/commission/finding"
	"chargehand/commission/site"
	"chargehand/protocol/registermap"
	"chargehand/tui/siteform"
	"chargehand/tui/theme"
)

func (a *app) newCommand() *cobra.Command {
	guided := false
	cmd := &cobra.Command{
		Use:   "new FILE",
		Short: "Write a commented site file and map file to start from",
		Long: `Writes FILE, a site file that explains every key, and beside it a register map. Both are whole: they pass check as
they stand, with the values of an invented site, so that each value can be replaced in turn.

--guided asks for the values in a form, with what is wrong beside its field and the findings moving as you type.`,
		Example: "  chargehand new wagtail.site.toml\n  chargehand new --guided wagtail.site.toml\n  chargehand check wagtail.site.toml",
		Args:    exactly(1, "the path of the new site file"),
		RunE: func(cmd *cobra.Command, args []string) error {
			return a.newSite(args[0], func(text string) (string, bool, error) {
				if !guided {
					return text, true, nil
				}
				return a.guide(cmd.Context(), args[0], text)
			})
		},
	}
	cmd.Flags().BoolVar(&guided, "guided", false, "ask for the values in a form")
	return cmd
}

// guide has the values of a site file typed into a form; false where it was left.
func (a *app) guide(ctx context.Context, file, text string) (string, bool, error) {
	if !a.hasTerminal() || a.plain {
		return "", false, errors.New("--guided needs a terminal to draw on; without it, `chargehand new` writes a file to edit")
	}
	t, err := a.theme(a.out)
	if err != nil {
		return "", false, err
	}
	registers, err := registermap.Read(file, []byte(site.MapTemplate()))
	if err != nil {
		return "", false, err
	}
	check := func(s site.Site) []finding.Finding { return desk.Findings(s, registers) }
	form, err := siteform.New(filepath.Base(file), text, check, t)
	if err != nil {
		return "", false, err
	}
	ended, err := tea.NewProgram(form, tea.WithAltScreen(), tea.WithContext(ctx), tea.WithInput(a.in), tea.WithOutput(a.out)).Run()
	if err != nil {
		return "", false, err
	}
	typed, save := ended.(siteform.Model).Text()
	return typed, save, nil
}

// newSite writes a site file and its map; fill may change the site file's text first, or call it off.
func (a *app) newSite(file string, fill func(text string) (string, bool, error)) error {
	if !strings.HasSuffix(file, ".toml") {
		return usageError{fmt.Errorf("a site file's name ends in .toml, read %q", file)}
	}
	mapFile := strings.TrimSuffix(strings.TrimSuffix(file, ".toml"), ".site") + ".map.toml"
	siteText, err := site.Template(filepath.Base(mapFile))
	if err != nil {
		return err
	}
	mapText := site.MapTemplate()
	for _, f := range []struct{ name, text string }{{file, siteText}, {mapFile, mapText}} {
		if _, err := os.Lstat(a.path(f.name)); !errors.Is(err, fs.ErrNotExist) {
			return fmt.Errorf("%s exists already; choose another name", f.name)
		}
	}
	siteText, wanted, err := fill(siteText)
	if err != nil {
		return err
	}
	if !wanted {
		a.say("nothing was written")
		return nil
	}
	for _, f := range []struct{ name, text string }{{file, siteText}, {mapFile, mapText}} {
		if err := writeNew(a.path(f.name), []byte(withLineEnds(f.text))); err != nil {
			return err
		}
		fmt.Fprintln(a.out, theme.Clean(f.name))
	}
	return nil
}

// withLineEnds gives a text the line ends that the system's editors like.
func withLineEnds(text string) string {
	if runtime.GOOS == "windows" {
		return strings.ReplaceAll(text, "\n", "\r\n")
	}
	return text
}

// writeNew creates a file that is not there yet; it follows no link and overwrites nothing.
func writeNew(path string, text []byte) error {
	f, err := os.OpenFile(path, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o644)
	if err != nil {
		return err
	}
	_, err = f.Write(text)
	return errors.Join(err, f.Sync(), f.Close())
}
