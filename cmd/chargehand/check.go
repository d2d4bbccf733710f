package main

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"sync"

	"github.com/spf13/cobra"
	"golang.org/x/term"

	"chargehand/commission/desk"
	"chargehand/commission/document"
	"chargehand/commission/droop"
	"chargehand/commission/finding"
	"chargehand/commission/report"
	"chargehand/commission/site"
	"chargehand/commission/window"
	"chargehand/protocol/registermap"
	"chargehand/tui/theme"
)

// largestFile is more than is ever read into memory; what a site or map file may have at most is for their readers to say,
// with its place.
const largestFile = 64 << 20

type checkOptions struct {
	json, csv, strict bool
	only, explain     string
	table             string
}

func (a *app) checkCommand() *cobra.Command {
	var o checkOptions
	cmd := &cobra.Command{
		Use:   "check SITE...",
		Short: "All desk findings of one or more sites",
		Long: `Calculates every finding of a site file over all corners of its tolerances: value, limit, margin, verdict, the
formula it comes from and, when it fails, what would make it pass. Needs no device.

Exit code: 0 when nothing fails, 1 when something does (with --strict also when something is undecided or
marginal), 2 when a file cannot be read.`,
		Example: "  chargehand check site.toml\n" +
			"  chargehand check --only precharge --explain precharge.energy site.toml\n" +
			"  chargehand check --json sites/*.toml",
		Args: atLeast(1, "the path of at least one site file"),
		RunE: func(cmd *cobra.Command, args []string) error { return a.check(cmd.Context(), args, o) },
	}
	f := cmd.Flags()
	f.BoolVar(&o.json, "json", false, "one JSON object a site, on its own line")
	f.BoolVar(&o.csv, "csv", false, "one CSV row a finding (RFC 4180)")
	f.BoolVar(&o.strict, "strict", false, "exit code 1 also for undecided and marginal findings")
	f.StringVar(&o.only, "only", "", "only findings whose id begins with `PREFIX`")
	f.StringVar(&o.explain, "explain", "", "the calculation of finding `ID` with this site's numbers put in")
	f.StringVar(&o.table, "table", "", "a `TABLE` beside the findings: window")
	return cmd
}

// checked is one file's outcome.
type checked struct {
	file     string
	site     site.Site
	sheet    desk.Sheet
	warnings []site.Warning
	err      error
}

func (a *app) check(ctx context.Context, files []string, o checkOptions) error {
	if o.json && o.csv {
		return usageError{fmt.Errorf("--json and --csv exclude each other")}
	}
	if o.table != "" && o.table != "window" {
		return usageError{fmt.Errorf("there is no table %q; write window", o.table)}
	}
	results := a.checkAll(ctx, files)
	code := exitDone
	for i, r := range results {
		if err := a.printChecked(r, o, i == 0); err != nil {
			return err
		}
		code = max(code, codeOf(r, o))
	}
	switch code {
	case exitUnable:
		return errUnable
	case exitFailed:
		return errFailed
	}
	return nil
}

func codeOf(r checked, o checkOptions) int {
	switch {
	case r.err != nil:
		return exitUnable
	case r.sheet.Verdict == finding.Fail:
		return exitFailed
	case o.strict && r.sheet.Verdict != finding.Pass:
		return exitFailed
	}
	return exitDone
}

// checkAll checks every file, several at a time, and keeps their order.
func (a *app) checkAll(ctx context.Context, files []string) []checked {
	results := make([]checked, len(files))
	bar := a.progress(len(files))
	next := make(chan int)
	var workers sync.WaitGroup
	for range min(runtime.GOMAXPROCS(0), len(files)) {
		workers.Go(func() {
			for i := range next {
				results[i] = a.checkOne(files[i])
				bar.step()
			}
		})
	}
	for i := range files {
		if ctx.Err() != nil {
			results[i] = checked{file: files[i], err: ctx.Err()}
			continue
		}
		next <- i
	}
	close(next)
	workers.Wait()
	bar.end()
	return results
}

func (a *app) checkOne(file string) checked {
	s, registers, warnings, err := a.readSite(file)
	if err != nil {
		return checked{file: file, err: err}
	}
	sheet := desk.Check(s, registers)
	sheet.File = file
	return checked{file: file, site: s, sheet: sheet, warnings: warnings}
}

// readSite reads a site file and, where it names one, its map; without the map no more than register numbers is lacking.
func (a *app) readSite(file string) (site.Site, droop.Registers, []site.Warning, error) {
	text, err := a.readSmall(file)
	if err != nil {
		return site.Site{}, nil, nil, err
	}
	s, warnings, err := site.Read(file, text)
	if err != nil || s.Device == nil || s.Device.Map == "" {
		return s, nil, warnings, err
	}
	mapFile := filepath.Join(filepath.Dir(file), filepath.FromSlash(s.Device.Map))
	mapText, err := a.readSmall(mapFile)
	if errors.Is(err, fs.ErrNotExist) {
		return s, nil, warnings, nil
	}
	if err != nil {
		return s, nil, warnings, err
	}
	m, err := registermap.Read(mapFile, mapText)
	return s, m, warnings, err
}

func (a *app) path(file string) string {
	if filepath.IsAbs(file) {
		return file
	}
	return filepath.Join(a.folder, file)
}

func (a *app) readSmall(file string) ([]byte, error) {
	info, err := os.Stat(a.path(file))
	if err != nil {
		return nil, err
	}
	if info.IsDir() {
		return nil, fmt.Errorf("%s is a folder, not a file", file)
	}
	if info.Size() > largestFile {
		return nil, fmt.Errorf("%s has %d bytes; no more than %d are read", file, info.Size(), largestFile)
	}
	f, err := os.Open(a.path(file))
	if err != nil {
		return nil, err
	}
	defer f.Close()
	text, err := io.ReadAll(io.LimitReader(f, largestFile+1)) // a device or a pipe has no size that could be asked for
	if err == nil && len(text) > largestFile {
		err = fmt.Errorf("%s gives more than %d bytes; no more are read", file, largestFile)
	}
	return text, err
}

func (a *app) printChecked(r checked, o checkOptions, first bool) error {
	for _, w := range r.warnings {
		lines(a.err, fmt.Sprintf("chargehand: %s:%d:%d: %s", r.file, w.Line, w.Column, w.Text))
	}
	sheet := r.sheet.Only(o.only)
	sheet.File = r.file
	switch {
	case r.err != nil && o.json:
		return a.printJSONError(r)
	case r.err != nil:
		lines(a.err, "chargehand: "+r.err.Error())
		return nil
	case o.explain != "":
		text, err := r.sheet.Explain(o.explain)
		if err != nil {
			return usageError{err}
		}
		lines(a.out, strings.TrimRight(text, "\n"))
		return nil
	case o.json:
		var text bytes.Buffer
		if err := sheet.WriteJSON(&text); err != nil {
			return err
		}
		_, err := a.out.Write(report.EscapeJSON(text.Bytes())) // it names the file as it was named
		return err
	case o.csv:
		return sheet.WriteCSV(a.out, first)
	case o.table == "window":
		return window.WriteRows(a.out, window.Table(r.site))
	}
	t, err := a.theme(a.out)
	if err != nil {
		return err
	}
	return sheet.WriteTable(a.out, finding.TableOptions{Width: a.columns(), ASCII: a.ascii, Style: func(v finding.Verdict, text string) string {
		return t.Paint(theme.VerdictRole(v), text)
	}})
}

// columns is the width of the terminal, or what a page of text has.
func (a *app) columns() int {
	if f, ok := a.out.(interface{ Fd() uintptr }); ok {
		if width, _, err := term.GetSize(int(f.Fd())); err == nil && width > 0 {
			return width
		}
	}
	return 100
}

// problemJSON is a file that could not be read, as `check --json` says it.
type problemJSON struct {
	Format string             `json:"format"`
	File   string             `json:"file"`
	Error  []document.Problem `json:"error"`
}

func (a *app) printJSONError(r checked) error {
	p := problemJSON{Format: finding.Format, File: r.file}
	if problems, ok := r.err.(*document.Problems); ok {
		p.Error = problems.List
		if problems.File != "" {
			p.File = problems.File
		}
	} else {
		p.Error = []document.Problem{{Read: r.err.Error(), Wanted: "a site file that can be read", Example: "site.toml"}}
	}
	text, err := json.Marshal(p)
	if err == nil {
		fmt.Fprintln(a.out, string(report.EscapeJSON(text)))
	}
	return err
}

// progressBar shows how many files are done, on stderr and only on a terminal.
type progressBar struct {
	mu        sync.Mutex
	app       *app
	done, all int
	show      bool
}

func (a *app) progress(all int) *progressBar {
	return &progressBar{app: a, all: all, show: all > 20 && isTerminal(a.err)}
}

func (p *progressBar) step() {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.done++
	if p.show && (p.done%10 == 0 || p.done == p.all) {
		filled := 30 * p.done / p.all
		fmt.Fprintf(p.app.err, "\r[%s%s] %d of %d files", strings.Repeat("#", filled), strings.Repeat(".", 30-filled), p.done, p.all)
	}
}

func (p *progressBar) end() {
	if p.show {
		fmt.Fprint(p.app.err, "\r\x1b[K")
	}
}
