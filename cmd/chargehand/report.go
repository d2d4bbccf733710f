package main

import (
	"context"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"chargehand/commission/chlog"
	"chargehand/commission/finding"
	"chargehand/commission/report"
	"chargehand/tui/theme"
)

// reportOptions say which form a report takes.
type reportOptions struct {
	paper, csv, out, signers string
	json, text, force        bool
}

func (a *app) reportCommand() *cobra.Command {
	var o reportOptions
	cmd := &cobra.Command{
		Use:   "report LOG",
		Short: "The report of a log as PDF with plots, or its data",
		Long: `Tells a commissioning from its log alone, sealed or not: verdict and signatures, plots of what was measured over what
was predicted, every finding and point, the nameplates as found and as left, deviations, punch list, and how to check
the log without this program. A rehearsal, an unsealed or a broken log is marked so on every page. The same log gives
the same bytes.

The PDF lies beside the log as NAME.pdf unless --out names another place; --json and --text go to standard output
unless it does; --csv writes findings.csv, points.csv, readings.csv, punch.csv and a file for each capture into a folder.
A file that is there already stays as it is without --force.

Every CSV row begins with the log's id, so many logs can be loaded together:
  DuckDB      SELECT * FROM read_csv('*/findings.csv', union_by_name = true)
  SQLite      .import --csv a/findings.csv findings
  Python      pandas.concat(pandas.read_csv(f) for f in glob.glob('*/findings.csv'))
  R           do.call(rbind, lapply(Sys.glob('*/findings.csv'), read.csv))
  PowerShell  Get-ChildItem */findings.csv | ForEach-Object { Import-Csv $_ }

Exit code: 0 when it is written and nothing failed, 1 when the verdict is fail or the log cannot be relied on as it
stands (the reason is printed), 2 when it cannot be written.`,
		Example: "  chargehand report WAG-017-20261201-093000.chlog\n" +
			"  chargehand report --paper letter --out report.pdf --force WAG-017-20261201-093000.chlog\n" +
			"  chargehand report --csv data --text WAG-017-20261201-093000.chlog",
		Args: exactly(1, "the path of one log"),
		RunE: func(cmd *cobra.Command, args []string) error {
			story, err := a.tell(cmd.Context(), args[0], o)
			if err != nil {
				return err
			}
			if err := a.writeStory(story, a.path(args[0]), o); err != nil {
				return err
			}
			return a.reportVerdict(story)
		},
	}
	f := cmd.Flags()
	f.StringVar(&o.csv, "csv", "", "write CSV files (RFC 4180) into folder `DIR`, which is made where it is missing")
	f.BoolVar(&o.json, "json", false, "the whole report as one JSON object")
	f.BoolVar(&o.text, "text", false, "the report as text, for a mail or a screen reader")
	f.StringVar(&o.signers, "signers", "", "OpenSSH allowed_signers `FILE`, to say whose the keys are")
	outputFlags(cmd, &o.paper, &o.out, &o.force)
	return cmd
}

// outputFlags are what everything that writes a PDF has in common.
func outputFlags(cmd *cobra.Command, paper, out *string, force *bool) {
	f := cmd.Flags()
	f.StringVar(paper, "paper", string(report.A4), "a4 or letter")
	f.StringVar(out, "out", "", "write to `FILE`")
	f.BoolVar(force, "force", false, "overwrite files that are there already")
}

// writeReport writes the report of a log as PDF.
func (a *app) writeReport(ctx context.Context, log, out string, o reportOptions) error {
	story, err := a.tell(ctx, log, o)
	if err != nil {
		return err
	}
	return writeFile(a.path(out), o.force, func(w io.Writer) error { return story.WritePDF(w, report.Paper(o.paper)) })
}

// tell verifies a log and reads its story.
func (a *app) tell(ctx context.Context, log string, o reportOptions) (report.Story, error) {
	if !report.Paper(o.paper).IsKnown() {
		return report.Story{}, usageError{fmt.Errorf("there is no paper %q; write a4 or letter", o.paper)}
	}
	if o.json && o.text {
		return report.Story{}, usageError{fmt.Errorf("--json and --text exclude each other")}
	}
	if o.csv != "" && o.out != "" && !o.json && !o.text {
		return report.Story{}, usageError{fmt.Errorf("--csv writes into its folder; --out belongs to the PDF, --json or --text")}
	}
	verifier := chlog.Verifier{Now: a.now}
	if o.signers != "" {
		allowed, err := a.allowedSigners(o.signers)
		if err != nil {
			return report.Story{}, err
		}
		verifier.Signers = allowed
	}
	path := a.path(log)
	verified := verifier.Verify(ctx, []string{path})[0]
	if verified.Exit == exitUnable {
		return report.Story{}, fmt.Errorf("%s: %s", log, verified.Sentence)
	}
	f, err := os.Open(path)
	if err != nil {
		return report.Story{}, err
	}
	defer f.Close()
	return report.Read(f, verified)
}

// writeStory writes the forms that were asked for; the PDF where none was.
func (a *app) writeStory(story report.Story, log string, o reportOptions) error {
	if o.csv != "" {
		if err := a.writeTables(story, a.path(o.csv), o.force); err != nil {
			return err
		}
	}
	switch {
	case o.json:
		return a.writeOut(o, log, story.WriteJSON)
	case o.text:
		return a.writeOut(o, log, story.WriteText)
	case o.csv != "":
		return nil
	}
	out := strings.TrimSuffix(log, ".chlog") + ".pdf"
	if o.out != "" {
		out = a.path(o.out)
	}
	if err := notItself(out, log); err != nil {
		return err
	}
	err := writeFile(out, o.force, func(w io.Writer) error { return story.WritePDF(w, report.Paper(o.paper)) })
	if err == nil {
		fmt.Fprintln(a.out, theme.Clean(out))
	}
	return err
}

// writeOut writes to the file that --out names, else to standard output.
func (a *app) writeOut(o reportOptions, log string, write func(io.Writer) error) error {
	if o.out == "" {
		return write(a.out)
	}
	if err := notItself(a.path(o.out), log); err != nil {
		return err
	}
	return writeFile(a.path(o.out), o.force, write)
}

// writeTables writes the CSV files; where one of them is there already, none is written without force.
func (a *app) writeTables(story report.Story, folder string, force bool) error {
	if err := os.MkdirAll(folder, 0o755); err != nil {
		return fmt.Errorf("make the folder for the CSV files: %w", err)
	}
	tables := story.Tables()
	if !force {
		for _, t := range tables {
			if err := absent(filepath.Join(folder, t.Name)); err != nil {
				return err
			}
		}
	}
	for _, t := range tables {
		if err := writeFile(filepath.Join(folder, t.Name), force, t.Write); err != nil {
			return err
		}
	}
	fmt.Fprintf(a.out, "%s: %d files\n", theme.Clean(folder), len(tables))
	return nil
}

// reportVerdict says why a report ends with exit code 1.
func (a *app) reportVerdict(story report.Story) error {
	if story.Verification.Exit != exitDone {
		lines(a.err, "chargehand: "+story.Log.File+": "+story.Verification.Sentence)
		return errFailed
	}
	if story.Verdict == finding.Fail {
		return errFailed
	}
	return nil
}
