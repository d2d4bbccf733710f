//go:build !windows

package signing_test

import (
	"errors"
	"net"
	"path/filepath"
	"testing"

	"golang.org/x/crypto/ssh"
	"golang.org/x/crypto/ssh/agent"

	"chargehand/commission/signing"
)

func TestFindTakesAFileOrAsksTheAgent(t *testing.T) {
	ring := agent.NewKeyring()
	private, err := ssh.ParseRawPrivateKey([]byte(read(t, "ecdsa")))
	if err != nil {
		t.Fatal(err)
	}
	if err := ring.Add(agent.AddedKey{PrivateKey: private}); err != nil {
		t.Fatal(err)
	}
	socket := filepath.Join(t.TempDir(), "agent")
	listener, err := net.Listen("unix", socket)
	if err != nil {
		t.Fatal(err)
	}
	defer listener.Close()
	go func() {
		for {
			c, err := listener.Accept()
			if err != nil {
				return
			}
			go agent.ServeAgent(ring, c)
		}
	}()
	for _, name := range []string{filepath.Join("testdata", "ecdsa.pub"), key(t, "ecdsa").Fingerprint(), privateFile(t, "ecdsa")} {
		k, done, err := signing.Find(name, nil, socket)
		if err != nil || k.Fingerprint() != key(t, "ecdsa").Fingerprint() {
			t.Errorf("Find(%s) = %v, %v, want the key", name, k, err)
			continue
		}
		armoured, err := k.Sign([]byte("message"))
		if err != nil {
			t.Errorf("Find(%s): Sign = %v", name, err)
		}
		if _, err := signing.Verify([]byte("message"), armoured); err != nil {
			t.Errorf("Find(%s): Verify = %v", name, err)
		}
		if err := done(); err != nil {
			t.Error(err)
		}
	}
	if _, _, err := signing.Find(filepath.Join("testdata", "rsa.pub"), nil, socket); err == nil {
		t.Error("Find of a key that the agent lacks = nil, want an error")
	}
	if _, _, err := signing.Find("SHA256:x", nil, ""); !errors.Is(err, signing.ErrNoAgent) {
		t.Errorf("Find without an agent = %v, want ErrNoAgent", err)
	}
}
