package main

import (
	"strings"
	"testing"

	"chargehand/protocol/simulator"
)

// The shells ask through the hidden command __complete; its last line is a number whose bits are those of cobra's
// ShellCompDirective: 2 no space, 4 no files, 8 files with these endings, 16 folders.
func TestCompletion(t *testing.T) {
	for _, c := range []struct {
		args string
		want []string
		bits string
	}{
		{"check ", []string{"toml"}, ":8"},
		{"walk ", []string{"toml"}, ":8"},
		{"verify ", []string{"chlog"}, ":8"},
		{"verify one.chlog ", []string{"chlog"}, ":8"},
		{"report --paper ", []string{"a4", "letter"}, ":4"},
		{"report --csv ", nil, ":16"},
		{"check --theme ", []string{"auto", "dark", "light", "none"}, ":4"},
		{"rehearse --log ", []string{"chlog"}, ":8"},
		{"rehearse --disturb link-", []string{"link-drops"}, ":6"},
		{"simulate --disturb resistor-high,link-", []string{"resistor-high,link-drops"}, ":6"},
	} {
		got := called(t.TempDir(), append([]string{"__complete"}, strings.Split(c.args, " ")...)...)
		rows := strings.Split(strings.TrimRight(got.out, "\n"), "\n")
		var words []string
		for _, row := range rows[:len(rows)-1] {
			word, _, _ := strings.Cut(row, "\t")
			words = append(words, word)
		}
		if strings.Join(words, " ") != strings.Join(c.want, " ") || rows[len(rows)-1] != c.bits {
			t.Errorf("__complete %s= %q, want %q and %s", c.args, rows, c.want, c.bits)
		}
	}
}

func TestCompletionNamesEveryDisturbance(t *testing.T) {
	got := called(t.TempDir(), "__complete", "rehearse", "--disturb", "")
	for _, d := range simulator.Disturbances() {
		if !strings.Contains("\n"+got.out, "\n"+d.Name+"\t") {
			t.Errorf("completion of --disturb lacks %s", d.Name)
		}
	}
}

func TestCompletionScripts(t *testing.T) {
	for shell, want := range map[string]string{"bash": "complete ", "zsh": "#compdef chargehand", "fish": "complete -c chargehand",
		"powershell": "Register-ArgumentCompleter"} {
		if got := called(t.TempDir(), "completion", shell); got.code != exitDone || !strings.Contains(got.out, want) {
			t.Errorf("completion %s = exit %d without %q", shell, got.code, want)
		}
	}
}
