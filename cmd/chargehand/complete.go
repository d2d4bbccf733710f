package main

import (
	"strings"

	"github.com/spf13/cobra"

	"chargehand/protocol/simulator"
	"chargehand/tui/theme"
)

// withCompletions tells a shell what may stand where: a site file, a log, or one of a few words.
func withCompletions(root *cobra.Command) {
	endings := map[string]string{"check": "toml", "sheet": "toml", "link": "toml", "walk": "toml", "rehearse": "toml", "simulate": "toml",
		"sign": "chlog", "verify": "chlog", "report": "chlog"}
	words := map[string]cobra.CompletionFunc{
		"theme":   cobra.FixedCompletions([]cobra.Completion{"auto", "dark", "light", "none"}, cobra.ShellCompDirectiveNoFileComp),
		"paper":   cobra.FixedCompletions([]cobra.Completion{"a4", "letter"}, cobra.ShellCompDirectiveNoFileComp),
		"log":     filesEnding("chlog"),
		"csv":     cobra.FixedCompletions(nil, cobra.ShellCompDirectiveFilterDirs),
		"disturb": disturbances,
	}
	for _, cmd := range append(root.Commands(), root) {
		if ending, ok := endings[cmd.Name()]; ok {
			cmd.ValidArgsFunction = filesEnding(ending)
		}
		for flag, complete := range words {
			if cmd.Flag(flag) != nil {
				_ = cmd.RegisterFlagCompletionFunc(flag, complete) // fails only where it is there already
			}
		}
	}
}

func filesEnding(ending string) cobra.CompletionFunc {
	return cobra.FixedCompletions([]cobra.Completion{ending}, cobra.ShellCompDirectiveFilterFileExt)
}

// disturbances completes the last name of a list with commas.
func disturbances(_ *cobra.Command, _ []string, typed string) ([]cobra.Completion, cobra.ShellCompDirective) {
	before := typed[:strings.LastIndexByte(typed, ',')+1]
	var names []cobra.Completion
	for _, d := range simulator.Disturbances() {
		if strings.HasPrefix(d.Name, typed[len(before):]) {
			names = append(names, cobra.CompletionWithDesc(before+d.Name, theme.Clean(d.Meaning)))
		}
	}
	return names, cobra.ShellCompDirectiveNoFileComp | cobra.ShellCompDirectiveNoSpace
}
