package main

import (
	_ "embed"
	"strings"

	"github.com/spf13/cobra"
)

// notices are the licences of everything that the program is built from, gathered from the module cache by `go generate`.
//
//go:embed notices.txt
var notices string

//go:generate go run ./gather notices.txt

func (a *app) noticesCommand() *cobra.Command {
	return &cobra.Command{
		Use:     "notices",
		Short:   "Licences of what is built in",
		Long:    "Prints the licence of every module that the program is built from, of the Go standard library, and of the fonts in its PDF files.",
		Example: "  chargehand notices | less",
		Args:    exactly(0, "no argument"),
		RunE: func(*cobra.Command, []string) error {
			lines(a.out, strings.TrimSuffix(notices, "\n"))
			return nil
		},
	}
}
