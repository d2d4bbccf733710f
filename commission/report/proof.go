package report

import (
	"fmt"
	"path/filepath"
	"strings"
)

// proofStep is one thing that anybody can check with stock tools.
type proofStep struct {
	words    string
	commands []command
}

// command is a line to type and where.
type command struct{ where, text string }

const (
	shell      = "Unix shell"
	powershell = "PowerShell"
)

// proofSteps say how to check the log with ssh-keygen (OpenSSH 8.1 or later) and a hash, with its own names put in.
func (s Story) proofSteps() []proofStep {
	log := quoted(s.Log.File)
	steps := []proofStep{{
		words: fmt.Sprintf("The file is the one this report was made from if its SHA-256 is %s.", s.Log.SHA256),
		commands: []command{
			{shell, "sha256sum " + log},
			{"macOS", "shasum -a 256 " + log},
			{powershell, "Get-FileHash -Algorithm SHA256 " + log},
		},
	}, {
		words:    fmt.Sprintf("Each record holds the SHA-256 of the line before it. The last line's own, its line feed included, stands at the foot of each page: %s.", s.Log.Head),
		commands: []command{{shell, "tail -n 1 " + log + " | sha256sum"}},
	}}
	if len(s.Verification.Signatures) == 0 {
		return append(steps, proofStep{words: "There is no detached signature beside this log; who made it can only be checked by the statements in it, with `chargehand verify`."})
	}
	steps = append(steps, proofStep{words: "A list of allowed signers names who may sign, one a line: a name, namespaces=\"chargehand\", and the public key, which its owner gives " +
		"you by a way that you trust. Compare its fingerprint with the one above. Then, for each signature:"})
	for _, k := range s.Verification.Signatures {
		signature := quoted(filepath.Base(k.File))
		check := "ssh-keygen -Y verify -f allowed_signers -I NAME -n chargehand -s " + signature + " < " + log
		steps = append(steps, proofStep{words: fmt.Sprintf("%s, key %s:", k.File, orAbsent(k.Key)), commands: []command{
			{shell, check},
			{powershell, `cmd /c "` + strings.ReplaceAll(check, "'", `""`) + `"`},
		}})
	}
	return append(steps, proofStep{words: "Without a list, -Y check-novalidate -n chargehand -s does the same and tells only which key signed these bytes. " +
		"What no check can show: a log that its own signer wrote anew and signed again. A countersignature, or this page kept on paper, does."})
}

// quoted is a file name as both shells take it; quotes are only put where they are needed.
func quoted(name string) string {
	if strings.Trim(name, "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789._-") == "" && name != "" {
		return name
	}
	return "'" + strings.ReplaceAll(name, "'", `'\''`) + "'"
}
