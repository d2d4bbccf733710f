package main

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
	"strings"

	"github.com/spf13/cobra"

	"chargehand/commission/site"
	"chargehand/tui/theme"
)

func (a *app) newCommand() *cobra.Command {
	cmd := &cobra.Command{
		Use:   "new FILE",
		Short: "Write a commented site file and map file to start from",
		Long: `Writes FILE, a site file that explains every key, and beside it a register map. Both are whole: they pass check as
they stand, with the values of an invented site, so that each value can be replaced in turn.`,
		Example: "  chargehand new wagtail.site.toml\n  chargehand check wagtail.site.toml",
		Args:    exactly(1, "the path of the new site file"),
		RunE:    func(_ *cobra.Command, args []string) error { return a.newSite(args[0]) },
	}
	return cmd
}

func (a *app) newSite(file string) error {
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
