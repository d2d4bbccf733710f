//go:build peer

package signing_test

import (
	"bytes"
	"net"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"golang.org/x/crypto/ssh"
	"golang.org/x/crypto/ssh/agent"

	"chargehand/commission/signing"
)

func keygen(t *testing.T, stdin []byte, args ...string) (string, error) {
	t.Helper()
	cmd := exec.Command("ssh-keygen", args...)
	cmd.Stdin = bytes.NewReader(stdin)
	out, err := cmd.CombinedOutput()
	if _, missing := err.(*exec.Error); missing {
		t.Fatal(err)
	}
	return string(out), err
}

// ssh-keygen accepts what we sign, made by each kind of key, from a file and through an agent.
func TestOpenSSHAcceptsOurs(t *testing.T) {
	message := []byte(read(t, "message"))
	for _, name := range append(keyNames, "new") {
		dir := t.TempDir()
		var k signing.Key
		if name == "new" {
			made, err := signing.WriteNew(filepath.Join(dir, "id"), "tech@example.org", nil)
			if err != nil {
				t.Fatal(err)
			}
			k = made
			if out, err := keygen(t, nil, "-l", "-f", filepath.Join(dir, "id")); err != nil || !strings.Contains(out, k.Fingerprint()) {
				t.Errorf("ssh-keygen -l = %s, %v, want %s", out, err, k)
			}
			if out, err := keygen(t, nil, "-y", "-f", filepath.Join(dir, "id")); err != nil || !strings.HasPrefix(out, k.AuthorizedKey()) {
				t.Errorf("ssh-keygen -y = %s, %v, want %s", out, err, k.AuthorizedKey())
			}
		} else {
			k = load(t, name)
		}
		armoured, err := k.Sign(message)
		if err != nil {
			t.Fatal(err)
		}
		list, sig := filepath.Join(dir, "allowed"), filepath.Join(dir, "sig")
		os.WriteFile(list, []byte("tech@example.org "+k.AuthorizedKey()+"\n"), 0o600)
		os.WriteFile(sig, []byte(armoured), 0o600)
		verify := []string{"-Y", "verify", "-f", list, "-I", "tech@example.org", "-n", "chargehand", "-s", sig}
		if out, err := keygen(t, message, verify...); err != nil || !strings.Contains(out, `Good "chargehand" signature for tech@example.org`) {
			t.Errorf("%s: ssh-keygen -Y verify = %s, %v, want good", name, out, err)
		}
		if out, err := keygen(t, append(message, ' '), verify...); err == nil {
			t.Errorf("%s: ssh-keygen -Y verify of a longer message = %s, want an error", name, out)
		}
	}
}

func TestOpenSSHReadsOurEncryptedKey(t *testing.T) {
	path := filepath.Join(t.TempDir(), "id")
	k, err := signing.WriteNew(path, "tech@example.org", []byte("correct horse"))
	if err != nil {
		t.Fatal(err)
	}
	if out, err := keygen(t, nil, "-y", "-P", "correct horse", "-f", path); err != nil || !strings.HasPrefix(out, k.AuthorizedKey()) {
		t.Errorf("ssh-keygen -y = %s, %v, want %s", out, err, k.AuthorizedKey())
	}
	if out, err := keygen(t, nil, "-y", "-P", "wrong", "-f", path); err == nil {
		t.Errorf("ssh-keygen -y with a wrong passphrase = %s, want an error", out)
	}
}

// The real ssh-agent signs for us.
func TestOpenSSHAgentSigns(t *testing.T) {
	socket := filepath.Join(t.TempDir(), "agent")
	cmd := exec.Command("ssh-agent", "-D", "-a", socket)
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	defer func() { cmd.Process.Kill(); cmd.Wait() }()
	var connection net.Conn
	var err error
	for range 100 {
		if connection, err = net.Dial("unix", socket); err == nil {
			break
		}
		time.Sleep(20 * time.Millisecond)
	}
	if err != nil {
		t.Fatal(err)
	}
	client := agent.NewClient(connection)
	for _, name := range keyNames {
		private, err := ssh.ParseRawPrivateKey([]byte(read(t, name)))
		if err != nil {
			t.Fatal(err)
		}
		if err := client.Add(agent.AddedKey{PrivateKey: private, Comment: name}); err != nil {
			t.Fatal(err)
		}
	}
	connection.Close()
	a, err := signing.DialAgent(socket)
	if err != nil {
		t.Fatal(err)
	}
	defer a.Close()
	keys, err := a.Keys()
	if err != nil || len(keys) != len(keyNames) {
		t.Fatalf("Keys = %v, %v, want %d", keys, err, len(keyNames))
	}
	for _, k := range keys {
		armoured, err := k.Sign([]byte("message"))
		if err != nil {
			t.Fatal(err)
		}
		if got, err := signing.Verify([]byte("message"), armoured); err != nil || got.Fingerprint() != k.Fingerprint() {
			t.Errorf("Verify = %s, %v, want %s", got, err, k)
		}
	}
}

// Where ssh-keygen allows and refuses, so do we.
func TestAllowedSignersAgreeWithOpenSSH(t *testing.T) {
	message, armoured := []byte(read(t, "message")), read(t, "message.ed25519.sig")
	ed := key(t, "ed25519").AuthorizedKey()
	for _, c := range []struct{ name, list, at string }{
		{"plain", "tech@example.org " + ed, "20240615Z"},
		{"comment", "tech@example.org " + ed + " aft", "20240615Z"},
		{"quoted", `"tech@example.org" ` + ed, "20240615Z"},
		{"pattern", "*@example.org,!other@example.org " + ed, "20240615Z"},
		{"negated", "*@example.org,!tech@example.org " + ed, "20240615Z"},
		{"namespace", `tech@example.org namespaces="charge*" ` + ed, "20240615Z"},
		{"other namespace", `tech@example.org namespaces="git" ` + ed, "20240615Z"},
		{"option in capitals", `tech@example.org NAMESPACES="git" ` + ed, "20240615Z"},
		{"inside", `tech@example.org valid-after="20240101Z",valid-before="20241231Z" ` + ed, "20240615Z"},
		{"before", `tech@example.org valid-after="20240101Z",valid-before="20241231Z" ` + ed, "20230615Z"},
		{"after", `tech@example.org valid-after="20240101Z",valid-before="20241231Z" ` + ed, "20250615Z"},
		{"at the very end", `tech@example.org valid-before="20240615Z" ` + ed, "20240615Z"},
		{"at the very beginning", `tech@example.org valid-after="20240615Z" ` + ed, "20240615Z"},
		{"with minutes", `tech@example.org valid-before="202406150000" ` + ed, "20240615"},
		{"second line", `tech@example.org valid-before="20200101Z" ` + ed + "\ntech@example.org " + ed, "20240615Z"},
		{"broken time", `tech@example.org valid-before="2024-06-15" ` + ed, "20240615Z"},
		{"empty list", "", "20240615Z"},
	} {
		dir := t.TempDir()
		list, sig := filepath.Join(dir, "allowed"), filepath.Join(dir, "sig")
		os.WriteFile(list, []byte(c.list+"\n"), 0o600)
		os.WriteFile(sig, []byte(armoured), 0o600)
		out, err := keygen(t, message, "-Y", "verify", "-f", list, "-I", "tech@example.org", "-n", "chargehand", "-s", sig, "-Overify-time="+c.at)
		theirs := err == nil
		at, err := time.ParseInLocation("20060102", strings.TrimSuffix(c.at, "Z"), map[bool]*time.Location{true: time.UTC, false: time.Local}[strings.HasSuffix(c.at, "Z")])
		if err != nil {
			t.Fatal(err)
		}
		ours := false
		if parsed, err := signing.ParseAllowed("allowed", strings.NewReader(c.list), time.Local); err == nil {
			entry, err := parsed.Find(key(t, "ed25519"), at)
			ours = err == nil && entry.Allows("tech@example.org")
		}
		if ours != theirs {
			t.Errorf("%s: we say %v, ssh-keygen says %v (%s)", c.name, ours, theirs, out)
		}
	}
}
