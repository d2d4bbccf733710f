package signing_test

import (
	"bytes"
	"errors"
	"fmt"
	"io/fs"
	"net"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"testing"

	"golang.org/x/crypto/ssh"
	"golang.org/x/crypto/ssh/agent"

	"chargehand/commission/signing"
)

func read(t testing.TB, name string) string {
	t.Helper()
	b, err := os.ReadFile(filepath.Join("testdata", name))
	if err != nil {
		t.Fatal(err)
	}
	return string(b)
}

// privateFile copies a test key to where only the test can read it.
func privateFile(t testing.TB, name string) string {
	t.Helper()
	path := filepath.Join(t.TempDir(), name)
	if err := os.WriteFile(path, []byte(read(t, name)), 0o600); err != nil {
		t.Fatal(err)
	}
	return path
}

func load(t testing.TB, name string) signing.Key {
	t.Helper()
	k, err := signing.Load(privateFile(t, name), nil)
	if err != nil {
		t.Fatal(err)
	}
	return k
}

var keyNames = []string{"ed25519", "ecdsa", "rsa"}

// The signatures in testdata were made by ssh-keygen; testdata/make.sh is how.
func TestSignaturesOfOpenSSHHold(t *testing.T) {
	message := []byte(read(t, "message"))
	for _, name := range keyNames {
		for _, suffix := range []string{".sig", ".sha256.sig"} {
			armoured := read(t, "message."+name+suffix)
			key, err := signing.Verify(message, armoured)
			if err != nil {
				t.Errorf("Verify(message.%s%s) = %v, want nil", name, suffix, err)
				continue
			}
			if print := key.Fingerprint(); !strings.Contains(read(t, name+".fingerprint"), " "+print+" ") {
				t.Errorf("Fingerprint = %s, want that of %s", print, read(t, name+".fingerprint"))
			}
			if !strings.HasPrefix(read(t, name+".pub"), key.AuthorizedKey()+" ") {
				t.Errorf("AuthorizedKey = %s, want that of %s", key.AuthorizedKey(), read(t, name+".pub"))
			}
			if _, err := signing.Verify(append(message, ' '), armoured); !errors.Is(err, signing.ErrMismatch) {
				t.Errorf("Verify of a longer message = %v, want ErrMismatch", err)
			}
			for other, text := range map[string]string{"CR LF": strings.ReplaceAll(armoured, "\n", "\r\n")} {
				if _, err := signing.Verify(message, text); err != nil {
					t.Errorf("Verify with %s = %v, want nil", other, err)
				}
			}
		}
	}
	if _, err := signing.Verify(message, read(t, "message.namespace.sig")); err == nil || !strings.Contains(err.Error(), `namespace "git", not "chargehand"`) {
		t.Errorf(`Verify of a signature for "git" = %v, want a NamespaceError`, err)
	}
}

// An Ed25519 signature depends on nothing but key and message (RFC 8032), and we break lines where OpenSSH does.
func TestSignWritesWhatOpenSSHWrites(t *testing.T) {
	got, err := load(t, "ed25519").Sign([]byte(read(t, "message")))
	if want := read(t, "message.ed25519.sig"); err != nil || got != want {
		t.Errorf("Sign = %s, %v, want what ssh-keygen writes:\n%s", got, err, want)
	}
}

func TestSignAndVerify(t *testing.T) {
	message := bytes.Repeat([]byte("0123456789"), 10_000)
	for _, name := range keyNames {
		k := load(t, name)
		whole, err := k.Sign(message)
		if err != nil {
			t.Fatal(err)
		}
		streamed, err := k.SignFrom(bytes.NewReader(message))
		if err != nil {
			t.Fatal(err)
		}
		for _, armoured := range []string{whole, streamed} {
			if key, err := signing.Verify(message, armoured); err != nil || key.Fingerprint() != k.Fingerprint() {
				t.Errorf("%s: Verify = %s, %v, want %s", name, key, err, k.Fingerprint())
			}
		}
	}
}

func TestParseRefusesEverythingButOneBlock(t *testing.T) {
	good := read(t, "message.ed25519.sig")
	lines := strings.SplitAfter(good, "\n")
	for name, c := range map[string]struct{ text, want string }{
		"empty":           {"", "does not begin"},
		"binary":          {"\x00\x01\x02", "does not begin"},
		"text before":     {"hello\n" + good, "does not begin"},
		"text after":      {good + "hello\n", "text after -----END"},
		"line feed after": {good + "\n", "text after -----END"},
		"two blocks":      {good + good, "text after -----END"},
		"no end":          {strings.Join(lines[:4], ""), "no line -----END"},
		"last line open":  {strings.TrimSuffix(good, "\n"), "the last line does not end"},
		"header":          {lines[0] + "Hash: SHA512\n\n" + strings.Join(lines[1:], ""), "not as wide"},
		"some CR LF":      {strings.Replace(good, "\n", "\r\n", 1), "only some lines end in CR LF"},
		"line cut":        {lines[0] + lines[1][1:] + strings.Join(lines[2:], ""), "not as wide"},
		"character":       {strings.Replace(good, "U1NI", "U1N*", 1), "illegal base64"},
		"nothing inside":  {lines[0] + lines[len(lines)-2], "no base64"},
		"other block":     {strings.ReplaceAll(good, "SSH SIGNATURE", "PGP SIGNATURE"), "does not begin"},
		"too long":        {lines[0] + strings.Repeat("A", 1<<20), "longer than"},
		"version 2":       {strings.Replace(good, "U1NIU0lHAAAAAQ", "U1NIU0lHAAAAAg", 1), "version 2"},
		"carriage return": {strings.Replace(good, "U1NI", "U1N\r", 1), "a carriage return"},
	} {
		_, err := signing.Parse([]byte(c.text))
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: Parse = %v, want an error with %q", name, err, c.want)
		}
		if _, ok := errors.AsType[*signing.MalformedError](err); !ok {
			t.Errorf("%s: Parse = %T, want a MalformedError", name, err)
		}
	}
}

func TestEverySingleByteOfASignatureCounts(t *testing.T) {
	message, good := []byte(read(t, "message")), []byte(read(t, "message.ed25519.sig"))
	try := func(what string, i int, text []byte) {
		if bytes.Equal(text, good) {
			return
		}
		if _, err := signing.Verify(message, string(text)); err == nil {
			t.Errorf("Verify after %s at byte %d = nil, want an error", what, i)
		}
	}
	for i := range good {
		for c := range 256 {
			changed := bytes.Clone(good)
			changed[i] = byte(c)
			try(fmt.Sprintf("change to %#02x", c), i, changed)
			try(fmt.Sprintf("insertion of %#02x", c), i, append(append(bytes.Clone(good[:i]), byte(c)), good[i:]...))
		}
		try("deletion", i, append(bytes.Clone(good[:i]), good[i+1:]...))
		try("truncation", i, good[:i])
		if i > 0 {
			swapped := bytes.Clone(good)
			swapped[i], swapped[i-1] = swapped[i-1], swapped[i]
			try("swap", i, swapped)
		}
	}
}

func TestLoadAsksForThePassphrase(t *testing.T) {
	path := privateFile(t, "locked")
	asked := 0
	answer := func(word string) func(string) ([]byte, error) {
		return func(string) ([]byte, error) { asked++; return []byte(word), nil }
	}
	k, err := signing.Load(path, answer("correct horse"))
	if err != nil || asked != 1 || !strings.HasPrefix(read(t, "locked.pub"), k.AuthorizedKey()) {
		t.Errorf("Load(locked) = %v, %v after %d questions, want the key after one", k, err, asked)
	}
	if _, err := signing.Load(path, answer("wrong horse")); !errors.Is(err, signing.ErrPassphrase) {
		t.Errorf("Load with a wrong passphrase = %v, want ErrPassphrase", err)
	}
	if _, err := signing.Load(path, nil); err == nil || !strings.Contains(err.Error(), "nobody to ask") {
		t.Errorf("Load with nobody to ask = %v, want an error that says so", err)
	}
	cancelled := errors.New("cancelled")
	if _, err := signing.Load(path, func(string) ([]byte, error) { return nil, cancelled }); !errors.Is(err, cancelled) {
		t.Errorf("Load after a cancelled question = %v, want that error", err)
	}
}

func TestLoadRefusesWhatIsNoPrivateKeyOfItsOwner(t *testing.T) {
	dir := t.TempDir()
	file := func(name, text string, mode os.FileMode) string {
		path := filepath.Join(dir, name)
		if err := os.WriteFile(path, []byte(text), mode); err != nil {
			t.Fatal(err)
		}
		return path
	}
	for _, c := range []struct{ name, path, want string }{
		{"public key", file("a", read(t, "ed25519.pub"), 0o644), "this is a public key"},
		{"text", file("b", "hello", 0o600), "no OpenSSH private key"},
		{"empty", file("c", "", 0o600), "no OpenSSH private key"},
		{"folder", dir, "is no key file"},
		{"large", file("d", strings.Repeat("x", 1<<17), 0o600), "is no key file"},
		{"missing", filepath.Join(dir, "none"), "no such file"},
	} {
		if _, err := signing.Load(c.path, nil); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: Load = %v, want an error with %q", c.name, err, c.want)
		}
	}
	if runtime.GOOS == "windows" {
		return // files have no such mode there
	}
	_, err := signing.Load(file("open", read(t, "ed25519"), 0o644), nil)
	if open, ok := errors.AsType[*signing.TooOpenError](err); !ok || open.Mode.Perm() != 0o644 {
		t.Errorf("Load of a key with mode 0644 = %v, want a TooOpenError", err)
	}
}

func TestWriteNewMakesAKeyThatLoads(t *testing.T) {
	for _, word := range []string{"", "correct horse"} {
		path := filepath.Join(t.TempDir(), "id_chargehand")
		made, err := signing.WriteNew(path, "tech@example.org", []byte(word))
		if err != nil {
			t.Fatal(err)
		}
		loaded, err := signing.Load(path, func(string) ([]byte, error) { return []byte(word), nil })
		if err != nil || loaded.Fingerprint() != made.Fingerprint() {
			t.Errorf("Load = %v, %v, want %v", loaded, err, made)
		}
		if info, _ := os.Stat(path); runtime.GOOS != "windows" && info.Mode().Perm() != 0o600 {
			t.Errorf("mode = %v, want 0600", info.Mode())
		}
		public, _ := os.ReadFile(path + ".pub")
		if want := made.AuthorizedKey() + " tech@example.org\n"; string(public) != want {
			t.Errorf(".pub = %q, want %q", public, want)
		}
		if _, err := signing.WriteNew(path, "", nil); err == nil {
			t.Error("WriteNew over an existing key = nil, want an error")
		}
		if err := os.Remove(path + ".pub"); err != nil {
			t.Fatal(err)
		}
		if _, err := signing.WriteNew(path, "", nil); err == nil || errors.Is(err, fs.ErrNotExist) {
			t.Errorf("WriteNew over an existing private key = %v, want an error that says so", err)
		}
	}
	if _, err := signing.WriteNew(filepath.Join(t.TempDir(), "k"), "two\nlines", nil); err == nil {
		t.Error("WriteNew with a line feed in the comment = nil, want an error")
	}
}

func TestKeyNeverPrintsItself(t *testing.T) {
	k := load(t, "ed25519")
	secret := strings.Split(read(t, "ed25519"), "\n")[1]
	for _, form := range []string{"%v", "%+v", "%#v", "%s", "%q"} {
		if got := fmt.Sprintf(form, k); strings.Contains(got, secret[:20]) || !strings.Contains(got, k.Fingerprint()) {
			t.Errorf("Sprintf(%s) = %s, want the fingerprint alone", form, got)
		}
	}
}

func TestAgentSigns(t *testing.T) {
	ring := agent.NewKeyring()
	for _, name := range keyNames {
		private, err := ssh.ParseRawPrivateKey([]byte(read(t, name)))
		if err != nil {
			t.Fatal(err)
		}
		if err := ring.Add(agent.AddedKey{PrivateKey: private, Comment: name}); err != nil {
			t.Fatal(err)
		}
	}
	here, there := net.Pipe()
	served := make(chan error)
	go func() { served <- agent.ServeAgent(ring, there) }()
	a := signing.NewAgent(here)
	keys, err := a.Keys()
	if err != nil || len(keys) != 3 {
		t.Fatalf("Keys = %v, %v, want three", keys, err)
	}
	for i, k := range keys {
		if k.Comment() != keyNames[i] {
			t.Errorf("Comment = %q, want %q", k.Comment(), keyNames[i])
		}
		found, err := a.Key(k.Fingerprint())
		if err != nil {
			t.Fatal(err)
		}
		armoured, err := found.Sign([]byte("message"))
		if err != nil {
			t.Fatal(err)
		}
		if key, err := signing.Verify([]byte("message"), armoured); err != nil || key.Fingerprint() != k.Fingerprint() {
			t.Errorf("Verify = %s, %v, want %s", key, err, k)
		}
	}
	if _, err := a.Key("SHA256:none"); err == nil || !strings.Contains(err.Error(), "holds 3 usable keys") {
		t.Errorf("Key(none) = %v, want an error", err)
	}
	if err := a.Close(); err != nil {
		t.Fatal(err)
	}
	<-served
	if _, err := keys[0].Sign([]byte("message")); err == nil {
		t.Error("Sign after the agent has gone = nil, want an error")
	}
	if _, err := signing.DialAgent(filepath.Join(t.TempDir(), "none")); !errors.Is(err, signing.ErrNoAgent) {
		t.Errorf("DialAgent(none) = %v, want ErrNoAgent", err)
	}
}
