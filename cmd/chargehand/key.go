package main

import (
	"bufio"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"
	"golang.org/x/term"

	"chargehand/commission/signing"
)

func (a *app) keyCommand() *cobra.Command {
	cmd := &cobra.Command{
		Use:   "key",
		Short: "Make or show an OpenSSH key for signing",
		Long: `Sign-offs and seals are signed with an OpenSSH key. An existing key or ssh-agent works as well as one made here.
Key material never gets into a log.`,
		Example: "  chargehand key new             make an Ed25519 key in chargehand's folder\n" +
			"  chargehand key show            show its public half and fingerprint",
		RunE: func(cmd *cobra.Command, args []string) error {
			if len(args) > 0 {
				return usageError{fmt.Errorf("there is no command %q under key", args[0])}
			}
			return cmd.Help()
		},
	}
	cmd.AddCommand(a.keyNewCommand(), a.keyShowCommand())
	return cmd
}

func (a *app) keyNewCommand() *cobra.Command {
	var comment string
	var open bool
	cmd := &cobra.Command{
		Use:   "new [FILE]",
		Short: "Make an Ed25519 key; FILE holds it, FILE.pub the public half",
		Long: `Makes an OpenSSH Ed25519 key. The file gets mode 0600 and is never overwritten. The passphrase is asked without
echo; an empty one leaves the key unencrypted.`,
		Example: "  chargehand key new\n  chargehand key new --comment \"tech@example.org\" ~/.ssh/id_commissioning",
		Args:    atMostOne("the file for the key"),
		RunE: func(_ *cobra.Command, args []string) error {
			file, err := a.keyFile(args)
			if err != nil {
				return err
			}
			return a.makeKey(file, comment, open)
		},
	}
	cmd.Flags().StringVar(&comment, "comment", "", "`TEXT` to tell the key by, such as an address")
	cmd.Flags().BoolVar(&open, "no-passphrase", false, "leave the key unencrypted without asking")
	return cmd
}

func (a *app) makeKey(file, comment string, open bool) error {
	var passphrase []byte
	if !open {
		var err error
		if passphrase, err = a.newPassphrase(); err != nil {
			return err
		}
	}
	if err := os.MkdirAll(filepath.Dir(file), 0o700); err != nil {
		return err
	}
	key, err := signing.WriteNew(file, comment, passphrase)
	if err != nil {
		return err
	}
	fmt.Fprintf(a.out, "%s\n%s\n", file, key.Fingerprint())
	fmt.Fprintln(a.err, "keep the file secret; give "+file+".pub to whoever checks your logs")
	return nil
}

func (a *app) keyShowCommand() *cobra.Command {
	return &cobra.Command{
		Use:   "show [FILE]",
		Short: "Show a key's public half, fingerprint and a line for an allowed_signers file",
		Long: `Shows the public half of a key: of FILE, else of chargehand's own key, and of every key that ssh-agent offers. The
private half is never read for it where FILE.pub stands beside it.`,
		Example: "  chargehand key show\n  chargehand key show ~/.ssh/id_ed25519",
		Args:    atMostOne("the file of the key"),
		RunE: func(_ *cobra.Command, args []string) error {
			file, err := a.keyFile(args)
			if err != nil {
				return err
			}
			return a.showKeys(file, len(args) > 0)
		},
	}
}

func (a *app) showKeys(file string, named bool) error {
	shown := 0
	text, err := os.ReadFile(strings.TrimSuffix(file, ".pub") + ".pub")
	switch {
	case err == nil:
		public, err := signing.ParsePublicKey(strings.TrimSpace(string(text)))
		if err != nil {
			return fmt.Errorf("read %s.pub: %w", file, err)
		}
		a.showKey(file, public.Fingerprint(), public.AuthorizedKey())
		shown++
	case named || !errors.Is(err, fs.ErrNotExist):
		key, err := signing.Load(file, a.askPassphrase)
		if err != nil {
			return err
		}
		a.showKey(file, key.Fingerprint(), key.AuthorizedKey())
		shown++
	}
	if !named {
		shown += a.showAgent()
	}
	if shown == 0 {
		a.complain(errors.New("there is no key"), "`chargehand key new` makes one")
		return errUnable
	}
	return nil
}

func (a *app) showAgent() int {
	agent, err := a.agent()
	if err != nil {
		return 0
	}
	defer agent.Close()
	keys, err := agent.Keys()
	if err != nil {
		return 0
	}
	for _, k := range keys {
		a.showKey("ssh-agent "+k.Comment(), k.Fingerprint(), k.AuthorizedKey())
	}
	return len(keys)
}

func (a *app) agent() (*signing.Agent, error) {
	address, _ := a.env("SSH_AUTH_SOCK")
	return signing.DialAgent(address)
}

func (a *app) showKey(where, fingerprint, authorized string) {
	lines(a.out, fmt.Sprintf("%s\n  fingerprint      %s\n  public key       %s\n  allowed_signers  NAME namespaces=\"%s\" %s",
		where, fingerprint, authorized, signing.Namespace, authorized))
}

func atMostOne(what string) cobra.PositionalArgs {
	return func(cmd *cobra.Command, args []string) error {
		if len(args) > 1 {
			return usageError{fmt.Errorf("%s wants at most %s, got %d arguments", cmd.CommandPath(), what, len(args))}
		}
		return nil
	}
}

// keyFile is the file named, else chargehand's own key.
func (a *app) keyFile(args []string) (string, error) {
	if len(args) == 1 {
		return a.path(args[0]), nil
	}
	folder, err := a.configFolder()
	return filepath.Join(folder, "id_ed25519"), err
}

// newPassphrase asks twice without echo.
func (a *app) newPassphrase() ([]byte, error) {
	if !isTerminal(a.in) {
		return nil, fmt.Errorf("there is no terminal to ask for a passphrase; --no-passphrase leaves the key unencrypted")
	}
	first, err := a.secret("passphrase (empty for none): ")
	if err != nil || len(first) == 0 {
		return nil, err
	}
	second, err := a.secret("the same again: ")
	if err == nil && string(first) != string(second) {
		err = errors.New("the two passphrases differ")
	}
	return first, err
}

// askPassphrase asks for a key's passphrase without echo.
func (a *app) askPassphrase(file string) ([]byte, error) {
	if !isTerminal(a.in) {
		return nil, fmt.Errorf("%s has a passphrase and there is no terminal to ask for it; ssh-agent can hold the key", file)
	}
	return a.secret("passphrase of " + file + ": ")
}

func (a *app) secret(prompt string) ([]byte, error) {
	fmt.Fprint(a.err, prompt)
	defer fmt.Fprintln(a.err)
	if f, ok := a.in.(interface{ Fd() uintptr }); ok {
		return term.ReadPassword(int(f.Fd()))
	}
	line, err := bufio.NewReader(a.in).ReadString('\n')
	return []byte(strings.TrimRight(line, "\r\n")), err
}

// signer finds the key to sign with: a file, "agent" or "agent:SHA256:…", else chargehand's own key; nil where there is none.
func (a *app) signer(named string) (signing.Signer, error) {
	if rest, ok := strings.CutPrefix(named, "agent"); ok && (rest == "" || rest[0] == ':') {
		return a.agentKey(strings.TrimPrefix(rest, ":"))
	}
	file, err := a.keyFile(nil)
	if named != "" {
		file, err = a.path(named), nil
	}
	if err != nil {
		return nil, err
	}
	key, err := signing.Load(file, a.askPassphrase)
	if named == "" && errors.Is(err, fs.ErrNotExist) {
		return nil, nil
	}
	if err != nil {
		return nil, err
	}
	return key, nil
}

func (a *app) agentKey(fingerprint string) (signing.Signer, error) {
	agent, err := a.agent()
	if err != nil {
		return nil, err
	}
	if fingerprint != "" {
		return agent.Key(fingerprint)
	}
	keys, err := agent.Keys()
	if err == nil && len(keys) != 1 {
		err = fmt.Errorf("ssh-agent offers %d keys; name one as agent:SHA256:…, `chargehand key show` lists them", len(keys))
	}
	if err != nil {
		return nil, err
	}
	return keys[0], nil
}
