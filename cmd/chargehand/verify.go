package main

import (
	"context"
	"encoding/json"
	"fmt"
	"os"
	"path/filepath"
	"time"

	"github.com/spf13/cobra"

	"chargehand/commission/chlog"
	"chargehand/commission/report"
	"chargehand/commission/signing"
	"chargehand/tui/theme"
)

func (a *app) signCommand() *cobra.Command {
	var key string
	cmd := &cobra.Command{
		Use:   "sign LOG",
		Short: "Sign or countersign a sealed log",
		Long: `Writes a detached OpenSSH signature of every byte of a sealed log beside it: LOG.sig, or LOG.2.sig and so on for
those who sign after. The log itself is never touched. Anybody can check it with stock ssh-keygen:

  ssh-keygen -Y verify -f allowed_signers -I NAME -n chargehand -s LOG.sig < LOG`,
		Example: "  chargehand sign WAG-017-20261201-093000.chlog\n  chargehand sign --key agent WAG-017-20261201-093000.chlog",
		Args:    exactly(1, "the path of one log"),
		RunE:    func(_ *cobra.Command, args []string) error { return a.sign(args[0], key) },
	}
	keyFlag(cmd, &key)
	return cmd
}

func keyFlag(cmd *cobra.Command, key *string) {
	cmd.Flags().StringVar(key, "key", "", "sign with the private key in `FILE`, or with \"agent\" or \"agent:SHA256:…\"; else with the key of `chargehand key new`")
}

func (a *app) sign(log, named string) error {
	signer, err := a.signer(named)
	if err != nil {
		return err
	}
	if signer == nil {
		a.complain(fmt.Errorf("there is no key to sign with"), "`chargehand key new` makes one, --key names another")
		return errUnable
	}
	signature, err := chlog.SignFile(a.path(log), signer)
	if err != nil {
		return err
	}
	fmt.Fprintf(a.out, "%s\nsigned by key %s\n", theme.Clean(signature), signer.Fingerprint())
	return nil
}

type verifyOptions struct {
	signers string
	json    bool
}

func (a *app) verifyCommand() *cobra.Command {
	var o verifyOptions
	cmd := &cobra.Command{
		Use:   "verify LOG...",
		Short: "Verify chain, seal and signatures of one or more logs",
		Long: `Says in one sentence what may be relied on in a log, and how far: the chain of its records, its seal, the signed
statements and the detached signatures beside it. With a list of allowed signers it says who signed; without one
it says so. Logs of one call with the same identity are compared with each other.

Exit code: 0 when all is well, 1 when something is wrong or cannot be relied on, 2 when a file is no log.`,
		Example: "  chargehand verify *.chlog\n  chargehand verify --signers allowed_signers --json WAG-017-20261201-093000.chlog",
		Args:    atLeast(1, "the path of at least one log"),
		RunE:    func(cmd *cobra.Command, args []string) error { return a.verify(cmd.Context(), args, o) },
	}
	cmd.Flags().StringVar(&o.signers, "signers", "", "OpenSSH allowed_signers `FILE`")
	cmd.Flags().BoolVar(&o.json, "json", false, "one JSON object a log, on its own line")
	return cmd
}

func (a *app) verify(ctx context.Context, logs []string, o verifyOptions) error {
	verifier := chlog.Verifier{Now: a.now, Progress: a.verifyProgress()}
	if o.signers != "" {
		allowed, err := a.allowedSigners(o.signers)
		if err != nil {
			return err
		}
		verifier.Signers = allowed
	}
	paths := make([]string, len(logs))
	for i, log := range logs {
		paths[i] = a.path(log)
	}
	code := exitDone
	for i, found := range verifier.Verify(ctx, paths) {
		found.File = logs[i]
		if err := a.printReport(found, o.json); err != nil {
			return err
		}
		code = max(code, found.Exit)
	}
	switch code {
	case exitUnable:
		return errUnable
	case exitFailed:
		return errFailed
	}
	return nil
}

func (a *app) allowedSigners(file string) (*signing.Allowed, error) {
	f, err := os.Open(a.path(file))
	if err != nil {
		return nil, err
	}
	defer f.Close()
	return signing.ParseAllowed(file, f, time.Local)
}

func (a *app) printReport(r chlog.Report, asJSON bool) error {
	if asJSON {
		text, err := json.Marshal(r)
		if err == nil {
			fmt.Fprintln(a.out, string(report.EscapeJSON(text)))
		}
		return err
	}
	lines(a.out, r.String())
	for _, note := range r.Notes {
		lines(a.out, "  "+note)
	}
	for _, s := range r.Signatures {
		lines(a.out, fmt.Sprintf("  %s: %s, key %s, %s %s", filepath.Base(s.File), s.State, s.Key, s.Name, s.Role))
	}
	if r.Head != "" {
		lines(a.out, fmt.Sprintf("  %d records, head %s", r.Records, r.Head))
	}
	return nil
}

// verifyProgress shows how much is read, on stderr, on a terminal, and only where there is enough to wait for.
func (a *app) verifyProgress() func(done, total int64) {
	const worth = 64 << 20
	if !isTerminal(a.err) {
		return nil
	}
	return func(done, total int64) {
		switch {
		case total < worth:
		case done >= total:
			fmt.Fprint(a.err, "\r\x1b[K")
		default:
			fmt.Fprintf(a.err, "\rread %d of %d MB", done>>20, total>>20)
		}
	}
}
