package main

import (
	"context"
	"fmt"

	"github.com/spf13/cobra"
)

// reportOptions say which form a report takes.
type reportOptions struct {
	paper, csv, out   string
	json, text, force bool
}

func (a *app) reportCommand() *cobra.Command {
	var o reportOptions
	cmd := &cobra.Command{
		Use:   "report LOG",
		Short: "The report of a log as PDF with plots, or its data",
		Args:  exactly(1, "the path of one log"),
		RunE:  func(cmd *cobra.Command, args []string) error { return a.writeReport(cmd.Context(), args[0], o.out, o) },
	}
	return cmd
}

func (a *app) writeReport(context.Context, string, string, reportOptions) error {
	return fmt.Errorf("report")
}

func (a *app) sheetCommand() *cobra.Command   { return &cobra.Command{Use: "sheet SITE"} }
func (a *app) noticesCommand() *cobra.Command { return &cobra.Command{Use: "notices"} }
