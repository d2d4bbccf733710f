package main

import (
	"fmt"
	"io"
	"strings"

	"github.com/spf13/cobra"

	"chargehand/commission/desk"
	"chargehand/commission/report"
	"chargehand/tui/theme"
)

type sheetOptions struct {
	paper, out string
	force      bool
}

func (a *app) sheetCommand() *cobra.Command {
	var o sheetOptions
	cmd := &cobra.Command{
		Use:   "sheet SITE",
		Short: "The blank test sheet as PDF, to take along on paper",
		Long: `Writes the whole walk as a PDF to fill in by hand where no laptop may go: every point with its caution, what to do and
what to expect with this site's predictions put in, boxes for readings, instruments and results, lines for signatures,
and the predicted curves. What is copied from it into a walk later is marked there as taken from paper.

The PDF lies beside the site file as NAME.sheet.pdf unless --out names another place.`,
		Example: "  chargehand sheet site.toml\n  chargehand sheet --paper letter --out sheet.pdf site.toml",
		Args:    exactly(1, "the path of one site file"),
		RunE:    func(_ *cobra.Command, args []string) error { return a.writeSheet(args[0], o) },
	}
	outputFlags(cmd, &o.paper, &o.out, &o.force)
	return cmd
}

func (a *app) writeSheet(file string, o sheetOptions) error {
	if !report.Paper(o.paper).IsKnown() {
		return usageError{fmt.Errorf("there is no paper %q; write a4 or letter", o.paper)}
	}
	p, err := a.papers(file)
	if err != nil {
		return err
	}
	blank := report.Sheet{Site: p.site, File: file, Text: p.siteText, Findings: desk.Check(p.site, p.registersOrNone()).Findings, At: a.now()}
	out := strings.TrimSuffix(strings.TrimSuffix(a.path(file), ".toml"), ".site") + ".sheet.pdf"
	if o.out != "" {
		out = a.path(o.out)
	}
	if err := notItself(out, a.path(file)); err != nil {
		return err
	}
	err = writeFile(out, o.force, func(w io.Writer) error { return blank.WritePDF(w, report.Paper(o.paper)) })
	if err == nil {
		fmt.Fprintln(a.out, theme.Clean(out))
	}
	return err
}
